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

#: Rows worked at once: the scratch (4 MB) then stays in the second and third level cache; 8192 to 32768 measured alike.
_CHUNK = 16384


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

    Worked in chunks that stay in cache; `out` (N, 3, 3) is filled when given. Relative error a few eps at every
    margin.
    """
    values = _table(q)
    margins = np.empty((len(values), 3, 3)) if out is None else out
    if margins.shape != (len(values), 3, 3):
        raise AttitudeError(f"out has shape {margins.shape}", remedy=f"({len(values)}, 3, 3) is needed")
    work = _Deficits(min(_CHUNK, len(values)))
    for start in range(0, len(values), _CHUNK):
        near, far = work.of(values[start : start + _CHUNK])
        np.minimum(near, far, out=near)
        np.arcsin(np.sqrt(near, out=near), out=near)
        near *= 2.0
        margins[start : start + _CHUNK].reshape(-1, 9)[...] = near.T
    return margins


def least_entry_margins(q: ArrayLike) -> Array:
    """The nine least margins (3, 3) rad over the rows of q (N, 4), unit, scalar first, body to reference.

    Of the recorded attitudes only: nothing is said about what happens between them.
    """
    values = _table(q)
    work = _Deficits(min(_CHUNK, len(values)))
    least = np.full(9, np.inf)
    for start in range(0, len(values), _CHUNK):
        for deficits in work.of(values[start : start + _CHUNK]):
            np.minimum(least, deficits.min(axis=1), out=least)
    return 2.0 * np.arcsin(np.sqrt(least)).reshape(3, 3)


def _table(q: ArrayLike) -> Array:
    values = np.asarray(q, dtype=float)
    if values.ndim != 2 or values.shape[1] != 4 or len(values) == 0:
        raise AttitudeError(f"quaternions have shape {values.shape}", remedy="(N, 4), scalar first, N at least 1")
    return values


class _Deficits:
    """Scratch for one chunk: for entries 00, 01, … 22 the rows (1 - R_ik)/2 and (1 + R_ik)/2.

    Each is the squared sine of half an angle, a sum of squares of w, x, y, z: 1 - R_xz = (x-z)^2 + (w-y)^2,
    1 + R_xz = (x+z)^2 + (w+y)^2, 1 - R_xx = 2 (y^2 + z^2), 1 + R_xx = 2 (w^2 + x^2). Nothing cancels.
    """

    def __init__(self, size: int) -> None:
        self._rows = np.empty((4, size))
        self._squares = np.empty((4, size))
        self._terms = np.empty((4, size))
        self._near = np.empty((9, size))
        self._far = np.empty((9, size))

    def of(self, block: Array) -> tuple[Array, Array]:
        """((1 - R_ik)/2, (1 + R_ik)/2), two (9, n) views of the scratch, overwritten by the next call."""
        n = len(block)
        rows, squares = self._rows[:, :n], self._squares[:, :n]
        near, far = self._near[:, :n], self._far[:, :n]
        self._load(block, rows, squares)
        ww, xx, yy, zz = squares
        for place, (one, two, three) in ((0, (xx, yy, zz)), (4, (yy, zz, xx)), (8, (zz, xx, yy))):
            np.add(two, three, out=near[place])
            np.add(ww, one, out=far[place])
        # R_ik = 2 (p r + w s) and R_ki = 2 (p r - w s): p, r the components i, k and s the third one.
        for i, k in ((1, 0), (2, 1), (0, 2)):
            s = 3 - i - k
            terms = self._squared_terms(rows, i, k, s, n)
            np.add(terms[0], terms[1], out=near[3 * i + k])
            np.add(terms[2], terms[3], out=far[3 * i + k])
            np.add(terms[0], terms[3], out=near[3 * k + i])
            np.add(terms[2], terms[1], out=far[3 * k + i])
        return near, far

    def _squared_terms(self, rows: Array, i: int, k: int, s: int, n: int) -> Array:
        """(p - r)^2/2, (w - s)^2/2, (p + r)^2/2, (w + s)^2/2."""
        terms = self._terms[:, :n]
        np.subtract(rows[1 + i], rows[1 + k], out=terms[0])
        np.subtract(rows[0], rows[1 + s], out=terms[1])
        np.add(rows[1 + i], rows[1 + k], out=terms[2])
        np.add(rows[0], rows[1 + s], out=terms[3])
        np.multiply(terms, terms, out=terms)
        terms *= 0.5
        return terms

    def _load(self, block: Array, rows: Array, squares: Array) -> None:
        """Components as contiguous rows of unit length to rounding; a wrong length raises AttitudeError."""
        rows[...] = block.T
        np.multiply(rows, rows, out=squares)
        length = squares.sum(axis=0)
        slack = tolerances.UNIT_QUATERNION_FAST
        if not (1.0 - length.min() <= slack and length.max() - 1.0 <= slack):
            require_unit_quaternion(block)
            rows /= np.sqrt(length)
            np.multiply(rows, rows, out=squares)
