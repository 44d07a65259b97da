"""What a triple is worth when its attitude is known to within a turn of at most `error`: least upper bounds.

The attitude lies in a ball of rotation angle d around the one that is written down, m is its lock margin.

outer angles       The first angle is the bearing of the carried axis about the line of the reference axis, at the
                   distance m from it. The axis stays within a circle of radius d; the tangents from the line to that
                   circle give asin(sin d / sin m), and anything at all once d reaches m. Likewise the last angle, with
                   the roles of the axes exchanged.
middle angle       d: it is the distance of that axis from the line, up to a constant.
known combination  On the sphere of unit quaternions the attitude moves by at most d/2. Half the sum or difference
                   known at the nearer singular value is the polar angle in a plane in which the quaternion has the
                   length cos(m/2): 2 asin(sin(d/2) / cos(m/2)). It stays d at lock itself.
other combination  The same in the other plane: 2 asin(sin(d/2) / sin(m/2)).

All four are attained. To first order they are d/sin m, d, d/cos(m/2), d/sin(m/2).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


class AngleErrors(NamedTuple):
    """Largest changes (...) rad of: an outer angle, the middle angle, the combination of the outer angles known at the
    nearer singular value, and the other combination. pi means: not known at all."""

    outer: Array
    middle: Array
    combination: Array
    other_combination: Array


def angle_errors(margin: ArrayLike, error: ArrayLike) -> AngleErrors:
    """Least upper bounds of the angle errors at a lock margin (...) rad for an attitude error of at most `error` rad.

    The same for all 24; the combination is first + s last, s as in the branch for lock (see extraction).
    """
    m, d = np.broadcast_arrays(np.asarray(margin, dtype=float), np.asarray(error, dtype=float))
    if not np.all((m >= 0.0) & (m <= np.pi / 2 + 1e-12)) or not np.all((d >= 0.0) & (d <= np.pi)):
        raise AttitudeError(
            "a margin lies between 0 and 90 deg, an attitude error between 0 and 180 deg", remedy="give both in rad"
        )
    outer = _bearing(np.sin(d), np.sin(m), within=d < m)
    half = np.sin(d / 2.0)
    near, far = np.cos(m / 2.0), np.sin(m / 2.0)
    return AngleErrors(
        outer,
        d + 0.0,
        2.0 * _bearing(half, near, within=half < near, beyond=np.pi / 2),
        2.0 * _bearing(half, far, within=half < far, beyond=np.pi / 2),
    )


def decimals_known(error: ArrayLike) -> NDArray[np.int_]:
    """Decimals of a degree that still mean something when an angle is off by at most `error` (...) rad.

    The error is then at most half a unit of the last decimal shown. 0: whole degrees; -1: not even those; -2: not even
    tens of degrees; exactly known angles get 15.
    """
    with np.errstate(divide="ignore"):
        decimals = np.floor(-np.log10(2.0 * np.degrees(np.asarray(error, dtype=float))) + 1e-12)
    return np.clip(decimals, -2, 15).astype(int)


def _bearing(reach: Array, distance: Array, *, within: NDArray[np.bool_], beyond: float = np.pi) -> Array:
    ratio = np.divide(reach, distance, out=np.ones_like(reach), where=within)
    return np.where(within, np.arcsin(np.minimum(ratio, 1.0)), beyond)
