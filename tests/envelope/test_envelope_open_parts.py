"""What has no closed form: two direction constraints at once, dispersion about some axes, zero on both sides.

Each is a bracket. Three named cases each: the bracket closes to 0.1 deg, and sampling by scipy never leaves it.
"""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import rotation_angle
from trunnion.envelope.axis_dispersion import (
    AxisDispersion,
    TurnSide,
    axis_dispersed_clearance,
    axis_dispersed_margin,
)
from trunnion.envelope.both_sides import best_zero_both_sides
from trunnion.envelope.constrained import Constrained, constrained_clearance, constrained_margin
from trunnion.envelope.margins import direction_clearance, entry_margin_table, lock_margin
from trunnion.envelope.regions import Box, Cone, Dispersed, Mounted, Poses, Union
from trunnion.envelope.sampling import sample_region
from trunnion.envelope.zero import Side, best_zero
from trunnion.errors import RegionError

d = np.radians
GAP = d(0.1)


def imaging():
    """Camera axis within 15 deg of down while the panel's normal keeps 20 … 60 deg from the Sun."""
    return Constrained(Cone([0, 0, 1], [0, 0, 1], 0.0, d(15.0)), (Cone([0, 1, 0], [0.3, 0.8, 0.2], d(20.0), d(60.0)),))


def star_tracker():
    """Nose within 30 deg of north while the tracker keeps at least 40 deg from down."""
    return Constrained(Cone([1, 0, 0], [1, 0, 0], 0.0, d(30.0)), (Cone([0, 1, 1], [0, 0, 1], d(40.0), np.pi),))


def survey(make_convention):
    """A cruise box whose nose also keeps within 40 deg of north-east."""
    box = Box(make_convention("3-2-1"), ((-np.pi, np.pi), (d(-20.0), d(25.0)), (d(-45.0), d(45.0))))
    return Constrained(box, (Cone([1, 0, 0], [1, 1, 0], 0.0, d(40.0)),))


def keeps(cone, R, slack=0.0):
    held = R @ cone.body_axis
    angle = np.arctan2(np.linalg.norm(np.cross(held, cone.reference_axis), axis=-1), held @ cone.reference_axis)
    return (angle >= cone.nearest - slack) & (angle <= cone.farthest + slack)


@pytest.mark.parametrize("name", ["imaging", "star tracker", "survey"])
def test_two_direction_constraints(make_convention, name):
    region = {"imaging": imaging, "star tracker": star_tracker, "survey": lambda: survey(make_convention)}[name]()
    R = sample_region(region.region, 65536).matrices
    R = R[np.all([keeps(cone, R) for cone in region.cones], axis=0)]
    for text in ("3-2-1", "2-3-1", "1-3-1"):
        convention = make_convention(text)
        margin = constrained_margin(region, convention, seconds=60.0)
        lines = convention.lock_margin(R)
        assert margin.least.hi - margin.least.lo <= GAP
        assert margin.largest.hi - margin.largest.lo <= GAP
        assert margin.least.lo <= lines.min()
        assert margin.largest.hi >= lines.max() - 1e-13
        assert margin.least.hi >= lines.min() - d(3.0)  # 65,000 points come this near
        assert margin.least.basis is Basis.CERTIFIED
        for extreme in (margin.least, margin.largest):
            assert all(keeps(cone, extreme.witness.matrix, 2e-9) for cone in region.cones)
            assert float(convention.lock_margin(extreme.witness.matrix)) == pytest.approx(
                extreme.witness.value, abs=1e-9
            )
    clearance = constrained_clearance(region, [1, 1, 0], [0, 1, 1], seconds=60.0)
    pointing = np.arccos(np.clip(R @ np.array([1, 1, 0]) / np.sqrt(2) @ np.array([0, 1, 1]) / np.sqrt(2), -1, 1))
    assert clearance.least.lo <= pointing.min()
    assert clearance.largest.hi >= pointing.max()
    assert clearance.least.hi - clearance.least.lo <= GAP
    assert clearance.largest.hi - clearance.largest.lo <= GAP


def test_constraint_by_hand():
    """Nose on the horizon's north, within 20 deg; starboard at least 60 deg from down: wing up to 30 deg down."""
    region = Constrained(Cone([1, 0, 0], [1, 0, 0], 0.0, 0.0), (Cone([0, 1, 0], [0, 0, 1], d(60.0), np.pi),))
    clearance = constrained_clearance(region, [0, 1, 0], [0, 0, 1], tolerance=d(0.01))
    assert np.degrees(clearance.least.lo) == pytest.approx(60.0, abs=0.011)
    assert np.degrees(clearance.largest.hi) == pytest.approx(180.0, abs=0.011)


