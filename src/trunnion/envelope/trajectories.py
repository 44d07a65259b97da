"""Exact extremes between the rows of a table under slerp: continuous time, no sampling.

For unit quaternions q the set where u lies along R(q) v is a great circle of the quaternion sphere: there are two
linear maps P and N (2 × 4 each, rows of one orthogonal 4 × 4 matrix) with |P q| = sin(angle/2) and
|N q| = cos(angle/2). Along a slerp step, q(t) = cos t q0 + sin t q1', P q(t) runs along an ellipse and
|P q(t)|² = A + B cos(2t - t0): at most one minimum inside a step, at a parameter given by one arctangent. The angle
there is 2 atan2(|P q|, |N q|), accurate at both ends. The largest angle is the least one to -u.

Screening. The angle changes by no more than the rotation angle. Rows are taken in blocks; the middle row of a block and
the length of way in it bound the block from below, and only blocks that can beat the best value seen are looked at.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_product
from trunnion.envelope.vectors import Array

BLOCK = 32  # steps in a block
_CHUNK = 8192  # rows handled at once in a dense pass: the working arrays stay in cache
_SLACK = 1e-7  # rad; screening angles come from cosines, which are blind below 1.5e-8 rad near 0 and pi
_CHORD_TO_ANGLE = 2.2215  # a step of rotation angle s has quaternion chord 2 sin(s/4) >= s / 2.2215 for s <= pi


@dataclass(frozen=True, eq=False)
class Rows:
    """Unit quaternions (N, 4) of consecutive rows, joined by slerp, with what screening needs to know of them."""

    quaternions: Array
    middles: NDArray[np.intp]  # (B,) row in the middle of each block
    way: Array  # (B,) rad: no attitude of the block is further than this from its middle row
    widest: Array  # (B,) rad: no step of the block is larger


def rows_of(quaternions: Array) -> Rows:
    """Prepare rows (N, 4) for screening."""
    count = len(quaternions)
    blocks = max(1, -(-(count - 1) // BLOCK))
    padded = np.zeros(blocks * BLOCK)
    padded[: count - 1] = _squared_chords(quaternions)
    chord = padded.reshape(blocks, 2, BLOCK // 2)
    # Cauchy-Schwarz: the sum of n step angles is at most sqrt(n × sum of squares)
    way = _CHORD_TO_ANGLE * np.sqrt(BLOCK // 2 * chord.sum(axis=2).max(axis=1))
    widest = _CHORD_TO_ANGLE * np.sqrt(chord.max(axis=(1, 2)))
    middles = np.minimum(np.arange(blocks) * BLOCK + BLOCK // 2, count - 1)
    return Rows(quaternions, middles, way, widest)


def _squared_chords(quaternions: Array) -> Array:
    """|q1 ∓ q0|² (N-1,) of neighbouring rows, from their inner product; good to 1e-15, enough for screening."""
    chords = np.empty(len(quaternions) - 1)
    for start in range(0, len(chords), _CHUNK):
        part = quaternions[start : start + _CHUNK + 1]
        inner = np.abs(np.einsum("ij,ij->i", part[1:], part[:-1]))
        chords[start : start + _CHUNK] = np.maximum(2.0 - 2.0 * inner, 0.0) + 2e-15
    return chords


@dataclass(frozen=True, eq=False)
class LeastAngles:
    """Least angle of M pairs over a slerp path: value (M,) rad, the row before, the fraction of the step after it."""

    value: Array
    row: NDArray[np.intp]
    fraction: Array


def forms(u: Array, v: Array) -> Array:
    """Orthogonal 4 × 4 matrices (M, 4, 4): rows 0, 1 are P and rows 2, 3 are N for pairs u, v (3, M)."""
    to_u, to_v = _quaternion_from_z(u), _quaternion_from_z(v)
    conjugate = to_u * np.array([1.0, -1.0, -1.0, -1.0])
    basis = np.eye(4)
    images = quaternion_product(quaternion_product(conjugate[:, None], basis[None]), to_v[:, None])
    return np.swapaxes(images, 1, 2)[:, [1, 2, 0, 3]]


def _quaternion_from_z(vectors: Array) -> Array:
    """Unit quaternions (M, 4) of turns that bring the z axis onto unit vectors (3, M)."""
    x, y, z = vectors
    upper = z >= 0.0
    w = np.sqrt(0.5 * (1.0 + np.abs(z)))
    # near -z turn first by half a turn about x: the same formula for the mirrored vector, then that half turn
    near = np.stack([w, -y / (2 * w), x / (2 * w), np.zeros_like(w)], axis=1)
    far = np.stack([w, y / (2 * w), -x / (2 * w), np.zeros_like(w)], axis=1)
    turned_over = quaternion_product(far, np.array([0.0, 1.0, 0.0, 0.0]))
    return np.where(upper[:, None], near, turned_over)


def end_angles(rows: Rows, u: Array, v: Array) -> LeastAngles:
    """Least angles to u, then least angles to -u, between them and R v over the whole slerp path.

    Pairs u, v (3, M) give 2 M results; pi minus the second half are the largest angles to u.
    """
    maps = forms(u, v)
    maps = np.concatenate([maps, maps[:, [2, 3, 0, 1]]])
    lower = _middle_bounds(rows, u, v)
    best = _Best(len(maps))
    for pair in range(len(maps)):
        at = int(np.argmin(lower[pair]))
        best.take(pair, *_examine(rows, maps[pair], np.arange(max(at - 4, 0), min(at + 5, len(rows.way))), np.inf))
    open_blocks = lower <= best.value[:, None] + _SLACK
    if np.count_nonzero(open_blocks) > 3 * len(rows.way):
        lower = np.maximum(lower, _dense_bounds(rows, u, v))
        open_blocks = lower <= best.value[:, None] + _SLACK
    for pair in range(len(maps)):
        _search(rows, maps[pair], lower[pair], np.flatnonzero(open_blocks[pair]), pair, best)
    return LeastAngles(best.value, best.row, best.fraction)


class _Best:
    """The best value of each pair so far, and where."""

    def __init__(self, count: int) -> None:
        self.value = np.full(count, np.inf)
        self.row = np.zeros(count, dtype=np.intp)
        self.fraction = np.zeros(count)

    def take(self, pair: int, value: float, row: int, fraction: float) -> None:
        if value < self.value[pair]:
            self.value[pair], self.row[pair], self.fraction[pair] = value, row, fraction


def _search(rows: Rows, form: Array, lower: Array, blocks: NDArray[np.intp], pair: int, best: _Best) -> None:
    """Examine open blocks, the most promising first, until none can beat the best value."""
    if len(blocks) > 256:
        blocks = blocks[np.argsort(lower[blocks])]
    for start in range(0, len(blocks), 256):
        part = blocks[start : start + 256]
        part = part[lower[part] <= best.value[pair] + _SLACK]
        if len(part) == 0:
            break
        best.take(pair, *_examine(rows, form, part, best.value[pair]))


def _middle_bounds(rows: Rows, u: Array, v: Array) -> Array:
    """Lower bounds (2 M, B) rad from the middle row of each block."""
    angle = np.arccos(np.clip(cosines(rows.quaternions[rows.middles].T, u, v), -1.0, 1.0))
    return np.concatenate([angle, np.pi - angle]) - rows.way


def _dense_bounds(rows: Rows, u: Array, v: Array) -> Array:
    """Lower bounds (2 M, B) rad from every row of each block and half its widest step."""
    count, blocks = len(rows.quaternions), len(rows.way)
    highest, lowest, first = (np.empty((u.shape[1], blocks)) for _ in range(3))
    for start in range(0, blocks, _CHUNK // BLOCK):
        stop = min(start + _CHUNK // BLOCK, blocks)
        part = rows.quaternions[start * BLOCK : stop * BLOCK]
        if len(part) < (stop - start) * BLOCK:
            part = rows.quaternions[np.minimum(np.arange(start * BLOCK, stop * BLOCK), count - 1)]
        # row in block before block, so that maxima run along whole arrays instead of short rows
        found = cosines(part.reshape(-1, BLOCK, 4).transpose(2, 1, 0), u, v)
        np.max(found, axis=1, out=highest[:, start:stop])
        np.min(found, axis=1, out=lowest[:, start:stop])
        first[:, start:stop] = found[:, 0]
    after = np.concatenate([first[:, 1:], cosines(rows.quaternions[-1:].T, u, v)], axis=1)
    near = np.arccos(np.clip(np.maximum(highest, after), -1.0, 1.0))
    far = np.arccos(np.clip(np.maximum(-lowest, -after), -1.0, 1.0))
    return np.concatenate([near, far]) - 0.5 * rows.widest


_AXES_U, _AXES_V = np.repeat(np.eye(3), 3, axis=1), np.tile(np.eye(3), (1, 3))


def cosines(components: Array, u: Array, v: Array) -> Array:
    """u . R v (M, ...) for quaternion components (4, ...): the nine matrix entries once, then one small product."""
    w, x, y, z = np.ascontiguousarray(components)
    ww, xx, yy, zz = w * w, x * x, y * y, z * z
    two_w, two_x = w + w, x + x
    wx, wy, wz, xy, xz, yz = two_w * x, two_w * y, two_w * z, two_x * y, two_x * z, (y + y) * z
    plus, minus, both, apart = ww + xx, ww - xx, yy + zz, yy - zz
    entries = np.empty((9, *w.shape))
    parts = (
        (np.subtract, plus, both),
        (np.subtract, xy, wz),
        (np.add, xz, wy),
        (np.add, xy, wz),
        (np.add, minus, apart),
        (np.subtract, yz, wx),
        (np.subtract, xz, wy),
        (np.add, yz, wx),
        (np.subtract, minus, apart),
    )
    for entry, (combine, one, other) in zip(entries, parts, strict=True):
        combine(one, other, out=entry)
    if u.shape == (3, 9) and np.array_equal(u, _AXES_U) and np.array_equal(v, _AXES_V):
        return entries
    weights = (u[:, None] * v[None, :]).reshape(9, -1)
    return np.tensordot(weights, entries, axes=(0, 0))


def _examine(rows: Rows, form: Array, blocks: NDArray[np.intp], best: float) -> tuple[float, int, float]:
    """Exact least angle within some blocks where it is below `best`: value, row before, fraction of the step.

    A step can go below `best` only if one of its ends is within half the widest step of it.
    """
    last = len(rows.quaternions) - 1
    index = np.minimum(blocks[:, None] * BLOCK + np.arange(BLOCK + 1), last)
    if best < np.inf:
        sines = rows.quaternions[index] @ form[:2].T
        reach = np.minimum(0.5 * (best + 0.5 * rows.widest[blocks] + _SLACK), 0.5 * np.pi)
        near = sines[..., 0] ** 2 + sines[..., 1] ** 2 <= (np.sin(reach) ** 2)[:, None] + 1e-15
        start = index[:, :-1][near[:, :-1] | near[:, 1:]]
        if len(start) == 0:
            return np.inf, 0, 0.0
    else:
        start = index[:, :-1].ravel()
    value, fraction = step_minima(rows.quaternions[start], rows.quaternions[np.minimum(start + 1, last)], form)
    at = int(np.argmin(value))
    return float(value[at]), int(start[at]), float(fraction[at])


def step_minima(q0: Array, q1: Array, form: Array) -> tuple[Array, Array]:
    """Least angle (n,) rad over each slerp step q0 → q1 (n, 4), both ends included, and its fraction of the step."""
    flip = np.einsum("ij,ij->i", q0, q1) < 0.0
    step = np.where(flip[:, None], -q1, q1) - q0
    chord = np.einsum("ij,ij->i", step, step)  # |q1 - q0|², at most 2
    sine = np.sqrt(chord * (1.0 - 0.25 * chord))
    moving = sine > 0.0
    across = (step + 0.5 * chord[:, None] * q0) / np.where(moving, sine, 1.0)[:, None]
    length = np.arctan2(sine, 1.0 - 0.5 * chord)
    one, other = q0 @ form.T, across @ form.T
    d0 = one[:, 0] ** 2 + one[:, 1] ** 2
    d1 = other[:, 0] ** 2 + other[:, 1] ** 2
    mixed = one[:, 0] * other[:, 0] + one[:, 1] * other[:, 1]
    turn = np.mod(0.5 * np.arctan2(-mixed, 0.5 * (d1 - d0)), np.pi)
    beyond = turn > length
    nearer_end = turn - length < np.pi - turn  # outside the step: the end nearer to the minimum, both ways round
    turn = np.where(beyond, np.where(nearer_end, length, 0.0), turn)
    turn = np.where(moving, turn, 0.0)
    at = np.cos(turn)[:, None] * one + np.sin(turn)[:, None] * other
    value = 2.0 * np.arctan2(np.hypot(at[:, 0], at[:, 1]), np.hypot(at[:, 2], at[:, 3]))
    return value, np.where(moving, turn / np.where(moving, length, 1.0), 0.0)


def attitudes_at(quaternions: Array, row: NDArray[np.intp], fraction: Array) -> Array:
    """Quaternions (M, 4) at fractions of the slerp steps after rows."""
    after = np.minimum(row + 1, len(quaternions) - 1)
    q0, q1 = quaternions[row], quaternions[after]
    q1 = np.where(np.einsum("ij,ij->i", q0, q1)[:, None] < 0.0, -q1, q1)
    step = q1 - q0
    chord = np.einsum("ij,ij->i", step, step)
    sine = np.sqrt(chord * (1.0 - 0.25 * chord))
    across = (step + 0.5 * chord[:, None] * q0) / np.where(sine > 0.0, sine, 1.0)[:, None]
    angle = fraction * np.arctan2(sine, 1.0 - 0.5 * chord)
    found = np.cos(angle)[:, None] * q0 + np.sin(angle)[:, None] * across
    return found / np.linalg.norm(found, axis=1, keepdims=True)


def matrices_at(quaternions: Array, row: NDArray[np.intp], fraction: Array) -> Array:
    """Matrices (M, 3, 3) at fractions of the slerp steps after rows."""
    return matrix_from_quaternion(attitudes_at(quaternions, row, fraction))
