"""The columns a reader took from a file, before they mean an attitude."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from trunnion.tables.table import Trouble
from trunnion.units import UNITS

Array = NDArray[np.float64]

#: A count of seconds below this keeps steps of 1 ns in double precision (spacing 9.3e-10 s at 2**23 s).
_FINE_SECONDS = float(2**22)


@dataclass
class Columns:
    """Time (any numeric type, in `time_unit`) and value columns (float64), each (N,), with the reader's report.

    `rows` are the 1-based data rows; None means 1…N. `facts` are answers found in the file; `line_of` gives
    the line of a data row in a text file. `damage` stops reading
    unless the statement accepts it; `findings` do not.
    """

    time: NDArray[np.generic]
    values: list[Array]
    rows: NDArray[np.int64] | None = None
    damage: list[Trouble] = field(default_factory=list)
    findings: list[Trouble] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    facts: dict[str, str] = field(default_factory=dict)
    line_of: Callable[[int], int | None] | None = None


def seconds(time: NDArray[np.generic], unit: str, origin: float | int | None = None) -> tuple[Array, float, float]:
    """(times (N,) s from the origin, origin in s, clock step in s) of a time column in `unit`.

    Whole numbers and date stamps are subtracted before they become floats, so nanoseconds since 1970 keep every digit.
    The origin is 0 while the numbers are small, else the first time; pass the raw `origin` of a first chunk to keep it.
    """
    scale = UNITS[unit].to_inside(1.0)
    if time.dtype.kind == "M":
        time, scale = time.astype("datetime64[ns]").astype(np.int64), 1e-9
    zero = raw_origin(time, unit) if origin is None else origin
    if time.dtype.kind in "iu" and len(time):
        least, largest = int(time.min()) - int(zero), int(time.max()) - int(zero)
        if max(-least, largest) < 2**62:  # else the difference may wrap round: floats then
            return (time.astype(np.int64) - np.int64(zero)).astype(float) * scale, float(zero) * scale, 0.0
    step = _clock_step(time) * scale
    return (time.astype(float) - float(zero)) * scale, float(zero) * scale, step


def _clock_step(time: NDArray[np.generic]) -> float:
    """The smallest step the number type can tell at the largest of these times; 0 for whole numbers."""
    if time.dtype.kind != "f":
        return 0.0
    finite = np.abs(time[np.isfinite(time)])
    with np.errstate(over="ignore"):
        return float(np.spacing(np.max(finite))) if len(finite) else 0.0


def raw_origin(time: NDArray[np.generic], unit: str) -> float | int:
    """The number in the file's own unit from which times are counted: 0 for small clocks, else the first time."""
    scale = 1e-9 if time.dtype.kind == "M" else UNITS[unit].to_inside(1.0)
    numbers = time.astype("datetime64[ns]").astype(np.int64) if time.dtype.kind == "M" else time
    good = numbers[np.isfinite(numbers)] if numbers.dtype.kind == "f" else numbers
    if len(good) == 0 or abs(float(good[0])) * scale < _FINE_SECONDS:
        return 0
    return int(good[0]) if good.dtype.kind in "iu" else float(good[0])
