"""Forbidden sectors: azimuth and elevation polygons, per mode, and ways round them.

A sector's edges are straight lines in azimuth and elevation, as such cut-outs are drawn and typed (common practice).
Azimuths are counted on along the polygon, so a sector across north is written 350, 370 deg. Base axes north, east,
down. Clearances are angles on the sky, certified: the edges are followed in short steps and half a step is taken off.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.passes import Pass, azimuth_elevation, directions
from trunnion.hardware.travel import TravelPlan
from trunnion.hardware.vectors import Array, angle_between, unit

_STEP = np.radians(0.1)  # rad; spacing of the points an edge is followed by
_NEAREST = 2e-8  # rad; the nearest outline point is found by its cosine, which cannot tell angles this small apart


@dataclass(frozen=True, eq=False)
class Sector:
    """One forbidden sector: name, polygon (N, 2) of azimuth and elevation (rad), the modes it holds in (none: all)."""

    name: str
    corners: Array
    modes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        corners = np.asarray(self.corners, dtype=float)
        if corners.ndim != 2 or corners.shape[1:] != (2,) or len(corners) < 3 or not np.all(np.isfinite(corners)):
            raise HardwareError(f"sector '{self.name}' needs three or more corners of azimuth and elevation")
        if np.any(np.abs(corners[:, 1]) > np.pi / 2 + 1e-12):
            raise HardwareError(f"sector '{self.name}' has an elevation beyond 90 deg")
        if np.ptp(corners[:, 0]) > 2.0 * np.pi + 1e-9:
            raise HardwareError(
                f"sector '{self.name}' spans {np.degrees(np.ptp(corners[:, 0])):.4g} deg of azimuth",
                remedy="one turn at most; count azimuths on across north (350, 370)",
            )
        crossing = _self_crossing(corners)
        if crossing is not None:
            raise HardwareError(
                f"sector '{self.name}' crosses itself: the side after corner {crossing[0] + 1} meets the side after "
                f"corner {crossing[1] + 1}",
                remedy="list the corners in order round the outline",
            )
        object.__setattr__(self, "corners", corners)

    def holds_in(self, mode: str | None) -> bool:
        """True when the sector is forbidden in this mode (None: any)."""
        return mode is None or not self.modes or mode in self.modes

    def contains(self, azimuth: ArrayLike, elevation: ArrayLike) -> NDArray[np.bool_]:
        """True where a direction (rad, broadcast) lies in the sector, whole turns of azimuth aside; edges count as
        in.
        """
        a, e = np.broadcast_arrays(np.asarray(azimuth, dtype=float), np.asarray(elevation, dtype=float))
        first = np.min(self.corners[:, 0])
        inside = np.zeros(a.shape, dtype=bool)
        shifted = first + (a - first) % (2.0 * np.pi)
        for turn in (0.0, -2.0 * np.pi):
            inside |= _in_polygon(self.corners, shifted + turn, e)
        return inside

    def edge_points(self) -> tuple[Array, float]:
        """Directions (M, 3) along the outline and the largest distance (rad) of any outline point from one of them."""
        points = []
        for one, other in zip(self.corners, np.roll(self.corners, -1, axis=0), strict=True):
            count = max(1, int(np.ceil(np.linalg.norm(other - one) / _STEP)))
            points.append(one + (other - one) * np.arange(count)[:, None] / count)
        outline = np.concatenate(points)
        return directions(outline[:, 0], outline[:, 1]), _STEP / 2.0 + _NEAREST


def _self_crossing(corners: Array) -> tuple[int, int] | None:
    count = len(corners)
    after = np.roll(corners, -1, axis=0)
    for i in range(count):
        for j in range(i + 1, count):
            neighbours = j == i + 1 or (i == 0 and j == count - 1)
            if _sides_meet(corners[i], after[i], corners[j], after[j], neighbours):
                return i, j
    return None


def _sides_meet(a: Array, b: Array, c: Array, d: Array, neighbours: bool) -> bool:
    def side(p: Array, q: Array, r: Array) -> float:
        return float((q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0]))

    first, second, third, fourth = side(a, b, c), side(a, b, d), side(c, d, a), side(c, d, b)
    if neighbours:  # they share a corner: only folding back on itself counts
        shared_back = np.allclose(b, c) and first == 0.0 and second == 0.0 and float((a - b) @ (d - c)) > 0.0
        shared_front = np.allclose(a, d) and third == 0.0 and first == 0.0 and float((b - a) @ (c - d)) > 0.0
        return bool(shared_back or shared_front)
    if first * second < 0.0 and third * fourth < 0.0:
        return True

    def on(p: Array, q: Array, r: Array, area: float) -> bool:
        return area == 0.0 and bool(np.all(np.minimum(p, q) <= r) and np.all(r <= np.maximum(p, q)))

    return on(a, b, c, first) or on(a, b, d, second) or on(c, d, a, third) or on(c, d, b, fourth)


def _in_polygon(corners: Array, x: Array, y: Array) -> NDArray[np.bool_]:
    """Even-odd rule, with points on an edge (1e-12) counted in."""
    inside = np.zeros(x.shape, dtype=bool)
    on_edge = np.zeros(x.shape, dtype=bool)
    for (x1, y1), (x2, y2) in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        across = (x2 - x1) * (y - y1) - (y2 - y1) * (x - x1)
        length = np.hypot(x2 - x1, y2 - y1)
        along = ((x - x1) * (x2 - x1) + (y - y1) * (y2 - y1)) / max(length, 1e-300)
        on_edge |= (np.abs(across) <= 1e-12 * max(length, 1.0)) & (along >= -1e-12) & (along <= length + 1e-12)
        if y1 != y2:
            crosses = (y1 > y) != (y2 > y)
            inside ^= crosses & (x < x1 + (y - y1) * (x2 - x1) / (y2 - y1))
    return inside | on_edge


@dataclass(frozen=True)
class SectorResult:
    """One sector against a pass, a cone or listed directions: certified clearance (rad, 0 when entered) and time in
    it.
    """

    sector: str
    clearance: float
    seconds: float


def clearance_of_directions(sector: Sector, direction_g: ArrayLike, *, radius: ArrayLike = 0.0) -> Array:
    """Certified angle (...) rad from cones of half angle `radius` about directions (..., 3) to the sector; 0 when
    met.
    """
    v = unit(direction_g)
    outline, half_step = sector.edge_points()
    flat = v.reshape(-1, 3)
    away = np.zeros(len(flat))
    for start in range(0, len(flat), 2048):
        part = flat[start : start + 2048]
        # nearest outline point by the largest cosine, then its angle without loss
        nearest = outline[np.argmax(part @ outline.T, axis=1)]
        away[start : start + 2048] = angle_between(part, nearest)
    inside = sector.contains(*azimuth_elevation(flat))
    left: Array = np.where(inside, 0.0, np.maximum(away - half_step, 0.0)).reshape(v.shape[:-1])
    return np.maximum(left - np.asarray(radius, dtype=float), 0.0)


def sectors_along_pass(
    sectors: Sequence[Sector], track: Pass, *, mode: str | None = None, error: float = 0.0
) -> list[SectorResult]:
    """Clearance of a pass from each sector that holds in `mode`, and the time inside.

    Between samples the line moves at most half the angle between them away from the nearer one: taken off, as is
    `error` (rad), the pointing error. Time inside is counted on ten points a step (sampled).
    """
    step = angle_between(track.direction_g[1:], track.direction_g[:-1])
    half = 0.5 * np.maximum(np.append(step, 0.0), np.insert(step, 0, 0.0))
    share = (np.arange(10) + 0.5) / 10.0
    between = unit(track.direction_g[:-1, None] * (1.0 - share[:, None]) + track.direction_g[1:, None] * share[:, None])
    weight = np.diff(track.times)[:, None] / 10.0
    results = []
    for sector in sectors:
        if sector.holds_in(mode):
            clearance = clearance_of_directions(sector, track.direction_g, radius=half + error)
            inside = sector.contains(*azimuth_elevation(between))
            results.append(SectorResult(sector.name, float(np.min(clearance)), float(np.sum(inside * weight))))
    return results


def keep_away(name: str, track: Pass, other_g: ArrayLike, half_angle: float, *, error: float = 0.0) -> SectorResult:
    """A moving forbidden cone, such as the Sun's: other_g (3,) or (N, 3) at the pass's times, half angle in rad.

    Clearance is certified when the other direction, too, moves on great circles between the samples: both may come
    nearer by half a step. Time inside is counted on samples joined linearly (sampled).
    """
    other = np.broadcast_to(unit(other_g, f"the direction of {name}"), track.direction_g.shape)
    away = angle_between(track.direction_g, other)
    step = angle_between(track.direction_g[1:], track.direction_g[:-1]) + angle_between(other[1:], other[:-1])
    least = float(np.min(np.minimum(away[1:], away[:-1]) - step / 2.0)) - half_angle - error
    inside = away < half_angle
    share = 0.5 * (inside[1:].astype(float) + inside[:-1])
    return SectorResult(name, max(least, 0.0), float(np.sum(share * np.diff(track.times))))


def sectors_against_cone(
    sectors: Sequence[Sector], centre_g: ArrayLike, half_angle: float, *, mode: str | None = None
) -> list[SectorResult]:
    """Certified clearance of every direction within `half_angle` (rad) of `centre_g` (3,): an envelope of
    directions.
    """
    return [
        SectorResult(s.name, float(clearance_of_directions(s, np.asarray(centre_g), radius=half_angle)), 0.0)
        for s in sectors
        if s.holds_in(mode)
    ]


@dataclass(frozen=True, eq=False)
class Route:
    """A move of a two-axis mount between joint angles that keeps out of the sectors: corner angles (N, 2) rad, time (s)
    at full rates, and its least certified clearance (rad).
    """

    angles: Array
    time: float
    clearance: float


def route(
    chain: GimbalChain,
    start: ArrayLike,
    end: ArrayLike,
    sectors: Sequence[Sector],
    *,
    mode: str | None = None,
    clearance: float = 0.0,
    step: float = np.radians(2.0),
    boresight_p: ArrayLike = (1.0, 0.0, 0.0),
) -> Route:
    """The quickest way in joint angles from start to end (2,), inside the travel and `clearance` (rad) off the sectors.

    Searched on a grid of `step` (rad) with scipy's shortest path; every leg is certified, since no point of a leg is
    further than half its length from one of its ends. No way: an error that says which sector closes it. The direct
    move is taken when it is free.
    """
    begin, goal = np.asarray(start, dtype=float), np.asarray(end, dtype=float)
    used = [s for s in sectors if s.holds_in(mode)]
    for name, angles in (("start", begin), ("end", goal)):
        for sector in used:
            if _clear(chain, angles[None], [sector], boresight_p)[0] <= clearance:
                raise HardwareError(f"the {name} of the move lies in sector '{sector.name}' or too near to it")
    direct = _legs(begin, goal, step)
    free = _least(chain, direct, used, boresight_p)
    if free > clearance:
        return Route(np.array([begin, goal]), _time(chain, np.array([begin, goal])), free)
    nodes, size = _grid(chain, begin, goal, step)
    clear = _clear(chain, nodes, used, boresight_p)
    path = _shortest_path(chain, nodes, clear, size, begin, goal, clearance, step)
    found = None if path is None else _checked(chain, begin, goal, nodes[path], used, boresight_p, clearance, step)
    if found is None:
        raise HardwareError(
            f"no way from the start to the end keeps {np.degrees(clearance):.3g} deg off the sectors inside the travel",
            remedy="a finer step, a smaller clearance, or a mode in which a sector does not hold",
        )
    return found


def _checked(
    chain: GimbalChain,
    begin: Array,
    goal: Array,
    path: Array,
    sectors: Sequence[Sector],
    boresight_p: ArrayLike,
    clearance: float,
    step: float,
) -> Route | None:
    """The path straightened, with its certified clearance; None when the first or last leg does not keep it."""
    corners = _straightened(chain, np.vstack([begin, path, goal]), sectors, boresight_p, clearance, step)
    dense = np.vstack([_legs(a, b, step) for a, b in pairwise(corners)])
    least = _least(chain, dense, sectors, boresight_p)
    return Route(corners, _time(chain, corners), least) if least > clearance else None


def _line(chain: GimbalChain, angles: Array, boresight_p: ArrayLike) -> Array:
    return chain.attitude(angles) @ unit(boresight_p)


def _clear(chain: GimbalChain, angles: Array, sectors: Sequence[Sector], boresight_p: ArrayLike) -> Array:
    line = _line(chain, angles, boresight_p)
    away = np.full(len(angles), np.pi)
    for sector in sectors:
        away = np.minimum(away, clearance_of_directions(sector, line))
    return away


def _legs(a: Array, b: Array, step: float) -> Array:
    """Points (N, 2) from a to b in joint angles, at most `step` / 4 apart in the sum of both joints."""
    count = max(1, int(np.ceil(np.sum(np.abs(b - a)) / (step / 4.0))))
    return a + (b - a) * np.arange(count + 1)[:, None] / count


def _least(chain: GimbalChain, points: Array, sectors: Sequence[Sector], boresight_p: ArrayLike) -> float:
    """Certified clearance along consecutive points: the line moves no further than the joints do."""
    if not sectors:
        return float(np.pi)
    gap = np.sum(np.abs(np.diff(points, axis=0)), axis=1)
    half = 0.5 * float(np.max(gap, initial=0.0))
    return max(float(np.min(_clear(chain, points, sectors, boresight_p))) - half, 0.0)


def _time(chain: GimbalChain, corners: Array) -> float:
    rates = np.where(np.isfinite(chain.limits("rate")), chain.limits("rate"), 1.0)
    return float(np.sum(np.max(np.abs(np.diff(corners, axis=0)) / rates, axis=1)))


def _grid(chain: GimbalChain, begin: Array, goal: Array, step: float) -> tuple[Array, tuple[int, int]]:
    lower = np.where(np.isfinite(chain.travel[:, 0]), chain.travel[:, 0], np.minimum(begin, goal) - np.pi)
    upper = np.where(np.isfinite(chain.travel[:, 1]), chain.travel[:, 1], np.maximum(begin, goal) + np.pi)
    axes = [np.linspace(lo, hi, int(np.ceil((hi - lo) / step)) + 1) for lo, hi in zip(lower, upper, strict=True)]
    grid = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1)
    return grid.reshape(-1, 2), (len(axes[0]), len(axes[1]))


def _shortest_path(
    chain: GimbalChain,
    nodes: Array,
    clear: Array,
    size: tuple[int, int],
    begin: Array,
    goal: Array,
    clearance: float,
    step: float,
) -> list[int] | None:
    """Node numbers of the quickest free path, from the node nearest to the start to that nearest to the end."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import dijkstra

    index = np.arange(len(nodes)).reshape(size)
    rates = np.where(np.isfinite(chain.limits("rate")), chain.limits("rate"), 1.0)
    # a diagonal leg turns the joints by up to two steps: its middle may be one step nearer to a sector than its ends
    free = clear > clearance + step
    rows, columns, costs = [], [], []
    for da, db in ((1, 0), (0, 1), (1, 1), (1, -1)):
        one = index[: size[0] - da, max(0, -db) : size[1] - max(0, db)].ravel()
        other = index[da:, max(0, db) : size[1] + min(0, db)].ravel()
        keep = free[one] & free[other]
        cost = np.max(np.abs(nodes[other] - nodes[one]) / rates, axis=1)
        rows.append(one[keep])
        columns.append(other[keep])
        costs.append(cost[keep] + 1e-9)
    graph = coo_array((np.concatenate(costs), (np.concatenate(rows), np.concatenate(columns))), shape=(len(nodes),) * 2)
    first, last = (_nearest_free(nodes, free, angles, step) for angles in (begin, goal))
    if first is None or last is None:
        return None
    before = dijkstra(graph, directed=False, indices=np.array([first]), return_predecessors=True)[1][0]
    path = [last]
    while path[-1] != first:
        if before[path[-1]] < 0:
            return None
        path.append(int(before[path[-1]]))
    return path[::-1]


