"""Small vector algebra shared by mounts and gimbals. Everything is batched over leading dimensions.

All angles in rad, all vectors `(..., 3)`, all matrices `(..., 3, 3)` active (they move the vector, not the
axes).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import HardwareError

Array = NDArray[np.float64]


def unit(vector: ArrayLike, what: str = "direction") -> Array:
    """Unit vector(s) along `vector` (..., 3). Raises HardwareError for zero length or a number that is not
    finite.
    """
    v = np.asarray(vector, dtype=float)
    if v.shape[-1:] != (3,):
        raise HardwareError(f"{what} has shape {v.shape}, expected (..., 3)", remedy="give three components")
    length = np.linalg.norm(v, axis=-1, keepdims=True)
    if not np.all(np.isfinite(length)) or np.any(length < 1e-300):
        raise HardwareError(f"{what} has no direction: {v.tolist()}", remedy="give three finite numbers, not all zero")
    return v / length


def dot(a: Array, b: Array) -> Array:
    """Scalar product over the last dimension."""
    return np.einsum("...i,...i->...", a, b)


def angle_between(a: Array, b: Array) -> Array:
    """Angle (rad, 0..pi) between two vectors, accurate at both ends (atan2 of cross and dot product)."""
    return np.arctan2(np.linalg.norm(np.cross(a, b), axis=-1), dot(a, b))


def turned(axis: ArrayLike, angle: ArrayLike, vector: ArrayLike) -> Array:
    """`vector` turned by `angle` about the unit vector `axis`, all batched."""
    n, v = np.asarray(axis, dtype=float), np.asarray(vector, dtype=float)
    t = np.asarray(angle, dtype=float)[..., None]
    along = dot(n, v)[..., None] * n
    return along + np.cos(t) * (v - along) + np.sin(t) * np.cross(n, v)


def azimuth(n: Array, y: Array, u: Array) -> Array:
    """The turn (rad) about `n` that carries the half plane of `y` onto that of `u`.

    Built from products of two cross products, so it keeps its accuracy when `u` or `y` lies close to `n`.
    """
    n_y, n_u = np.cross(n, y), np.cross(n, u)
    return np.arctan2(dot(n, np.cross(n_y, n_u)), dot(n_y, n_u))


def wrapped(angle: ArrayLike) -> Array:
    """The angle brought into [-pi, pi)."""
    a = np.asarray(angle, dtype=float)
    return a - 2.0 * np.pi * np.floor(a / (2.0 * np.pi) + 0.5)


def nearest_rotation(M: Array) -> tuple[Array, float]:
    """The proper rotation nearest to `M` (3, 3) in the Frobenius norm, and that distance. Never applied
    silently.
    """
    left, _, right = np.linalg.svd(M)
    R = left @ np.diag([1.0, 1.0, np.sign(np.linalg.det(left @ right))]) @ right
    return R, float(np.linalg.norm(M - R))


def perpendicular(n: Array) -> Array:
    """A unit vector square to the unit vector `n` (3,)."""
    away = np.eye(3)[int(np.argmin(np.abs(n)))]
    return unit(np.cross(n, away))


def about_all(centre: Array, radius: float, count: int) -> Array:
    """`count` directions (count, 3) evenly round the circle at the angle `radius` (rad) from `centre` (3,)."""
    one = perpendicular(centre)
    other = np.cross(centre, one)
    t = np.linspace(0.0, 2.0 * np.pi, count, endpoint=False)[:, None]
    return np.cos(radius) * centre + np.sin(radius) * (np.cos(t) * one + np.sin(t) * other)
