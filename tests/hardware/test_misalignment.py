"""Misalignment into angles: the certified bound is reached, never passed, and linear theory agrees far from lock."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import HardwareError
from trunnion.hardware import misalignment
from trunnion.hardware.mounts import MountTolerance

LOCAL, BODY = Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down"))
ORDINARY = Convention("ordinary", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, ("heading", "elevation", "bank"))


@pytest.mark.parametrize(("elevation", "turn"), [(10, 0.5), (60, 0.5), (85, 2.0), (88, 1.9)])
def test_certified_bound_is_reached_by_a_search_with_scipys_angles_and_never_passed(elevation, turn):
    R = Rotation.from_euler("ZYX", np.radians([30, elevation, -20]))
    tau = np.radians(turn)
    bound = misalignment.worst_angle_errors(tau, np.radians(90 - elevation))

    def error(v, k):
        phi = tau * np.asarray(v) / np.linalg.norm(v)
        away = (R * Rotation.from_rotvec(phi)).as_euler("ZYX") - R.as_euler("ZYX")
        return np.abs((away[k] + np.pi) % (2 * np.pi) - np.pi)

    for k in range(3):
        best = max(
            -minimize(
                lambda v, k=k: -error(v, k), start, method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-13}
            ).fun
            for start in ([1, 0.2, 0.1], [0.1, 1, 0.3], [0.2, 0.1, -1])
        )
        assert best <= bound[k] + 1e-12
        assert best == pytest.approx(bound[k], rel=1e-5)


def test_a_turn_that_reaches_the_lock_leaves_the_outer_angles_open():
    np.testing.assert_array_equal(misalignment.worst_angle_errors(0.1, 0.1), [np.pi, 0.1, np.pi])


def test_three_routes_side_by_side(random_rotations):
    tolerance = MountTolerance(total=np.radians(0.5))
    R = random_rotations(60)
    errors = misalignment.angle_errors(tolerance, ORDINARY, R, np.eye(3), draws=3000)
    assert np.all(errors.monte_carlo <= errors.certified + 1e-12)
    assert np.all(errors.monte_carlo[[0, 2]] > 0.9 * errors.certified[[0, 2]])
    assert errors.vehicle == pytest.approx(np.radians(0.5))
    assert errors.linear[1] == pytest.approx(np.radians(0.5), rel=1e-9)


def test_covariance_gives_sigmas_that_random_draws_confirm(random_rotations):
    C = np.radians(np.diag([0.1, 0.2, 0.05])) ** 2
    R = Rotation.from_euler("ZYX", [0.3, 0.5, -0.2]).as_matrix()
    R_bn = random_rotations(1)[0]
    errors = misalignment.angle_errors(MountTolerance(covariance=C), ORDINARY, R, R_bn, draws=100)
    turns = np.random.default_rng(3).multivariate_normal(np.zeros(3), C, 20_000)
    drawn = (Rotation.from_matrix(R) * Rotation.from_rotvec(turns @ R_bn.T)).as_euler("ZYX") - [0.3, 0.5, -0.2]
    np.testing.assert_allclose(errors.sigma, np.std(drawn, axis=0), rtol=0.03)
    assert errors.certified is None


def test_per_axis_bounds_hold_for_components_and_for_turns_in_any_order(rng):
    """Corners and random points of the box, as one rotation vector and as three turns, composed by scipy."""
    bounds = np.radians([1.0, 20.0, 35.0])
    limit = MountTolerance(per_axis=tuple(bounds)).largest_turn
    largest = 0.0
    for _ in range(300):
        turns = bounds * np.sign(rng.normal(size=3)) * rng.choice([1.0, rng.random()])
        order = rng.permutation(3)
        composed = Rotation.from_euler("".join("xyz"[k] for k in order), turns[order]).magnitude()
        largest = max(largest, float(np.linalg.norm(turns)), composed)
    assert largest <= limit + 1e-12
    assert largest > 0.97 * limit


@pytest.mark.parametrize(
    "statement",
    [
        {"total": -0.1},
        {"per_axis": (0.1, np.nan, 0.1)},
        {"covariance": np.array([[1.0, 2, 0], [2, 1, 0], [0, 0, 1]])},
        {"covariance": np.array([[1.0, 2, 0], [0, 1, 0], [0, 0, 1]])},
    ],
)
def test_tolerances_that_are_none(statement):
    with pytest.raises(HardwareError):
        MountTolerance(**statement)


def test_growth_table_grows_as_one_over_sine():
    rows = misalignment.growth_towards_lock(np.radians(0.5), np.radians([60, 30, 10, 1, 0.4]))
    np.testing.assert_allclose([r.gain for r in rows], 1 / np.sin(np.radians([60, 30, 10, 1, 0.4])))
    assert all(row.certified >= row.linear for row in rows)
    assert rows[-1].certified == np.pi


def test_turn_with_probability_holds_for_random_draws(rng):
    C = np.diag([1.0, 1.0, 1.0]) * 1e-6
    turn = misalignment.turn_with_probability(C, 0.95)
    drawn = np.linalg.norm(rng.multivariate_normal(np.zeros(3), C, 20_000), axis=1)
    assert np.mean(drawn <= turn) == pytest.approx(0.95, abs=0.006)
    uneven = np.diag([1.0, 0.1, 0.1]) * 1e-6
    drawn = np.linalg.norm(rng.multivariate_normal(np.zeros(3), uneven, 5000), axis=1)
    assert np.mean(drawn <= misalignment.turn_with_probability(uneven, 0.95)) > 0.95
