"""Rates as evidence, offsets, forms that are no sequence, statements that disagree. Data made by scipy."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.crosswalk.disagreement import agreements
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import Answer, identify_angles, quaternion_readings
from trunnion.crosswalk.offsets import identify_with_offsets, offsets_of
from trunnion.crosswalk.other_forms import identify_other_forms
from trunnion.crosswalk.rate_evidence import (
    identify_attitudes_by_rates,
    identify_by_rates,
    identify_rate_columns,
    integrated,
)
from trunnion.errors import AttitudeError

NAMES = ("yaw", "pitch", "roll")


def flight(sequence: str = "ZYX", noise: float = 0.005) -> tuple[np.ndarray, np.ndarray, Rotation, np.ndarray]:
    """Times, angles (deg), attitudes, body rates (rad/s) with noise: rates are scipy's differences of attitudes."""
    t = np.arange(0.0, 20.0, 0.02)
    angles = np.column_stack([40 * np.sin(0.5 * t), 30 * np.sin(0.9 * t + 1), 50 * np.sin(0.7 * t + 2)])
    turned = Rotation.from_euler(sequence, angles, degrees=True)
    between = (turned[:-1].inv() * turned[1:]).as_rotvec() / 0.02
    rates = np.vstack([between[:1], 0.5 * (between[1:] + between[:-1]), between[-1:]])
    return t, angles, turned, rates + np.random.default_rng(1).normal(scale=noise, size=rates.shape)


@pytest.mark.parametrize("sequence", ["ZYX", "ZXY", "xyz"])
@pytest.mark.parametrize("per_second", [True, False])
def test_rates_alone_identify_the_angles(sequence: str, per_second: bool) -> None:
    t, angles, _, rates = flight(sequence)
    found = identify_by_rates(t, angles, np.degrees(rates) if per_second else rates, names=NAMES)
    assert found.answer is Answer.IDENTIFIED
    said = "about moving axes" if sequence.isupper() else "about fixed axes"
    digits = "-".join(str("XYZ".index(letter) + 1) for letter in sequence.upper())
    assert any(f"{digits} {said}; turns: yaw, pitch, roll; deg" in name for name in found.fits[0].reading.names)
    assert found.fits[0].reading.words.endswith("deg/s" if per_second else "rad/s")


def test_rate_columns_in_another_order_are_found_against_known_attitudes() -> None:
    t, _, turned, rates = flight()
    found = identify_rate_columns(t, turned.as_matrix(), np.degrees(rates[:, [1, 0, 2]]) * [1, -1, 1])
    assert found.answer is Answer.IDENTIFIED
    assert found.fits[0].reading.words == "x: −second number, y: first number, z: third number; deg/s"


def test_rates_tell_where_a_quaternion_has_its_scalar_and_which_way_it_maps() -> None:
    t, _, turned, rates = flight()
    for attitudes, way in ((turned, "body to reference"), (turned.inv(), "reference to body")):
        found = identify_attitudes_by_rates(t, quaternion_readings(attitudes.as_quat()), rates)
        assert [finding.reading.words for finding in found.fits] == [f"scalar last, maps {way}; rates in rad/s"]


def test_rates_of_a_body_at_rest_and_disordered_times_are_refused() -> None:
    t, angles, _, rates = flight()
    with pytest.raises(AttitudeError, match="turns by less than 3 deg"):
        identify_by_rates(t, angles, 0.0 * rates)
    with pytest.raises(AttitudeError, match="time of sample 3"):
        identify_by_rates(np.concatenate([t[:2], t[1:-1]]), angles, rates)
    with pytest.raises(AttitudeError, match="do not go together"):
        identify_by_rates(t[:-1], angles, rates)


def test_rates_add_up_as_scipy_adds_them() -> None:
    rates = np.random.default_rng(3).normal(size=(30, 3))
    total = Rotation.identity()
    for one, other in itertools.pairwise(rates):
        total = total * Rotation.from_rotvec(0.05 * (one + other) / 2)
    np.testing.assert_allclose(integrated(np.arange(30) * 0.05, rates)[-1], total.as_matrix(), rtol=0, atol=1e-13)


