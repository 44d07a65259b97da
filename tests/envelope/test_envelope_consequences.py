"""Shares, demand and ranking: what follows from a margin."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation, Slerp

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about, quaternion_from_matrix
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.demand import peak_demand
from trunnion.envelope.ranking import AXIS_PAIRS, rank_sequences
from trunnion.envelope.regions import Box, Cone, Dispersed, Mounted, Poses, Track, Union
from trunnion.envelope.sampling import sample_region
from trunnion.envelope.shares import shares_near_lock, time_within
from trunnion.errors import RegionError

d = np.radians


def random_track(rng, rows, size, **more):
    steps = Rotation.from_rotvec(rng.normal(size=(rows, 3)) * size)
    path = [steps[0]]
    for step in steps[1:]:
        path.append(path[-1] * step)
    q = np.roll(Rotation.concatenate(path).as_quat(), 1, axis=1)
    return Track(np.cumsum(rng.uniform(0.5, 1.5, rows)), q, **more)


def test_share_of_time_against_dense_scipy_slerp(make_convention, count):
    rng = np.random.default_rng(31)
    for n in range(count(60)):
        track = random_track(rng, 20, 0.5 if n % 2 else 0.05)
        convention = make_convention(list(Sequence)[n % 12].value)
        times = np.linspace(track.times[0], track.times[-1], 40001)
        R = Slerp(track.times, Rotation.from_quat(np.roll(track.quaternions, -1, axis=1)))(times).as_matrix()
        margins = convention.lock_margin(R)
        for distance in d([5.0, 20.0, 45.0, 80.0]):
            assert time_within(track, convention, distance) == pytest.approx(np.mean(margins <= distance), abs=2e-3)


def test_constant_spin_share_by_hand(make_convention):
    """The nose goes round a meridian through up: within 10 deg of the line for 40 of 360 deg."""
    q = quaternion_from_matrix(np.stack([about([0, 1, 0], d(30.0) * n) for n in range(13)]))
    shares = shares_near_lock(Track(np.arange(13.0), q), make_convention("3-2-1"), d([10.0]))
    assert shares[0].lo == pytest.approx(40.0 / 360.0, abs=1e-13)
    assert shares[0].basis is Basis.MEASURED


def test_attitude_error_brackets_the_share(make_convention):
    q = quaternion_from_matrix(np.stack([about([0, 1, 0], d(30.0) * n) for n in range(13)]))
    track = Track(np.arange(13.0), q, attitude_error=d(2.0))
    share = shares_near_lock(track, make_convention("3-2-1"), d([10.0]))[0]
    assert (share.lo, share.hi) == pytest.approx((32.0 / 360.0, 48.0 / 360.0), abs=1e-13)
    assert share.basis is Basis.CERTIFIED


def test_share_of_a_box_states_its_rule(make_convention):
    """Heading any, elevation 0 … 90: a tenth lies within 9 deg of up, by the rule uniform in angles."""
    box = Box(make_convention("3-2-1"), ((-np.pi, np.pi), (0.0, np.pi / 2), (0.0, 0.0)))
    share = shares_near_lock(box, make_convention("3-2-1"), d([9.0]))[0]
    assert share.lo == pytest.approx(0.1, abs=1e-3)
    assert share.basis is Basis.SAMPLED
    assert "uniform in the stated angles" in share.rule


def test_samples_lie_in_their_region():
    cone = Cone([1, 2, 0], [0, 0, -1], 0.2, 0.5)
    held = sample_region(cone, 4096).matrices @ cone.body_axis
    angle = np.arccos(held @ cone.reference_axis)
    assert angle.min() >= 0.2 - 1e-12
    assert angle.max() <= 0.5 + 1e-12
    assert np.mean(np.cos(angle)) == pytest.approx(0.5 * (np.cos(0.2) + np.cos(0.5)), abs=1e-3)
    ball = sample_region(Dispersed(Mounted(Poses(np.eye(3)), np.eye(3)), 0.3))
    assert np.all(Rotation.from_matrix(ball.matrices).magnitude() <= 0.3 + 1e-12)
    with pytest.raises(RegionError, match="no measure common"):
        sample_region(Union({"a": cone}))


def test_peak_demand_over_a_region(make_convention):
    """A cone that leaves 30 deg: outer rates double, by scipy's angles of a body turning the worst way."""
    cone = Cone([1, 0, 0], [1, 0, 0], 0.0, d(60.0))
    peak = peak_demand(cone, make_convention("3-2-1"), 1.0)
    assert peak.outer_rate == pytest.approx((2.0, 2.0))
    assert peak.outer_rate[0] <= peak.outer_rate[1]
    assert peak.basis is Basis.CERTIFIED
    E = Rotation.from_matrix(peak.margin.witness.matrix)
    rng = np.random.default_rng(32)
    ways = rng.normal(size=(20_000, 3))
    ways /= np.linalg.norm(ways, axis=1)[:, None]
    h = 1e-6
    turned = (Rotation.from_rotvec(ways * h) * E).as_euler("ZYX") - E.as_euler("ZYX")
    rates = np.abs(turned - 2 * np.pi * np.round(turned / (2 * np.pi))) / h
    assert rates[:, [0, 2]].max() == pytest.approx(2.0, rel=1e-2)
    assert rates[:, [0, 2]].max() <= 2.0 * (1 + 1e-4)


def test_peak_demand_at_lock_is_without_bound(make_convention):
    everywhere = Cone([1, 0, 0], [0, 0, 1], 0.0, d(10.0))
    assert peak_demand(everywhere, make_convention("3-2-1"), 1.0).outer_rate[1] == np.inf


def test_nine_pairs_serve_twelve_sequences_twice():
    moving = [s for row in AXIS_PAIRS for pair in row for s in pair.moving]
    fixed = [s for row in AXIS_PAIRS for pair in row for s in pair.fixed]
    assert sorted(s.name for s in moving) == sorted(s.name for s in fixed) == sorted(s.name for s in Sequence)
    for i in range(3):
        for k in range(3):
            assert len(AXIS_PAIRS[i][k].moving) == (2 if i == k else 1)


def test_pair_words(local, body):
    assert AXIS_PAIRS[2][0].words(local, body) == "locks when the vehicle's forward axis lies along the down/up line"


def test_ranking_of_the_tail_sitter(tail_sitter):
    """Wing last is best of the twelve about moving axes with 45 deg; ordinary 3-2-1 is among those with none."""
    ranked = rank_sequences(tail_sitter)
    assert [row.sequence for row in ranked if row.rank == 1] == [Sequence.ZXY]
    assert np.degrees(ranked[0].margin.least.lo) == pytest.approx(45.0)
    assert next(row for row in ranked if row.sequence is Sequence.ZYX).margin.least.lo == 0.0
    assert len(ranked) == 12
    fixed = rank_sequences(tail_sitter, sense=Sense.FIXED)
    assert {row.sequence for row in fixed if row.rank == 1} == {Sequence.YXZ}
