"""Margins of an invented tail-sitter and of simple regions, each derived by hand beside the check.

Values: derived here by hand, no publication.
"""

import numpy as np
import pytest

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about
from trunnion.envelope.margins import direction_clearance, entry_margin_table, lock_margin
from trunnion.envelope.regions import Box, Cone, Dispersed, Mounted, Poses, Referred, Union

BOUND = 1e-12  # deg, the claimed rounding bound


def degrees(extreme):
    return np.degrees(extreme.lo), np.degrees(extreme.hi)


def assert_is(extreme, value):
    """The bracket holds the value and is no wider than the claimed rounding bound on either side."""
    lo, hi = degrees(extreme)
    assert lo <= value + 1e-13
    assert hi >= value - 1e-13
    assert hi - lo <= 2.0 * BOUND + 1e-13


def test_nose_up_hover_locks_the_ordinary_convention(tail_sitter, make_convention):
    margin = lock_margin(tail_sitter, make_convention("3-2-1"))
    assert margin.least.lo == 0.0
    assert_is(margin.least, 0.0)
    assert margin.least.governing == ("hover", "transition")
    assert margin.least.basis is Basis.CERTIFIED


@pytest.mark.parametrize("a", [30.0, 35.0, 40.0, 45.0, 50.0])
def test_last_axis_turned_below_the_nose(tail_sitter, make_convention, a):
    """The carried axis a deg below the nose: hover leaves a - 10, transition min(a, 90 - a), cruise 70 - a."""
    nose_lowered = make_convention("3-2-1", right=about([0.0, 1.0, 0.0], np.radians(a)))
    margin = lock_margin(tail_sitter, nose_lowered)
    assert_is(margin.least, min(a - 10.0, min(a, 90.0 - a), 70.0 - a))


def test_best_lowered_nose_is_a_tie_of_hover_and_cruise(tail_sitter, make_convention):
    nose_lowered = make_convention("3-2-1", right=about([0.0, 1.0, 0.0], np.radians(40.0)))
    margin = lock_margin(tail_sitter, nose_lowered)
    assert_is(margin.least, 30.0)
    assert margin.least.governing == ("hover", "cruise")


def test_wing_last_is_governed_by_cruise_bank(tail_sitter, make_convention):
    margin = lock_margin(tail_sitter, make_convention("3-1-2"))
    assert_is(margin.least, 45.0)
    assert margin.least.governing == ("cruise",)
    assert np.degrees(margin.least.witness.value) == pytest.approx(45.0, abs=1e-10)


def test_largest_margin_of_level_flight_is_a_right_angle(tail_sitter, make_convention):
    assert_is(lock_margin(tail_sitter, make_convention("3-2-1")).largest, 90.0)


def test_unit_stood_on_end_is_locked_in_cruise_and_clear_in_hover(tail_sitter, make_convention):
    """The unit's z points forward, its x up: in level flight its x axis is vertical; in hover 80 deg away."""
    R_bs = np.array([[0.0, 0.0, 1.0], [0.0, 1.0, 0.0], [-1.0, 0.0, 0.0]])
    convention = make_convention("3-2-1")
    assert_is(lock_margin(Mounted(tail_sitter.parts["cruise"], R_bs), convention).least, 0.0)
    assert_is(lock_margin(Mounted(tail_sitter.parts["hover"], R_bs), convention).least, 80.0)


def test_cone_and_dispersion_add_up(make_convention):
    """A cone of 10 deg followed by any turn of 4 deg is the cone of 14 deg."""
    d = np.radians
    narrow = Dispersed(Cone([1, 0, 0], [0, 0, -1], 0.0, d(10.0)), d(4.0))
    wide = Cone([1, 0, 0], [0, 0, -1], 0.0, d(14.0))
    for text in ("3-1-2", "3-2-1", "1-2-3", "3-1-3"):
        one, other = lock_margin(narrow, make_convention(text)), lock_margin(wide, make_convention(text))
        assert one.least.lo == pytest.approx(other.least.lo, abs=1e-14)
        assert one.largest.hi == pytest.approx(other.largest.hi, abs=1e-14)


