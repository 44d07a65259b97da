"""Which reading of these numbers is it? Every chain tried against known attitudes, the honest answer given.

The answer is one function, a list that the data cannot tell apart, or none with the best miss and the gap to the next.
Equal functions are never listed as separate findings: each finding carries all its names.
"""

from __future__ import annotations

import enum
from collections.abc import Sequence as Many
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import matrix_from_quaternion, require_rotation
from trunnion.attitude.sequences import Sequence
from trunnion.attitude.words import listed
from trunnion.crosswalk.fitting import FEWEST_TO_TRIM, KEPT_SHARE, Constants, Fitted, fit, nearest_rotations, scores
from trunnion.crosswalk.readings import COLUMN_ORDERS, Chain, all_chains, chain_matrices
from trunnion.crosswalk.wrong_readings import right_angle_rotations
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

ROUNDING = 1e-6
"""rad; noise assumed per axis where none is stated and the fit is better than that: printed digits."""

LARGEST_NOISE = np.radians(1.0)
"""rad per axis; where no noise is stated, a best fit worse than this noise would give is called a miss."""

PRINTED = 5e-3
"""Entries of M^T M of a matrix with three printed decimals may miss the identity's by this; common practice."""

RATIO = 2.0
"""Where no noise is stated, readings within this factor of the best fit are not told apart."""

_SURE = 4.75  # normal deviate of one in a million
_LESS_LIKELY = 2.0 * np.log(1e5)
SPREAD = 24  # samples that eliminate readings before all are used
_SEED = 3


class Answer(enum.Enum):
    """What the data say."""

    IDENTIFIED = "identified"
    AMBIGUOUS = "can't be told apart by these data"
    NONE_FITS = "none fits"


@dataclass(frozen=True, eq=False)
class Reading:
    """One candidate reading: its words and other names, and the attitudes it makes of rows of numbers."""

    words: str
    names: tuple[str, ...]
    chain: Chain | None = None
    key: object = None


@dataclass(frozen=True, eq=False)
class Finding:
    """One reading with its fit: constants L, C of L A C, root mean square miss (rad), residual of each sample (rad)."""

    reading: Reading
    left: Array
    right: Array
    miss: float
    residuals: Array


@dataclass(frozen=True, eq=False)
class Identification:
    """The answer, the findings that fit, the best that does not, the noise (rad per axis), outlier rows, reasons.

    second_best: where none fits, the candidate after the best.
    gap: how many times worse the next candidate is than the best.
    """

    answer: Answer
    constants: Constants
    fits: tuple[Finding, ...]
    next_best: Finding | None
    noise: float
    noise_stated: bool
    outliers: tuple[int, ...]
    reasons: tuple[str, ...]
    tried: int
    second_best: Finding | None = None

    @property
    def gap(self) -> float:
        """Miss of the best reading that does not fit over the miss of the best one (infinite where that is zero)."""
        if self.next_best is None or not self.fits:
            return float("inf")
        best = self.fits[0].miss
        return float("inf") if best == 0.0 else self.next_best.miss / best


@dataclass(frozen=True, eq=False)
class Candidates:
    """Readings and the attitudes (K, N, 3, 3) they make of the samples."""

    readings: tuple[Reading, ...]
    attitudes: Array
    names: tuple[str, str, str] = field(default=("first number", "second number", "third number"))


def identify_angles(
    numbers: ArrayLike,
    truth: ArrayLike,
    *,
    constants: Constants = Constants.NONE,
    noise: float | None = None,
    names: tuple[str, str, str] = ("first number", "second number", "third number"),
) -> Identification:
    """Find every chain of turns that takes numbers (N, 3), as they stand, to the known attitudes R_rb (N, 3, 3).

    noise: largest standard deviation per axis (rad) to allow for, None when it is not known.
    Raises AttitudeError for no samples, numbers that are not finite, or attitudes that are no rotations.
    """
    written, R = checked_samples(numbers, truth)
    chains = _class_chains() if constants is Constants.BOTH else all_chains()
    some = well_spread(written) if len(R) > 2 * SPREAD else np.arange(len(R))
    fitted = fit(_attitudes(chains, written[some]), R[some], constants)
    chosen = list(chains)
    if len(some) < len(R):
        limit = max(3.0 * float(fitted.scores.min()), 2.0 * _bound(max(noise or 0.0, ROUNDING), len(some)))
        left = np.flatnonzero(fitted.scores <= limit)
        left = np.union1d(left, np.argsort(fitted.scores, kind="stable")[:2])
        chosen = [chains[index] for index in left]
        fitted = fit(np.array([chain.matrix(written) for chain in chosen]), R, constants)
    readings = [chain_reading(chain, constants, names) for chain in chosen]
    tried = len(chains) * (24 if constants is Constants.RELABELLED else 1)
    found = decide(readings, fitted, constants, noise, tried)
    return _with_reasons(found, written, R, names)


