"""Public bug reports with numbers: the right answer comes out, and the wrong one is seen to be another attitude."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.attitude.extraction import Policy, chain_angles, chain_matrix
from trunnion.attitude.rotations import (
    elementary,
    matrix_from_quaternion,
    quaternion_from_matrix,
    rotation_angle,
    scalar_first,
)
from trunnion.attitude.sequences import Sense, Sequence

CASES: dict[str, dict[str, Any]] = {
    case["id"]: case for case in json.loads((Path(__file__).parent / "cases.json").read_text())
}
ZYX = {"sequence": Sequence.ZYX, "sense": Sense.MOVING}


def close(actual: Any, expected: Any, atol: float) -> None:
    np.testing.assert_allclose(actual, expected, rtol=0, atol=atol)


def off_by_deg(wrong: Any, R: np.ndarray, sequence: Sequence = Sequence.ZYX) -> float:
    return float(np.degrees(rotation_angle(chain_matrix(wrong, sequence=sequence, sense=Sense.MOVING), R)))


@pytest.mark.parametrize("name", [name for name in CASES if name.startswith("dm_control")])
def test_branch_formulas_at_both_singular_values(name: str) -> None:
    case = CASES[name]
    sequence, R = Sequence[case["input"]["sequence"]], np.array(case["input"]["R"])
    for policy, key in ((Policy.LAST_ZERO, "triple_last_zero"), (Policy.FIRST_ZERO, "triple_first_zero")):
        found = chain_angles(R, sequence=sequence, sense=Sense.MOVING, policy=policy)
        close(found.angles, case["expected"][key], case["tolerance"])
    wrong = case["expected"]["old_branch_result"]
    assert off_by_deg(wrong, R, sequence) == pytest.approx(case["expected"]["old_branch_error_deg"], abs=1e-6)


@pytest.mark.parametrize("name", ["bullet3-1805", *(name for name in CASES if name.startswith("ros-geometry"))])
def test_exact_matrices_at_lock(name: str) -> None:
    case = CASES[name]
    R = np.array(case["input"]["R"])
    found = chain_angles(R, **ZYX)
    assert found.singular
    assert found.margin == 0.0
    assert rotation_angle(chain_matrix(found.angles, **ZYX), R) < 1e-15
    close(_turns(found.angles), _turns(case["expected"]["yaw_pitch_roll"]), case["tolerance"])
    if "old_result" in case["expected"]:
        assert off_by_deg(case["expected"]["old_result"], R) == pytest.approx(case["expected"]["old_error_deg"])


def _turns(angles: Any) -> np.ndarray:
    """pi and -pi are one direction."""
    return np.concatenate([np.cos(angles), np.sin(angles)])


def test_hipparchus_304_two_zero_arguments_are_not_an_angle() -> None:
    case = CASES["hipparchus-304"]
    R = np.array(case["input"]["R"])
    close(chain_angles(R, **ZYX).angles, case["expected"]["triple_last_zero"], case["tolerance"])
    first_zero = chain_angles(R, **ZYX, policy=Policy.FIRST_ZERO)
    close(first_zero.angles, case["expected"]["equivalent"], case["tolerance"])
    assert off_by_deg(case["expected"]["old_result"], R) == pytest.approx(case["expected"]["old_error_deg"])


def test_nalgebra_1482_sign_of_the_angle_left() -> None:
    case = CASES["nalgebra-1482"]
    R = chain_matrix(case["input"]["yaw_pitch_roll"], **ZYX)
    close(chain_angles(R, **ZYX).angles, case["expected"]["yaw_pitch_roll"], case["tolerance"])
    assert off_by_deg(case["expected"]["old_result"], R) == pytest.approx(case["expected"]["old_error_deg"])


@pytest.mark.parametrize("side", ["plus", "minus"])
def test_kornia_3993_roll_pinned_to_zero(side: str) -> None:
    case = CASES["kornia-3993"]
    R = chain_matrix(case["input"][side][::-1], **ZYX)
    close(chain_angles(R, **ZYX).angles[::-1], case["expected"][f"{side}_roll_pitch_yaw"], case["tolerance"])


def test_spinach_427_product_that_ends_at_lock() -> None:
    case = CASES["spinach-427"]
    one = chain_matrix(case["input"]["a"], sequence=Sequence.ZYZ, sense=Sense.MOVING)
    close(one @ one, case["expected"]["R"], case["tolerance"])
    found = chain_angles(one @ one, sequence=Sequence.ZYZ, sense=Sense.MOVING)
    assert found.singular
    close(found.angles, case["expected"]["triple_last_zero"], case["tolerance"])
    wrong = chain_matrix(case["expected"]["old_result"], sequence=Sequence.ZYZ, sense=Sense.MOVING)
    assert np.linalg.norm(wrong - one @ one) == pytest.approx(case["expected"]["frobenius_error_old"])


def test_px4_19933_quaternion_slightly_too_long() -> None:
    case = CASES["px4-19933"]
    found = chain_angles(matrix_from_quaternion(case["input"]["q_wxyz"]), **ZYX)
    close(np.degrees(found.angles), case["expected"]["yaw_pitch_roll_deg"], case["tolerance"])
    assert np.degrees(found.angles[0]) == pytest.approx(case["expected"]["published_yaw_deg"], abs=1e-3)


def test_momentum_1630_sine_above_one() -> None:
    case = CASES["momentum-1630"]
    R = matrix_from_quaternion(scalar_first(case["input"]["q_xyzw"]))
    found = chain_angles(R, sequence=Sequence.XYZ, sense=Sense.FIXED)
    assert found.angles[1] == case["expected"]["middle_angle"]
    close(found.angles, case["expected"]["fixed_axis_xyz"], case["tolerance"])


@pytest.mark.parametrize("name", ["cgmath-563", "glm-737"])
def test_beyond_the_singular_value_the_other_triple_is_the_same_attitude(name: str) -> None:
    case = CASES[name]
    R = elementary(1, np.radians(case["input"]["angle_y_deg"]))
    close(R, case["expected"]["R"], case["tolerance"])
    found = chain_angles(R, sequence=Sequence.XYZ, sense=Sense.MOVING)
    close(_turns(found.angles), _turns(np.radians(case["expected"]["equivalent_deg"])), case["tolerance"])
    other = chain_angles(R, sequence=Sequence.XYZ, sense=Sense.MOVING, other_branch=True)
    close(np.degrees(other.angles), [0.0, case["input"]["angle_y_deg"], 0.0], 1e-12)


def test_quaternion_to_euler_1_scalar_place() -> None:
    case = CASES["q2e-1"]
    q = np.array(case["input"]["q"])
    for read, key in ((scalar_first(q), "scalar_last_XYZ"), (q, "scalar_first_XYZ")):
        found = chain_angles(matrix_from_quaternion(read), sequence=Sequence.XYZ, sense=Sense.MOVING)
        close(_turns(found.angles), _turns(case["expected"][key]), case["tolerance"])


@pytest.mark.parametrize("name", ["ZYX", "XYZ"])
def test_humanml3d_150_quaternion_of_a_triple(name: str) -> None:
    case = CASES["humanml3d-150"]
    R = chain_matrix(case["input"]["angles"], sequence=Sequence[name], sense=Sense.MOVING)
    close(quaternion_from_matrix(R), case["expected"][name], case["tolerance"])
    old = {"ZYX": "old_ZYX", "XYZ": "old_XYZ_round_trip"}[name]
    angle = rotation_angle(matrix_from_quaternion(case["expected"][old]), R)
    assert np.degrees(angle) == pytest.approx(case["expected"][f"old_{name}_error_deg"], abs=1e-4)


def test_transforms3d_17_inverse_of_a_triple() -> None:
    case = CASES["transforms3d-17"]
    angles = np.radians(case["input"]["angles_deg"])
    inverse = chain_matrix(angles, sequence=Sequence.ZXZ, sense=Sense.MOVING).T
    close(inverse, case["expected"]["R_inverse"], case["tolerance"])
    close(
        chain_matrix(np.radians(case["expected"]["inverse_deg"]), sequence=Sequence.ZXZ, sense=Sense.MOVING),
        inverse,
        case["tolerance"],
    )
    found = chain_angles(inverse, sequence=Sequence.ZXZ, sense=Sense.MOVING)
    close(np.degrees(found.angles), case["expected"]["inverse_in_range_deg"], case["tolerance"])
    same_numbers = chain_matrix(angles, sequence=Sequence.ZXZ, sense=Sense.FIXED)
    off = np.degrees(rotation_angle(same_numbers, inverse))
    assert off == pytest.approx(case["expected"]["extrinsic_same_triple_off_by_deg"], abs=1e-9)
