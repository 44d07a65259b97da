"""Oceanographic tilt readings (oce issue 1203 and others): a tilt to the horizontal is not the pitch of a sequence."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.forms import Level, TiltPair, TiltType
from trunnion.attitude.frames import Frame, attitude_from_axes
from trunnion.attitude.rotations import determinant
from trunnion.attitude.sequences import Sense, Sequence

CASE = json.loads((Path(__file__).parent / "case.json").read_text())
HALF_LAST_DIGIT = 0.5e-4  # deg, printed with four decimals
LOCAL = Frame("local", ("east", "north", "up"))
SHIP = Frame("ship", ("starboard", "forward", "up"))
LEVEL = Level(up=LOCAL.direction("up"), north=LOCAL.direction("north"))


def pair(*types: TiltType) -> TiltPair:
    """Pitch: bow up positive; roll: port side up positive (a right-handed turn about the bow axis)."""
    return TiltPair(LEVEL, SHIP.direction("forward"), -SHIP.direction("starboard"), SHIP.direction("up"), types)


def reading() -> np.ndarray:
    return np.radians([0.0, CASE["first_tilt_deg"], CASE["second_tilt_deg"]])


def test_pitch_of_the_matrix_from_two_tangent_tilts() -> None:
    R = pair(TiltType.TANGENT, TiltType.TANGENT).rotation(reading())
    # heading about up, then pitch about starboard, then roll about forward: 3-1-2 of (starboard, forward, up) axes
    sequence = Convention(
        "pitch then roll", LOCAL, SHIP, Sequence.ZXY, Sense.MOVING, ("heading", "pitch", "roll"), (-1, 1, 1)
    )
    heading, pitch, roll = np.degrees(sequence.angles(R).angles)
    assert heading == pytest.approx(0.0, abs=1e-12)
    assert pitch == pytest.approx(CASE["matrix_pitch_deg"], abs=HALF_LAST_DIGIT)
    assert roll == pytest.approx(CASE["second_tilt_deg"], abs=1e-12)


def test_total_tilt_of_two_tangent_tilts() -> None:
    form = pair(TiltType.TANGENT, TiltType.TANGENT)
    total = np.degrees(form.total_tilt(form.rotation(reading())))
    assert total == pytest.approx(CASE["total_tilt_deg"], abs=HALF_LAST_DIGIT)


def test_total_tilt_if_the_readings_are_taken_as_angles_of_a_sequence() -> None:
    form = pair(TiltType.SINE, TiltType.TANGENT)
    total = np.degrees(form.total_tilt(form.rotation(reading())))
    assert total == pytest.approx(CASE["total_tilt_if_taken_as_sequence_angles_deg"], abs=HALF_LAST_DIGIT)


def test_map_for_upward_looking_is_a_rotation() -> None:
    ship = Frame("ship", ("starboard", "forward", "mast"))
    instrument = Frame("instrument", ("x", "y", "z"))
    words = {axis: ship_axis for ship_axis, axis in CASE["upward_looking"].items()}
    R = attitude_from_axes(ship, instrument, words)
    assert determinant(R) == 1.0
    np.testing.assert_array_equal(R, np.diag([-1.0, 1.0, -1.0]))
