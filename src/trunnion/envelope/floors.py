"""Guaranteed floors between rows when only a largest body rate is known.

Between two rows a time dt apart, a carried direction moves along a path of length at most w dt from where it was to
where it will be.

Simple form. With angles m0, m1 to u at the rows, no point of the path is nearer than (m0 + m1 - w dt) / 2.

Direction form. All points of the path have distances to the two ends that add up to at most w dt: they lie in a
spherical ellipse with those ends as foci. A spherical ellipse is where an elliptic cone meets the sphere, so it is
convex and every supporting plane of the cone proves a bound: with h the plane's unit normal, h . c >= 0 on the ellipse
and h . u = -sin(s), no point of the ellipse is nearer to u than s. The best plane is searched for; since any plane will
do, the floor holds however well the search does.
"""

from __future__ import annotations

import numpy as np

from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.envelope.balls import listed_spread, widened
from trunnion.envelope.box import ROUNDING_BOUND
from trunnion.envelope.results import (
    LARGEST_ANGLE,
    LARGEST_LINE,
    LEAST_ANGLE,
    LEAST_LINE,
    RIGHT_ANGLE,
    Spread,
)
from trunnion.envelope.vectors import Array, angle_between, cross, dot, unit

_STRING_SLACK = 1e-14  # rad added to the length of way: covers the rounding of the distance between the foci
_GRID = 17
_GOLDEN = 0.5 * (np.sqrt(5.0) - 1.0)
_BATCH = 4096


def simple_floor(m0: Array, m1: Array, way: Array) -> Array:
    """Least angle that is possible between rows with angles m0, m1 and a way of at most `way`; all rad."""
    return np.maximum(0.0, 0.5 * (m0 + m1 - way))


def direction_floor(start: Array, stop: Array, way: Array, u: Array) -> Array:
    """Sharper floor (n,) rad from the directions themselves: start, stop, u (3, n) unit, way (n,) rad.

    Never above the true distance of u to the reachable set, never below `simple_floor`; up to pi/2.
    """
    half = 0.5 * way + _STRING_SLACK
    simple = simple_floor(angle_between(start, u), angle_between(stop, u), way)
    focal = 0.5 * angle_between(start, stop)
    usable = half < RIGHT_ANGLE - 1e-9
    half = np.where(usable, half, 1.0)
    focal = np.minimum(focal, half)
    centre = unit(start + stop + 1e-300)
    along, across = _local_axes(centre, start, stop)
    goal = np.stack([np.abs(dot(along, u)), np.abs(dot(across, u)), dot(centre, u)])
    wide = np.tan(half)
    narrow = np.sqrt(np.sin(half - focal) * np.sin(half + focal)) / np.cos(half)
    sine = _best_plane(goal, wide, narrow)
    sharp = np.arcsin(np.clip(sine, 0.0, 1.0))
    return np.where(usable, np.maximum(simple, sharp - 0.5 * ROUNDING_BOUND), simple)


def _local_axes(centre: Array, start: Array, stop: Array) -> tuple[Array, Array]:
    """Unit axes along the line of the foci and across it; any pair when the foci coincide."""
    along = stop - start
    along = along - dot(along, centre) * centre
    away = np.zeros_like(centre)
    away[np.argmin(np.abs(centre), axis=0), np.arange(centre.shape[1])] = 1.0
    other = cross(centre, away)
    apart = np.sqrt(dot(along, along))
    along = unit(np.where(apart > 1e-14, along, other))
    return along, cross(centre, along)


def _best_plane(goal: Array, wide: Array, narrow: Array) -> Array:
    """Largest sine of a bound over the supporting planes (-cos t, -sin t, sqrt(wide² cos² + narrow² sin²))."""

    def sine(t: Array) -> Array:
        c, s = np.cos(t), np.sin(t)
        lift = (wide * c) ** 2 + (narrow * s) ** 2
        return (goal[0] * c + goal[1] * s - goal[2] * np.sqrt(lift)) / np.sqrt(1.0 + lift)

    grid = np.linspace(0.0, RIGHT_ANGLE, _GRID)
    values = np.stack([sine(np.full_like(wide, t)) for t in grid])
    at = grid[np.argmax(values, axis=0)]
    low, high = np.maximum(at - grid[1], 0.0), np.minimum(at + grid[1], RIGHT_ANGLE)
    for _ in range(40):
        one, other = high - _GOLDEN * (high - low), low + _GOLDEN * (high - low)
        left = sine(one) > sine(other)
        low, high = np.where(left, low, one), np.where(left, other, high)
    return np.maximum(sine(0.5 * (low + high)), values.max(axis=0))


