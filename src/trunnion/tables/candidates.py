"""What numeric columns may hold: a clock, quaternions, matrices, angles. Suggestions only, each with its ground."""

from __future__ import annotations

import re
from collections.abc import Sequence as Many
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_UNIT = 5e-3  # a quaternion's length, or a matrix's orthogonality, within this in nine rows of ten
_SHARE = 0.9
_ANGLE_WORDS = re.compile(
    r"(roll|pitch|yaw|heading|bank|elevation|azimuth|tilt|course|euler|phi|theta|psi|omega|kappa|hdg|att)",
    re.IGNORECASE,
)
_TIME_WORDS = re.compile(r"(^t$|^t_|time|stamp|epoch|^us$|^ms$)", re.IGNORECASE)
_NO_ANGLE = re.compile(r"(rate|speed|vel|dot|acc|std|var|cov|err|valid|flag|moment|thrust)", re.IGNORECASE)


@dataclass(frozen=True)
class Found:
    """One suggestion: what it is (time, quaternion, matrix, angles), the columns, and the ground for it."""

    what: str
    columns: tuple[str, ...]
    ground: str


@dataclass
class Series:
    """One series of a file: name, number of rows, a sample of each numeric column, and what those may hold."""

    name: str
    rows: int
    columns: dict[str, Array]
    found: list[Found] = field(default_factory=list)

    def span(self, name: str) -> tuple[float, float] | None:
        """Least and largest finite value of a column's sample."""
        values = self.columns[name]
        finite = values[np.isfinite(values)]
        return (float(finite.min()), float(finite.max())) if len(finite) else None


def search(series: Series) -> Series:
    """Fill `series.found`."""
    names = list(series.columns)
    series.found = [*_clocks(series), *_quaternions(series, names), *_matrices(series, names), *_angles(series, names)]
    return series


def _clocks(series: Series) -> list[Found]:
    found = []
    for name, values in series.columns.items():
        with np.errstate(invalid="ignore"):
            rising = len(values) > 1 and bool(np.all(np.diff(values) > 0.0))
        if _TIME_WORDS.search(name) and (rising or len(values) == 1):
            step = float(np.median(np.diff(values))) if len(values) > 1 else float("nan")
            found.append(Found("time", (name,), f"rises in every row, usual step {step:.6g}"))
    return found


def _runs(names: Many[str], width: int) -> list[tuple[str, ...]]:
    return [tuple(names[start : start + width]) for start in range(len(names) - width + 1)]


def _quaternions(series: Series, names: Many[str]) -> list[Found]:
    found: list[Found] = []
    for run in _runs(names, 4):
        values = np.stack([series.columns[name] for name in run], axis=-1)
        length = np.linalg.norm(values, axis=-1)
        if len(values) == 0 or np.mean(np.abs(length - 1.0) < _UNIT) < _SHARE or not _varies(values):
            continue
        if found and set(found[-1].columns) & set(run):
            continue
        means = np.mean(np.abs(values), axis=0)
        largest = run[int(np.argmax(means))]
        worst = float(np.nanmax(np.abs(length - 1.0)))
        ground = f"length 1 within {worst:.2g}; '{largest}' is the largest on average ({np.max(means):.3f}), which for "
        found.append(Found("quaternion", run, ground + "small motions is the scalar part"))
    return found


def _varies(values: Array) -> bool:
    """At least two of the columns change along the series (one row alone may be anything)."""
    return len(values) == 1 or int(np.count_nonzero(np.ptp(values, axis=0) > 1e-6)) >= 2


def _matrices(series: Series, names: Many[str]) -> list[Found]:
    found: list[Found] = []
    for run in _runs(names, 9):
        if found and set(found[-1].columns) & set(run):
            continue
        M = np.stack([series.columns[name] for name in run], axis=-1).reshape(-1, 3, 3)
        if len(M) == 0:
            continue
        with np.errstate(invalid="ignore", over="ignore"):
            miss = np.max(np.abs(np.swapaxes(M, 1, 2) @ M - np.eye(3)), axis=(1, 2))
        if np.mean(miss < _UNIT) >= _SHARE:
            mirrored = np.mean(np.linalg.det(np.nan_to_num(M)) < 0.0) > 0.5
            kind = "a reflection: one frame is left-handed" if mirrored else "a rotation"
            found.append(
                Found("matrix", run, f"orthogonal within {np.nanmax(miss):.2g}, {kind}; by rows or columns is open")
            )
    return found


def _angles(series: Series, names: Many[str]) -> list[Found]:
    chosen = [name for name in names if _ANGLE_WORDS.search(name) and not _NO_ANGLE.search(name) and series.span(name)]
    if not chosen:
        return []
    largest = max(max(abs(end) for end in series.span(name) or (0.0,)) for name in chosen)
    if largest > 4.0 * np.pi:
        ground = f"named as angles; up to {largest:.6g}, too large for radians"
    elif largest > 0.5:
        ground = f"named as angles; up to {largest:.6g}: radians, or small angles in degrees"
    else:
        ground = f"named as angles; up to {largest:.6g}: the unit can't be told"
    return [Found("angles", tuple(chosen[:3]), ground)] + (
        [Found("angles", tuple(chosen[3:6]), ground)] if len(chosen) > 3 else []
    )