def identify_attitudes(
    readings: Many[tuple[str, ArrayLike]],
    truth: ArrayLike,
    *,
    constants: Constants = Constants.NONE,
    noise: float | None = None,
) -> Identification:
    """The same for readings given by the attitudes (N, 3, 3) each makes of the samples (quaternions, matrices)."""
    R = require_rotation(np.asarray(truth, dtype=float), "a known attitude")
    A = np.array([np.asarray(attitudes, dtype=float) for _, attitudes in readings])
    made = [Reading(words, (words,), key=words) for words, _ in readings]
    if constants is Constants.RELABELLED:
        return _both_relabelled(made, A, R, noise)
    return decide(made, fit(A, R, constants), constants, noise, len(readings))


def _both_relabelled(readings: list[Reading], A: Array, R: Array, noise: float | None) -> Identification:
    """Right-angle constants on both sides: chains absorb the one on the left, quaternions and matrices do not."""
    lefts = np.array(right_angle_rotations())
    turned = (lefts[:, None, None] @ A[None]).reshape(-1, *A.shape[1:])
    fitted = fit(turned, R, Constants.RELABELLED)
    fitted = replace(fitted, left=np.repeat(lefts, len(readings), axis=0))
    return decide(readings * len(lefts), fitted, Constants.RELABELLED, noise, len(turned) * len(lefts))


def quaternion_readings(components: ArrayLike, *, two_sided: bool = False) -> list[tuple[str, Array]]:
    """Attitudes of four columns (N, 4) under every place of the scalar, direct and conjugated.

    two_sided: constants on both sides are unknown. Then there are two functions, not four: with q = a + bi + cj + dk,
    d + ai + bj + ck = u q* k u* for a right-angle u, so that the scalar last is the conjugate with the scalar first.
    """
    q = np.asarray(components, dtype=float)
    norms = np.linalg.norm(q, axis=1)
    if q.ndim != 2 or q.shape[1] != 4 or not np.all(np.isfinite(q)) or np.any(norms == 0.0):
        raise AttitudeError("quaternions need four finite columns, not all zero")
    q = q / norms[:, None]
    found = []
    for place, words in ((0, "scalar first"), (3, "scalar last")):
        order = [0, 1, 2, 3] if place == 0 else [3, 0, 1, 2]
        for sense, way in ((1.0, "body to reference"), (-1.0, "reference to body")):
            read = q[:, order] * np.array([1.0, sense, sense, sense])
            found.append((f"{words}, maps {way}", matrix_from_quaternion(read)))
    if two_sided:
        return [(f"{found[n][0]} (or {found[3 - n][0]}, between other axes)", found[n][1]) for n in (0, 1)]
    return found


def matrix_readings(entries: ArrayLike) -> list[tuple[str, Array]]:
    """Attitudes of nine columns (N, 9) by rows or by columns; both ways of mapping are these two.

    Mirrored axes on one side make every matrix improper and are refused by name; on both sides they are relabellings.
    """
    M = np.asarray(entries, dtype=float).reshape(-1, 3, 3)
    if np.all(np.linalg.det(M) < 0.0):
        raise AttitudeError(
            "every matrix has determinant −1: one of the two frames is left-handed",
            remedy="reverse one axis of that frame (one row or one column) and state it as left-handed",
        )
    M = printed_rotations(M, "a matrix")
    return [
        ("entries by rows, maps body to reference", M),
        ("entries by columns, or by rows and maps reference to body", np.swapaxes(M, -1, -2)),
    ]


