"""Noise near lock against scipy.stats and Monte Carlo; rate and acceleration demand against scipy's angles."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from scipy.spatial.transform import Rotation

from trunnion.attitude.demand import (
    acceleration_demand,
    margin_for_acceleration,
    margin_for_rate,
    rate_demand,
)
from trunnion.attitude.noise import (
    chance_first_angle_off,
    chance_margin_below,
    linear_noise,
    mean_margin_read,
)
from trunnion.errors import AttitudeError

DEG = np.pi / 180.0


def noisy_angles(
    letters: str, margin: float, sigma: float, draws: int, body_side: bool
) -> tuple[np.ndarray, np.ndarray]:
    """Errors (draws, 3) of scipy's angles under isotropic noise, and the margins read; seeds fixed."""
    repeated = letters[0] == letters[2]
    truth = np.array([0.4, margin if repeated else np.pi / 2 - margin, -0.9])
    noise = Rotation.from_rotvec(np.random.default_rng(8).normal(scale=sigma, size=(draws, 3)))
    attitude = Rotation.from_euler(letters, truth)
    angles = (attitude * noise if body_side else noise * attitude).as_euler(letters)
    read = angles[:, 1] if repeated else np.pi / 2 - angles[:, 1]
    return np.angle(np.exp(1j * (angles - truth))), read


@pytest.mark.parametrize("letters", ["ZYX", "XYZ", "ZXZ", "YXY"])
@pytest.mark.parametrize("margin", [10 * DEG, 60 * DEG])
@pytest.mark.parametrize("body_side", [True, False])
def test_linear_law_against_monte_carlo(letters: str, margin: float, body_side: bool) -> None:
    sigma = 0.1 * DEG
    error, _ = noisy_angles(letters, margin, sigma, 20_000, body_side)
    law = linear_noise(margin, sigma)
    assert law.holds
    sampling = 0.02  # four standard deviations of a standard deviation of 20 000 draws
    assert np.std(error[:, 0]) == pytest.approx(law.outer, rel=sampling)
    assert np.std(error[:, 2]) == pytest.approx(law.outer, rel=sampling)
    assert np.std(error[:, 1]) == pytest.approx(law.middle, rel=sampling)
    correlation = np.corrcoef(error[:, 0], error[:, 2])[0, 1]
    assert abs(correlation) == pytest.approx(law.correlation, abs=sampling)
    known = error[:, 0] - np.sign(correlation) * error[:, 2]
    assert np.std(known) == pytest.approx(law.combination, rel=sampling)


def test_margin_read_is_rice_distributed_against_scipy() -> None:
    ratio = np.array([0.01, 0.3, 1.0, 3.0, 10.0])
    np.testing.assert_allclose(mean_margin_read(ratio, 1.0), scipy.stats.rice.mean(ratio), rtol=1e-12)
    for share in (0.3, 0.9, 1.2, 3.0):
        ours = chance_margin_below(share * ratio, ratio, 1.0)
        np.testing.assert_allclose(ours, scipy.stats.rice.cdf(share * ratio, ratio), rtol=0, atol=1e-12)
    assert mean_margin_read(300.0, 1.0) == pytest.approx(300.0 + 1 / 600.0, rel=1e-9)  # first terms of the series


@pytest.mark.parametrize("letters", ["ZYX", "ZYZ"])
def test_beyond_the_linear_law_against_monte_carlo(letters: str) -> None:
    """Margin 1 deg, noise 0.3 deg: mean margin 1.0462 deg, first angle off by over 30 deg in 9.55 %."""
    margin, sigma, draws = 1.0 * DEG, 0.3 * DEG, 100_000
    error, read = noisy_angles(letters, margin, sigma, draws, body_side=True)
    assert not linear_noise(margin, sigma).holds
    # scipy folds the margin at lock: its distance from the singular value is what is read
    assert np.mean(np.abs(read)) == pytest.approx(mean_margin_read(margin, sigma), rel=0.004)
    assert mean_margin_read(margin, sigma) / DEG == pytest.approx(1.0462, abs=1e-4)
    for by in (30 * DEG, 90 * DEG):
        chance = chance_first_angle_off(by, margin, sigma)
        assert np.mean(np.abs(error[:, 0]) > by) == pytest.approx(chance, abs=4 * np.sqrt(chance / draws))
    assert chance_first_angle_off(30 * DEG, margin, sigma) == pytest.approx(0.0955, abs=1e-4)


def test_first_angle_is_nearly_uniform_for_noise_of_three_margins() -> None:
    for by in (0.5, 1.5, 2.5):
        chance = chance_first_angle_off(by, 1.0, 3.0)
        assert chance == pytest.approx(1.0 - by / np.pi, abs=0.14)
        assert chance_first_angle_off(by, 1.0, 1e6) == pytest.approx(1.0 - by / np.pi, abs=1e-5)
    assert chance_first_angle_off(np.pi, 1.0, 1.0) == 0.0


