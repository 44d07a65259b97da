"""Least and largest angle between a fixed direction and a carried one over a box of three angles: closed form.

Setting. T(a, b, c) = Rot(p, a) Rot(q, b) Rot(r, c) with unit axes p, q, r, ranges for a, b, c, unit vectors u (on
the left) and v (on the right); constant rotations on either side are absorbed into u and v. Wanted: the range of
the angle between u and T v. With x(a) = Rot(p, -a) u and y(b, c) = Rot(q, b) Rot(r, c) v that is the angle between
x and y, and its cosine is f = x . y.

Claim. Least and largest angle are taken at one of the points `_candidates` lists: 8 corners, 24 points on edges,
48 on faces, and, only when neighbouring axes are not perpendicular, 16 inside.

Proof.
1. The partial derivatives of f are the components of y × x along p, q and Rot(q, b) r. If these three directions
   are independent, a stationary point inside the box has x parallel to y: the angle is 0 or pi.
2. If they are dependent and neighbours are perpendicular, Rot(q, b) r = ±p, f depends on a ± c only, and the line
   of equal f through the point runs into a face. If neighbours are not perpendicular, x and y both lie in the plane
   of p and q: b puts r into the plane of p and q, a puts u there, c puts v there; two solutions each, eight points.
3. Angle 0 (or pi, with -y for y) inside. The heights over q agree, q . x(a) = q . Rot(r, c) v, and b follows as a
   difference of azimuths about q. With perpendicular neighbours this reads A cos(a - a0) = B cos(c - c0) on the
   torus of a and c: every branch goes round in a or in c, or b is free, so inside a box it reaches a face; the ends
   of a full turn therefore stay faces. Otherwise the curve may close inside; there it has an extreme of a, where
   q . Rot(r, c) v is stationary in c: again eight points.
4. On a face two turns remain, s about n1 (acting on u) and t about n2 (acting on v). Two components of y × x vanish,
   so either x × y is parallel to n1 × n2 and both lie in the plane of the axes (2 × 2 points), or x = ±y: two circles
   meet in at most two points a sign. If a circle shrinks to its axis or n1 is parallel to n2, f is constant along
   lines that end on edges.
5. On an edge f = A + B cos + C sin: two points, half a turn apart.

Every candidate inside the ranges is an attitude of the box, so the list can never give more than the box holds; by
the claim it never gives less.

Rounding. A candidate is exact for inputs moved by a few units of the last place, and is displaced far only along
directions in which f hardly changes. `ROUNDING_BOUND` is claimed and tested against 50-digit arithmetic.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.envelope.vectors import (
    TURN,
    Array,
    angle_between,
    azimuth,
    half_tangent_squared,
    triangle_angle,
    turned,
)

ROUNDING_BOUND = np.radians(1e-12)
"""Bound (rad) on the error of the closed forms in floating point; measured below 4e-15 rad on adversarial boxes."""

_END_TOLERANCE = 1e-12  # rad; a candidate this far outside a range end counts as that end
_PERPENDICULAR = 1e-15  # axes whose cosine is below this are perpendicular; beyond, the inner points are listed too
_CHUNK = 2048  # problems evaluated at once: keeps the working arrays in cache


@dataclass(frozen=True)
class BoxRange:
    """Range of the angle between u and T v over boxes, M problems at once.

    least, largest (M,) rad, within ROUNDING_BOUND of the truth; least_at, largest_at (3, M) the angles a, b, c (rad,
    inside the ranges) where they are taken.
    """

    least: Array
    largest: Array
    least_at: Array
    largest_at: Array


def box_angle_range(axes: Array, low: Array, high: Array, u: Array, v: Array) -> BoxRange:
    """Exact range of the angle between u and Rot(p,a) Rot(q,b) Rot(r,c) v for low <= (a, b, c) <= high.

    axes (3, 3) rows p, q, r, unit; low, high (3, M) rad, the angle is the first index; u, v (3, M) unit.
    Ranges wider than a turn are full turns. See the module's docstring for the proof.
    """
    low, high, u, v = np.broadcast_arrays(low, high, u, v)
    pieces = [_chunk_range(axes, low[:, part], high[:, part], u[:, part], v[:, part]) for part in _slices(low.shape[1])]
    return BoxRange(*(np.concatenate(column, axis=-1) for column in zip(*pieces, strict=True)))


def carried(axes: Array, angles: Array, v: Array) -> Array:
    """T v for angles (3, ...) and v (3, ...)."""
    p, q, r = _columns(axes, angles.ndim)
    return turned(p, angles[0], turned(q, angles[1], turned(r, angles[2], v)))


def _slices(count: int) -> list[slice]:
    return [slice(start, start + _CHUNK) for start in range(0, count, _CHUNK)]


def _columns(axes: Array, dimensions: int) -> tuple[Array, Array, Array]:
    first, second, third = (axis.reshape((3,) + (1,) * (dimensions - 1)) for axis in axes)
    return first, second, third


def _chunk_range(axes: Array, low: Array, high: Array, u: Array, v: Array) -> tuple[Array, ...]:
    """Evaluate all candidates of up to _CHUNK problems; least, largest and where."""
    candidates = _candidates(axes, low, high, u, v)  # (3, K, M)
    clipped, inside = _into_range(candidates, low[:, None], high[:, None])
    row, column = np.nonzero(inside)
    angles = clipped[:, row, column]
    size = np.full(inside.shape, np.nan)
    p, q, r = _columns(axes, 2)
    left = turned(p, -angles[0], u[:, column])
    right = turned(q, angles[1], turned(r, angles[2], v[:, column]))
    size[row, column] = half_tangent_squared(left, right)
    every = np.arange(inside.shape[1])
    result = []
    for choice in (np.nanargmin(size, axis=0), np.nanargmax(size, axis=0)):
        at = clipped[:, choice, every]
        x = turned(p, -at[0], u)
        y = turned(q, at[1], turned(r, at[2], v))
        result += [angle_between(x, y), at]
    return result[0], result[2], result[1], result[3]


def _into_range(angles: Array, low: Array, high: Array) -> tuple[Array, NDArray[np.bool_]]:
    """Bring angles (3, K, M) into [low, high] by whole turns; clipped angles and which are inside."""
    moved = angles + TURN * np.ceil((low - _END_TOLERANCE - angles) / TURN)
    inside = np.all(moved <= high + _END_TOLERANCE, axis=0)
    return np.minimum(np.maximum(moved, low), high), inside


def _candidates(axes: Array, low: Array, high: Array, u: Array, v: Array) -> Array:
    """All candidate angles (3, K, M), in the ranges or not."""
    ends = np.stack([low, high], axis=1)  # (angle, end, M)
    p, _, r = _columns(axes, 3)
    x = turned(p, -ends[0], u[:, None])  # (3, end of a, M)
    z = turned(r, ends[2], v[:, None])  # (3, end of c, M)
    lists = [
        _corners(ends),
        _on_edges(axes, ends, u, v, x, z),
        _on_faces(axes, ends, u, v, x, z),
    ]
    if max(abs(float(axes[0] @ axes[1])), abs(float(axes[1] @ axes[2]))) > _PERPENDICULAR:
        lists.append(_inside(axes, u, v))
    return np.concatenate(lists, axis=1)


def _corners(ends: Array) -> Array:
    count = ends.shape[-1]
    a = np.broadcast_to(ends[0][:, None, None], (2, 2, 2, count))
    b = np.broadcast_to(ends[1][None, :, None], (2, 2, 2, count))
    c = np.broadcast_to(ends[2][None, None, :], (2, 2, 2, count))
    return np.stack([a, b, c]).reshape(3, 8, count)


def _on_edges(axes: Array, ends: Array, u: Array, v: Array, x: Array, z: Array) -> Array:
    """One angle free: the turn that brings one lever arm onto the other, and half a turn on. 24 points."""
    p, q, r = _columns(axes, 4)
    count = ends.shape[-1]
    y = turned(q, ends[1][None, :, None], z[:, None])  # (3, b, c, M)
    w = turned(q, -ends[1][None, None, :], x[:, :, None])  # (3, a, b, M)
    shape = (2, 2, count)
    a0 = np.broadcast_to(ends[0][:, None], shape)
    b0, b1 = (np.broadcast_to(ends[1][i], shape) for i in (np.s_[:, None], np.s_[None, :]))
    c1 = np.broadcast_to(ends[2][None, :], shape)
    free_a = np.stack([azimuth(p, y, u[:, None, None]), b0, c1])
    free_b = np.stack([a0, azimuth(q, z[:, None], x[:, :, None]), c1])
    free_c = np.stack([a0, b1, azimuth(r, v[:, None, None], w)])
    lists = []
    for index, points in enumerate((free_a, free_b, free_c)):
        opposite = points.copy()
        opposite[index] += np.pi
        lists += [points.reshape(3, 4, count), opposite.reshape(3, 4, count)]
    return np.concatenate(lists, axis=1)


@dataclass(frozen=True)
class _Faces:
    """The six faces as two-turn problems: turn s about n1 acts on u, turn t about n2 acts on v; (3, 6, M) each."""

    n1: Array
    n2: Array
    u: Array
    v: Array
    fixed: Array  # (6, M) value of the fixed angle


def _faces(axes: Array, ends: Array, u: Array, v: Array, x: Array, z: Array) -> _Faces:
    """Face pairs in the order c fixed, a fixed, b fixed."""
    p, q, r = _columns(axes, 3)
    count = ends.shape[-1]
    shape = (3, 2, count)
    tilted_r, tilted_v = turned(q, ends[1], r), turned(q, ends[1], v[:, None])

    def join(*parts: Array) -> Array:
        return np.concatenate([np.broadcast_to(part, shape) for part in parts], axis=1)

    return _Faces(
        n1=join(p, q, p),
        n2=join(q, r, tilted_r),
        u=join(u[:, None], x, u[:, None]),
        v=join(z, v[:, None], tilted_v),
        fixed=np.concatenate([ends[2], ends[0], ends[1]], axis=0),
    )


def _on_faces(axes: Array, ends: Array, u: Array, v: Array, x: Array, z: Array) -> Array:
    """Two angles free: both vectors in the plane of the two axes (24), or parallel to each other (24)."""
    face = _faces(axes, ends, u, v, x, z)
    turns = [*_in_plane_of_axes(face), *_parallel(face)]
    first = np.stack([s for s, _ in turns])  # (8, 6, M)
    second = np.stack([t for _, t in turns])
    fixed = np.broadcast_to(face.fixed, first.shape)
    count = ends.shape[-1]
    c_fixed, a_fixed, b_fixed = np.s_[:, 0:2], np.s_[:, 2:4], np.s_[:, 4:6]
    lists = [
        np.stack([first[c_fixed], second[c_fixed], fixed[c_fixed]]),
        np.stack([fixed[a_fixed], first[a_fixed], second[a_fixed]]),
        np.stack([first[b_fixed], fixed[b_fixed], second[b_fixed]]),
    ]
    return np.concatenate([points.reshape(3, 16, count) for points in lists], axis=1)


def _in_plane_of_axes(face: _Faces) -> list[tuple[Array, Array]]:
    s = azimuth(face.n1, face.n2, face.u)
    t = azimuth(face.n2, face.v, face.n1)
    return [(s, t), (s, t + np.pi), (s + np.pi, t), (s + np.pi, t + np.pi)]


def _parallel(face: _Faces) -> list[tuple[Array, Array]]:
    """x = g y for g = ±1: the circle of u about n1 meets that of g v about g n2, a triangle with known sides."""
    to_u = angle_between(face.n1, face.u)
    to_v = angle_between(face.n2, face.v)
    turns = []
    for sign in (1.0, -1.0):
        n2, v = sign * face.n2, sign * face.v
        between = angle_between(face.n1, n2)
        at_n1 = triangle_angle(to_u, between, to_v)
        start = azimuth(face.n1, n2, face.u)
        for corner in (at_n1, -at_n1):
            s = start - corner
            t = azimuth(face.n2, v, turned(face.n1, -s, face.u))
            turns.append((s, t))
    return turns


def _inside(axes: Array, u: Array, v: Array) -> Array:
    """Points inside the box, possible only when neighbouring axes are not perpendicular. 16 points."""
    p, q, r = (np.broadcast_to(column, u.shape) for column in _columns(axes, 2))
    a, b, c = azimuth(p, q, u), azimuth(q, r, p), azimuth(r, v, q)
    half = (0.0, np.pi)
    own_lock = [np.stack([a + i, b + j, c + k]) for i in half for j in half for k in half]
    closed_curve = []
    for turn in half:
        z = turned(r, c + turn, v)
        for sign in (1.0, -1.0):
            at_p = triangle_angle(angle_between(p, u), angle_between(p, q), angle_between(q, sign * z))
            for corner in (at_p, -at_p):
                angle = a - corner
                x = turned(p, -angle, u)
                closed_curve.append(np.stack([angle, azimuth(q, sign * z, x), c + turn]))
    return np.stack(own_lock + closed_curve, axis=1)
