"""Fit candidate attitudes to known ones, up to constants nobody told: robust, many candidates at once.

A candidate k says attitudes A[k, n] for the samples n; the truth is R[n]. With no constant A should be R; with one on
the right A C, on the left C A, with both L A C; with right-angle constants C is one of the 24. Constants are fitted as
nearest rotations to weighted means (the orthogonal Procrustes solution: B = sum w M, B = U S V^T, rotation
U diag(1, 1, det) V^T), the weights falling with the residual so that a tenth of false samples does no harm
(iteratively reweighted least squares; Weiszfeld's weights, common practice).
"""

from __future__ import annotations

import enum
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.right_angles import right_angle_rotations

Array = NDArray[np.float64]


class Constants(enum.Enum):
    """What is unknown besides the reading itself."""

    NONE = "no constant rotation"
    RELABELLED = "frames relabelled by right angles"
    RIGHT = "an unknown constant rotation on the body side"
    LEFT = "an unknown constant rotation on the reference side"
    BOTH = "unknown constant rotations on both sides"


@dataclass(frozen=True, eq=False)
class Fitted:
    """For K candidates and N samples: constants left, right (K, 3, 3), residual angles (K, N) rad, score (K,) rad.

    The score is the root mean square of the residuals, the worst 15 per cent left out from 8 samples on.
    """

    left: Array
    right: Array
    residuals: Array
    scores: Array


KEPT_SHARE = 0.85
FEWEST_TO_TRIM = 8
_ROUNDS = 4
_BOTH_ROUNDS = 24
_LEAST_RESIDUAL = 1e-3  # rad; below this the reweighting stops to tell good samples from better ones


def fit(candidates: Array, truth: Array, constants: Constants) -> Fitted:
    """Fit every candidate (K, N, 3, 3) to the truth (N, 3, 3)."""
    if constants is Constants.RELABELLED:
        return _relabelled(candidates, truth)
    count = len(candidates)
    left = right = np.broadcast_to(np.eye(3), (count, 3, 3))
    if constants is Constants.RIGHT:
        right = _robust_mean(np.swapaxes(candidates, -1, -2) @ truth)
    elif constants is Constants.LEFT:
        left = _robust_mean(truth @ np.swapaxes(candidates, -1, -2))
    elif constants is Constants.BOTH:
        left, right = _both_sides(candidates, truth)
    residuals = angle_between(left[:, None] @ candidates @ right[:, None], truth)
    return Fitted(left, right, residuals, scores(residuals))


def angle_between(one: Array, other: Array) -> Array:
    """Rotation angle (...) rad between rotations (..., 3, 3), from the chord: exact down to zero."""
    chord = np.sqrt(np.sum((one - other) ** 2, axis=(-2, -1)))
    return 2.0 * np.arcsin(np.minimum(chord / np.sqrt(8.0), 1.0))


def scores(residuals: Array) -> Array:
    """Root mean square (...) of residuals (..., N), the worst left out where there are enough samples."""
    count = residuals.shape[-1]
    kept = count if count < FEWEST_TO_TRIM else int(np.ceil(KEPT_SHARE * count))
    smallest = np.sort(residuals, axis=-1)[..., :kept]
    return np.sqrt(np.mean(smallest**2, axis=-1))


def nearest_rotations(matrices: Array) -> Array:
    """Nearest rotations (..., 3, 3) to matrices (..., 3, 3), determinant +1."""
    U, _, Vt = np.linalg.svd(matrices)
    flip = np.where(np.linalg.det(U @ Vt) < 0.0, -1.0, 1.0)
    U = U.copy()
    U[..., :, 2] *= flip[..., None]
    return U @ Vt


def _robust_mean(rotations: Array) -> Array:
    """Mean rotation (K, 3, 3) of rotations (K, N, 3, 3), false samples weighted down."""
    mean = nearest_rotations(rotations.sum(axis=1))
    for _ in range(_ROUNDS if rotations.shape[1] >= FEWEST_TO_TRIM else 0):
        weights = 1.0 / np.maximum(angle_between(rotations, mean[:, None]), _LEAST_RESIDUAL)
        mean = nearest_rotations(np.einsum("kn,knij->kij", weights, rotations))
    return mean


