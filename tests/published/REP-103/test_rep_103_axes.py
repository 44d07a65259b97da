"""REP-103 axes against aircraft axes: one attitude in both conventions, and the optical frame."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import chain_angles
from trunnion.attitude.frames import Frame, attitude_from_axes
from trunnion.attitude.partners import axis_map
from trunnion.attitude.rotations import quaternion_from_matrix, rotation_angle, scalar_last
from trunnion.attitude.sequences import Sense, Sequence

CASES = json.loads((Path(__file__).parent / "cases.json").read_text())
NED, FRD = Frame("aircraft local", ("north", "east", "down")), Frame("aircraft", ("forward", "right", "down"))
ENU, FLU = Frame("world", ("east", "north", "up")), Frame("base", ("forward", "left", "up"))
NAMES = ("yaw", "pitch", "roll")
AIRCRAFT = Convention("aircraft", NED, FRD, Sequence.ZYX, Sense.MOVING, NAMES)
ROBOT = Convention("robot", ENU, FLU, Sequence.ZYX, Sense.MOVING, NAMES)
ROUNDING = 1e-14


@pytest.mark.parametrize("case", CASES["attitudes"], ids=lambda case: str(case["ned_deg"]))
def test_one_attitude_in_both_conventions(case: dict[str, Any]) -> None:
    R_ned = AIRCRAFT.matrix(np.radians(case["ned_deg"]))
    R_enu = axis_map(ENU, NED) @ R_ned @ axis_map(FLU, FRD).T
    np.testing.assert_allclose(R_ned, case["R_ned"], rtol=0, atol=ROUNDING)
    np.testing.assert_allclose(R_enu, case["R_enu"], rtol=0, atol=ROUNDING)
    found = ROBOT.angles(R_enu)
    tabled = ROBOT.matrix(np.radians(case["enu_yaw_pitch_roll_deg"]))
    assert rotation_angle(ROBOT.matrix(found.angles), tabled) < ROUNDING
    if not found.singular:
        np.testing.assert_allclose(np.degrees(found.angles), case["enu_yaw_pitch_roll_deg"], rtol=0, atol=1e-12)


def test_optical_frame() -> None:
    optical = Frame("optical", ("right", "down", "forward"))
    R = attitude_from_axes(FLU, optical, {"forward": "forward", "right": "right"})
    case = CASES["optical"]
    np.testing.assert_array_equal(R, case["R"])
    q = scalar_last(quaternion_from_matrix(R))
    np.testing.assert_allclose(q * np.sign(q[3]), case["q_xyzw"], rtol=0, atol=ROUNDING)
    fixed = chain_angles(R, sequence=Sequence.XYZ, sense=Sense.FIXED)
    np.testing.assert_allclose(np.degrees(fixed.angles), case["fixed_axis_rpy_deg"], rtol=0, atol=1e-12)
