"""Public bug reports against the derivation and the source generated from it: the right answer, at exact lock too."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.symbolic.codegen import codegen

CASES: dict[str, dict[str, Any]] = {
    case["id"]: case for case in json.loads((Path(__file__).parent / "cases.json").read_text())
}


@pytest.fixture(scope="module")
def generated(derived):
    """`generated("ZYX")`: the generated Python of that sequence as a namespace."""

    def make(name: str) -> dict[str, Any]:
        namespace: dict[str, Any] = {"__name__": "generated"}
        exec(codegen(derived(name).convention)["plain.py"], namespace)
        return namespace

    return make


def turns(angles: Any) -> np.ndarray:
    """pi and -pi are one direction."""
    return np.concatenate([np.cos(angles), np.sin(angles)])


@pytest.mark.parametrize("name", [name for name in CASES if name.startswith("dm_control")])
def test_the_combination_at_each_pole_is_the_derived_one(name: str, derived) -> None:
    case = CASES[name]
    derivation = derived(case["input"]["sequence"])
    middle = case["input"]["angles"][1]
    number = next(n for n, locked in enumerate(derivation.locked) if abs(float(locked.turn) - middle) < 1e-12)
    left = derivation.combination(number, np.array(case["input"]["R"]))
    assert left == pytest.approx(case["expected"]["triple_last_zero"][0], abs=case["tolerance"])
    assert derivation.locked[number].relation * left == pytest.approx(
        case["expected"]["triple_first_zero"][2], abs=case["tolerance"]
    )


@pytest.mark.parametrize("name", ["bullet3-1805", *(name for name in CASES if name.startswith("ros-geometry"))])
def test_generated_source_answers_exact_matrices_at_lock(name: str, generated) -> None:
    case = CASES[name]
    source = generated("ZYX")
    angles, margin = source["angles_from_matrix"](case["input"]["R"])
    assert margin == 0.0
    np.testing.assert_allclose(turns(angles), turns(case["expected"]["yaw_pitch_roll"]), rtol=0, atol=1e-15)
    np.testing.assert_allclose(source["matrix_from_angles"](angles), case["input"]["R"], rtol=0, atol=1e-15)


def test_generated_source_offers_both_answers_of_hipparchus_304(generated) -> None:
    case, source = CASES["hipparchus-304"], generated("ZYX")
    for policy, key in (("LAST_ZERO", "triple_last_zero"), ("FIRST_ZERO", "equivalent")):
        angles, _ = source["angles_from_matrix"](case["input"]["R"], source[policy])
        np.testing.assert_allclose(angles, case["expected"][key], rtol=0, atol=1e-15)


def test_generated_source_takes_the_unnormalised_quaternion_of_px4_19933(generated) -> None:
    case, source = CASES["px4-19933"], generated("ZYX")
    angles, _ = source["angles_from_quaternion"](case["input"]["q_wxyz"])
    matrix = source["matrix_from_quaternion"](case["input"]["q_wxyz"])
    assert np.degrees(angles[1]) == pytest.approx(-90.0, abs=1e-3)
    # The quaternion has six digits: heading and bank apart mean nothing here, their sum is the published -110 deg.
    assert np.degrees(angles[0] + angles[2]) == pytest.approx(case["expected"]["published_yaw_deg"], abs=1e-3)
    assert source["turn_between"](source["matrix_from_angles"](angles), matrix) < 1e-15


def test_what_is_left_of_the_quaternion_meets_kornia_3993(derived) -> None:
    case, derivation = CASES["kornia-3993"], derived("ZYX")
    forms = {
        "plus": (
            r"2 \operatorname{atan2}\left(- q_{1} + q_{3},\, q_{0} + q_{2}\right)",
            lambda w, x, y, z: (z - x, w + y),
        ),
        "minus": (
            r"2 \operatorname{atan2}\left(q_{1} + q_{3},\, q_{0} - q_{2}\right)",
            lambda w, x, y, z: (z + x, w - y),
        ),
    }
    for number, (pole, (latex, arguments)) in enumerate(forms.items(), start=1):
        assert derivation.step(f"quaternion-lock-{number}").rhs == latex
        roll, pitch, yaw = case["input"][pole]
        four = derivation.value("quaternion", [yaw, pitch, roll])[0]
        expected = case["expected"][f"{pole}_roll_pitch_yaw"][2]
        assert 2 * np.arctan2(*arguments(*four)) == pytest.approx(expected, abs=case["tolerance"])


def test_derived_quaternion_meets_humanml3d_150(derived) -> None:
    case = CASES["humanml3d-150"]
    for name in ("ZYX", "XYZ"):
        ours = derived(name).value("quaternion", case["input"]["angles"])[0]
        np.testing.assert_allclose(ours, case["expected"][name], rtol=0, atol=case["tolerance"])


def test_derived_second_triple_meets_cgmath_563_and_glm_737(generated) -> None:
    for name in ("cgmath-563", "glm-737"):
        case, source = CASES[name], generated("XYZ")
        angles, _ = source["angles_from_matrix"](case["expected"]["R"])
        expected = np.radians(case["expected"]["equivalent_deg"])
        np.testing.assert_allclose(turns(angles), turns(expected), rtol=0, atol=case["tolerance"])


def test_derived_inverse_meets_transforms3d_17(derived) -> None:
    case, derivation = CASES["transforms3d-17"], derived("ZXZ")
    R = derivation.value("matrix", np.radians(case["input"]["angles_deg"]))
    np.testing.assert_allclose(R.T, case["expected"]["R_inverse"], rtol=0, atol=case["tolerance"])
    found = np.degrees(derivation.angles(R.T))
    np.testing.assert_allclose(found, case["expected"]["inverse_in_range_deg"], rtol=0, atol=1e-12)
    again = derivation.value("matrix", np.radians(case["expected"]["inverse_deg"]))
    np.testing.assert_allclose(again, R.T, rtol=0, atol=case["tolerance"])
