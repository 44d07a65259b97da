"""Tables out: CSV and Parquet whose header states the convention, so that the file needs no letter beside it."""

from __future__ import annotations

import json
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from trunnion import __version__
from trunnion.attitude import words
from trunnion.attitude.conventions import Convention
from trunnion.errors import StoreError
from trunnion.tables.converting import ConvertedTable
from trunnion.tables.table import AttitudeTable

STATEMENT_KEY = b"trunnion.statement"
_QUATERNION = ("qw", "qx", "qy", "qz")


def write_csv(table: AttitudeTable | ConvertedTable, path: Path, convention: Convention | None = None) -> None:
    """Write a CSV: comment lines with the statement, then one row a time.

    A converted table gives angles (deg), the lock margin (deg), a near-lock flag and the quaternion; a plain one the
    quaternion (scalar first, body to reference). `convention` names the frames of a plain table. Numbers keep every
    digit. The file appears under its name only when it is complete.
    """
    from pyarrow import csv as arrow_csv

    columns, statement = _content(table, convention)
    head = "".join(f"# {line}\n" for line in _lines(statement))

    def write(handle: Any) -> None:
        handle.write(head.encode("utf-8"))
        arrow_csv.write_csv(_arrow(columns), handle)

    _write_complete(path, write)


def write_parquet(table: AttitudeTable | ConvertedTable, path: Path, convention: Convention | None = None) -> None:
    """Write the columns of `write_csv` as Parquet; the statement is JSON under the schema key `trunnion.statement`."""
    import pyarrow.parquet as pq

    columns, statement = _content(table, convention)
    text = json.dumps(statement, ensure_ascii=False).encode("utf-8")
    arrow = _arrow(columns).replace_schema_metadata({STATEMENT_KEY: text})
    _write_complete(path, lambda handle: pq.write_table(arrow, handle))


def _content(
    table: AttitudeTable | ConvertedTable, convention: Convention | None
) -> tuple[dict[str, np.ndarray], dict[str, Any]]:
    """Columns by name, and the statement about them."""
    converted = table if isinstance(table, ConvertedTable) else None
    plain = table.table if isinstance(table, ConvertedTable) else table
    named = converted.convention if converted else convention
    columns: dict[str, np.ndarray] = {"t": plain.times}
    if converted:
        for place, name in enumerate(converted.convention.angle_names):
            columns[name] = np.degrees(converted.angles[:, place])
        columns["lock margin"] = np.degrees(converted.margins)
        columns["near lock"] = converted.near.astype(np.int8)
    columns.update(zip(_QUATERNION, plain.quaternions.T, strict=True))
    return columns, _statement(plain, named, converted)


def _statement(table: AttitudeTable, convention: Convention | None, converted: ConvertedTable | None) -> dict[str, Any]:
    reference = convention.reference.name if convention else table.statement.reference or "reference"
    body = convention.body.name if convention else table.statement.body or "body"
    statement: dict[str, Any] = {
        "written by": f"trunnion {__version__}",
        "made from": f"{table.path.name}, SHA-256 {table.sha256}",
        "time": f"t in s from {table.origin!r} s on the source's clock",
        "quaternion": f"{', '.join(_QUATERNION)}: scalar first, Hamilton, maps {body} to {reference}",
        "frames": _frame_words(convention) if convention else "as stated for the source",
    }
    if converted:
        statement["convention"] = convention_statement(converted.convention)
        statement["lock margin"] = "rotation angle in deg to the nearest attitude at which these angles lock"
        statement["near lock"] = f"1 where the margin is below {np.degrees(converted.near_lock):g} deg"
        statement["warnings"] = converted.warnings()
    return statement


def _frame_words(convention: Convention) -> str:
    frames = (convention.reference, convention.body)
    return "; ".join(f"{frame.name} = x {frame.axes[0]}, y {frame.axes[1]}, z {frame.axes[2]}" for frame in frames)


def convention_statement(convention: Convention) -> dict[str, Any]:
    """All that fixes a convention, as data and as sentences one can turn a model by."""
    return {
        "name": convention.name,
        "sequence": convention.sequence.value,
        "about": convention.sense.value,
        "angles": list(convention.angle_names),
        "unit": "deg",
        "signs": list(convention.signs),
        "offsets deg": np.degrees(convention.offsets).tolist(),
        "constant on the reference side": convention.left.tolist(),
        "constant on the body side": convention.right.tolist(),
        "in words": list(
            dict.fromkeys(
                [
                    words.zero_sentence(convention),
                    *words.turn_sentences(convention),
                    words.mapping_sentence(convention),
                    words.range_sentence(convention),
                ]
            )
        ),
    }


def _lines(statement: dict[str, Any], indent: str = "") -> list[str]:
    """The statement as indented lines."""
    lines = []
    for key, value in statement.items():
        if isinstance(value, dict):
            lines += [f"{indent}{key}:", *_lines(value, indent + "  ")]
        elif isinstance(value, list) and value and isinstance(value[0], str) and len(str(value)) > 80:
            lines += [f"{indent}{key}:", *(f"{indent}  - {' '.join(item.split())}" for item in value)]
        else:
            lines.append(f"{indent}{key}: {' '.join(str(value).split())}")
    return lines


def _arrow(columns: dict[str, np.ndarray]) -> Any:
    import pyarrow as pa

    return pa.table({name: np.ascontiguousarray(values) for name, values in columns.items()})


def _write_complete(path: Path, write: Callable[[Any], None]) -> None:
    """Write beside the target and move it into place, so that a half-written file never bears the name."""
    try:
        handle, name = tempfile.mkstemp(prefix=f".{path.name}-", dir=path.parent)
        try:
            with os.fdopen(handle, "wb") as stream:
                write(stream)
            os.replace(name, path)
        except BaseException:
            Path(name).unlink(missing_ok=True)
            raise
    except OSError as err:
        raise StoreError(f"'{path}' can't be written: {err.strerror or err}", remedy="check the folder") from err
