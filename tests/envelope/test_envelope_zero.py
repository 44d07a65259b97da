"""Where zero should be: check values, optimality against scipy, both sides, right angles, the rule of thumb."""

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.spatial.transform import Rotation

from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.attitude.rotations import about, rotation_angle
from trunnion.envelope.farthest import farthest_line, line_margin
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Box, Cone, Dispersed, Poses
from trunnion.envelope.zero import (
    Side,
    best_right_angle_zero,
    best_zero,
    rule_of_thumb,
    sampled_zero_upper,
)
from trunnion.errors import RegionError

d = np.radians
GOLDEN = 0.5 * (1.0 + np.sqrt(5.0))
ICOSAHEDRON = np.array(
    [[0, 1, GOLDEN], [0, 1, -GOLDEN], [1, GOLDEN, 0], [1, -GOLDEN, 0], [GOLDEN, 0, 1], [-GOLDEN, 0, 1]]
) / np.hypot(1.0, GOLDEN)
CUBE = np.array([[1, 1, 1], [1, 1, -1], [1, -1, 1], [-1, 1, 1]]) / np.sqrt(3.0)


@pytest.mark.parametrize(
    ("points", "expected"),
    [
        (np.eye(3), np.arccos(1 / np.sqrt(3))),  # 54.735610317 deg
        (CUBE, np.arccos(1 / np.sqrt(3))),
        (ICOSAHEDRON, np.arctan(3.0 - np.sqrt(5.0))),  # 37.377368141 deg
        (np.eye(3)[:2], np.pi / 2),
        (np.eye(3)[:1], np.pi / 2),
    ],
)
def test_farthest_line_of_regular_sets(points, expected):
    """Half a cube's diagonal angle; 37.377368141 deg from the icosahedron's diagonals (classical polyhedra)."""
    assert farthest_line(points).margin == pytest.approx(expected, abs=1e-10)


def test_listed_attitudes_against_scipy_multistart(count):
    """No direction that scipy finds is farther away."""
    rng = np.random.default_rng(51)
    for n in range(count(60)):
        points = Rotation.random(30 + 10 * n, random_state=n).as_matrix()[:, :, 0]
        if n % 2:
            points = points[points[:, 2] > 0.6] if np.count_nonzero(points[:, 2] > 0.6) else points
        ours = farthest_line(points)
        assert line_margin(points, ours.direction) == pytest.approx(ours.margin, abs=1e-14)
        for _ in range(20):
            found = minimize(
                lambda x, p=points: np.abs(p @ (x / np.linalg.norm(x))).max(), rng.normal(size=3), method="Nelder-Mead"
            )
            assert np.arccos(found.fun) <= ours.margin + 1e-7


def test_exchange_equals_the_full_hull():
    """20,000 points of a box: growing a small subset gives what the hull of all gives."""
    from trunnion.envelope.farthest import facets

    rng = np.random.default_rng(52)
    angles = rng.uniform(-1, 1, (20_000, 3)) * [1.5, 0.5, 0.7]
    points = Rotation.from_euler("ZYX", angles).as_matrix()[:, :, 2]
    normals, _, _ = facets(points)
    assert farthest_line(points).margin == pytest.approx(line_margin(points, normals[0]), abs=1e-12)


def test_nearly_flat_sets():
    rng = np.random.default_rng(53)
    circle = rng.uniform(0, 2 * np.pi, 300)
    for height in (0.0, 1e-15, 1e-12, 1e-9, 1e-4):
        points = np.stack([np.cos(circle), np.sin(circle), height * rng.normal(size=300)], axis=1)
        points /= np.linalg.norm(points, axis=1)[:, None]
        assert farthest_line(points).margin == pytest.approx(np.pi / 2, abs=5 * height + 1e-9)


def test_no_directions():
    with pytest.raises(RegionError, match="no directions"):
        farthest_line(np.zeros((0, 3)))


@pytest.mark.parametrize("side", list(Side))
@pytest.mark.parametrize("text", ["3-2-1", "2-3-2"])
def test_listed_poses_give_the_exact_optimum_and_a_convention_that_has_it(make_convention, side, text):
    R = (Rotation.from_rotvec(np.random.default_rng(54).normal(size=(40, 3)) * 0.3)).as_matrix()
    choice = best_zero(Poses(R, d(2.0)), make_convention(text), side)
    assert choice.finished
    assert choice.gap <= 1e-11
    assert choice.margin.least.lo == pytest.approx(choice.upper, abs=1e-11)
    again = lock_margin(Poses(R, d(2.0)), choice.convention)
    assert again.least.lo == pytest.approx(choice.upper, abs=1e-11)
    assert sampled_zero_upper(Poses(R), make_convention(text), side) == pytest.approx(choice.upper + d(2.0), abs=1e-11)


