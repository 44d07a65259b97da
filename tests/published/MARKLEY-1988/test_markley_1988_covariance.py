"""Covariance of the fitted mount against scipy's sensitivity, the closed form, and random draws."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.hardware.surveys import covariance_of, survey_directions

CASES = {
    "square pair": ([[1, 0, 0], [0, 1, 0]], [1e-4, 3e-4], np.diag([9e-8, 1e-8, 9e-9])),
    "pair at 30 deg": (
        [[1, 0, 0], [np.sqrt(3) / 2, 0.5, 0]],
        [1e-4, 1e-4],
        [[7e-8, 1.732050807569e-8, 0], [1.732050807569e-8, 1e-8, 0], [0, 0, 5e-9]],
    ),
    "three directions": (
        [
            [0.2672612419124244, 0.5345224838248488, 0.8017837257372732],
            [-0.4364357804719848, 0.2182178902359924, 0.8728715609439696],
            [0.8864844143558726, -0.4432422071779363, 0.13297266215338088],
        ],
        [1e-4, 2e-4, 5e-4],
        [
            [1.003407399076e-8, 4.729279026677e-9, 7.638251633072e-9],
            [4.729279026677e-9, 2.254945234963e-8, 2.471707196406e-8],
            [7.638251633072e-9, 2.471707196406e-8, 4.969103240194e-8],
        ],
    ),
}
TEN_DIGITS = 1e-10


@pytest.mark.parametrize("name", CASES)
def test_covariance_cases(name):
    b, sigma, expected = CASES[name]
    P = covariance_of(b, sigma)
    np.testing.assert_allclose(P, expected, atol=TEN_DIGITS * np.max(np.abs(expected)), rtol=0)


@pytest.mark.parametrize("name", CASES)
def test_covariance_equals_scipys_sensitivity(name):
    """scipy documents sensitivity; times N / sum(1/sigma^2) it is the covariance for weights 1/sigma^2."""
    b, sigma, _ = CASES[name]
    weights = 1 / np.square(sigma)
    _, _, sensitivity = Rotation.align_vectors(b, b, weights=weights, return_sensitivity=True)
    theirs = sensitivity * len(b) / np.sum(weights)
    np.testing.assert_allclose(covariance_of(b, sigma), theirs, atol=1e-8 * np.max(theirs), rtol=0)


def test_random_draws_scatter_as_the_covariance_says(count):
    rng = np.random.default_rng(7)
    b = np.array(CASES["three directions"][0])
    sigma = np.array([1e-4, 2e-4, 5e-4])
    draws = count(20_000)
    turns = np.empty((draws, 3))
    for k in range(draws):
        noise = rng.normal(size=(3, 3)) * sigma[:, None]
        fitted = survey_directions(b, b + noise, sigma).R_bs if k < 5 else _scipy_fit(b, b + noise, sigma)
        turns[k] = Rotation.from_matrix(fitted).as_rotvec()
    P = covariance_of(b, sigma)
    scatter = turns.T @ turns / draws
    assert np.max(np.abs(scatter - P)) < 6 * np.max(P) / np.sqrt(draws)


def _scipy_fit(b, s, sigma):
    return Rotation.align_vectors(b, s, weights=1 / sigma**2)[0].as_matrix()
