"""What a margin costs in angle rates and angle accelerations, and the margin a limit asks for.

Chain: w = a' n1 + b' n2 + c' n3 with n1 the first axis, n2 perpendicular to n1 and to the carried axis n3, and m the
angle between the lines of n1 and n3. The dual vectors are n1* = (n1 - cos(m) n3)/sin²(m) and likewise n3*, of length
1/sin m, and n2 itself. Hence |a'|, |c'| <= w/sin m and |b'| <= w. Differentiating once more,
    a'' = n1* . w' ± b' (a' cos m - c')/sin m,      b'' = n2 . w' ± a' c' sin m,
and, with |a' cos m - c'| at most sqrt(1 + 3 cos² m)/sin m times the part of w in the plane of n1 and n3 while b' is
the part across it, and a' c' a quadratic form in w with largest value w² (1 + cos m)/(2 sin² m):
    |a''|, |c''| <= α/sin m + (w²/2) sqrt(1 + 3 cos² m)/sin² m,      |b''| <= α + w² (1 + cos m)/(2 sin m).
All four are attained, so they are the peaks, not just bounds. They fall as m grows; the least margin governs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Region
from trunnion.errors import RegionError


@dataclass(frozen=True)
class Demand:
    """Peak angle rates (rad/s) and accelerations (rad/s²) at a margin; inf at lock."""

    margin: float
    outer_rate: float
    middle_rate: float
    outer_acceleration: float
    middle_acceleration: float


def demand_at(margin: float, body_rate: float, body_acceleration: float = 0.0) -> Demand:
    """Peak demand at one margin (rad, 0 … pi/2) for body rates up to `body_rate` rad/s and body angular accelerations
    up to `body_acceleration` rad/s², in any direction."""
    _require_not_negative(body_rate, body_acceleration)
    sine, cosine = np.sin(margin), np.cos(margin)
    if sine <= 0.0:
        busy = np.inf if body_rate > 0.0 else 0.0
        turning = np.inf if body_rate > 0.0 or body_acceleration > 0.0 else 0.0
        return Demand(margin, busy, body_rate, turning, busy or body_acceleration)
    outer = body_acceleration / sine + 0.5 * body_rate**2 * np.sqrt(1.0 + 3.0 * cosine**2) / sine**2
    middle = body_acceleration + 0.5 * body_rate**2 * (1.0 + cosine) / sine
    return Demand(margin, float(body_rate / sine), body_rate, float(outer), float(middle))


@dataclass(frozen=True)
class PeakDemand:
    """Peak demand over a region: proven upper bounds, and the demand at the least margin's witness."""

    bound: Demand
    at_witness: Demand
    basis: Basis


def peak_demand(region: Region, convention: Convention, body_rate: float, body_acceleration: float = 0.0) -> PeakDemand:
    """Peak angle rates and accelerations of a convention over a region."""
    least = lock_margin(region, convention).least
    attained = least.witness.value if least.witness is not None else least.hi
    return PeakDemand(
        demand_at(least.lo, body_rate, body_acceleration),
        demand_at(attained, body_rate, body_acceleration),
        least.basis,
    )


def margin_for_rate(body_rate: float, limit: float) -> float:
    """Margin (rad) at which the outer angle rates just keep `limit` rad/s: asin(w/W)."""
    _require_not_negative(body_rate)
    if not limit > 0.0 or body_rate > limit:
        raise RegionError(
            f"no margin keeps an angle rate of {limit:g} rad/s when the body turns at {body_rate:g} rad/s",
            remedy="at a right angle to lock the angle rates still equal the body rate; raise the limit",
        )
    return float(np.arcsin(body_rate / limit))


def margin_for_acceleration(body_rate: float, body_acceleration: float, limit: float) -> float:
    """Margin (rad) at which the outer angle accelerations just keep `limit` rad/s²; rounded to the safe side."""
    _require_not_negative(body_rate, body_acceleration)
    if demand_at(np.pi / 2, body_rate, body_acceleration).outer_acceleration > limit:
        raise RegionError(
            f"no margin keeps an angle acceleration of {limit:g} rad/s²",
            remedy="even at a right angle to lock the demand is α + w²/2; raise the limit",
        )
    low, high = 0.0, np.pi / 2
    for _ in range(60):
        middle = 0.5 * (low + high)
        enough = demand_at(middle, body_rate, body_acceleration).outer_acceleration <= limit
        low, high = (low, middle) if enough else (middle, high)
    return high


def _require_not_negative(*values: float) -> None:
    if not all(np.isfinite(value) and value >= 0.0 for value in values):
        raise RegionError("a body rate or acceleration is negative or no number", remedy="state its largest size")
