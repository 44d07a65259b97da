"""Rotations as matrices, unit quaternions and rotation vectors, and the metric between them.

A matrix `R_ab` takes b-components to a-components, v_a = R_ab v_b; read as an active turn it turns a's axes
onto b's. Quaternions are (..., 4), SCALAR FIRST, Hamilton product, and belong to the same map: v_a = q v_b
q*. Scalar-last order exists only at the borders (`scalar_first`, `scalar_last`). Angles in rad.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude import tolerances
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


def elementary(axis: int, angle: ArrayLike) -> Array:
    """Active matrix (..., 3, 3) of a right-handed turn by `angle` (...) rad about axis 0, 1 or 2 (x, y,
    z).
    """
    if axis not in (0, 1, 2):
        raise AttitudeError(f"there is no axis number {axis}", remedy="0, 1, 2 stand for x, y, z")
    turn = np.asarray(angle, dtype=float)
    first, second = (axis + 1) % 3, (axis + 2) % 3
    R = np.zeros((*turn.shape, 3, 3))
    c, s = np.cos(turn), np.sin(turn)
    R[..., axis, axis] = 1.0
    R[..., first, first] = R[..., second, second] = c
    R[..., second, first] = s
    R[..., first, second] = -s
    return R


def skew(v: ArrayLike) -> Array:
    """Matrix (..., 3, 3) of the cross product: skew(v) @ w = v x w."""
    x, y, z = np.moveaxis(np.asarray(v, dtype=float), -1, 0)
    o = np.zeros_like(x)
    return np.stack([np.stack([o, -z, y], -1), np.stack([z, o, -x], -1), np.stack([-y, x, o], -1)], -2)


def unit(v: ArrayLike, what: str = "direction") -> Array:
    """The unit vector(s) (..., 3) along v; a zero or non-finite vector raises AttitudeError naming `what`."""
    vector = np.asarray(v, dtype=float)
    scale = np.max(np.abs(vector), axis=-1, keepdims=True)
    if vector.shape[-1:] != (3,) or not np.all(np.isfinite(vector)) or np.any(scale == 0.0):
        raise AttitudeError(f"{what} {_short(vector)} is no direction", remedy="give three numbers, not all zero")
    scaled = vector / scale
    return scaled / np.linalg.norm(scaled, axis=-1, keepdims=True)


def about(axis: ArrayLike, angle: ArrayLike) -> Array:
    """Active matrix (..., 3, 3) of a right-handed turn by `angle` rad about the direction `axis` (..., 3)."""
    n = unit(axis, "turning axis")
    turn = np.asarray(angle, dtype=float)[..., None, None]
    K = skew(n)
    half = np.sin(turn / 2.0)
    return np.eye(3) + np.sin(turn) * K + 2.0 * half * half * (K @ K)


def from_rotation_vector(vector: ArrayLike) -> Array:
    """Matrix (..., 3, 3) of the turn by |vector| rad about `vector` (..., 3); the zero vector is no turn."""
    return matrix_from_quaternion(quaternion_from_rotation_vector(vector))


def quaternion_from_rotation_vector(vector: ArrayLike) -> Array:
    """Unit quaternion (..., 4) of the turn by |vector| rad about `vector` (..., 3)."""
    phi = np.asarray(vector, dtype=float)
    angle = np.linalg.norm(phi, axis=-1, keepdims=True)
    # sin(a/2)/a by numpy's sinc, which is exact at zero: sinc(t) = sin(pi t)/(pi t).
    return np.concatenate([np.cos(angle / 2.0), 0.5 * np.sinc(angle / (2.0 * np.pi)) * phi], axis=-1)


def rotation_vector(R: ArrayLike) -> Array:
    """Rotation vector (..., 3) rad of a matrix (..., 3, 3), length in [0, pi].

    At half a turn the axis is known up to its sign; the sign with the first non-zero component positive is
    returned.
    """
    q = quaternion_from_matrix(R)
    length = np.linalg.norm(q[..., 1:], axis=-1, keepdims=True)
    angle = 2.0 * np.arctan2(length, q[..., :1])
    ratio = np.divide(angle, length, out=np.full_like(angle, 2.0), where=length > 0.0)
    return ratio * q[..., 1:]


def quaternion_product(p: ArrayLike, q: ArrayLike) -> Array:
    """Hamilton product p q (..., 4), scalar first: belongs to the matrix product R(p) R(q)."""
    a, b = np.asarray(p, dtype=float), np.asarray(q, dtype=float)
    scalar = a[..., :1] * b[..., :1] - np.sum(a[..., 1:] * b[..., 1:], axis=-1, keepdims=True)
    vector = a[..., :1] * b[..., 1:] + b[..., :1] * a[..., 1:] + np.cross(a[..., 1:], b[..., 1:])
    return np.concatenate([scalar, vector], axis=-1)


def quaternion_conjugate(q: ArrayLike) -> Array:
    """Conjugate (..., 4): the quaternion of the transposed matrix."""
    return np.asarray(q, dtype=float) * np.array([1.0, -1.0, -1.0, -1.0])


def scalar_first(q_scalar_last: ArrayLike) -> Array:
    """(x, y, z, w) from outside to the (w, x, y, z) used inside."""
    return np.roll(np.asarray(q_scalar_last, dtype=float), 1, axis=-1)


def scalar_last(q: ArrayLike) -> Array:
    """(w, x, y, z) as used inside to (x, y, z, w) for the outside."""
    return np.roll(np.asarray(q, dtype=float), -1, axis=-1)


def require_unit_quaternion(
    q: ArrayLike, what: str = "quaternion", tolerance: float = tolerances.UNIT_QUATERNION
) -> Array:
    """Check (..., 4) finite quaternions of length 1 within `tolerance`; returns them as an array, unchanged.

    Raises AttitudeError naming the first one that is not.
    """
    values = np.asarray(q, dtype=float)
    if values.shape[-1:] != (4,):
        raise AttitudeError(f"{what} has shape {values.shape}", remedy="four numbers each, scalar first")
    length = np.linalg.norm(values, axis=-1)
    bad = ~(np.abs(length - 1.0) <= tolerance)
    if np.any(bad):
        where = _first(bad)
        raise AttitudeError(
            f"{what}{where} has length {length[bad].flat[0]:.9g}",
            remedy=f"a unit quaternion has length 1 within {tolerance:g}",
        )
    return values


def matrix_from_quaternion(q: ArrayLike) -> Array:
    """Matrix (..., 3, 3) of unit quaternions (..., 4), scalar first. Lengths off 1 by over 1e-6 raise
    AttitudeError.

    The homogeneous form is used (divided by |q|^2), so the matrix is orthogonal to rounding all the same.
    """
    values = require_unit_quaternion(q)
    w, x, y, z = np.moveaxis(values, -1, 0)
    s = 2.0 / (w * w + x * x + y * y + z * z)
    R = np.empty((*w.shape, 3, 3))
    R[..., 0, 0] = 1.0 - s * (y * y + z * z)
    R[..., 1, 1] = 1.0 - s * (x * x + z * z)
    R[..., 2, 2] = 1.0 - s * (x * x + y * y)
    R[..., 0, 1], R[..., 1, 0] = s * (x * y - w * z), s * (x * y + w * z)
    R[..., 0, 2], R[..., 2, 0] = s * (x * z + w * y), s * (x * z - w * y)
    R[..., 1, 2], R[..., 2, 1] = s * (y * z - w * x), s * (y * z + w * x)
    return R


def quaternion_from_matrix(R: ArrayLike) -> Array:
    """Unit quaternion (..., 4), scalar first, of rotation matrices (..., 3, 3).

    Sign: scalar part positive; at half a turn the first non-zero vector component is positive. Uses the row
    of the 4 x 4 outer product q q^T with the largest diagonal, so nothing cancels. Raises AttitudeError for
    no rotation.
    """
    M = require_rotation(R)
    K = np.empty((*M.shape[:-2], 4, 4))
    xx, yy, zz = M[..., 0, 0], M[..., 1, 1], M[..., 2, 2]
    K[..., 0, 0], K[..., 1, 1] = 1 + xx + yy + zz, 1 + xx - yy - zz
    K[..., 2, 2], K[..., 3, 3] = 1 - xx + yy - zz, 1 - xx - yy + zz
    K[..., 0, 1] = K[..., 1, 0] = M[..., 2, 1] - M[..., 1, 2]
    K[..., 0, 2] = K[..., 2, 0] = M[..., 0, 2] - M[..., 2, 0]
    K[..., 0, 3] = K[..., 3, 0] = M[..., 1, 0] - M[..., 0, 1]
    K[..., 1, 2] = K[..., 2, 1] = M[..., 0, 1] + M[..., 1, 0]
    K[..., 1, 3] = K[..., 3, 1] = M[..., 0, 2] + M[..., 2, 0]
    K[..., 2, 3] = K[..., 3, 2] = M[..., 1, 2] + M[..., 2, 1]
    best = np.argmax(np.diagonal(K, axis1=-2, axis2=-1), axis=-1)
    q = np.take_along_axis(K, best[..., None, None], axis=-2)[..., 0, :]
    return positive_quaternion(q / np.linalg.norm(q, axis=-1, keepdims=True))


def positive_quaternion(q: ArrayLike) -> Array:
    """Of q and -q the one whose first non-zero component is positive (scalar part positive but at half a
    turn).
    """
    values = np.asarray(q, dtype=float) + 0.0
    leading = np.argmax(values != 0.0, axis=-1)
    sign = np.sign(np.take_along_axis(values, leading[..., None], axis=-1))
    return values * np.where(sign == 0.0, 1.0, sign)


def rotation_angle(R1: ArrayLike, R2: ArrayLike) -> Array:
    """Angle (...) rad in [0, pi] of the turn from R1 to R2 (both (..., 3, 3)); the metric of attitudes.

    atan2 of the antisymmetric part and the trace: absolute error a few eps at every angle, where arccos of
    the trace loses half the digits near 0 and pi. Source: formula of the trade; checked against HUYNH-2009
    values.
    """
    A, B = np.asarray(R1, dtype=float), np.asarray(R2, dtype=float)
    D = np.swapaxes(A, -1, -2) @ B
    v = np.stack([D[..., 2, 1] - D[..., 1, 2], D[..., 0, 2] - D[..., 2, 0], D[..., 1, 0] - D[..., 0, 1]], axis=-1)
    return np.arctan2(np.linalg.norm(v, axis=-1), np.trace(D, axis1=-2, axis2=-1) - 1.0)


def quaternion_angle(p: ArrayLike, q: ArrayLike) -> Array:
    """Angle (...) rad in [0, pi] of the turn between unit quaternions; p and -p are the same attitude."""
    d = quaternion_product(quaternion_conjugate(p), q)
    return 2.0 * np.arctan2(np.linalg.norm(d[..., 1:], axis=-1), np.abs(d[..., 0]))


def same_attitude(R1: ArrayLike, R2: ArrayLike, tolerance: float = tolerances.SAME_ATTITUDE) -> NDArray[np.bool_]:
    """Are these the same attitude: is the turn between them at most `tolerance` rad? Triples are never
    compared.
    """
    return np.asarray(rotation_angle(R1, R2) <= tolerance)


def slerp(q0: ArrayLike, q1: ArrayLike, t: ArrayLike) -> Array:
    """Attitude (..., 4) at the fraction t of the constant-rate turn from q0 to q1, the shorter way round.

    At exactly half a turn the way is not unique; the one of the signs as given is taken. Source:
    SHOEMAKE-1985.
    """
    a, b = np.asarray(q0, dtype=float), np.asarray(q1, dtype=float)
    d = quaternion_product(quaternion_conjugate(a), b)
    d = np.where(d[..., :1] < 0.0, -d, d)
    length = np.linalg.norm(d[..., 1:], axis=-1, keepdims=True)
    angle = 2.0 * np.arctan2(length, d[..., :1])
    ratio = np.divide(angle, length, out=np.full_like(angle, 2.0), where=length > 0.0)
    step = quaternion_from_rotation_vector(np.asarray(t, dtype=float)[..., None] * ratio * d[..., 1:])
    return quaternion_product(a, step)


def require_rotation(M: ArrayLike, what: str = "matrix", tolerance: float = tolerances.ROTATION) -> Array:
    """Check that (..., 3, 3) matrices are rotations within `tolerance` in every entry of M^T M; returns the
    array.

    Raises AttitudeError naming `what`, the first offender and what is wrong: shape, a value that is no
    number, a reflection (which is named, never repaired), rows that are not unit or not perpendicular.
    """
    R = np.asarray(M, dtype=float)
    if R.shape[-2:] != (3, 3):
        raise AttitudeError(f"{what} has shape {R.shape}", remedy="three rows of three numbers")
    if not np.all(np.isfinite(R)):
        bad = ~np.all(np.isfinite(R), axis=(-2, -1))
        raise AttitudeError(f"{what}{_first(bad)} holds a value that is no number", remedy="nine finite numbers")
    off = np.max(np.abs(np.swapaxes(R, -1, -2) @ R - np.eye(3)), axis=(-2, -1))
    mirrored = determinant(R) < 0.0
    if np.any(mirrored):
        raise AttitudeError(
            f"{what}{_first(mirrored)} is a reflection (determinant negative), not a rotation",
            remedy="one of the two frames is left-handed, or one axis has the wrong sign",
        )
    bad = off > tolerance
    if np.any(bad):
        raise AttitudeError(
            f"{what}{_first(bad)} is not a rotation: its columns miss unit length or right angles by "
            f"{off[bad].flat[0]:.3g}",
            remedy=f"at most {tolerance:g} is taken for rounding; give more digits, or fit the nearest "
            "rotation knowingly",
        )
    return R


def determinant(M: ArrayLike) -> Array:
    """Determinant (...) of 3 x 3 matrices by the triple product of the columns."""
    A = np.asarray(M, dtype=float)
    return np.sum(A[..., :, 0] * np.cross(A[..., :, 1], A[..., :, 2]), axis=-1)


def nearest_rotation(M: ArrayLike) -> tuple[Array, Array]:
    """The rotation (..., 3, 3) nearest to M and the distance |M - R| (...), root sum of squares of the nine
    entries.

    A mirrored or singular matrix raises AttitudeError: it is not a rotation with noise. Source: polar
    decomposition.
    """
    A = np.asarray(M, dtype=float)
    bad = ~(determinant(A) > 0.0)
    if A.shape[-2:] != (3, 3) or np.any(bad):
        raise AttitudeError(
            f"matrix{_first(bad)} is mirrored, flat or no number: no rotation is near it",
            remedy="look for a left-handed frame or a wrong sign before fitting",
        )
    U, _, Vt = np.linalg.svd(A)
    R = U @ Vt
    return R, np.linalg.norm(A - R, axis=(-2, -1))


def _first(bad: NDArray[np.bool_]) -> str:
    """' 12' or ' (3, 4)' for the first True of an array; '' for a single item."""
    if np.ndim(bad) == 0:
        return ""
    place = tuple(int(i) for i in np.argwhere(bad)[0])
    return f" {place[0]}" if len(place) == 1 else f" {place}"


def _short(values: Array) -> str:
    return np.array2string(np.asarray(values).reshape(-1)[:3], separator=", ", precision=6)
