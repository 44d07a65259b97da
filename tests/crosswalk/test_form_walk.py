"""Forms walked to sequences and back, against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.forms import DirectionRoll, Level, RotationVector, TiltPair, TiltType
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.attitude.stated_forms import StatedForm
from trunnion.crosswalk.form_walk import form_walk
from trunnion.errors import AttitudeError

X, Y, Z = np.eye(3)
LOCAL, BODY = Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down"))
SHIP = Convention("ship", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, ("heading", "pitch", "roll"))
SINE, TANGENT = TiltType.SINE, TiltType.TANGENT


def tilts(*types: TiltType, names: tuple[str, str, str] = ("heading", "pitch", "roll")) -> StatedForm:
    """Nose up and port side up positive: the senses of the ship's pitch and roll."""
    return StatedForm("tilts", LOCAL, BODY, TiltPair(Level(-Z, X), X, -Y, -Z, types, names))


def test_a_gimballed_pair_is_the_sequence_itself() -> None:
    walk = form_walk(tilts(SINE, TANGENT), SHIP)
    values = np.radians([[30.0, 20.0, -40.0], [-120.0, -60.0, 150.0]])
    np.testing.assert_allclose(walk.angles(values)[0], values, rtol=0, atol=1e-14)
    assert np.max(walk.taken_for_angles(values)) < 1e-14


def test_names_in_another_order_are_taken_by_name() -> None:
    walk = form_walk(tilts(SINE, TANGENT, names=("heading", "pitch", "roll")), SHIP)
    assert walk.columns == (0, 1, 2)
    other = Convention("other", LOCAL, BODY, Sequence.XYZ, Sense.FIXED, ("roll", "pitch", "heading"))
    assert form_walk(tilts(SINE, TANGENT), other).columns == (2, 1, 0)
    assert np.max(form_walk(tilts(SINE, TANGENT), other).taken_for_angles(np.radians([10.0, 20.0, 30.0]))) < 1e-14


def test_strapped_tilts_walk_as_scipy_turns_them() -> None:
    walk = form_walk(tilts(SINE, SINE), SHIP)
    generator = np.random.default_rng(7)
    values = generator.uniform(-0.7, 0.7, size=(200, 3))
    angles, _ = walk.angles(values)
    carried = Rotation.from_euler("ZYX", angles)
    np.testing.assert_allclose(-carried.apply(X)[:, 2], np.sin(values[:, 1]), rtol=0, atol=1e-14)
    np.testing.assert_allclose(-carried.apply(-Y)[:, 2], np.sin(values[:, 2]), rtol=0, atol=1e-14)
    found = walk.numbers(angles)
    np.testing.assert_allclose(found.values, values, rtol=0, atol=1e-13)
    assert not found.inverted.any()


def test_an_inverted_body_comes_back_with_its_flag() -> None:
    walk = form_walk(tilts(SINE, SINE), SHIP)
    assert bool(walk.numbers(np.radians([10.0, 5.0, 175.0])).inverted)


def test_growth_of_errors_is_that_of_the_closed_form() -> None:
    # at zero heading and first tilt: sin(roll) = sin(b), so growth is 1; with pitch p and tilt b the roll grows as
    # cos b / sqrt(cos² p − sin² b)
    walk = form_walk(tilts(SINE, SINE), SHIP)
    assert float(walk.amplification(np.radians([0.0, 0.0, 30.0]))) == pytest.approx(1.0, abs=1e-8)
    p, b = np.radians([40.0, 25.0])
    roll_growth = np.cos(b) / np.sqrt(np.cos(p) ** 2 - np.sin(b) ** 2)
    assert float(walk.amplification([0.0, p, b])) >= roll_growth - 1e-8


def test_a_rotation_vector_and_its_inverse_walk_alike() -> None:
    vector = np.array([0.3, -0.2, 0.5])
    one = form_walk(StatedForm("v", LOCAL, BODY, RotationVector()), SHIP)
    two = form_walk(StatedForm("v", LOCAL, BODY, RotationVector(reverse=True)), SHIP)
    np.testing.assert_allclose(one.angles(vector)[0], Rotation.from_rotvec(vector).as_euler("ZYX"), rtol=0, atol=1e-14)
    np.testing.assert_allclose(two.angles(-vector)[0], one.angles(vector)[0], rtol=0, atol=1e-14)
    np.testing.assert_allclose(two.numbers(one.angles(vector)[0]).values, -vector, rtol=0, atol=1e-14)


def test_two_numbers_are_not_taken_for_three() -> None:
    pointer = StatedForm("p", LOCAL, BODY, DirectionRoll(-Z, X, X, -Z, with_roll=False))
    walk = form_walk(pointer, SHIP)
    assert walk.columns is None
    with pytest.raises(AttitudeError, match="has two numbers"):
        walk.taken_for_angles([0.1, 0.2])


def test_frames_that_do_not_name_the_same_axes_are_refused() -> None:
    strange = Convention(
        "strange", LOCAL, Frame("camera", ("x", "u", "v")), Sequence.ZYX, Sense.MOVING, ("a", "b", "c")
    )
    with pytest.raises(AttitudeError, match="do not name the same axes"):
        form_walk(tilts(SINE, SINE), strange)