@pytest.mark.parametrize(
    ("text", "side", "expected"),
    [
        ("3-2-1", Side.REFERENCE, 55.0),  # pitch reaches 35 deg: 90 - 35
        ("3-1-2", Side.REFERENCE, 50.0),  # bank reaches 40 deg: 90 - 40
        ("2-1-3", Side.REFERENCE, 38.8664226),  # arccos(cos 25 … ) corner of the box, see the closed form
    ],
)
def test_box_with_any_heading(make_convention, text, side, expected):
    """Heading any, elevation -25 … 35, bank -40 … 40; closed form as test, gap at most 0.01 deg."""
    box = Box(make_convention("3-2-1"), tuple(tuple(d(span)) for span in ([-180, 180], [-25, 35], [-40, 40])))
    choice = best_zero(box, make_convention(text), side, seconds=20.0)
    assert choice.finished
    assert np.degrees(choice.gap) <= 0.01
    assert np.degrees(choice.margin.least.lo) == pytest.approx(expected, abs=0.01)
    assert np.degrees(choice.upper) >= expected - 1e-6


def test_cone_of_30_deg_leaves_60(make_convention):
    """Any line across a cone of 30 deg is 60 deg from it, and none is better."""
    cone = Cone([1, 0, 0], [0, 0, -1], 0.0, d(30.0))
    choice = best_zero(cone, make_convention("3-2-1"), Side.REFERENCE)
    assert np.degrees(choice.margin.least.lo) == pytest.approx(60.0, abs=0.01)
    assert np.degrees(choice.upper) >= 60.0 - 1e-9


def test_present_zero_is_kept_when_it_is_as_good_as_any(make_convention):
    cone = Cone([1, 0, 0], [1, 0, 0], 0.0, d(30.0))
    choice = best_zero(cone, make_convention("3-2-1"), Side.REFERENCE)
    assert choice.turn == pytest.approx(0.0, abs=d(0.02))


def test_dispersion_comes_off(make_convention):
    cone = Dispersed(Cone([1, 0, 0], [0, 0, -1], 0.0, d(25.0)), d(5.0))
    choice = best_zero(cone, make_convention("3-2-1"), Side.REFERENCE)
    assert np.degrees(choice.margin.least.lo) == pytest.approx(60.0, abs=0.01)


def test_region_that_covers_every_direction_keeps_a_stated_gap(make_convention):
    """Nothing helps; the answer is a bracket from 0 to a few degrees, not a point."""
    every = Cone([1, 0, 0], [1, 0, 0], 0.0, np.pi)
    choice = best_zero(every, make_convention("3-2-1"), Side.REFERENCE, seconds=0.3)
    assert choice.margin.least.lo == 0.0
    assert not choice.finished
    assert choice.gap == pytest.approx(choice.upper)


def test_right_angle_choices_are_the_best_entry_of_a_line(tail_sitter, make_convention):
    """On the body side of 3-2-1 the wing is best, 45 deg; all 24 reach three lines."""
    choices = best_right_angle_zero(tail_sitter, make_convention("3-2-1"), Side.BODY)
    assert [round(float(np.degrees(c.margin.least.lo)), 9) for c in choices] == [45.0, 0.0, 0.0]
    assert np.degrees(choices[0].turn) == pytest.approx(90.0)
    assert choices[0].gap == 0.0
    assert len(right_angle_rotations()) == 24
    for Q in right_angle_rotations():
        assert np.linalg.det(Q) == pytest.approx(1.0)


def test_loss_around_the_optimum(make_convention):
    """A single pose, lock line a right angle away: turning it towards the pose costs rad for rad, along it nothing."""
    choice = best_zero(Poses(np.eye(3)), make_convention("3-2-1"), Side.REFERENCE)
    mildest, worst = choice.loss
    assert worst == pytest.approx(1.0, abs=1e-6)
    assert mildest == pytest.approx(0.0, abs=1e-6)


def test_turn_is_the_smallest_that_moves_the_lock_line(make_convention):
    choice = best_zero(Poses(about([0, 1, 0], 1.2)), make_convention("3-2-1"), Side.REFERENCE)
    assert choice.turn == pytest.approx(float(rotation_angle(choice.convention.left, np.eye(3))), abs=1e-12)
    assert choice.turn == pytest.approx(1.2, abs=1e-9)


def test_rule_of_thumb(make_convention):
    """Level flight suits 3-2-1 and not 3-1-3; common practice, no source."""
    assert rule_of_thumb(make_convention("3-2-1"), np.eye(3)).kept
    assert not rule_of_thumb(make_convention("3-1-3"), np.eye(3)).kept
    assert "does not keep" in rule_of_thumb(make_convention("3-1-3"), np.eye(3)).statement()
