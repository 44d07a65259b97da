"""Angle errors of an attitude known to within a ball: never exceeded and nearly reached by scipy's angles."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.noise import linear_noise
from trunnion.attitude.sensitivity import angle_errors, decimals_known
from trunnion.errors import AttitudeError

DEG = np.pi / 180.0


@pytest.mark.parametrize("letters", ["ZYX", "XYZ", "ZXZ", "YXY", "zyx", "xyx"])
@pytest.mark.parametrize(("margin", "error"), [(40, 10), (10, 9), (3, 0.01), (60, 50), (5, 20), (80, 2)])
@pytest.mark.parametrize("lower", [False, True])
def test_bounds_against_scipys_angles(letters: str, margin: float, error: float, lower: bool) -> None:
    m, d = margin * DEG, error * DEG
    repeated = letters[0] == letters[2]
    middle = (np.pi - m if lower else m) if repeated else (m - np.pi / 2 if lower else np.pi / 2 - m)
    truth = np.array([0.4, middle, -0.9])
    axes = np.random.default_rng(30).normal(size=(30_000, 3))
    axes /= np.linalg.norm(axes, axis=1, keepdims=True)
    size = d * np.random.default_rng(31).choice([1.0, 0.98, 0.7], (30_000, 1))
    angles = (Rotation.from_rotvec(size * axes) * Rotation.from_euler(letters, truth)).as_euler(letters)
    change = np.angle(np.exp(1j * (angles - truth)))
    total, difference = (np.abs(np.angle(np.exp(1j * (change[:, 0] + s * change[:, 2])))).max() for s in (1, -1))
    bound = angle_errors(m, d)
    near, far = sorted((total, difference))
    found = (np.abs(change[:, 0]).max(), np.abs(change[:, 2]).max(), np.abs(change[:, 1]).max(), near, far)
    limits = (bound.outer, bound.outer, bound.middle, bound.combination, bound.other_combination)
    for value, limit in zip(found, limits, strict=True):
        assert value <= limit * (1 + 1e-9) + 1e-12
    # the middle angle folds at lock: with an error beyond the margin it moves less than the carried axis
    reached = zip(found, limits, strict=True) if d < m else zip(found[:2], limits[:2], strict=True)
    for value, limit in reached:
        assert value >= 0.94 * limit


def test_first_order_is_the_linear_noise_law() -> None:
    m, d = np.array([1.0, 10.0, 60.0]) * DEG, 1e-6
    bound, law = angle_errors(m, d), linear_noise(m, d)
    np.testing.assert_allclose(bound.outer, law.outer, rtol=1e-8)
    np.testing.assert_allclose(bound.combination, law.combination, rtol=1e-8)
    np.testing.assert_allclose(bound.middle, law.middle, rtol=1e-15)


def test_at_lock_only_the_combination_is_known() -> None:
    bound = angle_errors(0.0, 0.5 * DEG)
    assert bound.outer == bound.other_combination == np.pi
    assert bound.combination == pytest.approx(0.5 * DEG, rel=1e-12)
    exact = angle_errors(0.0, 0.0)
    assert exact.combination == exact.middle == 0.0
    assert exact.outer == np.pi


@pytest.mark.parametrize(
    ("error_deg", "decimals"),
    [(0.0, 15), (0.005, 2), (0.0051, 1), (0.05, 1), (0.4, 0), (0.6, -1), (5.0, -1), (30.0, -2)],
)
def test_decimals_that_mean_something(error_deg: float, decimals: int) -> None:
    assert decimals_known(error_deg * DEG) == decimals


def test_margins_and_errors_out_of_range_are_refused() -> None:
    with pytest.raises(AttitudeError, match="give both in rad"):
        angle_errors(10.0, 0.1)