@pytest.mark.parametrize("sequence", ["ZXY", "ZYZ", "xyz"])
def test_offsets_are_found_when_asked_for(sequence: str) -> None:
    numbers = np.random.default_rng(6).uniform(-60, 60, size=(20, 3))
    added = np.array([12.0, 90.0 if sequence != "ZYZ" else 0.0, -33.0])
    truth = Rotation.from_euler(sequence, numbers + added, degrees=True)
    noisy = truth * Rotation.from_rotvec(np.random.default_rng(7).normal(scale=1e-4, size=(20, 3)))
    found = identify_with_offsets(numbers, noisy.as_matrix(), names=NAMES, noise=1e-4)
    assert found.answer is Answer.IDENTIFIED
    unit = Rotation.from_euler(sequence, np.array([[5, -20, 33.0], [50, 60, -70]]) + added, degrees=True).as_matrix()
    predicted = found.fits[0].reading.key.matrix(np.array([[5, -20, 33.0], [50, 60, -70]]))
    assert np.abs(predicted - unit).max() < 3e-4
    if sequence == "ZXY":
        assert np.degrees(offsets_of(found.fits[0])) == pytest.approx(added, abs=0.02)


def test_equal_functions_with_offsets_are_listed_once() -> None:
    # (a, b, c) and (a + 180, 180 - b, c + 180) are one attitude: NAIF-ROTATION, on the two solutions of m2eul.
    numbers = np.random.default_rng(8).uniform(-60, 60, size=(12, 3))
    found = identify_with_offsets(numbers, Rotation.from_euler("ZYX", numbers, degrees=True).as_matrix(), names=NAMES)
    assert len(found.fits) == 1
    assert offsets_of(found.fits[0]) == (0.0, 0.0, 0.0)


def tilts(truth: Rotation) -> np.ndarray:
    """Heading of the nose, tilt of nose and starboard axis to the horizontal (deg): a strapped accelerometer."""
    R = truth.as_matrix()
    return np.degrees(
        np.column_stack([np.arctan2(R[:, 1, 0], R[:, 0, 0]), np.arcsin(-R[:, 2, 0]), np.arcsin(R[:, 2, 1])])
    )


@pytest.mark.parametrize("constants", list(Constants))
def test_tilt_pairs_and_rotation_vectors_are_tried_before_none_fits(constants: Constants) -> None:
    truth = Rotation.from_euler("ZYX", np.random.default_rng(2).uniform(-50, 50, (30, 3)), degrees=True)
    for numbers, words in ((tilts(truth), "of sine type"), (truth.as_rotvec(degrees=True), "rotation vector")):
        found = identify_other_forms(numbers, truth.as_matrix(), constants=constants, names=NAMES)
        assert found.answer is Answer.IDENTIFIED
        assert words in found.fits[0].reading.words
        assert "deg" in found.fits[0].reading.words
    assert identify_angles(tilts(truth), truth.as_matrix()).answer is Answer.NONE_FITS


def test_statements_that_disagree_say_how_they_would_agree() -> None:
    truth = Rotation.from_euler("ZYX", np.random.default_rng(5).uniform(-60, 60, (10, 3)), degrees=True)
    entries = truth.as_matrix().transpose(0, 2, 1).reshape(-1, 9)
    found = agreements(quaternion=truth.as_quat(), matrix=entries, numbers=truth.as_euler("ZYX"), names=NAMES)
    assert [entry.agrees for entry in found] == [True, False, False, False]
    assert found[0].words["quaternion"] == "scalar last, maps body to reference"
    assert "by columns" in found[0].words["matrix"]
    assert "3-2-1 about moving axes; turns: yaw, pitch, roll; rad" in found[0].words["angles"]
    spoiled = Rotation.random(10, random_state=1).as_quat()
    assert not any(entry.agrees for entry in agreements(quaternion=spoiled, matrix=entries))
    with pytest.raises(AttitudeError, match="one statement alone"):
        agreements(quaternion=spoiled)


def test_one_star_tracker_mount_stated_in_two_languages() -> None:
    # nasa/nos3 issues 351 and 431 (2024): quaternion of a mount as printed there, scalar last; a second program wants
    # 2-1-3 angles. Recomputed with scipy: turning the sensor frame into the body frame the angles are
    # (65.9156, -81.1266, -147.0422), those of the inverse (86.3448, 9.1111, 97.5321).
    quaternion = np.array([[-0.5510871, -0.4059919, -0.5108982, 0.5200544]])
    for angles, way in (
        ((65.9156, -81.1266, -147.0422), "body to reference"),
        ((86.3448, 9.1111, 97.5321), "reference"),
    ):
        found = agreements(quaternion=quaternion, numbers=[angles], tolerance=np.radians(0.01), noise=np.radians(1e-3))
        (best,) = [entry for entry in found if entry.agrees]
        assert best.words["quaternion"] == "scalar last, maps body to reference"
        names = [name for finding in best.angles.fits for name in finding.reading.names]
        assert any("2-1-3 about moving axes" in name and f"matrix maps {way}" in name for name in names)
