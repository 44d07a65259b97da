"""Angles of a sequence from a matrix and back: the residual form, its singular branch, both branches of the
middle angle.

Letters: E is the chain, the product of the three elementary turns. Moving axes E = Rot(i,a) Rot(j,b)
Rot(k,c); fixed axes E = Rot(k,c) Rot(j,b) Rot(i,a), which is the moving chain k-j-i of the angles in reverse.

The residual form takes the first angle from its two entries, and the third from Rot(i,a)^T E, not from two
further entries. An error of the first angle, which near lock is as large as the rounding divided by the
margin, is thereby carried into the third with the opposite effect: the chain rebuilt from the three angles
meets the matrix to rounding at every margin. So no threshold is needed for safety. The branch for lock is
taken where rounding alone would choose the outer angles (margin at most tolerances.LOCK_ROUNDINGS roundings),
or below a margin the caller chooses; `lock_within=0` keeps it for exact zeros only.
"""

from __future__ import annotations

import enum
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude import tolerances
from trunnion.attitude.rotations import elementary
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


class Policy(enum.Enum):
    """Which of the two outer angles is set to zero when only their sum or difference is known."""

    LAST_ZERO = "last angle zero"
    FIRST_ZERO = "first angle zero"


class Extraction(NamedTuple):
    """Angles (..., 3) rad in turn order; margin (...) rad; singular (...): the branch for lock was taken."""

    angles: Array
    margin: Array
    singular: NDArray[np.bool_]


def wrap(angle: ArrayLike) -> Array:
    """The same direction within (-pi, pi] rad; values already there are returned bit for bit."""
    value = np.asarray(angle)
    turn = 2.0 * np.pi
    inside = (value > -np.pi) & (value <= np.pi)
    return np.where(inside, value, np.pi - np.mod(np.pi - value, turn))


def chain_matrix(angles: ArrayLike, *, sequence: Sequence, sense: Sense) -> Array:
    """The chain E (..., 3, 3) of angles (..., 3) rad in turn order about moving or fixed axes."""
    turns = np.asarray(angles, dtype=float)
    if turns.shape[-1:] != (3,):
        raise AttitudeError(f"angles have shape {turns.shape}", remedy="three angles each, in turn order")
    first, second, third = (elementary(axis, turns[..., n]) for n, axis in enumerate(sequence.axes))
    return first @ second @ third if sense is Sense.MOVING else third @ second @ first


def chain_angles(
    E: ArrayLike,
    *,
    sequence: Sequence,
    sense: Sense,
    policy: Policy = Policy.LAST_ZERO,
    other_branch: bool = False,
    lock_within: float | None = None,
) -> Extraction:
    """Angles of the chain E (..., 3, 3), rebuilt to rounding at every margin, and the lock margin.

    Ranges: outer angles (-pi, pi]; middle angle [-pi/2, pi/2] for three different axes, [0, pi] for a
    repeated axis; with `other_branch` the second triple of the same attitude, (a + pi, pi - b, c + pi) or
    (a + pi, -b, c + pi). At lock (margin at most `lock_within` rad; default: rounding, see tolerances) the
    middle angle is exactly its singular value, one outer angle is zero by `policy` and the other carries the
    sum or difference that is known; the rebuilt attitude misses E by at most the margin then. Single
    precision input is worked in single precision. `E` must be a rotation (see `require_rotation`); this inner
    function does not look again. Source: HENDERSON-1977 for the sequences; the residual form is proved in
    `symbolic`.
    """
    chain = np.asarray(E)
    if chain.dtype != np.float32:
        chain = chain.astype(float, copy=False)
    if chain.shape[-2:] != (3, 3):
        raise AttitudeError(f"matrix has shape {chain.shape}", remedy="three rows of three numbers")
    if lock_within is None:
        lock_within = tolerances.LOCK_ROUNDINGS * float(np.finfo(chain.dtype).eps)
    i, j, k = sequence.axes
    forward = sense is Sense.MOVING
    if not forward:
        i, k = k, i
        policy = Policy.FIRST_ZERO if policy is Policy.LAST_ZERO else Policy.LAST_ZERO
    angles, margin, singular = _moving_angles(chain, (i, j, k), policy, lock_within)
    if other_branch:
        # At lock both branches meet: the triple with a zero outer angle serves either.
        angles = np.where(singular[..., None], angles, second_triple(angles, repeated=sequence.repeated))
    return Extraction(angles if forward else angles[..., ::-1], margin, singular)


