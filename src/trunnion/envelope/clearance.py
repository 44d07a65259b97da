"""Clearance to a reference direction that moves: a table of directions (Sun, ground station, another vehicle).

Two questions. `clearance_to_any` asks for a region against every direction of the table, whenever it is met: the
attitude may be any of the region while the direction is anywhere on its path. `clearance_along` asks for a track
against the direction at the same time.

Between rows directions move along the great circle at a constant rate. The angle between two directions changes by no
more than both move, so steps are halved until the bracket is as narrow as asked for; the bracket is proven whatever its
width.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from functools import partial

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import unit
from trunnion.envelope.branching import Bounds, Bracket, Cells, least_value
from trunnion.envelope.margins import spread_of
from trunnion.envelope.regions import Between, Region, Track, as_pairs
from trunnion.envelope.results import LARGEST_ANGLE, LEAST_ANGLE, AngleRange, Extreme, Witness
from trunnion.envelope.trajectories import matrices_at
from trunnion.envelope.vectors import Array, angle_between
from trunnion.errors import RegionError

_ROUNDING = 1e-13


@dataclass(frozen=True, eq=False)
class Directions:
    """A moving reference direction: `times` (N,) increasing, `directions` (N, 3) in reference components.

    Scaled to unit length when made. Steps of nearly half a turn leave the way open and are refused.
    """

    times: Array
    directions: Array
    arcs: Array = field(init=False, repr=False)

    def __post_init__(self) -> None:
        times = np.asarray(self.times, dtype=float)
        directions = unit(self.directions, "reference direction")
        if times.ndim != 1 or not len(times) or directions.shape != (len(times), 3):
            raise RegionError("a table of directions needs N times and N x 3 directions", remedy="one direction a row")
        if not (np.isfinite(times).all() and (np.diff(times) > 0.0).all()):
            raise RegionError("times of the directions do not increase", remedy="rows in order of time, none twice")
        arcs = angle_between(directions[:-1].T, directions[1:].T)
        if (arcs > np.radians(170.0)).any():
            row = int(np.argmax(arcs)) + 1
            raise RegionError(
                f"between rows {row:,} and {row + 1:,} the direction moves by nearly half a turn",
                remedy="give rows closer in time: which way it went is a guess",
            )
        for name, value in (("times", times), ("directions", directions), ("arcs", arcs)):
            object.__setattr__(self, name, value)

    def at(self, row: NDArray[np.intp], fraction: Array) -> Array:
        """Directions (M, 3) at fractions of the steps after rows."""
        start = self.directions[row]
        stop = self.directions[np.minimum(row + 1, len(self.times) - 1)]
        arc = np.append(self.arcs, 0.0)[row]
        sine = np.where(arc > 1e-9, np.sin(arc), 1.0)
        one = np.where(arc > 1e-9, np.sin((1.0 - fraction) * arc) / sine, 1.0 - fraction)
        other = np.where(arc > 1e-9, np.sin(fraction * arc) / sine, fraction)
        found = one[:, None] * start + other[:, None] * stop
        return found / np.linalg.norm(found, axis=1, keepdims=True)

    def when(self, times: Array) -> tuple[NDArray[np.intp], Array]:
        """Row and fraction for each time; outside the table raises RegionError."""
        if times.min() < self.times[0] or times.max() > self.times[-1]:
            raise RegionError(
                f"directions are known from {self.times[0]:.6g} to {self.times[-1]:.6g} only",
                remedy="give directions for the whole track",
            )
        row = np.clip(np.searchsorted(self.times, times, side="right") - 1, 0, max(len(self.times) - 2, 0))
        if len(self.times) == 1:
            return row, np.zeros(len(times))
        return row, (times - self.times[row]) / np.diff(self.times)[row]


def clearance_to_any(
    region: Region,
    body_direction: ArrayLike,
    directions: Directions,
    *,
    tolerance: float = np.radians(0.01),
    seconds: float = 10.0,
) -> AngleRange:
    """Brackets of the least and largest angle (rad) between a body direction and any direction of the table."""
    _, v = as_pairs(np.array([1.0, 0.0, 0.0]), body_direction)
    ends = []
    for which, sign in ((LEAST_ANGLE, 1.0), (LARGEST_ANGLE, -1.0)):
        problem = _AnyTime(region, v, directions, which, sign)
        found = _search(problem.bound, directions.arcs, tolerance, 0.5 * seconds)
        ends.append(problem.extreme(found))
    return AngleRange(*ends)


def _search(bound: Callable[[Cells], Bounds], arcs: Array, tolerance: float, seconds: float) -> Bracket:
    """Over (row, fraction) of every step."""
    rows = np.arange(max(len(arcs), 1), dtype=float)
    low, high = np.stack([rows, np.zeros_like(rows)]), np.stack([rows, np.ones_like(rows)])
    return least_value(bound, low, high, tolerance=tolerance, seconds=seconds, batch=256)


class _AnyTime:
    """Extreme over the region for each place on the path of the direction: exact there, and changing with it."""

    def __init__(self, region: Region, v: Array, directions: Directions, which: int, sign: float) -> None:
        self.region, self.v, self.directions = region, v, directions
        self.which, self.sign = which, sign
        self.basis = Basis.CERTIFIED

    def bound(self, cells: Cells) -> Bounds:
        """Bounds for parts of steps."""
        row, fraction = cells.centre[0].astype(np.intp), cells.centre[1]
        spread = spread_of(self.region, self.directions.at(row, fraction).T.copy(), np.repeat(self.v, len(row), axis=1))
        self.basis = spread.basis
        reach = np.append(self.directions.arcs, 0.0)[row] * cells.half[1]
        lo, hi = spread.lo[self.which], spread.hi[self.which]
        outer, inner = (lo, hi.copy()) if self.sign > 0 else (-hi, -lo)
        lower = np.maximum(outer - reach, 0.0 if self.sign > 0 else -np.pi)  # no angle lies outside 0 … pi
        return Bounds(lower, inner, cells.centre, np.stack([np.full_like(reach, -1.0), reach]), cells)

    def extreme(self, found: Bracket) -> Extreme:
        """The bracket with the attitude and the time of the direction at which it is reached."""
        row, fraction = np.array([int(found.at[0])]), np.array([found.at[1]])
        u = self.directions.at(row, fraction).T.copy()
        spread = spread_of(self.region, u, self.v)
        time = float(np.interp(row[0] + fraction[0], np.arange(len(self.directions.times)), self.directions.times))
        matrix = spread.matrices[self.which, 0]
        witness = None
        if np.isfinite(matrix).all():
            value = float(angle_between(u[:, 0], matrix @ self.v[:, 0]))
            witness = Witness(matrix, value, time, f"{spread.where[self.which, 0]}, direction at time {time:.6g}")
        lo, hi = (found.lo, found.hi) if self.sign > 0 else (-found.hi, -found.lo)
        governing = spread.governing[self.which, 0]
        return Extreme(max(lo, 0.0), min(hi, np.pi), self.basis, witness, governing)


def clearance_along(
    track: Track,
    body_direction: ArrayLike,
    directions: Directions,
    *,
    tolerance: float = np.radians(0.01),
    seconds: float = 10.0,
) -> AngleRange:
    """Brackets of the least and largest angle (rad) between a body direction of a slerp track and a moving direction,
    both at the same time. An attitude error widens them; without one the basis is measured."""
    if track.between is not Between.SLERP or track.longest_gap is not None:
        raise RegionError(
            "clearance to a moving direction needs a track joined by slerp without gaps",
            remedy="state slerp between rows, or take the pieces one by one",
        )
    _, v = as_pairs(np.array([1.0, 0.0, 0.0]), body_direction)
    problem = _SameTime(track, v[:, 0], directions)
    ends = []
    for sign in (1.0, -1.0):
        found = least_value(
            partial(problem.bound, sign=sign),
            problem.knots[None, :-1] if len(problem.knots) > 1 else problem.knots[None],
            problem.knots[None, 1:] if len(problem.knots) > 1 else problem.knots[None],
            tolerance=tolerance,
            seconds=0.5 * seconds,
        )
        ends.append(problem.extreme(found, sign))
    return AngleRange(*ends)


class _SameTime:
    """Angle between u(t) and R(t) v over cells of time; knots are all rows of both tables."""

    def __init__(self, track: Track, v: Array, directions: Directions) -> None:
        self.track, self.v, self.directions = track, v, directions
        directions.when(track.times[[0, -1]])
        between = directions.times[(directions.times > track.times[0]) & (directions.times < track.times[-1])]
        self.knots = np.union1d(track.times, between)

    def _at(self, times: Array) -> tuple[Array, Array]:
        """Attitudes (n, 3, 3) and directions (n, 3)."""
        track = self.track
        row = np.clip(np.searchsorted(track.times, times, side="right") - 1, 0, max(len(track.times) - 2, 0))
        spans = np.diff(track.times)[row] if len(track.times) > 1 else np.ones(len(times))
        R = matrices_at(track.quaternions, row, np.clip((times - track.times[row]) / spans, 0.0, 1.0))
        return R, self.directions.at(*self.directions.when(times))

    def bound(self, cells: Cells, sign: float) -> Bounds:
        """Value in the middle, less what direction and body axis can move until the ends of the cell."""
        R, u = self._at(cells.centre[0])
        carried = (R @ self.v).T
        value = sign * angle_between(u.T, carried)
        ends = [self._at(cells.centre[0] + side * cells.half[0]) for side in (-1.0, 1.0)]
        reach = np.zeros(len(value))
        for R_end, u_end in ends:  # a cell lies within one step of either table: both go straight to its ends
            turn = np.swapaxes(R_end, -1, -2) @ R
            half = np.sqrt(np.maximum(3.0 - np.trace(turn, axis1=1, axis2=2), 0.0)) * 0.5
            reach = np.maximum(reach, 2.0 * np.arcsin(np.minimum(half, 1.0)) + angle_between(u.T, u_end.T))
        reach = np.where(cells.half[0] > 0.0, reach + 2e-8, 0.0)  # the trace is blind to turns below 1.5e-8 rad
        lower = np.maximum(value - reach, 0.0 if sign > 0 else -np.pi)
        return Bounds(lower, value, cells.centre, reach[None], cells)

    def extreme(self, found: Bracket, sign: float) -> Extreme:
        """The bracket widened by the attitude error, with the time at which it is reached."""
        R, u = self._at(found.at[:1])
        value = float(angle_between(u[0], R[0] @ self.v))
        witness = Witness(R[0], value, float(found.at[0]), f"at time {found.at[0]:.6g}")
        lo, hi = (found.lo, found.hi) if sign > 0 else (-found.hi, -found.lo)
        error = self.track.attitude_error
        found_range = Extreme(lo - _ROUNDING, hi + _ROUNDING, Basis.MEASURED, witness)
        if error is not None:
            witness = replace(witness, where=f"{witness.where}, before the attitude error is taken off")
            found_range = Extreme(lo - sign * error, hi - sign * error, Basis.CERTIFIED, witness)
        return replace(found_range, lo=max(found_range.lo, 0.0), hi=min(found_range.hi, np.pi))
