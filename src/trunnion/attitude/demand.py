"""What the angles must do when the body turns: largest angle rates and angle accelerations at a lock margin.

Let n1, n2, n3 be the axes of the three turns (n2 at right angles to both), m the lock margin, so that the lines of n1
and n3 make the angle m, s = sin m, c = cos m. With the unit vectors d1 = n2 x n3 and d3 = n1 x n2, w the angular
velocity:

    s r1 = w . d1,   r2 = w . n2,   s r3 = w . d3                                    (r = rates, up to signs)

Differentiate, with a = dw/dt, using that n1 is fixed in the reference, n3 in the body and n2 in between:

    s r1' = a . d1 -+ (w . n2)(w . n3) +- 2 c (w . d1)(w . n2) / s,    r2' = a . n2 +- (w . d1)(w . d3) / s

In the orthonormal axes (d1, n2, n3), with w = (p, q, r), the quadratic part of r1' is q (r / s -+ 2 c p / s^2): at most
|w|^2/2 times the length of (1/s, 2 c/s^2). That of r2' is a product of two components along directions m apart: at most
|w|^2 (1 + c)/2 over s. Both largest values are attained, so the bounds below are the least upper bounds:

    outer rate  w/s      outer acceleration   a/s + w^2 sqrt(4 - 3 s^2)/(2 s^2), near lock w^2/s^2
    middle rate w        middle acceleration  a + (w^2/2) cot(m/2)

They fall with growing margin: a floor of the margin gives a ceiling of the demand. Valid for all 24, whatever
constants.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


class Demand(NamedTuple):
    """Largest magnitude (...) for an outer (first or last) angle and for the middle angle."""

    outer: Array
    middle: Array


def rate_demand(margin: ArrayLike, w: ArrayLike) -> Demand:
    """Largest angle rates at a margin (...) rad under body rates of magnitude up to w (...); unit of w. Infinite at
    lock.
    """
    m, rate = np.broadcast_arrays(_checked(margin), np.asarray(w, dtype=float))
    with np.errstate(divide="ignore", invalid="ignore"):
        return Demand(np.where(rate == 0.0, 0.0, rate / np.sin(m)), rate + 0.0)


def acceleration_demand(margin: ArrayLike, w: ArrayLike, acceleration: ArrayLike) -> Demand:
    """Largest angle accelerations (...) at a margin (...) rad.

    Under body rates of magnitude up to w (rad/s: the square must carry rad) and body angular accelerations of magnitude
    up to `acceleration` (rad/s^2). Infinite at lock unless both are zero.
    """
    m, rate, a = np.broadcast_arrays(
        _checked(margin), np.asarray(w, dtype=float), np.asarray(acceleration, dtype=float)
    )
    s = np.sin(m)
    with np.errstate(divide="ignore", invalid="ignore"):
        outer = np.where(a == 0.0, 0.0, a / s) + np.where(
            rate == 0.0, 0.0, rate * rate * np.sqrt(4.0 - 3.0 * s * s) / (2.0 * s * s)
        )
        middle = a + np.where(rate == 0.0, 0.0, 0.5 * rate * rate / np.tan(m / 2.0))
    return Demand(outer, middle)


def margin_for_rate(w: float, limit: float) -> float:
    """Least margin (rad) at which no outer angle rate exceeds `limit` under body rates up to w (same unit):
    asin(w/limit).

    Raises AttitudeError when the limit is below w: no margin is enough, an outer angle must follow at 90 deg as well.
    """
    if not limit >= w >= 0.0 or limit <= 0.0:
        raise AttitudeError(
            f"a rate limit of {limit:g} is below the body rate {w:g}: no margin is enough",
            remedy="the limit of an outer angle must be at least the body rate",
        )
    return float(np.arcsin(w / limit))


def margin_for_acceleration(w: float, acceleration: float, limit: float) -> float:
    """Least margin (rad) at which no outer angle acceleration exceeds `limit` (rad/s^2), rounded up to 1e-12 rad.

    Body rates up to w (rad/s), body angular accelerations up to `acceleration` (rad/s^2). Raises AttitudeError when
    even a margin of 90 deg is not enough.
    """
    if not (float(acceleration_demand(np.pi / 2, w, acceleration).outer) <= limit):
        raise AttitudeError(
            f"an acceleration limit of {limit:g} rad/s^2 is not met at any margin",
            remedy=f"at 90 deg the demand is {float(acceleration_demand(np.pi / 2, w, acceleration).outer):g} rad/s^2",
        )
    low, high = 0.0, np.pi / 2  # the demand at `high` is within the limit, and falls with the margin
    while high - low > 1e-12:
        middle = 0.5 * (low + high)
        enough = float(acceleration_demand(middle, w, acceleration).outer) <= limit
        low, high = (low, middle) if enough else (middle, high)
    return high


def _checked(margin: ArrayLike) -> Array:
    m = np.asarray(margin, dtype=float)
    if not np.all((m >= 0.0) & (m <= np.pi / 2 + 1e-12)):
        raise AttitudeError("a lock margin lies between 0 and 90 deg", remedy="give it in rad")
    return m
