"""Alignment surveys against scipy's align_vectors, planted outliers, and bad tables."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import HardwareError
from trunnion.hardware import mounts, surveys

ARCMIN = np.radians(1 / 60)


@pytest.fixture
def observed(rng, random_rotations):
    """Twelve directions seen with one arcminute in each of two components, the truth drawn by scipy."""
    R = random_rotations(1)[0]
    s = rng.normal(size=(12, 3))
    s /= np.linalg.norm(s, axis=1, keepdims=True)
    b = s @ R.T
    return R, b + rng.normal(size=b.shape) * ARCMIN, s


def test_fit_equals_scipy_and_the_residuals_agree_with_the_accuracy(observed):
    R, b, s = observed
    survey = surveys.survey_directions(b, s, ARCMIN)
    unit = b / np.linalg.norm(b, axis=1, keepdims=True)
    reference, _ = Rotation.align_vectors(unit, s)
    np.testing.assert_allclose(survey.R_bs, reference.as_matrix(), atol=1e-13, rtol=0)
    assert "agree" in survey.chi_square.words
    assert survey.chi_square.freedom == 21
    assert not survey.outliers.any()
    assert not survey.warnings
    error = Rotation.from_matrix(survey.R_bs @ R.T).as_rotvec()
    assert error @ np.linalg.solve(survey.covariance, error) < 16.3  # 99.9 % point, three degrees of freedom


def test_one_planted_outlier_is_flagged_alone(observed):
    _, b, s = observed
    b[4] = Rotation.from_rotvec([0, 20 * ARCMIN, 15 * ARCMIN]).apply(b[4])
    survey = surveys.survey_directions(b, s, ARCMIN)
    assert np.flatnonzero(survey.outliers).tolist() == [4]
    assert "larger" in survey.chi_square.words


def test_difference_from_the_drawing_is_judged_and_rounded_to_what_the_data_support(body, observed):
    R, b, s = observed
    turn = np.radians([0.0, 0.3, 0.0])
    drawing = mounts.Mount("plate", body, Rotation.from_rotvec(turn).as_matrix().T @ R, boresight="z")
    found = surveys.survey_directions(b, s, ARCMIN, drawing=drawing).difference
    assert found.significant
    assert found.decimals == 3  # sigma about 0.007 deg
    np.testing.assert_allclose(found.correction_deg, [0, 0.3, 0], atol=0.03)
    assert found.pointing.boresight <= found.pointing.total
    same = surveys.survey_directions(b, s, ARCMIN, drawing=mounts.Mount("plate", body, R)).difference
    assert not same.significant
    assert not np.any(same.correction_deg)


def test_nearly_parallel_directions_are_warned_of_and_parallel_ones_refused(rng):
    def survey(spread):
        s = np.array([[1, 0, 0], [np.cos(spread), np.sin(spread), 0]])
        return surveys.survey_directions(s, s, ARCMIN)

    assert "worse than the others" in survey(np.radians(5)).warnings[0]
    assert not survey(np.radians(60)).warnings
    with pytest.raises(HardwareError, match="fewer than two are independent"):
        survey(np.radians(0.1))
    with pytest.raises(HardwareError, match="fewer than two are independent"):
        surveys.survey_directions([[1, 0, 0], [-1, 0, 0], [1, 0, 0]], [[0, 1, 0], [0, -1, 0], [0, 1, 0]], ARCMIN)


@pytest.mark.parametrize(
    ("b", "s", "sigma", "message"),
    [
        ([[1, 0, 0]], [[1, 0, 0]], 1e-3, "one direction"),
        ([[1, 0, 0], [0, 1, 0]], [[1, 0, 0]], 1e-3, "pair them"),
        ([[1, 0, 0], [0, 0, 0]], [[1, 0, 0], [0, 1, 0]], 1e-3, "no direction"),
        ([[1, 0, 0], [0, 1, 0]], [[1, 0, 0], [0, 1, 0]], 0.0, "zero, negative"),
        ([[1, 0, 0], [0, 1, np.nan]], [[1, 0, 0], [0, 1, 0]], 1e-3, "no direction"),
    ],
)
def test_survey_tables_that_cannot_be_used(b, s, sigma, message):
    with pytest.raises(HardwareError, match=message):
        surveys.survey_directions(b, s, sigma)


def test_attitude_pairs_with_shared_and_unknown_reference(rng, random_rotations):
    R_bs = random_rotations(1)[0]
    host = random_rotations(8)
    noise = Rotation.from_rotvec(rng.normal(size=(8, 3)) * ARCMIN).as_matrix()
    shared = surveys.survey_attitudes(host, host @ R_bs @ noise, ARCMIN)
    assert Rotation.from_matrix(shared.R_bs @ R_bs.T).magnitude() < 4 * ARCMIN / np.sqrt(8) * np.sqrt(3)
    assert "agree" in shared.chi_square.words
    offset = random_rotations(1)[0]
    apart = surveys.survey_attitudes(host, offset @ host @ R_bs @ noise, ARCMIN, reference_shared=False)
    assert Rotation.from_matrix(apart.R_bs @ R_bs.T).magnitude() < 6 * ARCMIN
    host[3] = host[3] @ Rotation.from_rotvec([0.05, 0, 0]).as_matrix()
    spoiled = surveys.survey_attitudes(host, host @ R_bs @ noise, ARCMIN)
    assert not spoiled.outliers.any()  # a change of both sides is no outlier
    sensor = host @ R_bs @ noise
    sensor[5] = sensor[5] @ Rotation.from_rotvec([0.05, 0, 0]).as_matrix()
    assert np.flatnonzero(surveys.survey_attitudes(host, sensor, ARCMIN).outliers).tolist() == [5]


@pytest.mark.parametrize("kind", list(mounts.TiltType))
def test_clinometer_readings_give_the_mount_back(rng, kind):
    """Readings made from scipy rotations by plain trigonometry of each tilt type."""
    R_bs = Rotation.from_rotvec(np.radians([3.0, -2.0, 25.0])).as_matrix()
    up_b = np.array([[0.1, 0.2, 1], [-0.3, 0.2, 1], [0.3, -0.1, 1], [0.0, -0.4, 1]])
    up_b /= np.linalg.norm(up_b, axis=1, keepdims=True)
    up_s = up_b @ R_bs
    tilts = np.arcsin(up_s[:, :2]) if kind is mounts.TiltType.SINE else np.arctan2(up_s[:, :2], up_s[:, 2:])
    survey = surveys.survey_clinometer(up_b, tilts, ARCMIN, kind)
    np.testing.assert_allclose(survey.R_bs, R_bs, atol=1e-12, rtol=0)


def test_two_sine_tilts_no_attitude_gives_are_an_error():
    with pytest.raises(HardwareError, match="exceed what any attitude gives"):
        surveys.up_from_tilts(np.radians([60.0, 50.0]), mounts.TiltType.SINE)


@pytest.mark.parametrize(("sigma", "decimals"), [(0.013, 2), (0.0009, 4), (0.5, 1), (2.0, 0)])
def test_supported_decimals(sigma, decimals):
    """The last printed digit lies between a tenth of the standard deviation and the deviation (common practice)."""
    assert surveys.supported_decimals(sigma) == decimals
