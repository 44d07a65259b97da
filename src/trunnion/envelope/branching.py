"""Best-first branch and bound over a box of parameters, many cells at a time.

The caller says, for cells given by centre and half width, a proven lower bound of the quantity, its value at a point
of the cell (inf when no point of the cell is known to be allowed), and along which parameter the cell is to be halved.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Cells:
    """n cells of k parameters: centre and half width (k, n)."""

    centre: Array
    half: Array


@dataclass(frozen=True, eq=False)
class Bounds:
    """What is known of n cells: lower (n,), value (n,), the point (k, n) of that value, urge to halve (k, n), and the
    cells themselves, which the caller may have shrunk."""

    lower: Array
    value: Array
    at: Array
    urge: Array
    cells: Cells


@dataclass(frozen=True, eq=False)
class Bracket:
    """The least value lies in [lo, hi]; hi is taken at `at`. `finished` says that hi - lo is within the tolerance."""

    lo: float
    hi: float
    at: Array
    cells: int
    finished: bool


CELLS_A_SECOND = 100_000
"""Cells counted as one second of work; an idle core of today does somewhat more."""


def least_value(
    bound: Callable[[Cells], Bounds],
    low: Array,
    high: Array,
    *,
    tolerance: float,
    most_cells: int = 2_000_000,
    seconds: float = np.inf,
    batch: int = 512,
) -> Bracket:
    """Bracket the least value over low <= t <= high (k,), or over several boxes (k, n), to `tolerance`.

    Stops early at `most_cells` evaluated cells or at the work of nominal `seconds` (see CELLS_A_SECOND), never by the
    clock: the same input gives the same bracket on every machine. It is then wider but no less true.
    """
    search = _Search(bound, tolerance)
    low, high = (np.asarray(end, dtype=float).reshape(len(low), -1) for end in (low, high))
    search.add(Cells(0.5 * (low + high), 0.5 * (high - low)))
    budget = most_cells if np.isinf(seconds) else min(most_cells, int(seconds * CELLS_A_SECOND))
    while search.open_cells() and search.count < budget:
        search.add(search.halves(batch))
    return search.bracket()


class _Search:
    """Open cells, the best value, and the least bound among cells that were closed."""

    def __init__(self, bound: Callable[[Cells], Bounds], tolerance: float) -> None:
        self.bound, self.tolerance = bound, tolerance
        self.best, self.at = np.inf, np.zeros(0)
        self.closed = np.inf
        self.count = 0
        self.bounds: Bounds | None = None

    def open_cells(self) -> int:
        return 0 if self.bounds is None else len(self.bounds.lower)

    def add(self, cells: Cells) -> None:
        found = self.bound(cells)
        self.count += cells.centre.shape[1]
        if len(found.value) and found.value.min() < self.best:
            at = int(np.argmin(found.value))
            self.best, self.at = float(found.value[at]), found.at[:, at].copy()
        self.bounds = found if self.bounds is None else _append(self.bounds, found)
        self._close()

    def _close(self) -> None:
        assert self.bounds is not None
        keep = self.bounds.lower < self.best - self.tolerance
        closed = self.bounds.lower[~keep]
        if len(closed):
            self.closed = min(self.closed, float(closed.min()))
        if not keep.all():
            self.bounds = _select(self.bounds, keep)

    def halves(self, batch: int) -> Cells:
        """Take the most promising cells out and cut each in two."""
        assert self.bounds is not None
        order = np.lexsort((self.bounds.value, self.bounds.lower))
        if len(order) > batch:  # by bound, but also by value, so that a good point is found early
            by_value = np.argpartition(self.bounds.value, batch // 4)[: batch // 4]
            order = np.unique(np.concatenate([order[: batch - batch // 4], by_value]))
        chosen = _select(self.bounds, order)
        rest = np.ones(len(self.bounds.lower), dtype=bool)
        rest[order] = False
        self.bounds = _select(self.bounds, rest)
        centre, half = chosen.cells.centre, chosen.cells.half.copy()
        axis, every = np.argmax(chosen.urge, axis=0), np.arange(centre.shape[1])
        half[axis, every] *= 0.5
        shift = np.zeros_like(centre)
        shift[axis, every] = half[axis, every]
        return Cells(np.concatenate([centre - shift, centre + shift], axis=1), np.concatenate([half, half], axis=1))

    def bracket(self) -> Bracket:
        still = self.bounds.lower.min() if self.open_cells() and self.bounds is not None else np.inf
        lo = min(float(still), self.closed, self.best)
        return Bracket(lo, self.best, self.at, self.count, self.open_cells() == 0)


def _append(one: Bounds, other: Bounds) -> Bounds:
    return Bounds(
        np.concatenate([one.lower, other.lower]),
        np.concatenate([one.value, other.value]),
        np.concatenate([one.at, other.at], axis=1),
        np.concatenate([one.urge, other.urge], axis=1),
        Cells(
            np.concatenate([one.cells.centre, other.cells.centre], axis=1),
            np.concatenate([one.cells.half, other.cells.half], axis=1),
        ),
    )


def _select(bounds: Bounds, chosen: NDArray) -> Bounds:
    return Bounds(
        bounds.lower[chosen],
        bounds.value[chosen],
        bounds.at[:, chosen],
        bounds.urge[:, chosen],
        Cells(bounds.cells.centre[:, chosen], bounds.cells.half[:, chosen]),
    )
