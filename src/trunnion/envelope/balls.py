"""Listed attitudes, and any region widened by a ball of rotations.

A turn by at most d tilts a carried direction by at most d, and by exactly d in whatever direction one likes; so every
angle between u and R v loses or gains exactly d, down to 0 and up to pi (pi/2 for lines). Which side the turn is made
on does not matter: a ball of turns is the same set seen from either frame.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about
from trunnion.envelope.box import ROUNDING_BOUND
from trunnion.envelope.results import (
    LARGEST_ANGLE,
    LARGEST_LINE,
    LEAST_ANGLE,
    RIGHT_ANGLE,
    ZERO_BELOW,
    Spread,
    empty_texts,
    no_names,
)
from trunnion.envelope.vectors import Array, angle_between

_CHUNK = 65536


def listed_spread(matrices: Array, u: Array, v: Array, label: str = "pose", times: Array | None = None) -> Spread:
    """Spread over listed attitudes (N, 3, 3) for pairs u, v (3, M); places are numbered from one."""
    best = np.full((4, u.shape[1]), np.inf)
    index = np.zeros((4, u.shape[1]), dtype=np.intp)
    sign = np.array([1.0, -1.0, 1.0, -1.0])[:, None]
    for start in range(0, len(matrices), _CHUNK):
        carried = np.einsum("nij,jm->inm", matrices[start : start + _CHUNK], v)
        angle = angle_between(carried, u[:, None])
        line = np.minimum(angle, np.pi - angle)
        scores = np.stack([angle, -angle, line, -line])
        at = np.argmin(scores, axis=1)
        value = np.take_along_axis(scores, at[:, None], axis=1)[:, 0]
        better = value < best
        best, index = np.where(better, value, best), np.where(better, at + start, index)
    return _at_rows(best * sign, matrices[index], index, label, times)


def _at_rows(value: Array, matrices: Array, index: NDArray[np.intp], label: str, times: Array | None) -> Spread:
    where = empty_texts(value.shape[1])
    for place in np.ndindex(*index.shape):
        where[place] = f"{label} {index[place] + 1:,}"
    stamps = np.full(value.shape, np.nan) if times is None else times[index]
    lo = np.where(value < ZERO_BELOW, 0.0, np.maximum(value - ROUNDING_BOUND, 0.0))
    top = np.array([np.pi, np.pi, RIGHT_ANGLE, RIGHT_ANGLE])[:, None]
    hi = np.minimum(value + ROUNDING_BOUND, top)
    return Spread(lo, hi, matrices, stamps, where, no_names(value.shape[1]), Basis.CERTIFIED)


def widened(spread: Spread, u: Array, v: Array, radius: float, words: str) -> Spread:
    """Spread after any turn of at most `radius` rad; witnesses are turned along."""
    if radius == 0.0:
        return spread
    sign = np.array([-1.0, 1.0, -1.0, 1.0])[:, None]
    top = np.array([np.pi, np.pi, RIGHT_ANGLE, RIGHT_ANGLE])[:, None]
    lo = np.clip(spread.lo + sign * radius, 0.0, top)
    hi = np.clip(spread.hi + sign * radius, 0.0, top)
    lo = np.where(lo < ZERO_BELOW, 0.0, lo)
    matrices = spread.matrices.copy()
    where = spread.where.copy()
    for place in np.ndindex(*lo.shape):
        matrices[place] = _turned_witness(spread.matrices[place], u[:, place[1]], v[:, place[1]], place[0], radius)
        where[place] = f"{where[place]}, {words} {np.degrees(radius):.6g} deg"
    return replace(spread, lo=lo, hi=hi, matrices=matrices, where=where)


def _turned_witness(R: Array, u: Array, v: Array, which: int, radius: float) -> Array:
    """R turned by up to radius so that the angle moves as far as it can in the wanted direction."""
    if not np.isfinite(R).all():
        return R
    carried = R @ v
    angle = float(angle_between(u, carried))
    goals = {LEAST_ANGLE: 0.0, LARGEST_ANGLE: np.pi, LARGEST_LINE: RIGHT_ANGLE}
    goal = goals.get(which, 0.0 if angle <= RIGHT_ANGLE else np.pi)
    wanted = np.clip(goal - angle, -radius, radius)
    axis = np.cross(u, carried)
    if np.linalg.norm(axis) < 1e-12:
        axis = np.cross(u, np.eye(3)[np.argmin(np.abs(u))])
    return about(axis, wanted) @ R