def _relabelled(candidates: Array, truth: Array) -> Fitted:
    """The best right-angle constant on the right: least score of the 24."""
    group = np.array(right_angle_rotations())
    cosine = np.einsum(
        "nji,knjl,mli->kmn", truth, candidates, np.swapaxes(group, -1, -2).swapaxes(-1, -2), optimize=True
    )
    chord = np.sqrt(np.maximum(6.0 - 2.0 * cosine, 0.0))
    rough = scores(2.0 * np.arcsin(np.minimum(chord / np.sqrt(8.0), 1.0)))
    right = group[np.argmin(rough, axis=1)]
    residuals = angle_between(candidates @ right[:, None], truth)
    left = np.broadcast_to(np.eye(3), right.shape)
    return Fitted(left, right, residuals, scores(residuals))


def _both_sides(candidates: Array, truth: Array) -> tuple[Array, Array]:
    """Left and right constants by turns, started from the relative rotations, whose vectors L must align."""
    first = _aligned(candidates, truth)
    right = _robust_mean(np.swapaxes(first[:, None] @ candidates, -1, -2) @ truth)
    left = first
    few = len(truth) < FEWEST_TO_TRIM
    for _ in range(_BOTH_ROUNDS):
        placed = candidates @ right[:, None]
        residuals = angle_between(left[:, None] @ placed, truth)
        weights = np.ones_like(residuals) if few else 1.0 / np.maximum(residuals, _LEAST_RESIDUAL)
        left = _weighted(weights, truth, placed)
        right = np.swapaxes(
            _weighted(weights, np.swapaxes(truth, -1, -2), np.swapaxes(left[:, None] @ candidates, -1, -2)), -1, -2
        )
    return left, right


def _weighted(weights: Array, truth: Array, placed: Array) -> Array:
    """Left constant (K, 3, 3) that best carries placed (K, N, 3, 3) onto the truth (N, 3, 3) with weights (K, N)."""
    one = (weights[..., None, None] * placed).transpose(0, 2, 1, 3).reshape(len(placed), 3, -1)
    other = truth.transpose(1, 0, 2).reshape(3, -1)
    return nearest_rotations(other @ np.swapaxes(one, -1, -2))


def _aligned(candidates: Array, truth: Array) -> Array:
    """Left constant (K, 3, 3) that best carries the turns between candidate samples onto those between true ones."""
    count = len(truth)
    steps = [step for step in (1, 2, 3, 5) if step < count]
    vectors, targets = [], []
    for step in steps:
        before, after = np.arange(count), np.roll(np.arange(count), -step)
        relative = candidates[:, after] @ np.swapaxes(candidates[:, before], -1, -2)
        vectors.append(_skew_vector(relative))
        targets.append(_skew_vector(truth[after] @ np.swapaxes(truth[before], -1, -2)))
    one = np.concatenate(vectors, axis=1) if vectors else np.zeros((len(candidates), 1, 3))
    other = np.concatenate(targets, axis=0) if targets else np.zeros((1, 3))
    left = nearest_rotations(np.einsum("ni,knj->kij", other, one))
    for _ in range(_ROUNDS):
        miss = np.linalg.norm(np.einsum("kij,knj->kni", left, one) - other, axis=-1)
        weights = 1.0 / np.maximum(miss, _LEAST_RESIDUAL)
        left = nearest_rotations(np.einsum("kn,ni,knj->kij", weights, other, one))
    return left


def _skew_vector(rotations: Array) -> Array:
    """(..., 3): sin(angle) times the axis of rotations (..., 3, 3)."""
    R = rotations
    return 0.5 * np.stack(
        [R[..., 2, 1] - R[..., 1, 2], R[..., 0, 2] - R[..., 2, 0], R[..., 1, 0] - R[..., 0, 1]], axis=-1
    )