def mirrored_readings(entries: ArrayLike) -> list[tuple[str, Array]]:
    """Attitudes of nine columns (N, 9) of reflections, under every axis of either frame that may be reversed.

    Raises AttitudeError when not all matrices are reflections.
    """
    M = np.asarray(entries, dtype=float).reshape(-1, 3, 3)
    if not np.all(np.linalg.det(M) < 0.0):
        raise AttitudeError("some of the matrices are reflections and some are not", remedy="look for false samples")
    found = []
    for words, N in (("entries by rows", M), ("entries by columns", np.swapaxes(M, -1, -2))):
        for axis in range(3):
            flip = np.diag([-1.0 if n == axis else 1.0 for n in range(3)])
            for side, made in (("reference", flip @ N), ("body", N @ flip)):
                said = f"{words}, the {side} frame left-handed: its {'xyz'[axis]} reversed"
                found.append((said, printed_rotations(made, "a matrix")))
    return found


def printed_rotations(matrices: ArrayLike, what: str) -> Array:
    """The nearest rotations (N, 3, 3) to matrices as printed or logged: entries may be rounded to three decimals.

    Raises AttitudeError for anything farther from a rotation, reflections named.
    """
    return nearest_rotations(require_rotation(np.asarray(matrices, dtype=float), what, PRINTED))


def checked_samples(numbers: ArrayLike, truth: ArrayLike) -> tuple[Array, Array]:
    """Numbers (N, 3) and R_rb (N, 3, 3) that go together; AttitudeError says what does not."""
    written = np.atleast_2d(np.asarray(numbers, dtype=float))
    R = np.asarray(truth, dtype=float)
    R = R[None] if R.ndim == 2 else R
    if not len(written) or written.shape[1] != 3 or R.shape != (len(written), 3, 3):
        raise AttitudeError(
            f"samples of shape {written.shape} and known attitudes of shape {R.shape} do not go together",
            remedy="three numbers and one known attitude a sample",
        )
    if not np.all(np.isfinite(written)):
        row = int(np.argmax(~np.isfinite(written).all(axis=1))) + 1
        raise AttitudeError(f"sample {row} holds a value that is no number", remedy="leave such samples out")
    return written, require_rotation(R, "a known attitude")


def _attitudes(chains: tuple[Chain, ...], written: Array) -> Array:
    if len(chains) == len(all_chains()):
        return np.concatenate([chain_matrices(written, degrees=True), chain_matrices(written, degrees=False)])
    return np.array([chain.matrix(written) for chain in chains])


def _class_chains() -> tuple[Chain, ...]:
    """One chain for each of the 48 classes that two unknown constants leave: columns, unit, and four kinds of axes."""
    return tuple(
        Chain(sequence.axes, signs, columns, unit)
        for unit in (True, False)
        for sequence in (Sequence.XYZ, Sequence.XYX)
        for signs in ((1, 1, 1), (1, 1, -1))
        for columns in COLUMN_ORDERS
    )


def chain_reading(chain: Chain, constants: Constants, names: tuple[str, str, str]) -> Reading:
    """A chain with its names in words; under two unknown constants the class it stands for."""
    if constants is not Constants.BOTH:
        said = tuple(reading.words(names) for reading in chain.readings())
        return Reading(said[0], said, chain, chain)
    order = ", ".join(names[column] for column in chain.columns)
    repeated = chain.axes[0] == chain.axes[2]
    same = chain.signs[2] > 0
    kind = (
        f"first and last turn about one axis, {'in the same sense' if same else 'in opposite senses'}"
        if repeated
        else f"three axes, {'right-handed' if same else 'left-handed'} in the order of the turns"
    )
    words = f"turns in the order {order}; {kind}; {'deg' if chain.degrees else 'rad'}"
    return Reading(words, (words,), chain, chain)


def well_spread(written: Array) -> NDArray[np.intp]:
    """Indices of samples whose numbers are far from each other: each time the one farthest from those already taken.

    The numbers are looked at, not the known attitudes, whose false values would be taken first.
    """
    scaled = written / np.maximum(np.ptp(written, axis=0), 1e-12)
    chosen = [0]
    distance = np.full(len(scaled), np.inf)
    while len(chosen) < SPREAD:
        distance = np.minimum(distance, np.sum((scaled - scaled[chosen[-1]]) ** 2, axis=1))
        chosen.append(int(np.argmax(distance)))
    return np.array(chosen)


def _bound(noise: float, count: int) -> float:
    """Root mean square angle that N samples with this noise per axis exceed once in a million (Wilson and Hilferty)."""
    k = 3.0 * count
    quantile = k * (1.0 - 2.0 / (9.0 * k) + _SURE * np.sqrt(2.0 / (9.0 * k))) ** 3
    return float(noise * np.sqrt(quantile / count))


