"""From the columns of one reader to an AttitudeTable: convert, judge, stop or drop, and say so."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import Fault, Place, TableError
from trunnion.tables.checks import check_times, gap_troubles
from trunnion.tables.columns import Columns, raw_origin, seconds
from trunnion.tables.forms import continuous_signs, to_quaternions
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable, Trouble

#: Mean steps outside these (s) make the stated unit of time doubtful: 10 us, one hour.
_USUAL_STEPS = (1e-5, 3600.0)


@dataclass(frozen=True)
class Before:
    """What a chunk must know of the rows before it: raw origin, last time (s), last quaternion, rows so far."""

    origin: float | int | None = None
    time: float | None = None
    quaternion: NDArray[np.float64] | None = None
    rows: int = 0


def assemble(
    columns: Columns, statement: TableStatement, path: Path, sha256: str, before: Before = Before()
) -> AttitudeTable:
    """Build the table. Rows that can't be used stop it with TableError naming all kinds of trouble with row numbers,
    unless the statement accepts damage; then they are left out and listed under `dropped`.
    """
    count = len(columns.time)
    rows = columns.rows if columns.rows is not None else np.arange(before.rows + 1, before.rows + count + 1)
    unit = statement.time_unit or "s"
    start = before.origin if before.origin is not None else raw_origin(columns.time, unit)
    times, origin, clock_step = seconds(columns.time, unit, start)
    converted = to_quaternions(columns.values, statement)
    late, time_troubles = _check_times_after(times, clock_step, before.time)
    troubles = [_renumber(trouble, rows) for trouble in (*converted.troubles, *time_troubles)]
    damage = [*columns.damage, *troubles]
    if damage:
        refuse_damage([*damage, *columns.findings], statement, path, columns)
    bad = converted.bad | late
    if np.all(bad):
        raise TableError([Fault("no row of the file can be used", "check columns and units", Place(path))])
    q = converted.quaternions
    if np.any(bad):
        q, times, rows = q[~bad], times[~bad], rows[~bad]
    q, flips = continuous_signs(q, before.quaternion)
    findings, gap_notes = _gaps(times, rows, before, statement.max_gap)
    notes = [*columns.notes, *converted.notes, *gap_notes, *_unit_doubt(times, unit, columns)]
    if flips:
        notes.append(f"the quaternion's sign flips {flips} times between rows; q and -q are one attitude")
    if origin:
        notes.append(f"times are counted from {origin:.9f} s on the file's clock")
    return AttitudeTable(
        statement=statement,
        path=path,
        sha256=sha256,
        times=times,
        quaternions=q,
        rows=rows,
        origin=origin,
        notes=tuple(notes),
        findings=(*columns.findings, *findings),
        dropped=tuple(damage),
    )


def _unit_doubt(times: NDArray[np.float64], unit: str, columns: Columns) -> list[str]:
    """A note where the usual step is so short or long that the stated unit is doubtful, or not used at all."""
    if columns.time.dtype.kind == "M":
        return [f"the time column holds dates; the stated unit '{unit}' is not used"]
    if len(times) < 3:
        return []
    step = float((times[-1] - times[0]) / (len(times) - 1))
    shortest, longest = _USUAL_STEPS
    return [] if shortest <= step <= longest else [f"the mean step is {step:.3g} s: is the time in '{unit}'?"]


def refuse_damage(
    damage: Sequence[Trouble], statement: TableStatement, path: Path, columns: Columns | None = None
) -> None:
    """Raise TableError with every trouble, unless the statement accepts damage."""
    if not damage or statement.accept_damaged:
        return
    faults = []
    for trouble in damage:
        line_of = columns.line_of if columns else None
        line = line_of(trouble.rows[0]) if line_of and trouble.rows else None
        faults.append(trouble.fault(path, line))
    last = faults[-1]
    advice = "to leave these out and go on, state accept damaged: (the reason)"
    faults[-1] = replace(last, remedy=f"{last.remedy}; {advice}" if last.remedy else advice)
    raise TableError(faults)


def _check_times_after(
    times: NDArray[np.float64], clock_step: float, last: float | None
) -> tuple[NDArray[np.bool_], list[Trouble]]:
    """check_times, with the last time of the chunk before as a row 0 that stays."""
    if last is None:
        return check_times(times, clock_step)
    late, troubles = check_times(
        np.where(times > last, times, np.where(np.isfinite(times), -np.inf, np.nan)), clock_step
    )
    stale = np.isfinite(times) & ~(times > last)
    if not np.any(stale):
        return late, troubles
    count = int(np.count_nonzero(stale))
    text = "the time is not after the rows of the part before"
    kept = [trouble for trouble in troubles if trouble.kind != "time missing" or np.any(~np.isfinite(times))]
    first = tuple(int(row) + 1 for row in np.flatnonzero(stale)[:5])
    return late | stale, [*kept, Trouble("time goes back", text, count, first)]


def _renumber(trouble: Trouble, rows: NDArray[np.int64]) -> Trouble:
    """Positions within the columns (from 1) to row numbers of the file."""
    return replace(trouble, rows=tuple(int(rows[place - 1]) for place in trouble.rows))


def _gaps(
    times: NDArray[np.float64], rows: NDArray[np.int64], before: Before, max_gap: float | None
) -> tuple[list[Trouble], list[str]]:
    if before.time is None:
        return gap_troubles(times, rows, max_gap)
    joined = np.concatenate([[before.time], times])
    return gap_troubles(joined, np.concatenate([[before.rows], rows]), max_gap)