def _nearest_free(nodes: Array, free: NDArray[np.bool_], angles: Array, step: float) -> int | None:
    near = np.flatnonzero(free & (np.max(np.abs(nodes - angles), axis=1) <= 2.0 * step))
    return None if not near.size else int(near[np.argmin(np.sum(np.abs(nodes[near] - angles), axis=1))])


def _straightened(
    chain: GimbalChain, path: Array, sectors: Sequence[Sector], boresight_p: ArrayLike, clearance: float, step: float
) -> Array:
    """Corners left out wherever the straight move between two of them is free as well."""
    keep, here = [path[0]], 0
    while here < len(path) - 1:
        there = len(path) - 1
        while there > here + 1:
            if _least(chain, _legs(path[here], path[there], step), sectors, boresight_p) > clearance:
                break
            there = here + (there - here) // 2 if there - here > 8 else there - 1
        keep.append(path[there])
        here = there
    return np.array(keep)


def unwinding_routes(
    chain: GimbalChain,
    plan: TravelPlan,
    sectors: Sequence[Sector],
    *,
    mode: str | None = None,
    clearance: float = 0.0,
    boresight_p: ArrayLike = (1.0, 0.0, 0.0),
) -> list[Route]:
    """A free way for every unwinding or flip of a travel plan, in order (see `route`)."""
    return [
        route(chain, one.angles[-1], other.angles[0], sectors, mode=mode, clearance=clearance, boresight_p=boresight_p)
        for one, other in pairwise(plan.segments)
    ]