def test_constraints_that_contradict_each_other(make_convention):
    region = Constrained(Cone([1, 0, 0], [1, 0, 0], 0.0, 0.1), (Cone([0, 1, 0], [1, 0, 0], 0.0, 0.1),))
    with pytest.raises(RegionError, match="no attitude keeps all the constraints"):
        constrained_margin(region, make_convention("3-2-1"))


def test_gap_stays_a_gap_when_time_runs_out(make_convention):
    margin = constrained_margin(imaging(), make_convention("2-3-1"), tolerance=1e-9, seconds=0.05)
    assert margin.least.hi - margin.least.lo > 1e-9
    assert margin.least.lo <= constrained_margin(imaging(), make_convention("2-3-1")).least.hi


def dispersions(make_convention):
    """Pitch only in cruise; pitch and yaw in hover; about north and east in a narrow box."""
    convention = make_convention("3-2-1")
    cruise = Box(convention, ((-np.pi, np.pi), (d(-20.0), d(25.0)), (d(-45.0), d(45.0))))
    hover = Cone([1, 0, 0], [0, 0, -1], 0.0, d(10.0))
    narrow = Box(convention, ((d(10.0), d(50.0)), (d(20.0), d(40.0)), (d(-10.0), d(5.0))))
    return {
        "pitch in cruise": AxisDispersion(cruise, [[0, 1, 0]], [d(5.0)]),
        "pitch and yaw in hover": AxisDispersion(hover, np.eye(3)[1:], [d(3.0), d(1.0)]),
        "north and east": AxisDispersion(narrow, np.eye(3)[:2], [d(4.0), d(2.0)], TurnSide.REFERENCE),
    }


@pytest.mark.parametrize("name", ["pitch in cruise", "pitch and yaw in hover", "north and east"])
def test_dispersion_about_some_axes(make_convention, name):
    region = dispersions(make_convention)[name]
    R = sample_region(region.region, 8192).matrices
    rng = np.random.default_rng(71)
    t = rng.uniform(-1, 1, (len(R), len(region.limits)))
    t = np.where(rng.uniform(size=t.shape) < 0.4, np.sign(t), t) * region.limits
    turns = Rotation.from_rotvec(t @ region.axes).as_matrix()
    turned = R @ turns if region.side is TurnSide.BODY else turns @ R
    for text in ("3-2-1", "3-1-2"):
        convention = make_convention(text)
        margin = axis_dispersed_margin(region, convention, seconds=60.0)
        lines = convention.lock_margin(turned)
        assert margin.least.lo <= lines.min() + 1e-13
        assert margin.largest.hi >= lines.max() - 1e-13
        assert margin.least.hi - margin.least.lo <= GAP
        assert margin.largest.hi - margin.largest.lo <= GAP
        ball = lock_margin(Dispersed(region.region, float(np.linalg.norm(region.limits))), convention)
        assert margin.least.hi >= ball.least.lo - 1e-12
        value = float(convention.lock_margin(margin.least.witness.matrix))
        assert value == pytest.approx(margin.least.witness.value, abs=1e-12)


def test_pitch_dispersion_by_hand(make_convention):
    """Level wings, nose up to 25 deg high, 5 deg of pitch: 60 deg left; bank costs nothing, unlike a ball's 40."""
    region = dispersions(make_convention)["pitch in cruise"]
    assert np.degrees(axis_dispersed_margin(region, make_convention("3-2-1")).least.lo) == pytest.approx(60.0, abs=0.06)
    wing = axis_dispersed_margin(region, make_convention("3-1-2"))
    assert np.degrees(wing.least.lo) == pytest.approx(45.0, abs=0.06)
    clearance = axis_dispersed_clearance(region, [1, 0, 0], [0, 0, -1])
    assert np.degrees(clearance.least.lo) == pytest.approx(60.0, abs=0.06)
    assert np.degrees(clearance.largest.hi) == pytest.approx(115.0, abs=0.06)


def test_dispersion_about_no_axis_is_refused():
    pose = Poses(np.eye(3))
    with pytest.raises(RegionError, match="one limit for each"):
        AxisDispersion(pose, np.eye(3), [0.1, 0.2])
    with pytest.raises(RegionError, match="outside 0 deg to 90 deg"):
        AxisDispersion(pose, [[1, 0, 0]], [2.0])


