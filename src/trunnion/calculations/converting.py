"""A table of a workbook in another of its conventions, written to a file whose header says which."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense
from trunnion.attitude.sequences import Sequence as Turns
from trunnion.calculations.writes import write_bytes
from trunnion.errors import TrunnionError
from trunnion.tables import ConvertedTable, MessageHead, aem_text, apm_text, convert_table, write_csv, write_parquet
from trunnion.tables.nearest import nearest_hint
from trunnion.units import parse_quantity

_KINDS = (".csv", ".parquet", ".aem", ".apm")


@dataclass(frozen=True)
class Conversion:
    """What was written, told in lines, and how many rows are near the lock of the target."""

    path: Path
    lines: tuple[str, ...]
    flagged: int


def convert_file(
    workbook: Path,
    envelope: str,
    convention: str,
    out: Path,
    *,
    near_lock: str = "5 deg",
    head: Sequence[str] = (),
    angles: bool = False,
) -> Conversion:
    """Convert the table of an envelope into a convention of the same workbook and write it as `out`'s suffix says.

    head: `key=text` pairs of an attitude message (the fields of `tables.MessageHead`, spaces for underscores).
    Raises TrunnionError for an envelope without a table, an unknown suffix, or what the message standard can't carry.
    """
    from trunnion.calculations.handover import convention_of
    from trunnion.spec import load_workbook

    suffix = out.suffix.lower()
    if suffix not in _KINDS:
        raise TrunnionError(f"'{out.name}' does not say what to write", remedy=f"end its name in {', '.join(_KINDS)}")
    loaded = load_workbook(workbook)
    target = convention_of(loaded, convention)
    table, source = _table_of(loaded, envelope, target)
    limit = parse_quantity(near_lock, kind="angle").value
    converted = convert_table(table, source, target, limit)
    if suffix == ".csv":
        write_csv(converted, out)
    elif suffix == ".parquet":
        write_parquet(converted, out)
    else:
        write_bytes(out, _message(converted, suffix, _head(head, target), angles).encode("utf-8"))
    margin, row = converted.least_margin
    told = (
        f"{len(converted.margins)} rows in '{target.name}'; least lock margin {np.degrees(margin):.6g} deg in row {row}"
    )
    notes = [f"note: {note}" for note in table.notes]
    lines = (f"{out}: {told}", *notes, *(f"flagged: {text}" for text in converted.warnings()))
    return Conversion(out, lines, int(np.count_nonzero(converted.near)))


def _table_of(loaded: Any, envelope: str, target: Convention) -> tuple[Any, Convention]:
    """The envelope's table, and a convention that names the frames it stands on."""
    from trunnion.spec.build import convention_from_plain, frame_from_plain
    from trunnion.spec.plain import plain_part
    from trunnion.tables import read_table, statement_from_plain

    known = loaded.names("envelopes")
    if envelope not in known:
        raise TrunnionError(f"this workbook has no envelope '{envelope}'", remedy=nearest_hint(envelope, known))
    plain = plain_part(loaded, "envelopes", envelope)
    if not isinstance(plain.get("table"), str):
        raise TrunnionError(f"envelope '{envelope}' is no table", remedy="name an envelope that states a table")
    statement = {
        key: value for key, value in plain.items() if key not in ("name", "dispersion", "max angular acceleration")
    }
    if isinstance(plain.get("convention"), dict):
        source = convention_from_plain(plain["convention"])
        statement["convention"] = source.name
        return read_table(statement_from_plain(statement, source), loaded.root), source
    frames = [frame_from_plain(plain_part(loaded, "frames", plain[side])) for side in ("reference", "body")]
    source = Convention("as logged", frames[0], frames[1], Turns.ZYX, Sense.MOVING, ("one", "two", "three"))
    return read_table(statement_from_plain(statement), loaded.root), source


def _message(converted: ConvertedTable, suffix: str, head: MessageHead, angles: bool) -> str:
    convention = converted.convention if angles else None
    if suffix == ".aem":
        return aem_text(converted.table, head, convention)
    if len(converted.table) != 1:
        raise TrunnionError(
            f"an APM holds one attitude, the table has {len(converted.table)}", remedy="write an AEM: name it .aem"
        )
    return apm_text(converted.table.quaternions[0], head, convention)


def _head(given: Sequence[str], target: Convention) -> MessageHead:
    """The head of a message from `key=text` pairs; the frames are named after the target's unless stated."""
    told: dict[str, Any] = {"reference_frame": target.reference.name.upper(), "body_frame": target.body.name.upper()}
    known = [field.name.replace("_", " ") for field in fields(MessageHead)]
    for pair in given:
        key, equals, text = pair.partition("=")
        if not equals or key.strip() not in known:
            raise TrunnionError(f"'{pair}' is no entry of a message head", remedy=f"the entries are {', '.join(known)}")
        value = text.strip()
        told[key.strip().replace(" ", "_")] = (value,) if key.strip() == "comments" else value
    missing = [name for name in known[:8] if name.replace(" ", "_") not in told]
    if missing:
        listed = " ".join(f'--head "{name}=…"' for name in missing)
        raise TrunnionError(f"an attitude message needs {', '.join(missing)}", remedy=f"add {listed}")
    return MessageHead(**told)
