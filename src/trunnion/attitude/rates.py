"""Rates of the angles and the angular velocity: both directions, body and reference components, determinant,
gains.

w is the angular velocity of b in r. The columns of a rate matrix B are the axes of the three turns in the
chosen components, so w = B d(angles)/dt. Determinant: +-cos b (three different axes) or -sin b (repeated
axis): it vanishes exactly at lock. Sources: WERTZ-1978 table E-2, DIEBEL-2006, NAIF-ROTATION (eul2xf,
xf2rav).
"""

from __future__ import annotations

import enum
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import elementary
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

if TYPE_CHECKING:
    from trunnion.attitude.conventions import Convention

Array = NDArray[np.float64]


class RateAxes(enum.Enum):
    """In which components an angular velocity is written."""

    BODY = "body axes"
    REFERENCE = "reference axes"


class AngleRates(NamedTuple):
    """The inverse of a rate matrix (..., 3, 3), and the lock margin (...) rad, whose sine divides its outer
    rows.
    """

    matrix: Array
    margin: Array


def body_rate_matrix(angles: ArrayLike, *, sequence: Sequence, sense: Sense) -> Array:
    """B (..., 3, 3) with w (in the axes carried by the chain) = B d(angles)/dt; angles (..., 3) rad in turn
    order.

    Regular everywhere; its inverse is singular at lock, see `angle_rate_matrix`.
    """
    return _columns(angles, sequence, sense, carried=True)


def reference_rate_matrix(angles: ArrayLike, *, sequence: Sequence, sense: Sense) -> Array:
    """B (..., 3, 3) with w (in the axes the chain starts from) = B d(angles)/dt; angles (..., 3) rad in turn
    order.
    """
    return _columns(angles, sequence, sense, carried=False)


def angle_rate_matrix(
    angles: ArrayLike,
    *,
    sequence: Sequence,
    sense: Sense,
    axes: RateAxes = RateAxes.BODY,
    least_margin: float = 0.0,
) -> AngleRates:
    """The inverse matrix (..., 3, 3): d(angles)/dt = matrix @ w, with w in the components of `axes`; and the
    margin.

    Outer rows have length 1/sin(margin), the middle row 1. Raises AttitudeError at lock, or at most
    `least_margin` rad from it, naming the first offender by its margin.
    """
    build = body_rate_matrix if axes is RateAxes.BODY else reference_rate_matrix
    B = build(angles, sequence=sequence, sense=sense)
    margin = middle_margin(np.asarray(angles, dtype=float)[..., 1], sequence)
    _require_margin(margin, least_margin)
    return AngleRates(_inverse(B, rate_determinant(angles, sequence=sequence, sense=sense)), margin)


def rate_determinant(angles: ArrayLike, *, sequence: Sequence, sense: Sense) -> Array:
    """Determinant (...) of the rate matrix, the same in body and reference components.

    Moving axes: parity * cos b for three different axes, -sin b for a repeated axis. Fixed axes: the same
    (the chain is the reversed sequence of opposite parity, with the columns in reverse, which changes the
    sign twice), except that a repeated axis gives +sin b.
    """
    b = np.asarray(angles, dtype=float)[..., 1]
    if sequence.repeated:
        return -np.sin(b) if sense is Sense.MOVING else np.sin(b)
    return sequence.parity * np.cos(b)


def middle_margin(middle: ArrayLike, sequence: Sequence) -> Array:
    """Lock margin (...) rad of a middle angle: its distance from the nearest singular value, in [0, pi/2]."""
    b = np.asarray(middle, dtype=float)
    s, c = np.abs(np.sin(b)), np.abs(np.cos(b))
    return np.arctan2(s, c) if sequence.repeated else np.arctan2(c, s)


class RateGains(NamedTuple):
    """How body rates grow into angle rates, per unit of |w|, all (...): largest rate of an outer angle, of
    the middle
    angle, of the three together (2-norm), and the condition number of the rate matrix."""

    outer: Array
    middle: Array
    together: Array
    condition: Array


