"""The best zero with constants on both sides at once, bracketed.

Wanted: unit u (moved by a constant on the reference side) and v (body side) with the largest least line angle between u
and R v over a region. For fixed v the best u is found exactly over any finite set of attitudes (`farthest`); that best
value, F(v), changes by no more than v does. So v alone is searched, by branch and bound over the half sphere: a cell of
directions within rho of its centre holds nothing better than F(centre) + rho. F over a growing set of attitudes of the
region bounds the truth from above; the closed form over the region, at the u found, from below, and its witness joins
the set.
"""

from __future__ import annotations

import heapq
from dataclasses import dataclass, replace
from itertools import count as counting

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.envelope.farthest import facets, flat_normal, line_margin
from trunnion.envelope.margins import lock_margin, spread_of
from trunnion.envelope.regions import Region
from trunnion.envelope.results import LARGEST_ANGLE, LEAST_ANGLE, LEAST_LINE, MarginRange
from trunnion.envelope.vectors import Array
from trunnion.envelope.zero import Side, best_zero, shortest_turn


@dataclass(frozen=True, eq=False)
class BothSides:
    """The best constants found on both sides and the bracket of what any pair of constants could give.

    convention: constants replaced by the best found; margin: its range over the region; the best possible least margin
    lies in [margin.least.lo, upper] (rad); gap is their difference.
    """

    convention: Convention
    margin: MarginRange
    upper: float
    gap: float
    finished: bool
    cells: int


def best_zero_both_sides(
    region: Region, convention: Convention, *, gap: float = np.radians(0.1), seconds: float = 10.0
) -> BothSides:
    """Bracket the best least margin over constants on both sides, to `gap` or to the work of nominal `seconds`.

    Cells are counted, never the clock, so that the same input gives the same bracket on every machine.
    """
    search = _Search(region, convention, gap, int(seconds * CELLS_A_SECOND))
    search.alternate(0.3 * seconds)
    search.run()
    return search.result()


CELLS_A_SECOND = 700
"""Cells counted as one second of work; an idle core of today does about as many."""


class _Search:
    """Attitudes collected, the best pair so far, and the cells of v still open (largest bound first)."""

    def __init__(self, region: Region, convention: Convention, gap: float, most_cells: int) -> None:
        self.region, self.convention, self.gap, self.most_cells = region, convention, gap, most_cells
        self.attitudes = np.zeros((0, 3, 3))
        self.best, self.pair = -1.0, convention.lock_axes
        self.cells = 0
        self.order = counting()
        self.heap: list[tuple[float, int, Array]] = []

    def alternate(self, seconds: float) -> None:
        """Improve one side after the other from several starts: a good pair, and attitudes that matter."""
        for sequence_axis in range(3):
            convention = replace(self.convention, right=np.roll(np.eye(3), sequence_axis, axis=0))
            for side in (Side.REFERENCE, Side.BODY, Side.REFERENCE, Side.BODY):
                convention = best_zero(self.region, convention, side, seconds=0.06 * seconds).convention
                self.try_pair(*convention.lock_axes)

    def try_pair(self, u: Array, v: Array) -> None:
        """Evaluate a pair over the region; keep it if best, and collect the attitudes nearest to lock."""
        spread = spread_of(self.region, u[:, None], v[:, None])
        value = float(spread.lo[LEAST_LINE, 0])
        if value > self.best:
            self.best, self.pair = value, (u, v)
        found = spread.matrices[[LEAST_ANGLE, LARGEST_ANGLE], 0]
        found = found[np.isfinite(found).all(axis=(1, 2))]
        self.attitudes = np.concatenate([self.attitudes, found])[-400:]

    def run(self) -> None:
        """Split the most promising cell of v until none can hold something better by more than the gap."""
        for corners in _half_sphere():
            self.push(corners)
        while self.heap and -self.heap[0][0] > self.best + self.gap and self.cells < self.most_cells:
            _, _, corners = heapq.heappop(self.heap)
            for part in _quarters(corners):
                self.push(part)

    def push(self, corners: Array) -> None:
        """Bound a triangular cell of directions and keep it if it may hold something better."""
        self.cells += 1
        centre = corners.sum(axis=0)
        centre /= np.linalg.norm(centre)
        reach = float(np.arccos(np.clip((corners @ centre).min(), -1.0, 1.0)))
        upper = np.pi / 2
        for _ in range(4):
            u, upper = self.best_u(centre)
            if upper <= self.best:
                break
            before = self.best
            self.try_pair(u, centre)
            if self.best > before and upper - self.best < 0.1 * self.gap:
                break
        if upper + reach > self.best + self.gap:
            heapq.heappush(self.heap, (-(upper + reach), next(self.order), corners))

    def best_u(self, v: Array) -> tuple[Array, float]:
        """The best u for v over the attitudes collected, and its margin: an upper bound for the region."""
        points = self.attitudes @ v
        flat = flat_normal(points)
        if flat is not None:
            return flat, np.pi / 2
        normals, _, _ = facets(points)
        return normals[0], line_margin(points, normals[0])

    def result(self) -> BothSides:
        """The best pair as constants, with the bracket."""
        u, v = self.pair
        now_u, now_v = self.convention.lock_axes
        left = shortest_turn(now_u, u) @ self.convention.left
        right = self.convention.right @ shortest_turn(now_v, v).T
        convention = replace(self.convention, left=left, right=right)
        margin = lock_margin(self.region, convention)
        upper = max(-self.heap[0][0] if self.heap else self.best + self.gap, margin.least.lo)
        upper = min(upper, np.pi / 2)
        left_over = upper - margin.least.lo
        return BothSides(convention, margin, upper, left_over, left_over <= self.gap + 1e-9, self.cells)


def _half_sphere() -> list[Array]:
    """Eight faces of the octahedron are two of each line: four triangles (3, 3) cover all lines."""
    x, y, z = np.eye(3)
    return [np.stack([s * x, t * y, z]) for s in (1.0, -1.0) for t in (1.0, -1.0)]


def _quarters(corners: Array) -> list[Array]:
    """A spherical triangle cut at the middles of its sides."""
    a, b, c = corners
    ab, bc, ca = (p / np.linalg.norm(p) for p in (a + b, b + c, c + a))
    return [np.stack(part) for part in ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))]