def test_cone_of_30_deg_about_a_perpendicular_direction_leaves_60(make_convention):
    cone = Cone([1, 0, 0], [1, 0, 0], 0.0, np.radians(30.0))
    assert_is(lock_margin(cone, make_convention("3-2-1")).least, 60.0)


def test_clearance_of_a_boresight_in_a_box(make_convention):
    """Elevation -20 … 25, bank 0: the nose stays 65 … 110 deg from up."""
    box = Box(make_convention("3-2-1"), ((-3.0, 3.0), tuple(np.radians([-20.0, 25.0])), (0.0, 0.0)))
    clearance = direction_clearance(box, [1, 0, 0], [0, 0, -1])
    assert_is(clearance.least, 65.0)
    assert_is(clearance.largest, 110.0)


def test_wrapped_range_is_the_short_way_through_half_a_turn(make_convention):
    convention = make_convention("3-2-1")
    box = Box(convention, (tuple(np.radians([170.0, -170.0])), (0.0, 0.0), (0.0, 0.0)))
    clearance = direction_clearance(box, [1, 0, 0], [1, 0, 0])
    assert_is(clearance.least, 170.0)
    assert_is(clearance.largest, 180.0)


def test_signs_and_offsets_of_the_convention_move_the_box(make_convention):
    """Elevation counted downwards from 10 deg: stated 0 … 30 is a nose 10 … -20 deg high."""
    turned = make_convention("3-2-1", signs=(1, -1, 1), offsets=(0.0, np.radians(10.0), 0.0))
    box = Box(turned, ((0.0, 0.0), (0.0, np.radians(30.0)), (0.0, 0.0)))
    clearance = direction_clearance(box, [1, 0, 0], [0, 0, -1])
    assert_is(clearance.least, 80.0)
    assert_is(clearance.largest, 110.0)


def test_referred_and_mounted_are_what_conventions_with_constants_say(make_convention, random_rotation, tail_sitter):
    rng = np.random.default_rng(7)
    A, B = random_rotation(rng), random_rotation(rng)
    with_constants = lock_margin(tail_sitter, make_convention("2-3-1", left=A, right=B))
    seen_from = lock_margin(Referred(Mounted(tail_sitter, B.T), A.T), make_convention("2-3-1"))
    assert with_constants.least.lo == pytest.approx(seen_from.least.lo, abs=1e-14)
    assert with_constants.largest.hi == pytest.approx(seen_from.largest.hi, abs=1e-14)


def test_table_of_nine_agrees_with_single_margins(tail_sitter, make_convention, random_rotation):
    from trunnion.attitude.sequences import Sense, Sequence

    rng = np.random.default_rng(8)
    A, B = random_rotation(rng), random_rotation(rng)
    table = entry_margin_table(tail_sitter, A, B)
    for sequence in Sequence:
        for sense in Sense:
            single = lock_margin(tail_sitter, make_convention(sequence.value, sense, left=A, right=B))
            assert table.of(sequence, sense).least.lo == pytest.approx(single.least.lo, abs=1e-14)


def test_poses_with_ball(make_convention):
    poses = Poses([np.eye(3), about([0, 1, 0], 0.6)], radius=0.1)
    margin = lock_margin(poses, make_convention("3-2-1"))
    assert margin.least.lo == pytest.approx(np.pi / 2 - 0.7, abs=1e-13)
    assert margin.least.witness.value == pytest.approx(np.pi / 2 - 0.7, abs=1e-13)
    assert margin.largest.hi == pytest.approx(np.pi / 2, abs=1e-13)
    nested = lock_margin(Union({"a": poses, "b": Poses(np.eye(3))}), make_convention("3-2-1"))
    assert nested.least.governing == ("a",)
