"""The bench check of one mount: a page to print, a readings file to fill in, and the judgement of it."""

from __future__ import annotations

import csv
import html
import io
from pathlib import Path
from typing import Any

import numpy as np

from trunnion.calculations.writes import write_bytes
from trunnion.errors import Place, TrunnionError
from trunnion.hardware.bench import BenchTable, readings_from_rows
from trunnion.hardware.diagnosis import Diagnosis, diagnose, evidence
from trunnion.hardware.mounts import Mount
from trunnion.sheet.mount_bench import SHOWN_IN, cell, heads_of, named_rows, table_of
from trunnion.units import UNITS, parse_quantity

FOLDER = "bench"
_KINDS = {"gyro": "angular rate", "clinometer": "angle"}
LARGEST_FILE = 1_000_000  # bytes; a filled-in sheet is a few kilobytes
_CHANNELS = ("reading 1", "reading 2", "reading 3")
_HEADING = ("instrument", "pose or turn", "channels", "unit", *_CHANNELS, "expected")
_UNITS = {"gyro": "deg/s", "clinometer": "deg", "accelerometer": "g", "magnetometer": "1", "star_tracker": "1"}


def bench_of(workbook: Any, name: str) -> BenchTable:
    """The bench table of a workbook's mount; the field at the bench is that of its sensor-mount-check calculation."""
    from trunnion.spec.build import mount_from_plain
    from trunnion.spec.plain import plain_part

    known = workbook.names("mounts")
    if name not in known:
        remedy = f"it has {', '.join(known)}" if known else "it has none"
        raise TrunnionError(f"this workbook has no mount '{name}'", remedy=remedy, place=Place(workbook.path))
    mount: Mount = mount_from_plain(plain_part(workbook, "mounts", name))
    return table_of(mount, _field(workbook, name))


def _field(workbook: Any, name: str) -> dict[str, Any] | None:
    from trunnion.spec.parts.base import to_plain

    for calculation in workbook.calculations:
        given = {key.replace("_", " "): value for key, value in calculation.parameters.items()}
        if given.get("mount") == name and "bench field" in given:
            stated: dict[str, Any] = to_plain(given["bench field"])
            return stated
    return None


def write_sheet(workbook: Any, name: str, folder: Path) -> list[Path]:
    """Write the page and the readings file to fill in; what was written, in order."""
    table = bench_of(workbook, name)
    folder.mkdir(parents=True, exist_ok=True)
    files = {f"{name}-bench.html": page(workbook, table), f"{name}-readings.csv": blank_readings(table)}
    written = []
    for file, text in files.items():
        write_bytes(folder / file, text.encode("utf-8"))
        written.append(folder / file)
    return written


