"""Lock margins and direction clearances over any region.

Everything rests on one question: over a set of attitudes R_rb, between which values lies the angle from a reference
direction u to a carried body direction R_rb v? Lock of a convention means that the two lie on one line for its pair
(u, v); clearance asks it for a boresight and a target. Each kind of region answers it in closed form.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.balls import listed_spread, widened
from trunnion.envelope.chains import box_chain, chain_spread
from trunnion.envelope.cones import free_cone_spread, rolled_cone_box
from trunnion.envelope.constrained import Constrained, constrained_spread
from trunnion.envelope.regions import (
    Box,
    Cone,
    Dispersed,
    Mounted,
    Poses,
    Referred,
    Region,
    Track,
    Union,
    as_pairs,
)
from trunnion.envelope.results import (
    LARGEST_ANGLE,
    LARGEST_LINE,
    LEAST_ANGLE,
    LEAST_LINE,
    AngleRange,
    MarginRange,
    Spread,
    extreme,
    joined,
    witness_angles,
)
from trunnion.envelope.tracks import track_spread
from trunnion.envelope.vectors import Array
from trunnion.errors import RegionError


def spread_of(region: Region, u: Array, v: Array) -> Spread:
    """The four extremes of M pairs u, v (3, M) over a region."""
    match region:
        case Box():
            return chain_spread(box_chain(region), u, v)
        case Cone(roll=None):
            return free_cone_spread(region, u, v)
        case Cone():
            return chain_spread(rolled_cone_box(region), u, v)
        case Poses():
            return widened(listed_spread(region.matrices, u, v), u, v, region.radius, "ball")
        case Track():
            return track_spread(region, u, v)
        case Union():
            return joined({name: spread_of(part, u, v) for name, part in region.parts.items()})
        case Dispersed():
            return widened(spread_of(region.region, u, v), u, v, region.radius, "dispersion")
        case Mounted():
            return _mounted(spread_of(region.region, u, region.R_bs @ v), region.R_bs)
        case Referred():
            return _referred(spread_of(region.region, region.R_qr.T @ u, v), region.R_qr)
        case Constrained():
            return constrained_spread(region, u, v)
    from trunnion.envelope.axis_dispersion import AxisDispersion, axis_dispersed_spread  # which asks for inner spreads

    if isinstance(region, AxisDispersion):
        return axis_dispersed_spread(region, u, v)
    raise RegionError(f"{type(region).__name__} is no region known here")


def _mounted(spread: Spread, R_bs: Array) -> Spread:
    spread.matrices[:] = spread.matrices @ R_bs
    return spread


def _referred(spread: Spread, R_qr: Array) -> Spread:
    spread.matrices[:] = R_qr @ spread.matrices
    return spread


def lock_margin(region: Region, convention: Convention) -> MarginRange:
    """Least and largest lock margin (rad) of a convention over a region.

    The margin is the rotation angle to the nearest attitude at which the convention locks: the angle between the
    lines of its two lock directions. lo and hi bracket each extreme; the witness is an attitude of the region.
    """
    u, v = as_pairs(*convention.lock_axes)
    return ranges_of(spread_of(region, u, v), u, v, line=True)[0]


def direction_clearance(region: Region, body_direction: ArrayLike, reference_direction: ArrayLike) -> AngleRange:
    """Least and largest angle (rad, 0 … pi) between a body direction (3,) and a reference direction (3,)."""
    u, v = as_pairs(reference_direction, body_direction)
    return ranges_of(spread_of(region, u, v), u, v, line=False)[0]


def ranges_of(spread: Spread, u: Array, v: Array, *, line: bool) -> list[AngleRange]:
    """The M ranges of a spread: of angles between lines (margins) or between directions (clearances)."""
    values = witness_angles(spread, u, v)
    least, largest = (LEAST_LINE, LARGEST_LINE) if line else (LEAST_ANGLE, LARGEST_ANGLE)
    return [
        AngleRange(extreme(spread, least, pair, values), extreme(spread, largest, pair, values))
        for pair in range(u.shape[1])
    ]


@dataclass(frozen=True, eq=False)
class EntryTable:
    """Margins of the nine axis pairs over a region: `ranges[i][k]` is the margin between the lines of reference axis i
    and carried body axis k. `least` and `largest` (3, 3) rad are the safe sides (lo of the least, hi of the largest).
    """

    ranges: tuple[tuple[MarginRange, MarginRange, MarginRange], ...]

    @property
    def least(self) -> Array:
        """Guaranteed least margins (3, 3) rad."""
        return np.array([[entry.least.lo for entry in row] for row in self.ranges])

    @property
    def largest(self) -> Array:
        """Guaranteed upper bounds (3, 3) rad on the margins."""
        return np.array([[entry.largest.hi for entry in row] for row in self.ranges])

    def of(self, sequence: Sequence, sense: Sense) -> MarginRange:
        """The range that belongs to a sequence about moving or fixed axes."""
        i, _, k = sequence.axes
        row, column = (i, k) if sense is Sense.MOVING else (k, i)
        return self.ranges[row][column]


def entry_margin_table(region: Region, left: ArrayLike | None = None, right: ArrayLike | None = None) -> EntryTable:
    """All nine axis pairs at once, for conventions R_rb = left E right (both (3, 3), identity by default).

    Entry (i, k): the line angle between left e_i and R_rb right^T e_k. Nine entries serve all twelve sequences about
    moving axes, and, read with rows and columns swapped, about fixed axes.
    """
    left = np.eye(3) if left is None else np.asarray(left, dtype=float)
    right = np.eye(3) if right is None else np.asarray(right, dtype=float)
    u, v = np.repeat(left, 3, axis=1), np.tile(right.T, (1, 3))
    found = ranges_of(spread_of(region, u, v), u, v, line=True)
    return EntryTable(tuple((found[3 * i], found[3 * i + 1], found[3 * i + 2]) for i in range(3)))