def test_zero_on_both_sides_of_listed_poses(make_convention):
    """Never below one side alone, never beaten by random pairs; constants are rotations that give the margin."""
    R = Rotation.from_rotvec(np.random.default_rng(72).normal(size=(25, 3)) * 0.5).as_matrix()
    convention = make_convention("3-2-1")
    both = best_zero_both_sides(Poses(R), convention, gap=d(0.5), seconds=60.0)
    assert both.finished
    for side in Side:
        assert both.upper >= best_zero(Poses(R), convention, side).margin.least.lo - 1e-12
        assert both.margin.least.lo >= best_zero(Poses(R), convention, side).margin.least.lo - d(0.5)
    rng = np.random.default_rng(73)
    u, v = rng.normal(size=(2, 3, 4000))
    u, v = u / np.linalg.norm(u, axis=0), v / np.linalg.norm(v, axis=0)
    cosines = np.abs(np.einsum("im,nij,jm->nm", u, R, v))
    assert np.arccos(cosines.max(axis=0)).max() <= both.upper + 1e-12
    assert lock_margin(Poses(R), both.convention).least.lo == pytest.approx(both.margin.least.lo, abs=1e-14)
    assert rotation_angle(both.convention.left @ both.convention.left.T, np.eye(3)) < 1e-12


@pytest.mark.full
@pytest.mark.parametrize("name", ["poses", "tail-sitter", "box"])
def test_zero_on_both_sides_closes_to_a_tenth_of_a_degree(make_convention, tail_sitter, name):
    """40 scattered poses; hover, transition and cruise; a box of limited heading. The gap is stated either way."""
    ranges = tuple(tuple(d(span)) for span in ([-40, 60], [-25, 35], [-40, 40]))
    region = {
        "poses": Poses(Rotation.from_rotvec(np.random.default_rng(1).normal(size=(40, 3)) * 0.6).as_matrix()),
        "tail-sitter": tail_sitter,
        "box": Box(make_convention("3-2-1"), ranges),
    }[name]
    both = best_zero_both_sides(region, make_convention("3-2-1"), seconds=30.0)
    assert both.finished
    assert both.gap <= GAP + 1e-9
    assert both.upper >= both.margin.least.lo
    if name == "tail-sitter":
        assert np.degrees(both.margin.least.lo) == pytest.approx(45.0, abs=0.1)


def test_clearance_of_constrained_agrees_with_the_cone_alone():
    """A constraint that never binds changes nothing."""
    cone = Cone([1, 0, 0], [0, 0, -1], d(5.0), d(20.0))
    loose = Constrained(cone, (Cone([1, 0, 0], [0, 0, -1], 0.0, d(100.0)),))
    exact = direction_clearance(cone, [1, 0, 1], [1, 0, 0])
    bracket = constrained_clearance(loose, [1, 0, 1], [1, 0, 0])
    assert bracket.least.lo <= exact.least.hi
    assert bracket.least.hi >= exact.least.lo - 1e-9
    assert bracket.largest.hi >= exact.largest.lo
    assert bracket.largest.lo <= exact.largest.hi + 1e-9


def test_open_parts_inside_unions_and_balls(make_convention):
    """A bracketed region may be a phase, be dispersed and be mounted like any other; all routes agree."""
    convention = make_convention("3-1-2")
    inner = Constrained(Cone([0, 0, 1], [0, 0, 1], 0.0, d(15.0)), (Cone([0, 1, 0], [0.3, 0.8, 0.2], 0.0, d(60.0)),))
    alone, spread = constrained_margin(inner, convention), lock_margin(inner, convention)
    assert spread.least.lo == pytest.approx(alone.least.lo, abs=d(0.03))
    assert spread.largest.hi == pytest.approx(alone.largest.hi, abs=d(0.03))
    ball = lock_margin(Dispersed(inner, d(2.0)), convention)
    assert ball.least.lo == pytest.approx(spread.least.lo - d(2.0), abs=1e-12)
    other = AxisDispersion(Cone([1, 0, 0], [1, 0, 0], 0.0, d(5.0)), np.eye(3)[1:2], np.array([d(3.0)]))
    both = lock_margin(Union({"near": inner, "far": other}), convention).least
    assert both.lo == min(spread.least.lo, lock_margin(other, convention).least.lo)
    turned = lock_margin(Mounted(inner, np.eye(3)[[1, 0, 2]] * np.array([[1], [-1], [1]])), convention)
    assert turned.least.hi - turned.least.lo <= d(0.05)
    assert entry_margin_table(other).least.shape == (3, 3)


def test_samples_of_open_parts_keep_their_limits():
    inner = Constrained(Cone([0, 0, 1], [0, 0, 1], 0.0, d(15.0)), (Cone([0, 1, 0], [0, 1, 0], d(10.0), d(60.0)),))
    held = sample_region(inner, 2048).matrices[:, 1, 1]
    assert len(held) >= 200
    assert (held <= np.cos(d(10.0)) + 1e-12).all()
    assert (held >= np.cos(d(60.0)) - 1e-12).all()
    nodding = AxisDispersion(Poses(np.eye(3)[None]), np.eye(3)[1:2], np.array([d(4.0)]))
    turns = Rotation.from_matrix(sample_region(nodding, 64).matrices).as_rotvec(degrees=True)
    assert np.abs(turns[:, [0, 2]]).max() < 1e-12
    assert np.abs(turns[:, 1]).max() <= 4.0