def blank_readings(table: BenchTable) -> str:
    """The readings file with its readings left empty."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(_HEADING)
    for name, values in table.expected.items():
        scale, _ = SHOWN_IN[name]
        tolerance = getattr(table.tolerance, name)
        for row, line, around in zip(named_rows(table, name), values, tolerance, strict=True):
            empty = [""] * len(_CHANNELS)
            said = "; ".join(cell(scale * v, scale * a) for v, a in zip(line, around, strict=True))
            writer.writerow([name, row.key, " ".join(heads_of(table, name)), _UNITS[name], *empty, said])
    return stream.getvalue()


def read_readings(table: BenchTable, path: Path) -> Any:
    """The filled-in file as channels; rows left empty are readings not taken. Anything else wrong names its line."""
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise TrunnionError("the readings file is too large to be one", place=Place(path))
        text = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as err:
        raise TrunnionError("the readings file can't be read", remedy="UTF-8 text", place=Place(path)) from err
    reader = csv.DictReader(io.StringIO(text))
    missing = [key for key in _HEADING[:-1] if key not in (reader.fieldnames or [])]
    if missing:
        cause = f"the readings file has no column '{missing[0]}'"
        raise TrunnionError(cause, remedy="fill in the file `trunnion bench` wrote", place=Place(path, 1))
    rows, seen = [], set()
    for line, entry in enumerate(reader, start=2):
        filled = _row(entry, Place(path, line))
        if filled is None:
            continue
        if (filled["instrument"], filled["row"]) in seen:
            raise TrunnionError(
                f"'{filled['row']}' of the {filled['instrument']} is filled in twice", place=Place(path, line)
            )
        seen.add((filled["instrument"], filled["row"]))
        rows.append(filled)
    return readings_from_rows(table, rows)


def _row(entry: dict[str, Any], place: Place) -> dict[str, Any] | None:
    """One filled-in row in inside units, or None when none of its readings is."""
    texts = [str(entry.get(key) or "").strip() for key in _CHANNELS]
    if not any(texts):
        return None
    count = max(1, len(str(entry.get("channels") or "").split()))
    unit = str(entry.get("unit") or "").strip()
    instrument, row = (str(entry.get(key) or "").strip() for key in ("instrument", "pose or turn"))
    factor = _factor(instrument, unit, place)
    values = [factor * _number(text, place) for text in texts[:count]]
    return {"instrument": instrument, "row": row, "values": values}


def _factor(instrument: str, unit: str, place: Place) -> float:
    """Size of the unit in inside units; a unit of the wrong kind is refused, never guessed."""
    kind = _KINDS.get(instrument)
    plain = _UNITS.get(instrument)
    if kind is None:
        if plain is not None and unit != plain:
            raise TrunnionError(
                f"'{unit[:20]}' is not the unit of the {instrument}", remedy=f"write {plain}", place=place
            )
        return 1.0
    if unit not in UNITS or UNITS[unit].kind != kind:
        cause = f"'{unit[:20]}' is not a unit of {kind}, which the {instrument} reads"
        raise TrunnionError(cause, remedy=f"for instance {plain}", place=place)
    return parse_quantity(f"1 {unit}").value


def _number(text: str, place: Place) -> float:
    try:
        value = float(text.replace("−", "-")) if text else np.nan
    except ValueError as err:
        raise TrunnionError(f"'{text[:40]}' is not a number", remedy="write +0.98", place=place) from err
    if text and not np.isfinite(value):
        raise TrunnionError(f"'{text[:40]}' is not a finite number", place=place)
    return value


def judge(workbook: Any, name: str, readings: Path) -> Diagnosis:
    """Pass or fail, and the mistake that explains a failure."""
    table = bench_of(workbook, name)
    return diagnose(table, read_readings(table, readings))


def judgement_lines(found: Diagnosis) -> list[str]:
    """What a screen shows of a judgement."""
    lines = [found.verdict, f"largest deviation {found.misfit:.3g} tolerances, at {found.worst}"]
    if found.mistake is not None and found.equally_good:
        lines += ["fits as well:", *[f"  {words}" for words in found.equally_good[:5]]]
    if not found.evidence.sufficient:
        lines.append(f"not revealed by what was read: {len(found.evidence.unseen)} mistakes, such as")
        lines += [f"  {words}" for words in found.evidence.unseen[:3]]
        lines += [f"  ({mark})" for mark in found.evidence.marks]
    return lines


def conclusive(found: Diagnosis) -> bool:
    """Passed on evidence that would have revealed every mistake considered."""
    return found.passed and found.evidence.sufficient


def page(workbook: Any, table: BenchTable) -> str:
    """The printable page: self-contained HTML, boxes to fill in, everything from the spec escaped."""
    mount, document = table.mount, workbook.document
    head = f"Bench check of {mount.name}"
    parts = [
        f"<h1>{_e(head)}</h1>",
        '<table class="title"><tr>'
        + "".join(
            f"<td><small>{_e(word)}</small>{_e(str(value))}</td>"
            for word, value in (("Document", document.number), ("Revision", document.revision), ("Mount", mount.name),
                                ("Host", mount.host.name))
        )
        + "".join(f'<td class="fill"><small>{word}</small></td>' for word in ("Serial number", "Date", "Done by"))
        + "</tr></table>",
        f"<p>{_e(_axes(mount))} {_e(_reports(mount))}</p>",
        "<p>Put the vehicle so, let it come to rest, and write each reading into its box. A reading passes within the "
        "tolerance printed in the box. Work through every row: level poses alone prove nothing.</p>",
        *[_instrument(table, name, values) for name, values in table.expected.items()],
        _unseen(table),
        '<table class="title"><tr>'
        + "".join(f'<td class="fill"><small>{word}</small></td>' for word in _FOOT)
        + "</tr></table>",
    ]  # fmt: skip
    return (
        f'<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8"><title>{_e(head)}</title><style>{_STYLE}</style>'
        f"</head><body>\n{''.join(parts)}\n</body></html>\n"
    )


def _axes(mount: Mount) -> str:
    from trunnion.hardware.mount_check import pointing_words

    return "; ".join(pointing_words(mount.R_bs, mount.host, mount.sensor_axes)) + "."


def _reports(mount: Mount) -> str:
    if mount.accelerometer is None:
        return ""
    sign = "+1 g" if mount.accelerometer.sign > 0 else "−1 g"
    return f"At rest the accelerometer reports {mount.accelerometer.value}: the axis that points up reads {sign}."


def _instrument(table: BenchTable, name: str, values: Any) -> str:
    scale, unit = SHOWN_IN[name]
    heads = "".join(f"<th>{_e(head)}{f', {unit}' if unit else ''}</th>" for head in heads_of(table, name))
    rows = []
    for row, line, around in zip(named_rows(table, name), values, getattr(table.tolerance, name), strict=True):
        boxes = "".join(
            f'<td class="box"><small>{cell(scale * v, scale * a)}</small></td>'
            for v, a in zip(line, around, strict=True)
        )
        rows.append(f"<tr><td>{_e(row.words)}</td>{boxes}</tr>")
    title = name.replace("_", " ").capitalize()
    return f"<h2>{_e(title)}</h2><table><tr><th>Put the vehicle so</th>{heads}</tr>{''.join(rows)}</table>"


def _unseen(table: BenchTable) -> str:
    found = evidence(table)
    if found.sufficient:
        return "<p>Worked through completely, this sheet reveals every mistake considered.</p>"
    return f"<p>Not revealed even by the whole sheet: {_e('; '.join(found.unseen[:4]))}.</p>"


def _e(text: str) -> str:
    return html.escape(text, quote=True)


_FOOT = ("All within tolerance: yes / no", "Done by", "Witness")
_STYLE = """
@page{size:A4;margin:14mm}body{font:10pt sans-serif;color:#1d2429;max-width:182mm;margin:auto}
h1{font-size:15pt;margin:0 0 3mm}h2{font-size:11pt;margin:5mm 0 1mm}
table{border-collapse:collapse;width:100%;page-break-inside:avoid}
th,td{border:0.3mm solid #66717a;padding:1mm 1.5mm;text-align:left;vertical-align:top}
th{background:#eef1f3}small{display:block;color:#444c53;font-size:7.5pt}
td.box{width:26mm;height:11mm}td.fill{height:11mm;min-width:22mm}
@media print{body{max-width:none}}
"""
