"""The worked pointing budget of annex C, its input distributions and its Rayleigh factors."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from trunnion.errors import HardwareError
from trunnion.hardware import budgets
from trunnion.hardware.mounts import MountTolerance

UNIT_OF_LAST_DIGIT = 0.0101  # arcsec; rows and totals print two decimals
ARCSEC = np.radians(1 / 3600)


@pytest.fixture(scope="module")
def budget() -> budgets.Budget:
    with (Path(__file__).parent / "contributors.csv").open() as table:
        rows = list(csv.DictReader(table))
    terms = tuple(
        budgets.Term(
            row["name"],
            "sensor",
            "ECSS-E-ST-60-10C annex C",
            tuple(budgets.gaussian(0.0, float(row[axis]) * ARCSEC) for axis in "xyz"),
            counts_in=tuple(row["counts"].split()),
        )
        for row in rows
    )
    return budgets.Budget(("x", "y", "z"), terms)


@pytest.mark.parametrize(
    ("index", "sigma", "doubled", "limit", "met"),
    [
        ("APE", (13.51, 8.37, 8.61), (27.01, 16.75, 17.21), (60, 20, 20), (True, True, True)),
        ("RPE", (10.70, 6.89, 6.28), (21.40, 13.78, 12.57), (30, 10, 10), (True, False, False)),
    ],
)
def test_annex_c_totals_and_compliance(budget, index, sigma, doubled, limit, met):
    total = budget.total(index, n_sigma=2.0, limit=np.array(limit) * ARCSEC)
    np.testing.assert_allclose(total.sigma / ARCSEC, sigma, atol=UNIT_OF_LAST_DIGIT, rtol=0)
    np.testing.assert_allclose(total.total / ARCSEC, doubled, atol=UNIT_OF_LAST_DIGIT, rtol=0)
    assert total.within == met


def test_annex_c_input_distributions():
    assert budgets.gaussian(1, 3).rms == pytest.approx(3.16, abs=0.005)
    flat = budgets.uniform(0, 4)
    assert (flat.mean, flat.sigma, flat.rms) == pytest.approx((2, 1.15, 2.31), abs=0.005)
    assert budgets.uniform(-5, 5).sigma == pytest.approx(2.89, abs=0.005)
    assert budgets.sinusoid(1.0).sigma == pytest.approx(1 / np.sqrt(2), abs=1e-15)


def test_rayleigh_factor_as_printed_and_against_scipy():
    assert budgets.rayleigh_factor(0.95) == pytest.approx(2.45, abs=0.005)
    assert budgets.rayleigh_factor(0.9973) == pytest.approx(3.44, abs=0.005)
    for chance in (0.683, 0.95, 0.9545, 0.99, 0.9973):
        assert budgets.rayleigh_factor(chance) == pytest.approx(stats.rayleigh.ppf(chance), abs=1e-12)


def test_directional_error_sums_means_and_sigmas_apart(budget):
    """sqrt(mean_A^2 + mean_B^2) + n sqrt(sigma_A^2 + sigma_B^2), clause on directional errors."""
    total = budget.total("APE")
    expected = 2 * np.hypot(total.sigma[0], total.sigma[1])
    assert budgets.directional_total(total, "x", "y") == pytest.approx(expected, rel=1e-15)


def test_fully_correlated_terms_add_linearly():
    def term(name, mark):
        return budgets.Term(name, "mount", "drawing", (budgets.gaussian(1.0, 3.0),), correlated=mark)

    independent = budgets.Budget(("x",), (term("a", None), term("b", None))).total(n_sigma=1)
    together = budgets.Budget(("x",), (term("a", "plate"), term("b", "plate"))).total(n_sigma=1)
    assert independent.sigma[0] == pytest.approx(np.sqrt(18))
    assert together.sigma[0] == pytest.approx(6.0)
    assert together.mean[0] == independent.mean[0] == 2.0


@pytest.mark.parametrize("limit", [0.0, -1.0, [1.0, 0.0, 1.0]])
def test_a_limit_of_zero_is_an_error(budget, limit):
    with pytest.raises(HardwareError, match="zero or below"):
        budget.total(limit=limit)


def test_a_term_without_source_is_an_error():
    with pytest.raises(HardwareError, match="no source"):
        budgets.Budget(("x",), (budgets.Term("a", "mount", "", (budgets.bounded(1.0),)),))


def test_mount_and_timing_terms_enter_as_bounds():
    """A bound counts as a uniform spread in squares (annex C treats misalignment so) and fully in the arithmetic
    sum.
    """
    mount = budgets.mount_term("plate", MountTolerance(total=5 * ARCSEC), "drawing")
    timing = budgets.timing_term("clock", (0.01, 0.0, 0.02), 1e-3, "test report")
    both = budgets.Budget(("x", "y", "z"), (mount, timing)).total()
    np.testing.assert_allclose(both.sigma[1] / ARCSEC, 2.89, atol=0.005)
    generous = budgets.Budget(("x", "y", "z"), (mount, timing)).total(n_sigma=3)
    np.testing.assert_allclose(generous.arithmetic, 5 * ARCSEC + np.array([1e-5, 0, 2e-5]), rtol=1e-12)
