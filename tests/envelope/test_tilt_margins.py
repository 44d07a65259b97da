"""Margins of tilt pairs and rotation vectors over regions, against scipy's sampling."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.regions import Box, Poses
from trunnion.envelope.tilts import tilt_margin, turn_margin

UP = np.array([0.0, 0.0, -1.0])
SHIP = Convention(
    "ship",
    Frame("local", ("north", "east", "down")),
    Frame("body", ("forward", "starboard", "down")),
    Sequence.ZYX,
    Sense.MOVING,
    ("heading", "pitch", "roll"),
)
LOW, HIGH = np.radians([-20.0, -25.0, -40.0]), np.radians([30.0, 15.0, 35.0])
BOX = Box(SHIP, tuple(zip(LOW, HIGH, strict=True)))


def sampled() -> Rotation:
    grid = np.stack(np.meshgrid(*(np.linspace(lo, hi, 21) for lo, hi in zip(LOW, HIGH, strict=True))), -1)
    return Rotation.from_euler("ZYX", grid.reshape(-1, 3))


def test_least_elevation_of_the_upright_axis() -> None:
    elevation = np.arcsin(np.abs(sampled().apply(UP) @ UP))
    found = tilt_margin(BOX, UP, UP)
    assert found.lo == pytest.approx(elevation.min(), abs=1e-9)  # the grid holds the corners, where it is reached
    assert found.witness is not None
    assert found.witness.value == pytest.approx(found.lo, abs=1e-9)


def test_half_turns_are_no_nearer_than_said() -> None:
    left = np.pi - sampled().magnitude()
    bound = turn_margin(BOX)
    assert 0.0 < bound <= left.min()
    assert bound > left.min() - np.radians(15.0)  # a bound, not loose beyond use


def test_one_pose_about_an_axis_is_exact() -> None:
    pose = Poses(Rotation.from_rotvec([0.0, 0.7, 0.0]).as_matrix()[None], 0.0)
    assert turn_margin(pose) == pytest.approx(np.pi - 0.7, abs=1e-12)