def rate_gains(margin: ArrayLike) -> RateGains:
    """Gains at a lock margin (...) rad; infinite at lock. The same for all 24 by their margin alone.

    1/sin m, 1, 1/(sqrt 2 sin(m/2)), cot(m/2): from B^T B = [[1, 0, g], [0, 1, 0], [g, 0, 1]] with |g| = cos
    m, written in half angles so that 1 - cos m does not cancel.
    """
    m = np.asarray(margin, dtype=float)
    with np.errstate(divide="ignore"):
        return RateGains(
            1.0 / np.sin(m), np.ones_like(m), 1.0 / (np.sqrt(2.0) * np.sin(m / 2.0)), 1.0 / np.tan(m / 2.0)
        )


def convention_rate_matrix(convention: Convention, angles: ArrayLike, axes: RateAxes = RateAxes.BODY) -> Array:
    """B (..., 3, 3) for the stated angles (..., 3) rad of a convention: w = B d(stated angles)/dt, senses
    included.

    w is the angular velocity of the body frame in the reference frame, in body or reference components.
    """
    chain = convention.chain_from_stated(angles)
    if axes is RateAxes.BODY:
        B = convention.right.T @ body_rate_matrix(chain, sequence=convention.sequence, sense=convention.sense)
    else:
        B = convention.left @ reference_rate_matrix(chain, sequence=convention.sequence, sense=convention.sense)
    return B * np.asarray(convention.signs, dtype=float)


def convention_angle_rates(
    convention: Convention,
    angles: ArrayLike,
    w: ArrayLike,
    axes: RateAxes = RateAxes.BODY,
    least_margin: float = 0.0,
) -> Array:
    """Rates (..., 3) rad/s of the stated angles for the angular velocity w (..., 3) rad/s in body or
    reference axes.

    Raises AttitudeError at lock, or at most `least_margin` rad from it.
    """
    B = convention_rate_matrix(convention, angles, axes)
    chain = convention.chain_from_stated(angles)
    _require_margin(middle_margin(chain[..., 1], convention.sequence), least_margin)
    determinant = rate_determinant(chain, sequence=convention.sequence, sense=convention.sense)
    inverse = _inverse(B, determinant * np.prod(convention.signs))
    return np.einsum("...ij,...j->...i", inverse, np.asarray(w, dtype=float))


def quaternion_rate(q: ArrayLike, w: ArrayLike, axes: RateAxes = RateAxes.BODY) -> Array:
    """dq/dt (..., 4) of a quaternion (scalar first, body to reference): q (0, w_b) / 2 or (0, w_r) q / 2."""
    from trunnion.attitude.rotations import quaternion_product

    rate = np.asarray(w, dtype=float)
    pure = np.concatenate([np.zeros_like(rate[..., :1]), rate], axis=-1)
    product = quaternion_product(q, pure) if axes is RateAxes.BODY else quaternion_product(pure, q)
    return 0.5 * product


def _columns(angles: ArrayLike, sequence: Sequence, sense: Sense, *, carried: bool) -> Array:
    """Turn axes as columns. Axis n is moved by the turns applied after it (reference components, moving axes:
    by the
    turns before it in the product); in carried components it is seen through the inverse of the rest."""
    turns = np.asarray(angles, dtype=float)
    order = (0, 1, 2) if sense is Sense.MOVING else (2, 1, 0)
    B = np.empty((*turns.shape[:-1], 3, 3))
    M = np.broadcast_to(np.eye(3), B.shape)
    for n in reversed(order) if carried else order:
        B[..., :, n] = M[..., :, sequence.axes[n]]
        turn = elementary(sequence.axes[n], turns[..., n])
        M = M @ (np.swapaxes(turn, -1, -2) if carried else turn)
    return B


def _inverse(B: Array, determinant: Array) -> Array:
    """Inverse by cross products over the determinant known in closed form: no loss of digits near lock."""
    n1, n2, n3 = B[..., :, 0], B[..., :, 1], B[..., :, 2]
    rows = np.stack([np.cross(n2, n3), np.cross(n3, n1), np.cross(n1, n2)], axis=-2)
    return rows / np.asarray(determinant)[..., None, None]


def _require_margin(margin: Array, least: float) -> None:
    bad = margin <= least
    if np.any(bad):
        raise AttitudeError(
            f"angle rates are asked for {np.degrees(np.min(margin)):.3g} deg from lock; they grow without "
            f"bound there, and at {np.degrees(least):.3g} deg or less they are refused",
            remedy="use the angular velocity or the quaternion rate there, or another sequence",
        )
