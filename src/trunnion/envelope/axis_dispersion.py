"""Dispersion about some axes only: each attitude followed by a turn whose rotation vector is limited axis by axis.

R' = R Exp(e) (limits along body axes) or Exp(e) R (along reference axes), e = sum t_i a_i with |t_i| <= d_i. On either
side the turn acts on one of the two directions only, so for a fixed e the closed form of the region gives the extreme
exactly; and since Exp shortens nothing more than it must, |angle(Exp(e1) v, Exp(e2) v)| <= |e1 - e2|, the extreme is
1-Lipschitz in e. Branch and bound over one or two (at most three) numbers then brackets it. A full ball of the same
size would only give a bound: it lets the axis tilt in directions the limits forbid.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass
from functools import lru_cache
from itertools import product

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import from_rotation_vector, unit
from trunnion.envelope.branching import Bounds, Bracket, Cells, least_value
from trunnion.envelope.margins import spread_of
from trunnion.envelope.regions import LARGEST_BALL, Region, as_pairs
from trunnion.envelope.results import (
    LARGEST_ANGLE,
    LARGEST_LINE,
    LEAST_ANGLE,
    LEAST_LINE,
    AngleRange,
    Extreme,
    Spread,
    Witness,
    spread_from,
    witness_angles,
)
from trunnion.envelope.vectors import Array
from trunnion.errors import RegionError

TOLERANCE = np.radians(0.05)
"""rad; how narrow a bracket is asked for."""
SECONDS = 10.0
"""Time a pair may take before its bracket is stated as wide as it is."""


class TurnSide(enum.Enum):
    """Whose axes limit the turn."""

    BODY = "body axes"
    REFERENCE = "reference axes"


@dataclass(frozen=True, eq=False)
class AxisDispersion(Region):
    """`region` followed by turns limited along `axes` (K, 3) to `limits` (K,) rad either way; K at most 3."""

    region: Region
    axes: Array
    limits: Array
    side: TurnSide = TurnSide.BODY

    def __post_init__(self) -> None:
        axes, limits = (
            np.atleast_2d(unit(self.axes, "axis of the dispersion")),
            np.atleast_1d(self.limits).astype(float),
        )
        if len(axes) != len(limits) or not 1 <= len(axes) <= 3:
            raise RegionError("a dispersion needs one limit for each of one to three axes", remedy="pair them up")
        if not np.all((limits >= 0.0) & (limits <= LARGEST_BALL)):
            raise RegionError("a limit of the dispersion lies outside 0 deg to 90 deg", remedy="check the unit")
        object.__setattr__(self, "axes", axes)
        object.__setattr__(self, "limits", limits)


def axis_dispersed_margin(
    region: AxisDispersion, convention: Convention, *, tolerance: float = np.radians(0.05), seconds: float = 10.0
) -> AngleRange:
    """Brackets of the least and largest lock margin; wider than the tolerance if time runs out, never wrong."""
    u, v = convention.lock_axes
    least = _bracket(region, u, v, LEAST_LINE, tolerance, 0.5 * seconds)
    return AngleRange(least, _bracket(region, u, v, LARGEST_LINE, tolerance, 0.5 * seconds))


def axis_dispersed_spread(region: AxisDispersion, u: Array, v: Array) -> Spread:
    """The four extremes of M pairs u, v (3, M), each bracketed as in `axis_dispersed_margin`."""
    return spread_from([_pair_extremes(region, tuple(u[:, m]), tuple(v[:, m])) for m in range(u.shape[1])])


@lru_cache(maxsize=256)
def _pair_extremes(region: AxisDispersion, u: tuple[float, ...], v: tuple[float, ...]) -> tuple[Extreme, ...]:
    """The four extremes of one pair; a sweep asks for the same pair several times."""
    line, body = np.array(u), np.array(v)
    return tuple(_bracket(region, line, body, which, TOLERANCE, 0.25 * SECONDS) for which in range(4))


def axis_dispersed_clearance(
    region: AxisDispersion,
    body_direction: ArrayLike,
    reference_direction: ArrayLike,
    *,
    tolerance: float = np.radians(0.05),
    seconds: float = 10.0,
) -> AngleRange:
    """Brackets of the least and largest angle between a body and a reference direction."""
    u, v = (pair[:, 0] for pair in as_pairs(reference_direction, body_direction))
    least = _bracket(region, u, v, LEAST_ANGLE, tolerance, 0.5 * seconds)
    return AngleRange(least, _bracket(region, u, v, LARGEST_ANGLE, tolerance, 0.5 * seconds))


def _bracket(region: AxisDispersion, u: Array, v: Array, which: int, tolerance: float, seconds: float) -> Extreme:
    sign = 1.0 if which in (LEAST_ANGLE, LEAST_LINE) else -1.0
    bases: list[Basis] = []
    top = np.pi / 2 if which in (LEAST_LINE, LARGEST_LINE) else np.pi
    end = 0.0 if sign > 0 else -top  # no angle lies beyond these

    def bound(cells: Cells) -> Bounds:
        spread = _spread(region, u, v, cells.centre)
        bases.append(spread.basis)
        reach = np.sqrt((cells.half**2).sum(axis=0))
        outer = spread.lo[which] if sign > 0 else -spread.hi[which]
        inner = spread.hi[which] if sign > 0 else -spread.lo[which]
        lower = np.maximum(outer - reach, end)
        return Bounds(lower, inner.copy(), cells.centre, cells.half, cells)

    corners = np.array(list(product((-1.0, 1.0), repeat=len(region.limits)))).T * region.limits[:, None]
    low = np.concatenate([-region.limits[:, None], corners], axis=1)  # the whole, and its corners as points
    high = np.concatenate([region.limits[:, None], corners], axis=1)
    found = least_value(bound, low, high, tolerance=tolerance, seconds=seconds, batch=128)
    return _extreme(region, u, v, which, sign, found, bases[0])


def _turned_pairs(region: AxisDispersion, u: Array, v: Array, turns: Array) -> tuple[Array, Array]:
    """Pairs (3, M) after turns (K, M): a turn on one side moves one of the two directions."""
    count = turns.shape[1]
    R = from_rotation_vector((region.axes.T @ turns).T)
    if region.side is TurnSide.BODY:
        return np.repeat(u[:, None], count, axis=1), (R @ v).T.copy()
    return (np.swapaxes(R, -1, -2) @ u).T.copy(), np.repeat(v[:, None], count, axis=1)


def _spread(region: AxisDispersion, u: Array, v: Array, turns: Array) -> Spread:
    return spread_of(region.region, *_turned_pairs(region, u, v, turns))


def _extreme(
    region: AxisDispersion, u: Array, v: Array, which: int, sign: float, found: Bracket, basis: Basis
) -> Extreme:
    turns = found.at[:, None]
    spread = _spread(region, u, v, turns)
    value = witness_angles(spread, *_turned_pairs(region, u, v, turns))[which, 0]
    R = from_rotation_vector(region.axes.T @ found.at)
    inner = spread.matrices[which, 0]
    matrix = inner @ R if region.side is TurnSide.BODY else R @ inner
    along = ", ".join(f"{np.degrees(t):.6g}" for t in found.at)
    witness = None
    if np.isfinite(value):
        witness = Witness(matrix, float(value), None, f"{spread.where[which, 0]}, then turned {along} deg")
    lo, hi = (found.lo, found.hi) if sign > 0 else (-found.hi, -found.lo)
    top = np.pi / 2 if which in (LEAST_LINE, LARGEST_LINE) else np.pi
    return Extreme(max(lo, 0.0), min(hi, top), basis, witness, spread.governing[which, 0])