def decide(
    readings: list[Reading], fitted: Fitted, constants: Constants, noise: float | None, tried: int
) -> Identification:
    """The answer for candidates that were fitted: which fit, which is next, which samples are false."""
    order = np.argsort(fitted.scores, kind="stable")
    count = fitted.residuals.shape[1]
    best = float(fitted.scores[order[0]])
    if noise is not None:
        level = max(noise, ROUNDING)
        limit = _bound(level, count)
        # A reading is dropped as well when the best one is 1e5 times as likely: chi-square larger by 2 ln 1e5.
        accept = (fitted.scores <= limit) & (fitted.scores**2 <= best**2 + _LESS_LIKELY * level**2 / count)
    else:
        limit = max(RATIO * best, _bound(ROUNDING, count))
        accept = fitted.scores <= limit if best <= _bound(LARGEST_NOISE, count) else np.zeros(len(readings), dtype=bool)
    findings = [_finding(readings[k], fitted, int(k)) for k in order[: max(2, int(accept.sum()) + 1)]]
    fits = tuple(findings[: int(accept.sum())])
    rest = findings[len(fits) :]
    answer = Answer.NONE_FITS if not fits else Answer.IDENTIFIED if len(fits) == 1 else Answer.AMBIGUOUS
    estimate = noise if noise is not None else best / np.sqrt(3.0)
    return Identification(
        answer,
        constants,
        fits,
        rest[0] if rest else None,
        float(estimate),
        noise is not None,
        _outliers(findings[0], limit),
        (),
        tried,
        rest[1] if not fits and len(rest) > 1 else None,
    )


def _finding(reading: Reading, fitted: Fitted, index: int) -> Finding:
    return Finding(
        reading, fitted.left[index], fitted.right[index], float(fitted.scores[index]), fitted.residuals[index]
    )


def _outliers(best: Finding, limit: float) -> tuple[int, ...]:
    """Rows (from 1) whose residual is far beyond what the fit allows, where there are enough samples to say so."""
    if len(best.residuals) < FEWEST_TO_TRIM:
        return ()
    kept = float(scores(best.residuals))
    far = best.residuals > max(4.0 * kept, 2.0 * limit, 10.0 * ROUNDING)
    most = int(np.floor((1.0 - KEPT_SHARE) * len(best.residuals)))
    rows = np.flatnonzero(far)
    return tuple(int(row) + 1 for row in rows) if len(rows) <= most else ()


def _with_reasons(found: Identification, written: Array, R: Array, names: tuple[str, str, str]) -> Identification:
    if found.answer is not Answer.AMBIGUOUS:
        return found
    return replace(found, reasons=tuple(poor_data(written, R, names)))


def poor_data(written: Array, R: Array, names: tuple[str, str, str]) -> list[str]:
    """Why samples may not tell readings apart: what never moves, what is always equal, what moves only by itself."""
    reasons = []
    moves = np.ptp(written, axis=0) > 1e-9 * np.maximum(1.0, np.abs(written).max(axis=0))
    if len(written) == 1:
        reasons.append("there is one sample only")
    still = [name for name, move in zip(names, moves, strict=True) if not move]
    if len(written) > 1 and still:
        reasons.append(f"{listed(still)} never change{'s' if len(still) == 1 else ''}")
    zero = [name for name, column in zip(names, written.T, strict=True) if not column.any()]
    if zero:
        reasons.append(f"{listed(zero)} {'is' if len(zero) == 1 else 'are'} always zero")
    for i, k in ((0, 1), (1, 2), (0, 2)):
        if written[:, i].any() and np.allclose(np.abs(written[:, i]), np.abs(written[:, k]), rtol=0, atol=1e-9):
            reasons.append(f"{names[i]} and {names[k]} are equal in size in every sample")
    if np.all((np.abs(written) > 1e-9).sum(axis=1) <= 1):
        reasons.append("only one angle differs from zero at a time, which never shows the order of the turns")
    down = R[:, 2, :]
    if len(R) > 1 and np.ptp(down, axis=0).max() < 1e-6:
        reasons.append("the third reference axis keeps its direction in the body: all samples are level or alike")
    return reasons or ["the turns are too small, or too much alike, for the noise"]
