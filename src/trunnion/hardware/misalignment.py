"""What a misalignment costs: in the vehicle's attitude and in every reported angle, growing towards lock.

Letters: `r` reference, `b` the frame whose attitude is reported, `n` the sensor's seat as drawn, `s` as it really is.
A sensor seated as R_ns = Exp(phi) but read with the drawing's R_bn reports the vehicle turned by R_bn phi: the
vehicle's attitude is wrong by exactly |phi|, whatever the attitude. What the three angles make of it is another thing.

With m the distance to lock and the whole turn at most t < m:
  middle angle      |error| <= t                       (it is a distance, and distances are 1-Lipschitz)
  outer angles      |error| <= asin(sin t / sin m)     (azimuth of a direction at distance m from the pole, moved by t)
Both are reached, so they are certified and cannot be improved; at m <= t the outer angles may be anything.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.attitude.rates import convention_rate_matrix
from trunnion.attitude.rotations import from_rotation_vector
from trunnion.errors import HardwareError
from trunnion.hardware.mounts import MountTolerance
from trunnion.hardware.vectors import Array, wrapped


def vehicle_attitude_error(tolerance: MountTolerance) -> float | None:
    """Certified bound (rad) of the vehicle attitude error the mount alone causes; None without a stated bound."""
    return tolerance.largest_turn


def turn_with_probability(covariance: ArrayLike, probability: float) -> float:
    """Turn (rad) a normal misalignment of this covariance (3, 3) rad^2 does not exceed with at least `probability`.

    Square root of the largest variance times the chi-square point with three degrees of freedom: exact when the three
    variances are equal, on the safe side otherwise.
    """
    from scipy.stats import chi2

    if not 0.0 < probability < 1.0:
        raise HardwareError(f"probability {probability:g} is not between 0 and 1")
    largest = float(np.max(np.linalg.eigvalsh(np.asarray(covariance, dtype=float))))
    return float(np.sqrt(largest * chi2.ppf(probability, 3)))


def worst_angle_errors(turn: ArrayLike, margin: ArrayLike) -> Array:
    """Certified largest error (..., 3) rad of (first, middle, third) angle for a whole turn at distance `margin`.

    turn, margin (...) rad, >= 0. Outer entries are pi where the turn reaches the lock.
    """
    t, m = np.broadcast_arrays(np.asarray(turn, dtype=float), np.asarray(margin, dtype=float))
    if np.any(t < 0.0) or np.any(m < 0.0) or not np.all(np.isfinite(t + m)):
        raise HardwareError("a misalignment or a margin is negative or not finite", remedy="angles >= 0")
    reaches = t >= m
    ratio = np.where(reaches, 1.0, np.sin(np.minimum(t, np.pi / 2)) / np.where(reaches, 1.0, np.sin(m)))
    outer = np.where(reaches, np.pi, np.arcsin(np.clip(ratio, 0.0, 1.0)))
    return np.stack([outer, np.minimum(t, np.pi), outer], axis=-1)


@dataclass(frozen=True, eq=False)
class AngleErrors:
    """Errors of the three stated angles by three routes, side by side; (3,) rad each, worst over the attitudes given.

    linear: bound of the first-order error. certified: closed form, None when only a covariance is stated. monte_carlo:
    largest error among the draws (a bounded tolerance) or its 99.73 % point (a covariance); sampled. sigma: first
    order one sigma from the covariance, or None. margin (rad): the least one used, with its basis.
    """

    linear: Array | None
    certified: Array | None
    monte_carlo: Array
    sigma: Array | None
    margin: float
    margin_basis: Basis
    vehicle: float | None
    draws: int


def angle_errors(
    tolerance: MountTolerance,
    convention: Convention,
    R_rb: ArrayLike,
    R_bn: ArrayLike,
    *,
    least_margin: float | None = None,
    draws: int = 2000,
    seed: int = 1,
) -> AngleErrors:
    """Errors of the reported angles over attitudes R_rb (..., 3, 3) for a mount R_bn and its tolerance.

    For the sensor's own angles give its attitudes as R_rb and the identity as R_bn. least_margin (rad): the certified
    least margin of the region the attitudes come from; without it the least among the attitudes is used (sampled).
    """
    R = np.asarray(R_rb, dtype=float).reshape(-1, 3, 3)
    if not len(R):
        raise HardwareError("no attitude to judge the misalignment at", remedy="give at least one attitude")
    found = convention.angles(R)
    sampled = float(np.min(found.margin))
    margin = sampled if least_margin is None else min(least_margin, sampled)
    turn = tolerance.largest_turn
    J = _angle_gain(convention, found.angles, found.singular) @ np.asarray(R_bn, dtype=float)
    return AngleErrors(
        None if turn is None else np.max(_linear_bound(J, tolerance), axis=0),
        None if turn is None else worst_angle_errors(turn, margin),
        _monte_carlo(tolerance, convention, R, np.asarray(R_bn, dtype=float), found.angles, draws, seed),
        None if tolerance.covariance is None else _sigma(J, tolerance.covariance),
        margin,
        Basis.SAMPLED if least_margin is None else Basis.CERTIFIED,
        turn,
        draws,
    )


def _angle_gain(convention: Convention, angles: Array, singular: ArrayLike) -> Array:
    """d(angles)/d(turn in body axes) (..., 3, 3); infinite where locked."""
    B = convention_rate_matrix(convention, angles)
    gain = np.full(B.shape, np.inf)
    free = ~np.asarray(singular, dtype=bool)
    gain[free] = np.linalg.inv(B[free])
    return gain


def _linear_bound(J: Array, tolerance: MountTolerance) -> Array:
    """First-order bound (N, 3): the smaller of what the per-axis bounds and the total rotation allow."""
    bounds = []
    with np.errstate(invalid="ignore"):
        if tolerance.per_axis is not None:
            bounds.append(np.abs(J) @ np.asarray(tolerance.per_axis))
        if tolerance.total is not None:
            bounds.append(tolerance.total * np.linalg.norm(J, axis=-1))
    return np.nan_to_num(np.min(bounds, axis=0), nan=np.inf)


def _sigma(J: Array, covariance: Array) -> Array:
    with np.errstate(invalid="ignore"):
        variance = np.einsum("nij,jk,nik->ni", J, np.asarray(covariance, dtype=float), J)
    return np.sqrt(np.max(np.nan_to_num(variance, nan=np.inf), axis=0))


def draw_turns(tolerance: MountTolerance, draws: int, seed: int) -> Array:
    """Random misalignments (draws, 3) rad within the tolerance: corners of the box, the surface of the ball, or
    normal.
    """
    rng = np.random.default_rng(seed)
    if tolerance.covariance is not None:
        return rng.multivariate_normal(np.zeros(3), np.asarray(tolerance.covariance, dtype=float), draws, method="svd")
    if tolerance.per_axis is not None:
        turns = rng.uniform(-1.0, 1.0, (draws, 3)) * tolerance.per_axis
        corner = rng.random(draws) < 0.5
        turns[corner] = np.sign(turns[corner]) * tolerance.per_axis
        if tolerance.total is not None:
            length = np.linalg.norm(turns, axis=1, keepdims=True)
            turns *= np.minimum(1.0, tolerance.total / np.maximum(length, 1e-300))
        return turns
    if tolerance.total is not None:
        v = rng.normal(size=(draws, 3))
        return tolerance.total * v / np.linalg.norm(v, axis=1, keepdims=True)
    raise HardwareError(
        "the mount states no tolerance", remedy="state per-axis bounds, a total rotation, or a covariance"
    )


def _monte_carlo(
    tolerance: MountTolerance, convention: Convention, R: Array, R_bn: Array, angles: Array, draws: int, seed: int
) -> Array:
    turns = draw_turns(tolerance, draws, seed)
    moved = from_rotation_vector(turns @ R_bn.T)
    pick = np.random.default_rng(seed + 1).integers(0, len(R), draws)
    # every attitude near the worst one matters most: half of the draws sit at the attitude of least margin
    pick[: draws // 2] = int(np.argmin(convention.lock_margin(R)))
    found = convention.angles(R[pick] @ moved)
    away = np.abs(wrapped(found.angles - angles[pick]))
    return np.quantile(away, 0.9973, axis=0) if tolerance.covariance is not None else np.max(away, axis=0)


@dataclass(frozen=True)
class Growth:
    """One row of the growth table (rad): at this margin, what a turn does to the outer angles."""

    margin: float
    linear: float
    certified: float
    gain: float


def growth_towards_lock(turn: float, margins: ArrayLike) -> list[Growth]:
    """How the outer angles' error grows as the margin shrinks, for one whole turn (rad). Gain is 1/sin(margin)."""
    rows = []
    for m in np.asarray(margins, dtype=float):
        gain = float("inf") if m <= 0.0 else float(1.0 / np.sin(m))
        rows.append(Growth(float(m), turn * gain, float(worst_angle_errors(turn, m)[0]), gain))
    return rows
