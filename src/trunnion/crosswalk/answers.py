"""The other party's answers to the reference attitudes: pass, fail, or the wrong reading that explains every row."""

from __future__ import annotations

import enum
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.attitude.rotations import matrix_from_quaternion, require_rotation, rotation_angle
from trunnion.crosswalk.reference import ReferenceSet
from trunnion.crosswalk.wrong_readings import ChainFamily, Rows, single_readings
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

AGREES = np.radians(0.05)
"""Answers within this rotation angle pass unless another tolerance is stated: three printed decimals of a matrix."""

_MOST_EXPLANATIONS = 8


class AnswerKind(enum.Enum):
    """What the other party computed from what: attitudes from our angles, or angles from our matrices."""

    MATRIX = "matrix"
    QUATERNION = "quaternion"
    ANGLES = "angles"


@dataclass(frozen=True, eq=False)
class Judgement:
    """How the answers compare: miss (N,) rad of each row, and the wrong readings that explain every one of them."""

    passed: bool
    tolerance: float
    misses: Array
    explanations: tuple[str, ...]

    @property
    def worst(self) -> int:
        """The row that misses most."""
        return int(np.argmax(self.misses))


def all_rows(reference: ReferenceSet) -> Rows:
    """Regular rows first, then the extra rows at and near lock."""
    return Rows.of(reference.convention, np.vstack([reference.regular.angles, reference.extra.angles]))


def judge(reference: ReferenceSet, kind: AnswerKind, answers: ArrayLike, *, tolerance: float = AGREES) -> Judgement:
    """Compare answers to `all_rows(reference)`, row by row, as rotations.

    answers: matrices (N, 3, 3) or quaternions (N, 4) scalar first as the convention exchanges them, computed from our
    angles; or angles (N, 3) rad computed from our matrices, where at lock any triple of the solution line passes.
    Raises AttitudeError when a row is missing or is no rotation.
    """
    rows = all_rows(reference)
    given = np.asarray(answers, dtype=float)
    shape = {AnswerKind.MATRIX: (3, 3), AnswerKind.QUATERNION: (4,), AnswerKind.ANGLES: (3,)}[kind]
    if given.shape != (len(rows.angles), *shape):
        raise AttitudeError(
            f"answers of shape {given.shape} to {len(rows.angles)} reference attitudes",
            remedy=f"one {kind.value} for each row, in order",
        )
    attitudes = _attitudes(rows, kind, given)
    misses = np.asarray(rotation_angle(attitudes, rows.truth), dtype=float)
    passed = bool(misses.max() <= tolerance)
    explanations = () if passed else tuple(_explanations(rows, kind, given, attitudes, tolerance))
    return Judgement(passed, tolerance, misses, explanations)


def _attitudes(rows: Rows, kind: AnswerKind, given: Array) -> Array:
    """R_rb (N, 3, 3) the answers stand for when they are read as our convention has it."""
    if kind is AnswerKind.ANGLES:
        return rows.convention.matrix(given)
    matrices = matrix_from_quaternion(given) if kind is AnswerKind.QUATERNION else given
    return rows.convention.from_stated_matrix(require_rotation(matrices, "an answer"))


def _explanations(rows: Rows, kind: AnswerKind, given: Array, attitudes: Array, tolerance: float) -> list[str]:
    """Wrong readings that turn our data into these answers (or these answers into our attitudes), nearest first."""
    found: list[tuple[float, str]] = []
    if kind is AnswerKind.ANGLES:
        read = Rows(rows.convention, given, rows.matrices, rows.quaternions)
        target = rows.truth
    else:
        read, target = rows, attitudes
    family = ChainFamily(rows.convention)
    apart = family.separations_from(read, target).max(axis=2)
    for index, relabelling in np.argwhere(apart <= tolerance):
        found.append((float(apart[index, relabelling]), family.words(int(index), int(relabelling))))
    for reading in single_readings(rows.convention):
        miss = float(np.max(rotation_angle(reading.attitudes(read), target)))
        if miss <= tolerance:
            found.append((miss, f"{reading.family}: {reading.words}"))
    if kind is not AnswerKind.ANGLES:
        found += _relabelled(rows, attitudes, tolerance)
    return [words for _, words in sorted(found)[:_MOST_EXPLANATIONS]]


def _relabelled(rows: Rows, attitudes: Array, tolerance: float) -> list[tuple[float, str]]:
    """Right answers in relabelled frames on both sides, which constants between them keep apart from the chains."""
    found = []
    for i, P in enumerate(right_angle_rotations()):
        for k, Q in enumerate(right_angle_rotations()):
            if i or k:
                miss = float(np.max(rotation_angle(P @ rows.truth @ Q, attitudes)))
                if miss <= tolerance and i and k:
                    found.append((miss, "right turns, reference and body frames relabelled"))
                elif miss <= tolerance:
                    found.append((miss, f"right turns, {'reference' if i else 'body'} frame relabelled"))
    return found