def second_triple(angles: ArrayLike, *, repeated: bool) -> Array:
    """The other triple (..., 3) of the same attitude, outer and middle angles wrapped into (-pi, pi]."""
    a, b, c = np.moveaxis(np.asarray(angles, dtype=float), -1, 0)
    middle = -b if repeated else np.pi - b
    return wrap(np.stack([_half_turn_on(a), middle, _half_turn_on(c)], axis=-1))


def _half_turn_on(angle: Array) -> Array:
    return np.where(angle > 0.0, angle - np.pi, angle + np.pi)


def _moving_angles(
    E: Array, axes: tuple[int, int, int], policy: Policy, lock_within: float
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Moving axes i-j-k: angles, margin, singular flag. One formula for all twelve, by parity.

    The column of E along k is (for three different axes) e sin b along i, -e sin a cos b along j, cos a cos b
    along l = k; (for k = i) cos b along i, sin a sin b along j, -e cos a sin b along the unused axis l.
    """
    i, j, k = axes
    l = 3 - i - j  # noqa: E741 - the completing axis; equals k for three different axes
    e = 1 if (j - i) % 3 == 1 else -1
    repeated = i == k
    y, x = (E[..., j, i], -e * E[..., l, i]) if repeated else (-e * E[..., j, k], E[..., k, k])
    along = E[..., i, i] if repeated else e * E[..., i, k]
    across = np.hypot(x, y)
    margin = np.arctan2(across, np.abs(along))
    exact = (x == 0.0) & (y == 0.0)
    singular = exact | (margin <= lock_within)
    a = np.where(exact, 0.0, np.arctan2(y, x)).astype(E.dtype, copy=False)
    b = np.arctan2(across, along) if repeated else np.arctan2(along, across)
    c = _residual(E, a, axes, e)
    if np.any(singular):
        a, b, c = _locked((a, b, c), singular, np.where(along < 0.0, -1, 1), e, repeated, policy)
    angles = np.stack([_open_end(a), b, _open_end(c)], axis=-1)
    return angles.astype(E.dtype, copy=False), margin, singular


def _residual(E: Array, a: Array, axes: tuple[int, int, int], e: int) -> Array:
    """Third angle from row j of Rot(i,a)^T E = Rot(j,b) Rot(k,c): that row does not contain b."""
    i, j, k = axes
    l = 3 - i - j  # noqa: E741
    row = np.cos(a)[..., None] * E[..., j, :] + (e * np.sin(a))[..., None] * E[..., l, :]
    return np.arctan2(-e * row[..., l] if i == k else e * row[..., i], row[..., j])


def _locked(
    angles: tuple[Array, Array, Array],
    singular: NDArray[np.bool_],
    side: NDArray[np.int_],
    e: int,
    repeated: bool,
    policy: Policy,
) -> tuple[Array, Array, Array]:
    """Where singular: middle angle exactly singular, one outer angle zero, the other the known combination.

    `side` is the sign of sin b (three different axes) or cos b (repeated axis). Known is a + s c with s = e
    side or s = side. Source: HENDERSON-1977 sequences; the rule for all 24 singular values is checked in
    tests/published.
    """
    a, b, c = angles
    s = side if repeated else e * side
    pole = np.where(side > 0, 0.0, np.pi) if repeated else side * (np.pi / 2.0)
    last_zero = policy is Policy.LAST_ZERO
    known_a = wrap(a + s * c) if last_zero else np.zeros_like(a)
    known_c = np.zeros_like(c) if last_zero else wrap(c + s * a)
    return np.where(singular, known_a, a), np.where(singular, pole, b), np.where(singular, known_c, c)


def _open_end(angle: Array) -> Array:
    """arctan2 gives -pi for (-0, -1); the range is (-pi, pi]. Also turns -0 into 0."""
    return np.where(angle <= -np.pi, -angle, angle) + 0.0
