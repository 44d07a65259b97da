"""Lock margins: the angle between a carried body axis and the line of a reference axis, never through arccos.

R (..., 3, 3) takes body components to reference components. margin[i, k] is the angle between the line of
reference axis i and body axis k; nine of them serve all twelve sequences. arccos |R_ik| would return 0 or
steps of 1.5e-8 rad near lock; here either atan2 of the other two components against |R_ik|, or, from a unit
quaternion, 2 arcsin sqrt(D/2) with D = 1 - |R_ik| written as a sum of squares, keeps the full relative
accuracy down to zero.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude import tolerances
from trunnion.attitude.rotations import require_unit_quaternion
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_CHUNK = 8192


def line_angle(u: ArrayLike, w: ArrayLike) -> Array:
    """Angle (...) rad in [0, pi/2] between the lines along u and w (..., 3); lengths do not matter, signs
    neither.
    """
    a, b = np.asarray(u, dtype=float), np.asarray(w, dtype=float)
    across = np.linalg.norm(np.cross(a, b), axis=-1)
    return np.arctan2(across, np.abs(np.sum(a * b, axis=-1)))


def direction_angle(u: ArrayLike, w: ArrayLike) -> Array:
    """Angle (...) rad in [0, pi] between the directions u and w (..., 3); lengths do not matter."""
    a, b = np.asarray(u, dtype=float), np.asarray(w, dtype=float)
    across = np.linalg.norm(np.cross(a, b), axis=-1)
    return np.arctan2(across, np.sum(a * b, axis=-1))


def entry_margins(R: ArrayLike) -> Array:
    """Nine margins (..., 3, 3) rad of rotation matrices (..., 3, 3): [i, k] between reference axis i and body
    axis k.
    """
    M = np.abs(np.asarray(R, dtype=float))
    if M.shape[-2:] != (3, 3):
        raise AttitudeError(f"matrix has shape {M.shape}", remedy="three rows of three numbers")
    others = np.hypot(np.roll(M, 1, axis=-2), np.roll(M, 2, axis=-2))
    return np.arctan2(others, M)


def entry_margins_from_quaternions(q: ArrayLike, out: Array | None = None) -> Array:
    """Nine margins (N, 3, 3) rad of every row of q (N, 4), unit, scalar first, body to reference.

    Worked in chunks that stay in cache; `out` (N, 3, 3) is filled when given. Relative error a few eps at
    every margin.
    """
    values = _table(q)
    margins = np.empty((len(values), 3, 3)) if out is None else out
    if margins.shape != (len(values), 3, 3):
        raise AttitudeError(f"out has shape {margins.shape}", remedy=f"({len(values)}, 3, 3) is needed")
    for start in range(0, len(values), _CHUNK):
        rows = _unit_rows(values[start : start + _CHUNK])
        half = np.empty((9, rows.shape[1]))
        for place, (minus, plus) in enumerate(_deficits(rows)):
            np.minimum(minus, plus, out=half[place])
        np.arcsin(np.sqrt(half, out=half), out=half)
        np.multiply(half.T.reshape(-1, 3, 3), 2.0, out=margins[start : start + _CHUNK])
    return margins


def least_entry_margins(q: ArrayLike) -> Array:
    """The nine least margins (3, 3) rad over the rows of q (N, 4), unit, scalar first, body to reference.

    Of the recorded attitudes only: nothing is said about what happens between them.
    """
    values = _table(q)
    least = np.full((9, 2), np.inf)
    for start in range(0, len(values), _CHUNK):
        rows = _unit_rows(values[start : start + _CHUNK])
        for place, pair in enumerate(_deficits(rows)):
            for side in (0, 1):
                least[place, side] = min(least[place, side], pair[side].min())
    return 2.0 * np.arcsin(np.sqrt(least.min(axis=1))).reshape(3, 3)


def _table(q: ArrayLike) -> Array:
    values = np.asarray(q, dtype=float)
    if values.ndim != 2 or values.shape[1] != 4 or len(values) == 0:
        raise AttitudeError(
            f"quaternions have shape {values.shape}", remedy="(N, 4), scalar first, N at least 1"
        )
    return values


def _unit_rows(block: Array) -> Array:
    """Components as four contiguous rows (4, n), of unit length to rounding; a wrong length raises
    AttitudeError.
    """
    rows = np.ascontiguousarray(block.T)
    square = np.einsum("ij,ij->j", rows, rows)
    low, high = square.min(), square.max()
    if not (1.0 - low <= tolerances.UNIT_QUATERNION_FAST and high - 1.0 <= tolerances.UNIT_QUATERNION_FAST):
        require_unit_quaternion(block)
        rows /= np.sqrt(square)
    return rows


def _deficits(rows: Array) -> list[tuple[Array, Array]]:
    """For entries 00, 01, … 22 the pair ((1 - R_ik)/2, (1 + R_ik)/2), each the squared sine of half an angle.

    Sums of squares of w, x, y, z: 1 - R_xz = (x-z)^2 + (w-y)^2, 1 + R_xz = (x+z)^2 + (w+y)^2,
    1 - R_xx = 2 (y^2 + z^2), 1 + R_xx = 2 (w^2 + x^2); nothing cancels.
    """
    w, x, y, z = rows
    ww, xx, yy, zz = rows * rows
    pairs: dict[tuple[int, int], tuple[Array, Array]] = {
        (0, 0): (yy + zz, ww + xx),
        (1, 1): (xx + zz, ww + yy),
        (2, 2): (xx + yy, ww + zz),
    }
    # R_ik = 2 (p r + w s) and R_ki = 2 (p r - w s), (p, r) the components i, k and s the third.
    for (i, k), (p, r, s) in {(1, 0): (x, y, z), (2, 1): (y, z, x), (0, 2): (z, x, y)}.items():
        near, far = _half_square(p - r), _half_square(p + r)
        less, more = _half_square(w - s), _half_square(w + s)
        pairs[i, k] = (near + less, far + more)
        pairs[k, i] = (near + more, far + less)
    return [pairs[i, k] for i in range(3) for k in range(3)]


def _half_square(a: Array) -> Array:
    np.multiply(a, a, out=a)
    a *= 0.5
    return a
