"""What a flight computer's extraction of angles is worth near lock: measured on the spot, against the laws.

Three ways of extraction are in use, in single or double precision:

ARC              middle angle by arcsine or arccosine of one entry, outer angles by two independent arctangents
TWO_ARCTANGENTS  middle angle by an arctangent, outer angles by two independent arctangents
RESIDUAL         as before, but the last angle from what the first one leaves (see extraction)

Laws, m the margin in rad, eps the spacing of the working precision at 1; constants as measured over all 24, below:

middle, ARC           4 eps/m, but never above 2.5 sqrt(eps): the entry is 1 - m^2/2 and knows m only so far
middle, arctangent    2 eps at every margin
outer angles          2 eps/m whatever the form: that much is lost in the matrix
combination           the sum or difference known at lock: 3.5 eps/m when the two are independent, 3 eps when residual
rebuilt attitude      as the combination (and the middle angle): 5 eps/m, or 3 eps

The measurement multiplies two rotations rounded to the working precision, in that precision, into a matrix at the
wanted margin, and extracts in it: a sensor's attitude times its mounting matrix, say. A matrix formed straight from a
quaternion can be better than that (for a repeated axis its small entries keep all their digits), never worse by more
than the constants. In double precision
the reference rounds as well, which triples the figures relative to single precision. The numbers are samples; the laws
say what they should look like.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.extraction import chain_angles, chain_matrix, wrap
from trunnion.attitude.rotations import matrix_from_quaternion, rotation_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

#: Constants of the laws (pure numbers, times eps or eps/margin): 99 % of the errors measured over all 24 in both
#: precisions stay below, and the largest rebuilt attitude below the last two.
ARC_MIDDLE, ARC_FLOOR = 4.0, 2.5
OUTER, COMBINATION = 2.0, 3.5
LARGEST_REBUILT, ROUNDING = 8.0, 5.0


class Precision(enum.Enum):
    """Working precision of the flight computer."""

    SINGLE = "float32"
    DOUBLE = "float64"

    @property
    def eps(self) -> float:
        """Spacing of the numbers at 1."""
        return float(np.finfo(self.value).eps)


class ExtractionForm(enum.Enum):
    """How the flight computer draws angles from a matrix."""

    ARC = "arcsine or arccosine"
    TWO_ARCTANGENTS = "independent arctangents"
    RESIDUAL = "residual form"


class ExtractionErrors(NamedTuple):
    """Errors (n,) rad at n margins: quantile stated with the measurement, and the largest rebuilt one."""

    margin: Array
    middle: Array
    first: Array
    last: Array
    combination: Array
    rebuilt: Array
    rebuilt_largest: Array


def measure_extraction(
    form: ExtractionForm,
    precision: Precision,
    margins: ArrayLike,
    *,
    sequence: Sequence = Sequence.ZYX,
    sense: Sense = Sense.MOVING,
    samples: int = 2000,
    quantile: float = 0.99,
    seed: int = 6,
) -> ExtractionErrors:
    """Errors of an extraction at each of `margins` (n,) rad, half the samples at either singular value.

    Fixed seed, so the same numbers come out again on the same machine. `rebuilt` is the rotation angle between the
    matrix that was handed over and the one of the angles that were returned. Near lock `first` and `last` saturate at
    pi.
    """
    values = np.atleast_1d(np.asarray(margins, dtype=float))
    if not np.all((values > 0.0) & (values <= np.pi / 2)) or samples < 2:
        raise AttitudeError("margins to measure at lie above 0 and up to 90 deg", remedy="give them in rad")
    rows = [
        _measure_one(form, precision, m, sequence, sense, samples, quantile, seed + 1000 * n)
        for n, m in enumerate(values)
    ]
    return ExtractionErrors(values, *np.array(rows).T)


def extraction_law(form: ExtractionForm, precision: Precision, margins: ArrayLike) -> ExtractionErrors:
    """The laws of the module text at margins (n,) rad: what 99 of 100 cases stay below, in all 24 and both
    precisions.
    """
    m = np.atleast_1d(np.asarray(margins, dtype=float))
    eps = precision.eps
    independent = form is not ExtractionForm.RESIDUAL
    middle = np.full_like(m, 2.0 * eps)
    if form is ExtractionForm.ARC:
        middle = np.minimum(ARC_MIDDLE * eps / m, ARC_FLOOR * np.sqrt(eps))
    outer = np.minimum(OUTER * eps / m, np.pi)
    combination = np.minimum(COMBINATION * eps / m, np.pi) if independent else np.full_like(m, 3.0 * eps)
    rebuilt = np.minimum(5.0 * eps / m, np.pi) if independent else np.full_like(m, 3.0 * eps)
    largest = np.minimum(LARGEST_REBUILT * eps / m, np.pi) if independent else np.full_like(m, ROUNDING * eps)
    return ExtractionErrors(m, middle, outer, outer, combination, rebuilt, largest)


@dataclass(frozen=True)
class Threshold:
    """Below `margin` (rad) the asked accuracy is not kept. `largest_error` (rad): largest error anywhere with the
    branch
    for lock taken below it, of the rebuilt attitude. `why`: one sentence."""

    margin: float
    largest_error: float
    why: str


def threshold_for_angles(precision: Precision, accuracy: float, constant: float = OUTER) -> Threshold:
    """The margin (rad) below which an outer angle is no longer known to `accuracy` rad: constant eps/accuracy.

    The same for every form: the digits are lost in the matrix. Below it the outer angles should be labelled
    undetermined and only their known combination shown.
    """
    if not accuracy > constant * precision.eps:
        raise AttitudeError(
            f"{accuracy:.3g} rad is below the rounding of {precision.value}: no margin is enough",
            remedy=f"more than {constant * precision.eps:.3g} rad, or a higher precision",
        )
    margin = float(np.arcsin(constant * precision.eps / accuracy))
    return Threshold(margin, accuracy, f"outer angles are known to {constant:g} eps / margin, whatever the form")


def threshold_for_attitude(
    form: ExtractionForm, precision: Precision, accuracy: float, constant: float = LARGEST_REBUILT
) -> Threshold:
    """The margin (rad) below which to take the branch for lock, so that the rebuilt attitude keeps `accuracy` rad.

    Residual form: none is needed. Independent arctangents err by constant eps/m above the threshold, and the branch for
    lock errs by up to m below it; both are kept to `accuracy` by thresholds between constant eps/accuracy and accuracy.
    The one where the two errors are equal is returned. Raises AttitudeError when no threshold can keep the accuracy.
    """
    if form is ExtractionForm.RESIDUAL:
        error = ROUNDING * precision.eps
        if accuracy < error:
            raise AttitudeError(f"{accuracy:.3g} rad is below the rounding of {precision.value}", remedy=f"{error:.3g}")
        return Threshold(0.0, error, "the residual form rebuilds the attitude to rounding at every margin")
    best = crossing(precision, constant)
    if accuracy < best:
        raise AttitudeError(
            f"no threshold keeps {accuracy:.3g} rad with {form.value} in {precision.value}: "
            f"the best reachable is {best:.3g} rad",
            remedy="use the residual form, or double precision",
        )
    return Threshold(
        best, best, f"above it {constant:g} eps / margin, below it the margin itself; equal at the threshold"
    )


def crossing(precision: Precision, constant: float = LARGEST_REBUILT) -> float:
    """The margin (rad) where the error of independent arctangents, constant eps/m, equals that of the lock branch,
    m.
    """
    return float(np.sqrt(constant * precision.eps))


class Consequence(NamedTuple):
    """What a threshold costs: rows of the consequence table."""

    threshold: float
    outer_error: float
    attitude_error_outside: float
    attitude_error_inside: float
    bits_lost: float
    share_of_attitudes: float


def consequences(form: ExtractionForm, precision: Precision, thresholds: ArrayLike) -> list[Consequence]:
    """For each threshold (rad): error of an outer angle and of the rebuilt attitude just outside, of the attitude
    inside
    (middle angle set onto its singular value), binary digits of an outer angle lost there, and the share of all
    attitudes (uniformly random) that lie inside, 1 - cos(threshold)."""
    rows = []
    for t in np.atleast_1d(np.asarray(thresholds, dtype=float)):
        outer = min(OUTER * precision.eps / np.sin(t), np.pi)
        independent = min(LARGEST_REBUILT * precision.eps / np.sin(t), np.pi)
        outside = ROUNDING * precision.eps if form is ExtractionForm.RESIDUAL else independent
        share = 2.0 * np.sin(t / 2.0) ** 2
        rows.append(Consequence(float(t), outer, outside, float(t), float(-np.log2(np.sin(t))), float(share)))
    return rows


def _measure_one(
    form: ExtractionForm,
    precision: Precision,
    m: float,
    sequence: Sequence,
    sense: Sense,
    samples: int,
    quantile: float,
    seed: int,
) -> tuple[float, ...]:
    truth, side = _triples_at(m, sequence, samples, seed)
    matrices = _matrices_in(precision, chain_matrix(truth, sequence=sequence, sense=sense), seed + 1)
    found = _extract(form, matrices, sequence, sense).astype(float)
    rebuilt = rotation_angle(matrices.astype(float), chain_matrix(found, sequence=sequence, sense=sense))
    error = wrap(found - truth)
    # The combination known at lock: first + s last; s is the side for a repeated axis, else times the parity.
    parity = 1 if sequence.repeated else sequence.parity * (1 if sense is Sense.MOVING else -1)
    combination = wrap(error[:, 0] + parity * side * error[:, 2])
    shown = [np.quantile(np.abs(e), quantile) for e in (error[:, 1], error[:, 0], error[:, 2], combination, rebuilt)]
    return (*(float(value) for value in shown), float(rebuilt.max()))


def _triples_at(m: float, sequence: Sequence, samples: int, seed: int) -> tuple[Array, Array]:
    """Triples (n, 3) at the margin m, alternating between the two singular values, and the side (n,) +1 or -1."""
    rng = np.random.default_rng(seed)
    outer = rng.uniform(-np.pi, np.pi, (samples, 2))
    side = np.where(np.arange(samples) % 2 == 0, 1.0, -1.0)
    middle = np.where(side > 0, m, np.pi - m) if sequence.repeated else side * (np.pi / 2 - m)
    return np.column_stack([outer[:, 0], middle, outer[:, 1]]), side


def _matrices_in(precision: Precision, E: Array, seed: int) -> Array:
    """E (n, 3, 3) as the product of two rotations held and multiplied in the working precision."""
    q = np.random.default_rng(seed).normal(size=(len(E), 4))
    A = matrix_from_quaternion(q / np.linalg.norm(q, axis=-1, keepdims=True))
    B = np.swapaxes(A, -1, -2) @ E
    return A.astype(precision.value) @ B.astype(precision.value)


def _extract(form: ExtractionForm, E: Array, sequence: Sequence, sense: Sense) -> Array:
    """Angles (n, 3) in turn order, in the precision of E, by one of the forms; no branch for lock."""
    if form is ExtractionForm.RESIDUAL:
        return chain_angles(E, sequence=sequence, sense=sense, lock_within=0.0).angles
    i, j, k = sequence.axes if sense is Sense.MOVING else sequence.axes[::-1]
    l, e = 3 - i - j, 1 if (j - i) % 3 == 1 else -1  # noqa: E741 - the completing axis
    if sequence.repeated:
        y, x, along = E[:, j, i], -e * E[:, l, i], E[:, i, i]
        c = np.arctan2(E[:, i, j], e * E[:, i, l])
        b = np.arccos(np.clip(along, -1, 1)) if form is ExtractionForm.ARC else np.arctan2(np.hypot(x, y), along)
    else:
        y, x, along = -e * E[:, j, k], E[:, k, k], e * E[:, i, k]
        c = np.arctan2(-e * E[:, i, j], E[:, i, i])
        b = np.arcsin(np.clip(along, -1, 1)) if form is ExtractionForm.ARC else np.arctan2(along, np.hypot(x, y))
    angles = np.stack([np.arctan2(y, x), b, c], axis=-1)
    return angles if sense is Sense.MOVING else angles[:, ::-1]
