"""On-board numerics: what each way of taking angles out of a matrix costs near lock, in double and single precision.

Three forms. ARCSINE: middle angle by arcsine (arccosine for a repeated axis), outer angles by two independent
arctangents. TWO_ARCTANGENTS: the middle angle by an arctangent too. RESIDUAL: first angle by arctangent, third from
Rot(i, a)^T E, so that an error of the first is undone by the third and the rebuilt attitude is right to rounding.

Laws, eps the spacing of numbers at one (2.2e-16, 1.2e-7) and m the margin in rad, for matrices that carry the rounding
of one product; measured here by `measure`, and compared with it by the template: middle by arcsine up to
min(1.5 eps/m, 1.5 sqrt(eps)), by arctangent 2 eps; outer angles, whatever the form, up to 0.75 eps/m, since the matrix
holds no more; rebuilt attitude from independent arctangents up to 1.25 eps/m, with the arcsine 1.6 eps/m, from the
residual form 3 eps at every margin.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.extraction import chain_angles, chain_matrix
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.vectors import Array
from trunnion.errors import RegionError

OUTER, MIDDLE, INDEPENDENT, WITH_ARCSINE = 0.75, 1.5, 1.25, 1.6
"""The laws' factors of eps/m: outer angles, middle by arcsine, rebuilt from independent arctangents, with arcsine."""


class Form(enum.Enum):
    """How the angles are taken out of the matrix."""

    ARCSINE = "arcsine or arccosine for the middle angle, two arctangents"
    TWO_ARCTANGENTS = "arctangents throughout, outer angles independent"
    RESIDUAL = "residual form: third angle from what the first leaves"


class Precision(enum.Enum):
    """Working precision on board."""

    DOUBLE = "float64"
    SINGLE = "float32"

    @property
    def eps(self) -> float:
        """Spacing of numbers at one."""
        return float(np.finfo(self.value).eps)


def extract(E: NDArray[Any], sequence: Sequence, form: Form) -> NDArray[Any]:
    """Angles (..., 3) about moving axes of matrices (..., 3, 3), worked in the precision of E."""
    if form is Form.RESIDUAL:
        return np.asarray(chain_angles(E, sequence=sequence, sense=Sense.MOVING, lock_within=0.0).angles)
    i, j, k = sequence.axes
    s, last = E.dtype.type(sequence.parity), sequence.third_axis
    if sequence.repeated:
        first = np.arctan2(E[..., j, i], -s * E[..., last, i])
        third = np.arctan2(E[..., i, j], s * E[..., i, last])
        across, along = np.hypot(E[..., i, j], E[..., i, last]), E[..., i, i]
        middle = np.arccos(np.clip(along, -1, 1)) if form is Form.ARCSINE else np.arctan2(across, along)
    else:
        first = np.arctan2(-s * E[..., j, k], E[..., k, k])
        third = np.arctan2(-s * E[..., i, j], E[..., i, i])
        across, along = np.hypot(E[..., i, i], E[..., i, j]), s * E[..., i, k]
        middle = np.arcsin(np.clip(along, -1, 1)) if form is Form.ARCSINE else np.arctan2(along, across)
    return np.stack([first, middle, third], axis=-1)


@dataclass(frozen=True)
class Errors:
    """Errors (rad) at one margin, 99 per cent of random attitudes below: each angle, the combination of the outer two
    that stays fixed at lock, and the rebuilt attitude."""

    margin: float
    first: float
    middle: float
    third: float
    combination: float
    rebuilt: float


def measure(
    sequence: Sequence, form: Form, precision: Precision, margins: Array, *, count: int = 20_000, seed: int = 1
) -> list[Errors]:
    """Errors of extraction at each margin (rad), over random outer angles, both singular values and matrices that carry
    the rounding of the working precision."""
    rng = np.random.default_rng(seed)
    found = []
    for margin in margins:
        true = rng.uniform(-np.pi, np.pi, (count, 3))
        upper = rng.uniform(size=count) < 0.5
        if sequence.repeated:
            true[:, 1] = np.where(upper, margin, np.pi - margin)
        else:
            true[:, 1] = np.where(upper, np.pi / 2 - margin, margin - np.pi / 2)
        exact = chain_matrix(true, sequence=sequence, sense=Sense.MOVING)
        angles = extract(_with_rounding(exact, precision, rng), sequence, form).astype(float)
        found.append(_errors(float(margin), sequence, true, upper, exact, angles))
    return found


