"""Which rows of a table can't be used: times that don't go forward, attitudes that are none."""

from __future__ import annotations

from bisect import bisect_left

import numpy as np
from numpy.typing import NDArray

from trunnion.tables.table import SHOWN_ROWS, Trouble, trouble_at

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

#: A clock whose step is coarser than this part of the usual time between rows has lost resolution.
CLOCK_STEP_PART = 0.1
#: Without a stated largest gap, one this many times the usual step is worth a note.
GAP_NOTE_STEPS = 10.0


def check_times(times: Array, clock_step: float = 0.0) -> tuple[Mask, list[Trouble]]:
    """Rows to drop (N,) so that times (N,) s become strictly increasing, and what is wrong.

    The rows kept are a longest strictly increasing run, so one wild time costs one row, not all after it.
    `clock_step` (s) is the smallest step the stored number type can tell at these times.
    """
    finite = np.isfinite(times)
    troubles = [trouble_at("time missing", "the time is empty or not a finite number", ~finite)]
    bad = ~finite
    previous = np.where(finite, times, -np.inf)
    with np.errstate(invalid="ignore"):
        step = np.diff(previous)
    if not np.all(step > 0.0):
        kept = _longest_increasing(previous)
        kept &= finite
        back, still = np.zeros_like(bad), np.zeros_like(bad)
        gone = np.flatnonzero(finite & ~kept)
        equal = np.isin(times[gone], times[kept])
        still[gone[equal]], back[gone[~equal]] = True, True
        troubles.append(trouble_at("time goes back", "the time does not fit between those of its neighbours", back))
        remedy = "print more digits of the time, or state why the rows may be left out: accept damaged: …"
        troubles.append(
            trouble_at("time repeats", "the time is that of another row: it lost resolution", still, remedy)
        )
        bad = ~kept
    good_steps = step if not np.any(bad) else np.diff(times[~bad])
    if _is_coarse(clock_step, good_steps):
        text = f"the time column resolves {clock_step:.3g} s, its usual step is {np.median(good_steps):.3g} s"
        troubles.append(Trouble("time resolution", text, 1, (), "store the time in 64 bits or as whole numbers"))
    return bad, [trouble for trouble in troubles if trouble is not None]


def _is_coarse(clock_step: float, steps: Array) -> bool:
    """Is the clock's step above its part of the usual one? The median is taken only when the least leaves doubt."""
    if len(steps) == 0 or clock_step <= CLOCK_STEP_PART * float(np.min(steps)):
        return False
    return clock_step > CLOCK_STEP_PART * float(np.median(steps))


def _longest_increasing(values: Array) -> Mask:
    """Mask (N,) of a longest strictly increasing subsequence (patience sorting, N log N)."""
    tails: list[float] = []
    tail_index: list[int] = []
    parent = np.full(len(values), -1)
    for index, value in enumerate(values.tolist()):
        place = bisect_left(tails, value)
        parent[index] = tail_index[place - 1] if place else -1
        if place == len(tails):
            tails.append(value)
            tail_index.append(index)
        else:
            tails[place] = value
            tail_index[place] = index
    kept = np.zeros(len(values), dtype=bool)
    at = tail_index[-1] if tail_index else -1
    while at >= 0:
        kept[at] = True
        at = int(parent[at])
    return kept


def gap_troubles(times: Array, rows: NDArray[np.int64], max_gap: float | None) -> tuple[list[Trouble], list[str]]:
    """(findings, notes) on the time between rows: gaps above `max_gap` (s), else a note on unusual ones."""
    if len(times) < 3:
        return [], []
    steps = np.diff(times)
    largest = float(np.max(steps))
    if max_gap is None:
        if largest <= GAP_NOTE_STEPS * float(np.min(steps)) or largest <= GAP_NOTE_STEPS * float(np.median(steps)):
            return [], []
        usual, where = float(np.median(steps)), rows[int(np.argmax(steps))]
        note = f"largest gap {largest:.6g} s after row {where} ({largest / usual:.0f} times the usual {usual:.3g} s)"
        return [], [f"{note}; no max gap is stated"]
    long = np.flatnonzero(steps > max_gap)
    if not len(long):
        return [], []
    text = f"more than {max_gap:.6g} s without an attitude after this row; the largest gap is {largest:.6g} s"
    return [Trouble("gap", text, len(long), tuple(int(row) for row in rows[long[:SHOWN_ROWS]]))], []
