"""The statement says what a person would do with a model, and its drawing data is what the matrices say."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import combination_text, singular_attitudes, turn_sentences
from trunnion.symbolic.statement import statement


def part(found, title: str) -> str:
    return "\n".join(next(p.paragraphs for p in found.parts if p.title == title))


def test_ordinary_aircraft_convention_reads_as_flight_mechanics_has_it(convention) -> None:
    """ISO 1151-2 as commonly quoted (clauses not seen): nose right, nose up, right side down are positive."""
    text = "\n".join(turn_sentences(convention()))
    assert "growing heading swings forward towards starboard" in text
    assert "growing elevation swings forward towards up" in text
    assert "growing bank swings starboard towards down" in text


def test_road_vehicle_convention_has_positive_pitch_nose_down() -> None:
    """ISO 8855 as adopted by the ASAM texts: x forward, y left, z up; positive pitch is nose down."""
    from trunnion.attitude.conventions import Convention
    from trunnion.attitude.frames import Frame
    from trunnion.attitude.sequences import Sequence

    road = Convention(
        "road",
        Frame("ground", ("east", "north", "up")),
        Frame("vehicle", ("forward", "left", "up")),
        Sequence.ZYX,
        Sense.MOVING,
        ("yaw", "pitch", "roll"),
    )
    text = "\n".join(turn_sentences(road))
    assert "growing yaw swings forward towards left" in text
    assert "growing pitch swings forward towards down" in text
    assert "growing roll swings left towards up" in text
    assert "Pitch 90°: the nose (forward) points straight down" in part(statement(road), "Singular attitudes")


def test_singular_attitudes_in_plain_words(convention) -> None:
    text = part(statement(convention()), "Singular attitudes")
    assert "Elevation 90°: the nose (forward) points straight up; only heading − bank is determined." in text
    assert "Elevation −90°: the nose (forward) points straight down; only heading + bank is determined." in text


@pytest.mark.parametrize("number", range(36))
def test_singular_words_are_what_scipy_shows(number: int, any_convention) -> None:
    """At the stated middle angle the body direction lies where the words say, and sliding keeps the attitude."""
    stated = any_convention(number)
    letters = stated.sequence.name if stated.sense is Sense.MOVING else stated.sequence.name.lower()

    def attitude(first: float, middle: float, last: float) -> Rotation:
        turns = np.asarray(stated.signs) * (np.array([first, middle, last]) - np.asarray(stated.offsets))
        chain = Rotation.from_euler(letters, turns)
        return Rotation.from_matrix(stated.left) * chain * Rotation.from_matrix(stated.right)

    for case in singular_attitudes(stated):
        here = attitude(0.4, case.angle, -1.1)
        np.testing.assert_allclose(here.apply(case.body_direction), case.reference_direction, rtol=0, atol=1e-14)
        slid = attitude(0.4 + 0.3, case.angle, -1.1 - case.coefficients[1] * 0.3)
        assert (here.inv() * slid).magnitude() < 1e-14
        sign = "+" if case.coefficients[1] > 0 else "−"
        assert combination_text(stated, case) == f"{stated.angle_names[0]} {sign} {stated.angle_names[2]}"


@pytest.mark.parametrize("number", range(0, 36, 5))
def test_drawing_starts_at_zero_and_each_turn_is_about_its_axis(number: int, any_convention) -> None:
    stated = any_convention(number)
    found = statement(stated)
    np.testing.assert_allclose(found.stages[0], stated.matrix(stated.offsets), rtol=0, atol=1e-14)
    angles = np.array(stated.offsets)
    for place, turn in enumerate(found.turns):
        angles[place] += turn.angle
        np.testing.assert_allclose(turn.after, stated.matrix(angles), rtol=0, atol=1e-14)
        made = Rotation.from_rotvec(turn.axis * turn.angle).as_matrix() @ turn.before
        np.testing.assert_allclose(made, turn.after, rtol=0, atol=1e-14)
    assert len(found.stage_captions) == len(found.stages) == 4


@pytest.mark.parametrize("direct", [True, False])
def test_worked_triple_matrix_and_quaternion_belong_together(direct: bool, convention) -> None:
    found = statement(convention(maps_body_to_reference=direct))
    w, x, y, z = found.worked_quaternion
    np.testing.assert_allclose(Rotation.from_quat([x, y, z, w]).as_matrix(), found.worked_matrix, rtol=0, atol=1e-15)
    text = part(found, "The matrix")
    assert ("v_local = R v_body" in text) == direct
    assert ("v_body = C v_local" in text) != direct


def test_attitude_only_is_said_and_texts_are_carried(convention) -> None:
    notes = {
        "local": "North is true north; origin at the pad.",
        "body": "Origin at the wing root, lever arm 1.2 m aft.",
    }
    found = statement(convention(), frame_notes=notes)
    frames = part(found, "Frames")
    assert all(note in frames for note in notes.values())
    assert "attitude only" in part(found, "Frames")


def test_what_a_named_standard_fixed_is_printed(convention) -> None:
    fixed = ("the sense of heading: nose right is positive.",)
    found = statement(convention(), standard="ISO 1151-1", fixed_by_standard=fixed)
    assert part(found, "Taken from a standard") == f"The workbook names ISO 1151-1. What was taken from it:\n{fixed[0]}"
    assert all(p.title != "Taken from a standard" for p in statement(convention()).parts)


def test_the_other_name_is_the_same_function(convention) -> None:
    found = part(statement(convention("ZXY")), "The same convention under another name")
    assert found.startswith("3-1-2 about moving axes is the same as 2-1-3 about fixed axes")
    angles = np.array([0.3, -0.4, 0.8])
    other = convention("YXZ", Sense.FIXED)
    np.testing.assert_allclose(other.matrix(angles[::-1]), convention("ZXY").matrix(angles), rtol=0, atol=1e-15)


def test_no_symbolic_algebra_is_loaded_for_words() -> None:
    code = (
        "import sys, trunnion.symbolic.statement; print([m for m in ('sympy', 'scipy', 'mpmath') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