def test_noise_without_size_and_impossible_angles_are_refused() -> None:
    with pytest.raises(AttitudeError, match="positive standard deviation"):
        linear_noise(0.1, 0.0)
    with pytest.raises(AttitudeError, match="more than 0 and at most 180 deg"):
        chance_first_angle_off(4.0, 0.1, 0.1)


def second_derivatives(letters: str, margin: float, w: np.ndarray, a: np.ndarray) -> np.ndarray:
    """Angle accelerations (n, 3) by central differences of scipy's angles along motions with body rate w + a t."""
    repeated = letters[0] == letters[2]
    start = Rotation.from_euler(letters, [0.4, margin if repeated else np.pi / 2 - margin, -0.9])
    step = 2e-4 * margin

    def angles(t: float) -> np.ndarray:
        # Magnus series of dR/dt = R (w + a t) to third order: w t + a t^2/2 + (w x a) t^3/12
        turn = w * t + a * t**2 / 2 + np.cross(w, a) * t**3 / 12
        return (start * Rotation.from_rotvec(turn)).as_euler(letters)

    before, at, after = angles(-step), angles(0.0), angles(step)
    return (np.angle(np.exp(1j * (after - at))) - np.angle(np.exp(1j * (at - before)))) / step**2


@pytest.mark.parametrize("letters", ["ZYX", "XYZ", "ZXZ", "YXY", "zyx", "xzx"])
@pytest.mark.parametrize("margin", [5 * DEG, 30 * DEG, 75 * DEG])
def test_acceleration_demand_is_the_least_upper_bound(letters: str, margin: float) -> None:
    """Random motions of body rate 1 and acceleration 0.7 never exceed the demand and come close to it."""
    rng = np.random.default_rng(15)
    w, a = (v / np.linalg.norm(v, axis=1, keepdims=True) for v in rng.normal(size=(2, 15_000, 3)))
    quadratic = second_derivatives(letters, margin, w, 0.0 * a)
    linear = second_derivatives(letters, margin, 1e-3 * w, a)
    demand, at_rest = acceleration_demand(margin, 1.0, 0.0), acceleration_demand(margin, 0.0, 1.0)
    for n, (bound, still) in enumerate(
        zip((demand.outer, demand.middle, demand.outer), (at_rest.outer, at_rest.middle, at_rest.outer), strict=True)
    ):
        largest = np.abs(quadratic[:, n]).max()
        assert 0.96 * bound <= largest <= bound * (1 + 1e-4)
        assert 0.98 * still <= np.abs(linear[:, n]).max() <= still * (1 + 1e-3)
    both = acceleration_demand(margin, 1.0, 0.7)
    assert both.outer == pytest.approx(demand.outer + 0.7 * at_rest.outer)
    assert both.middle == pytest.approx(demand.middle + 0.7 * at_rest.middle)


@pytest.mark.parametrize("letters", ["ZYX", "ZXZ", "xyz"])
@pytest.mark.parametrize("margin", [2 * DEG, 40 * DEG])
def test_rate_demand_against_differences_of_scipys_angles(letters: str, margin: float) -> None:
    repeated = letters[0] == letters[2]
    start = Rotation.from_euler(letters, [0.4, margin if repeated else np.pi / 2 - margin, -0.9])
    w = np.random.default_rng(16).normal(size=(10_000, 3))
    w /= np.linalg.norm(w, axis=1, keepdims=True)
    step = 1e-5 * margin
    ahead, behind = ((start * Rotation.from_rotvec(sign * step * w)).as_euler(letters) for sign in (1, -1))
    rates = np.abs(np.angle(np.exp(1j * (ahead - behind)))).max(axis=0) / (2 * step)
    demand = rate_demand(margin, 1.0)
    for found, bound in zip(rates, (demand.outer, demand.middle, demand.outer), strict=True):
        assert 0.98 * bound <= found <= bound * (1 + 1e-6)


def test_margins_that_limits_need() -> None:
    need = margin_for_rate(20.0, 60.0)
    assert need == pytest.approx(np.arcsin(1 / 3))
    assert rate_demand(need, 20.0).outer == pytest.approx(60.0)
    need = margin_for_acceleration(0.5, 1.0, 4.0)
    assert acceleration_demand(need, 0.5, 1.0).outer <= 4.0
    assert acceleration_demand(need - 1e-9, 0.5, 1.0).outer > 4.0
    with pytest.raises(AttitudeError, match="no margin is enough"):
        margin_for_rate(20.0, 10.0)
    with pytest.raises(AttitudeError, match="not met at any margin"):
        margin_for_acceleration(1.0, 1.0, 0.9)
    with pytest.raises(AttitudeError, match="between 0 and 90 deg"):
        rate_demand(2.0, 1.0)


def test_demand_at_lock_and_at_rest() -> None:
    assert np.isinf(rate_demand(0.0, 1.0).outer)
    assert rate_demand(0.0, 0.0).outer == 0.0
    assert np.isinf(acceleration_demand(0.0, 1.0, 0.0).outer)
    assert acceleration_demand(0.0, 0.0, 0.0).outer == 0.0
    assert acceleration_demand(np.pi / 2, 1.0, 0.0).outer == pytest.approx(0.5)
