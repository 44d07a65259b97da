"""The reference attitudes show up every wrong reading, and name the one behind a set of wrong answers."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.crosswalk.answers import AnswerKind, all_rows, judge
from trunnion.crosswalk.reference import CAUGHT, reference_set
from trunnion.errors import AttitudeError

LOCAL = Frame("local", ("north", "east", "down"))
BODY = Frame("body", ("forward", "starboard", "down"))
NAMES = ("heading", "elevation", "bank")
SKEW = Rotation.from_rotvec([0.1, 0.7, -0.3]).as_matrix()

CONVENTIONS = [
    Convention(f"{sequence.value} {sense.value}", LOCAL, BODY, sequence, sense, NAMES)
    for sequence in Sequence
    for sense in Sense
] + [
    Convention("signs", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, NAMES, signs=(-1, 1, -1)),
    Convention("offsets", LOCAL, BODY, Sequence.ZXZ, Sense.FIXED, NAMES, offsets=(0.3, -0.2, 0.1), right=SKEW),
    Convention("other way", LOCAL, BODY, Sequence.YZX, Sense.MOVING, NAMES, left=SKEW, maps_body_to_reference=False),
]


def scipy_attitudes(convention: Convention, angles: np.ndarray, letters: str) -> np.ndarray:
    """Attitudes of stated angles (N, 3) rad by scipy under the given sequence letters."""
    turns = (angles - np.array(convention.offsets)) * np.array(convention.signs)
    return convention.left @ Rotation.from_euler(letters, turns).as_matrix() @ convention.right


@pytest.mark.parametrize("convention", CONVENTIONS, ids=lambda convention: convention.name)
def test_every_wrong_reading_fails_a_regular_row_by_more_than_a_degree(convention: Convention) -> None:
    found = reference_set(convention)
    assert found.least_miss > CAUGHT
    assert all(family.missed == 0 for family in found.families)
    plain, relabelled = found.families[:2]
    # 4,608 names are 1,152 functions; with relabelling of both frames 2,654,208 names are 27,648 functions.
    assert (plain.names, plain.functions) == (4608, 1152)
    assert plain.names + relabelled.names <= 2_654_208
    assert plain.functions + relabelled.functions == 27_648
    assert plain.same == 1
    assert len(set(found.same_names)) == 4


@pytest.mark.parametrize("convention", CONVENTIONS[::5], ids=lambda convention: convention.name)
def test_the_right_answers_pass_in_every_form(convention: Convention) -> None:
    found = reference_set(convention)
    rows = all_rows(found)
    assert judge(found, AnswerKind.MATRIX, rows.matrices).passed
    assert judge(found, AnswerKind.QUATERNION, -rows.quaternions).passed
    assert judge(found, AnswerKind.ANGLES, rows.angles).passed


def test_at_lock_any_triple_of_the_solution_line_passes() -> None:
    convention = CONVENTIONS[0]
    found = reference_set(convention)
    rows = all_rows(found)
    # About moving axes 1-2-3 at +90 deg only the sum of the outer angles is fixed (check value of common practice).
    angles = rows.angles.copy()
    at_lock = [n for n, words in enumerate(found.extra_words) if words.startswith("at lock") and "-" not in words]
    for n in at_lock:
        row = len(found.regular.angles) + n
        angles[row] += [0.4, 0.0, -0.4]
    assert at_lock
    assert judge(found, AnswerKind.ANGLES, angles).passed


def test_fixed_axes_for_moving_axes_is_named() -> None:
    convention = Convention("ordinary", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, NAMES)
    found = reference_set(convention)
    wrong = scipy_attitudes(convention, all_rows(found).angles, "zyx")
    judgement = judge(found, AnswerKind.MATRIX, wrong)
    assert not judgement.passed
    assert judgement.misses.max() > CAUGHT
    assert any("1-2-3 about moving axes; turns: bank, elevation, heading" in words for words in judgement.explanations)


def test_a_transposed_matrix_and_a_scalar_last_quaternion_are_named() -> None:
    convention = Convention("ordinary", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, NAMES)
    found = reference_set(convention)
    rows = all_rows(found)
    transposed = judge(found, AnswerKind.MATRIX, rows.matrices.transpose(0, 2, 1))
    assert not transposed.passed
    assert any("transposed" in words for words in transposed.explanations)
    scalar_last = judge(found, AnswerKind.QUATERNION, rows.quaternions[:, [1, 2, 3, 0]])
    assert not scalar_last.passed
    assert any("scalar last" in words for words in scalar_last.explanations)


def test_angles_in_radians_taken_for_degrees_are_named() -> None:
    convention = Convention("ordinary", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, NAMES)
    found = reference_set(convention)
    wrong = Rotation.from_euler("ZYX", np.degrees(all_rows(found).angles)).as_matrix()
    judgement = judge(found, AnswerKind.MATRIX, wrong)
    assert any("; rad; the matrix maps body to reference" in words for words in judgement.explanations)


def test_a_missing_row_and_a_reflection_are_refused() -> None:
    found = reference_set(CONVENTIONS[0])
    rows = all_rows(found)
    with pytest.raises(AttitudeError, match="reference attitudes"):
        judge(found, AnswerKind.MATRIX, rows.matrices[:-1])
    with pytest.raises(AttitudeError, match="an answer"):
        judge(found, AnswerKind.MATRIX, rows.matrices @ np.diag([1.0, 1.0, -1.0]))