def path_floor(times: Array, carried: Array, rate: float, error: float, u: Array) -> tuple[float, int]:
    """Floor (rad) of the angle to u (3,) over all steps of carried directions (3, N), and the step that sets it.

    error: the rows' own error (rad). A point of the true path is within its way of the true ends, and these are within
    the error of the rows: the string gets longer by twice the error, and nothing else comes off.
    """
    count = carried.shape[1]
    angle = angle_between(carried, u[:, None])
    if count == 1:
        return max(float(angle[0]) - error, 0.0), 0
    way = rate * np.diff(times) + 2.0 * error
    simple = simple_floor(angle[:-1], angle[1:], way)
    order = np.argsort(simple, kind="stable")
    best, where = np.inf, 0
    for first in range(0, count - 1, _BATCH):
        part = order[first : first + _BATCH]
        if simple[part[0]] >= best:
            break
        goal = np.broadcast_to(u[:, None], (3, len(part)))
        sharp = direction_floor(carried[:, part], carried[:, part + 1], way[part], goal)
        at = int(np.argmin(sharp))
        if sharp[at] < best:
            best, where = float(sharp[at]), int(part[at])
    return best, where


def rate_limited_spread(
    times: Array, quaternions: Array, rate: float, error: float, offset: int, u: Array, v: Array
) -> Spread:
    """Spread of any motion through the rows (known to `error` rad) within the rate: the floor and the best row."""
    matrices = matrix_from_quaternion(quaternions)
    spread = listed_spread(matrices, u, v, label="row", times=times)
    _renumber(spread, offset)
    spread = widened(spread, u, v, error, "attitude error")
    for pair in range(u.shape[1]):
        carried = (matrices @ v[:, pair]).T
        near, at_near = path_floor(times, carried, rate, error, u[:, pair])
        far, at_far = path_floor(times, carried, rate, error, -u[:, pair])
        _widen_to_floors(spread, pair, near, np.pi - far)
        for which, step in ((LEAST_ANGLE, at_near), (LARGEST_ANGLE, at_far)):
            spread.where[which, pair] += f" (bound set between rows {step + 1 + offset:,} and {step + 2 + offset:,})"
    return spread


def _renumber(spread: Spread, offset: int) -> None:
    if offset:
        for place in np.ndindex(*spread.where.shape):
            row = int(str(spread.where[place]).split()[1].replace(",", ""))
            spread.where[place] = f"row {row + offset:,}"


def _widen_to_floors(spread: Spread, pair: int, near: float, far: float) -> None:
    """Put the floor under the least and the ceiling over the largest angle of one pair."""
    near, far = max(near - ROUNDING_BOUND, 0.0), min(far + ROUNDING_BOUND, np.pi)
    rows_cross = spread.hi[LEAST_ANGLE, pair] < RIGHT_ANGLE < spread.lo[LARGEST_ANGLE, pair]
    may_cross = near <= RIGHT_ANGLE <= far
    spread.lo[LEAST_ANGLE, pair] = min(near, spread.lo[LEAST_ANGLE, pair])
    spread.hi[LARGEST_ANGLE, pair] = max(far, spread.hi[LARGEST_ANGLE, pair])
    spread.lo[LEAST_LINE, pair] = min(near, np.pi - far, spread.lo[LEAST_LINE, pair])
    outermost = far if far < RIGHT_ANGLE else np.pi - near
    spread.hi[LARGEST_LINE, pair] = RIGHT_ANGLE if may_cross else max(outermost, spread.hi[LARGEST_LINE, pair])
    if rows_cross:
        spread.lo[LARGEST_LINE, pair] = RIGHT_ANGLE - ROUNDING_BOUND
