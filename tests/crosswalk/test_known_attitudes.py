"""Known truth from gravity with a heading, and from poses in words; judged by scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame
from trunnion.crosswalk.identify import Answer, identify_angles
from trunnion.crosswalk.known_attitudes import from_gravity_and_heading, from_pose, from_poses
from trunnion.errors import AttitudeError

NED = Frame("local", ("north", "east", "down"))
ENU = Frame("map", ("east", "north", "up"))
FRD = Frame("body", ("forward", "starboard", "down"))
FLU = Frame("base", ("forward", "port", "up"))


def heading_pitch_bank(*angles: float) -> np.ndarray:
    """Common aircraft practice (ISO 1151 axes; value from memory): 3-2-1 about moving axes, north-east-down."""
    return Rotation.from_euler("ZYX", angles, degrees=True).as_matrix()


@pytest.mark.parametrize(
    ("text", "angles"),
    [
        ("nose up 30 deg, wings level, heading east", (90, 30, 0)),
        ("level, heading 45 deg", (45, 0, 0)),
        ("nose level, banked 20 deg to starboard, heading north", (0, 0, 20)),
        ("Nose down 10 deg,  banked 35 deg to port, heading south-west", (225, -10, -35)),
        ("nose level, inverted, heading north", (0, 0, 180)),
        ("nose up 0.5 rad, wings level, heading west", (270, np.degrees(0.5), 0)),
        ("nose towards up, belly towards north", (0, 90, 0)),
        ("tail towards north, top towards up", (180, 0, 0)),
        ("starboard wing towards down, nose towards east", (90, 0, 90)),
    ],
)
def test_poses_in_words_are_the_attitudes_they_say(text: str, angles: tuple) -> None:
    np.testing.assert_allclose(
        from_pose(text, reference=NED, body=FRD), heading_pitch_bank(*angles), rtol=0, atol=1e-12
    )


def test_a_pose_is_the_same_in_other_frames() -> None:
    # North-east-down to east-north-up on the left, forward-starboard-down to forward-port-up on the right (REP 103).
    text = "nose up 30 deg, banked 20 deg to starboard, heading 70 deg"
    change = np.array([[0, 1, 0], [1, 0, 0], [0, 0, -1.0]])
    expected = change @ from_pose(text, reference=NED, body=FRD) @ np.diag([1.0, -1, -1])
    np.testing.assert_allclose(from_pose(text, reference=ENU, body=FLU), expected, rtol=0, atol=1e-12)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "says nothing"),
        ("nose up 30 deg, heading east", "leaves open the bank"),
        ("level, nose up 3 deg, heading east", "says the elevation of the nose twice"),
        ("nose up 30, wings level, heading east", "30"),
        ("nose up 90 deg, wings level, heading east", "the nose has no heading"),
        ("nose up 30 deg, starboard wing down 20 deg, heading east", "banked 20 deg to starboard"),
        ("nose up 30 deg, wings level, heading to the sea", "to the sea"),
        ("upside round", "which is not understood"),
        ("nose towards up, tail towards north", "one line twice"),
        ("nose towards up", "names 1 axes"),
    ],
)
def test_a_pose_that_leaves_something_open_is_refused(text: str, words: str) -> None:
    with pytest.raises(AttitudeError, match=words):
        from_pose(text, reference=NED, body=FRD)


def test_frames_without_directions_are_refused() -> None:
    with pytest.raises(AttitudeError, match="does not say where north and up are"):
        from_pose("level, heading north", reference=Frame("a", ("x", "y", "z")), body=FRD)


@pytest.mark.parametrize("points_down", [True, False])
def test_gravity_and_heading_give_the_attitude(points_down: bool) -> None:
    angles = np.random.default_rng(4).uniform([-180, -80, -180], [180, 80, 180], size=(50, 3))
    truth = Rotation.from_euler("ZYX", angles, degrees=True)
    vertical = truth.inv().apply([0, 0, 9.81 if points_down else -9.81])
    known = from_gravity_and_heading(
        vertical, np.radians(angles[:, 0]), reference=NED, body=FRD, points_down=points_down
    )
    assert known.usable.all()
    assert np.degrees((truth.inv() * Rotation.from_matrix(known.matrices)).magnitude()).max() < 1e-10


def test_a_nose_near_the_vertical_has_no_heading() -> None:
    truth = Rotation.from_euler("ZYX", [[30, 89, 0], [30, 60, 0]], degrees=True)
    vertical = truth.inv().apply([0, 0, 1.0])
    vertical[1] *= 3.0
    known = from_gravity_and_heading(vertical, np.radians([30.0, 30.0]), reference=NED, body=FRD, points_down=True)
    assert known.usable.tolist() == [False, True]
    broken = from_gravity_and_heading(
        [[0, 0, 0], [0, 0, np.nan]], [0.0, 0.0], reference=NED, body=FRD, points_down=True
    )
    assert not broken.usable.any()
    with pytest.raises(AttitudeError, match="do not go together"):
        from_gravity_and_heading([[0.0, 0, 1]], [0.0, 1.0], reference=NED, body=FRD, points_down=True)


POSES = (
    "nose up 30 deg, banked 20 deg to port, heading east",
    "nose down 15 deg, banked 40 deg to starboard, heading 200 deg",
)


def test_two_general_poses_identify_and_two_level_ones_do_not() -> None:
    known = from_poses(POSES, reference=NED, body=FRD)
    numbers = Rotation.from_matrix(known.matrices).as_euler("ZXY", degrees=True)
    found = identify_angles(numbers, known.matrices, names=("yaw", "roll", "pitch"))
    assert found.answer is Answer.IDENTIFIED
    assert "3-1-2 about moving axes; turns: yaw, roll, pitch; deg" in found.fits[0].reading.words
    level = from_poses(("level, heading east", "level, heading 200 deg"), reference=NED, body=FRD)
    numbers = Rotation.from_matrix(level.matrices).as_euler("ZXY", degrees=True)
    found = identify_angles(numbers, level.matrices, names=("yaw", "roll", "pitch"))
    assert found.answer is Answer.AMBIGUOUS
    assert any("level" in reason for reason in found.reasons)


def test_one_heading_only_is_said_to_be_too_little() -> None:
    # Heading held, the other two moving one at a time: the order of the turns can't show.
    known = from_poses(
        ["nose up 30 deg, wings level, heading north", "nose level, banked 20 deg to port, heading north"],
        reference=NED, body=FRD,
    )  # fmt: skip
    numbers = Rotation.from_matrix(known.matrices).as_euler("ZYX", degrees=True)
    numbers[:, 0] = 0.0
    found = identify_angles(numbers, known.matrices, names=("heading", "pitch", "roll"))
    assert found.answer is Answer.AMBIGUOUS
    assert any("heading" in reason for reason in found.reasons)
    assert any("one angle differs from zero at a time" in reason for reason in found.reasons)