def _with_rounding(exact: Array, precision: Precision, rng: np.random.Generator) -> NDArray[Any]:
    """Matrices with the rounding of one product in the working precision.

    Rounding the exact entries would flatter: those that vanish at lock would keep all their digits. On board a matrix
    is the outcome of products, and carries the rounding of numbers of size one in every entry.
    """
    turns = chain_matrix(rng.uniform(-np.pi, np.pi, (len(exact), 3)), sequence=Sequence.ZXZ, sense=Sense.MOVING)
    first = turns.astype(precision.value)
    second = (np.swapaxes(turns, -1, -2) @ exact).astype(precision.value)
    return np.asarray(first @ second)


def _errors(
    margin: float, sequence: Sequence, true: Array, upper: NDArray[np.bool_], exact: Array, angles: Array
) -> Errors:
    off = angles - true
    off = np.abs(off - 2.0 * np.pi * np.round(off / (2.0 * np.pi)))
    sign = _combination_sign(sequence, upper)
    mixed = (angles[:, 0] + sign * angles[:, 2]) - (true[:, 0] + sign * true[:, 2])
    mixed = np.abs(mixed - 2.0 * np.pi * np.round(mixed / (2.0 * np.pi)))
    rebuilt = rotation_angle(chain_matrix(angles, sequence=sequence, sense=Sense.MOVING), exact)
    rows = [*off.T, mixed, rebuilt]
    first, middle, third, combination, whole = (float(np.quantile(row, 0.99)) for row in rows)
    return Errors(margin, first, middle, third, combination, whole)


def _combination_sign(sequence: Sequence, upper: NDArray[np.bool_]) -> Array:
    """+1 where the sum of the outer angles stays fixed at lock, -1 where their difference does."""
    if sequence.repeated:
        return np.where(upper, 1.0, -1.0)
    return np.where(upper, 1.0, -1.0) * sequence.parity


def law(form: Form, precision: Precision, margin: float) -> Errors:
    """What the laws above expect at a margin (rad): the upper end of what was measured."""
    eps = precision.eps
    outer = OUTER * eps / margin
    middle = float(min(MIDDLE * eps / margin, MIDDLE * np.sqrt(eps))) if form is Form.ARCSINE else 2.0 * eps
    if form is Form.RESIDUAL:
        return Errors(margin, outer, middle, outer, 4.0 * eps, 3.0 * eps)
    whole = (WITH_ARCSINE if form is Form.ARCSINE else INDEPENDENT) * eps / margin
    return Errors(margin, outer, middle, outer, max(INDEPENDENT * eps / margin, 4.0 * eps), max(whole, 3.0 * eps))


@dataclass(frozen=True)
class Threshold:
    """Margin (rad) below which a form no longer rebuilds the attitude to the stated accuracy, and why."""

    margin: float
    reason: str


def threshold(form: Form, precision: Precision, accuracy: float) -> Threshold:
    """The margin at which to stop trusting the angles of a form for an attitude accuracy of `accuracy` rad.

    Raises RegionError when the precision cannot give that accuracy anywhere.
    """
    if not accuracy > 3.0 * precision.eps:
        raise RegionError(
            f"an accuracy of {accuracy:g} rad is beyond {precision.value}", remedy="state a coarser one, or use float64"
        )
    if form is Form.RESIDUAL:
        return Threshold(0.0, "none is needed: the rebuilt attitude is right to rounding at every margin")
    eps = precision.eps
    if form is Form.ARCSINE and accuracy < MIDDLE * np.sqrt(eps):
        return Threshold(WITH_ARCSINE * eps / accuracy, "arcsine and independent arctangents lose up to 1.6 eps/m")
    return Threshold(INDEPENDENT * eps / accuracy, "independent arctangents lose up to 1.25 eps/m together")


def branch_margin(precision: Precision) -> float:
    """The margin (rad) at which independent arctangents and the locked branch (one outer angle set to zero) lose the
    same: sqrt(1.4 eps), 1e-6 deg in double and 0.02 deg in single precision."""
    return float(np.sqrt(1.4 * precision.eps))


@dataclass(frozen=True)
class Consequence:
    """What a threshold margin means for one attitude accuracy."""

    accuracy: float
    threshold: float
    outer_error: float


def consequences(form: Form, precision: Precision, accuracies: Array) -> list[Consequence]:
    """For each accuracy (rad): the threshold and the error of an outer angle taken alone at it (inf at lock)."""
    rows = []
    for accuracy in accuracies:
        margin = threshold(form, precision, float(accuracy)).margin
        alone = OUTER * precision.eps / margin if margin > 0.0 else np.inf
        rows.append(Consequence(float(accuracy), margin, float(alone)))
    return rows
