"""Spherical building blocks on component-first arrays.

Vectors are arrays (3, ...): the component is the first index, everything else broadcasts. All angles rad.
Only products of two cross products are used where an angle about an axis is wanted; the shorter forms lose
digits when a vector lies close to the axis.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

TURN = 2.0 * np.pi


def dot(a: Array, b: Array) -> Array:
    """Inner product over the first index of (3, ...) arrays."""
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def cross(a: Array, b: Array) -> Array:
    """Cross product over the first index of (3, ...) arrays."""
    return np.stack([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])


def turned(axis: Array, angle: Array, vector: Array) -> Array:
    """`vector` turned by `angle` about the unit vector `axis` (right-hand rule); all broadcast, (3, ...)."""
    cosine, sine = np.cos(angle), np.sin(angle)
    along = (1.0 - cosine) * dot(axis, vector)
    return cosine * vector + sine * cross(axis, vector) + along * axis


def angle_between(a: Array, b: Array) -> Array:
    """Angle 0 … pi between unit vectors (3, ...), accurate to rounding at both ends.

    Source: W. Kahan's two-norm form of the angle between vectors (from memory).
    """
    apart, together = a - b, a + b
    return 2.0 * np.arctan2(np.sqrt(dot(apart, apart)), np.sqrt(dot(together, together)))


def half_tangent_squared(a: Array, b: Array) -> Array:
    """tan²(angle/2) of unit vectors (3, ...): orders angles without a transcendental, inf for opposite ones."""
    apart, together = a - b, a + b
    with np.errstate(divide="ignore"):
        return dot(apart, apart) / dot(together, together)


def azimuth(axis: Array, start: Array, goal: Array) -> Array:
    """The turn about `axis` that carries the half plane of `start` onto that of `goal`; -pi … pi.

    Zero when either lies on the axis: then every turn does it. Both lever arms are cross products with the
    axis, and the sine is formed from them, so nothing cancels when a vector comes close to the axis.
    """
    arm, wanted = cross(axis, start), cross(axis, goal)
    return np.arctan2(dot(axis, cross(arm, wanted)), dot(arm, wanted))


def triangle_angle(one_side: Array, other_side: Array, opposite: Array) -> Array:
    """Angle between two sides of a spherical triangle from its three sides; clamped where none exists.

    The half-angle form: tan²(P/2) = sin(S - a) sin(S - b) / (sin S sin(S - o)), S the half sum. Keeps its
    digits for small and for nearly flat triangles, unlike the cosine rule.
    """
    half = 0.5 * (one_side + other_side + opposite)
    upper = np.sin(half - one_side) * np.sin(half - other_side)
    lower = np.sin(half) * np.sin(half - opposite)
    return 2.0 * np.arctan2(np.sqrt(np.maximum(upper, 0.0)), np.sqrt(np.maximum(lower, 0.0)))


def unit(vector: Array) -> Array:
    """`vector` (3, ...) scaled to length one."""
    return vector / np.sqrt(dot(vector, vector))
