"""Shares, demand, noise and ranking: what follows from a margin."""

import numpy as np
import pytest
from scipy.optimize import minimize
from scipy.spatial.transform import Rotation, Slerp

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about, quaternion_from_matrix
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.demand import demand_at, margin_for_acceleration, margin_for_rate, peak_demand
from trunnion.envelope.noise import mean_margin_found, noise_gain, outer_error_beyond
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


def _second_difference(sequence, E, rate, acceleration, h=1e-4):
    """Angle accelerations by scipy: angles at t = -h, 0, h of a body with this rate and acceleration at t = 0."""

    def angles(t):
        turn = Rotation.from_rotvec(rate * t + 0.5 * acceleration * t * t)
        return (turn * Rotation.from_matrix(E)).as_euler(sequence.name)

    before, now, after = angles(-h), angles(0.0), angles(h)
    steps = [np.angle(np.exp(1j * (one - other))) for one, other in ((after, now), (now, before))]
    return (steps[0] - steps[1]) / h**2, (steps[0] + steps[1]) / (2 * h)


@pytest.mark.parametrize("text", ["3-2-1", "3-1-3", "2-3-1"])
@pytest.mark.parametrize("margin_deg", [8.0, 35.0, 80.0])
def test_peak_rates_and_accelerations_are_attained_and_never_beaten(text, margin_deg):
    """Rates and accelerations of scipy's angles for bodies turning every way, and the worst of them."""
    rng = np.random.default_rng(32)
    sequence = Sequence.from_text(text)
    middle = d(margin_deg) if sequence.repeated else np.pi / 2 - d(margin_deg)
    E = Rotation.from_euler(sequence.name, [0.4, middle, -0.7]).as_matrix()
    w, alpha = 0.8, 0.5
    peak = demand_at(d(margin_deg), w, alpha)
    worst = np.zeros((2, 3))

    def fastest(x, which):
        rate = w * x[:3] / np.linalg.norm(x[:3])
        acceleration = alpha * x[3:] / np.linalg.norm(x[3:])
        return np.abs(_second_difference(sequence, E, rate, acceleration)[which])

    for which in (0, 1):
        for angle in range(3):
            for _ in range(3):
                found = minimize(lambda x, w=which, a=angle: -fastest(x, w)[a], rng.normal(size=6), method="Powell")
                worst[which, angle] = max(worst[which, angle], -found.fun)
    expected = np.array(
        [
            [peak.outer_acceleration, peak.middle_acceleration, peak.outer_acceleration],
            [peak.outer_rate, peak.middle_rate, peak.outer_rate],
        ]
    )
    assert np.all(worst <= expected * (1 + 1e-4))
    assert worst == pytest.approx(expected, rel=2e-3)


def test_azimuth_rate_near_the_zenith():
    """The keyhole formula of pointing mounts: azimuth rate = target rate / cos(elevation) (common practice)."""
    for elevation in d([0.0, 60.0, 85.0]):
        assert demand_at(np.pi / 2 - elevation, 0.1).outer_rate == pytest.approx(0.1 / np.cos(elevation), rel=1e-14)


def test_margin_a_rate_limit_needs():
    assert np.degrees(margin_for_rate(d(10.0), d(20.0))) == pytest.approx(30.0)
    margin = margin_for_acceleration(0.3, 0.2, 2.0)
    assert demand_at(margin, 0.3, 0.2).outer_acceleration == pytest.approx(2.0)
    with pytest.raises(RegionError, match="no margin keeps an angle rate"):
        margin_for_rate(2.0, 1.0)
    with pytest.raises(RegionError, match="no margin keeps an angle acceleration"):
        margin_for_acceleration(1.0, 1.0, 1.2)


def test_peak_demand_over_a_region(make_convention):
    cone = Cone([1, 0, 0], [1, 0, 0], 0.0, d(60.0))
    peak = peak_demand(cone, make_convention("3-2-1"), 1.0)
    assert peak.bound.outer_rate == pytest.approx(2.0)
    assert peak.bound.outer_rate >= peak.at_witness.outer_rate
    assert peak.basis is Basis.CERTIFIED


def test_noise_laws_against_monte_carlo_by_scipy(count):
    """10 deg of margin, linear law; 1 deg with 0.3 deg of noise, Rice and projected normal."""
    rng = np.random.default_rng(33)
    n = count(400_000)
    for margin, sigma in ((10.0, 1.0), (60.0, 1.0)):
        angles = _noisy_angles(rng, n, d(margin), d(sigma))
        gain = noise_gain(d(margin), d(sigma))
        assert gain.linear
        assert np.std(angles[:, 0]) == pytest.approx(gain.outer, rel=0.03)
        assert np.std(angles[:, 1]) == pytest.approx(gain.middle, rel=0.03)
        assert np.std(angles[:, 0] - angles[:, 2]) == pytest.approx(gain.combination, rel=0.03)
        assert np.corrcoef(angles[:, 0], angles[:, 2])[0, 1] == pytest.approx(gain.correlation, abs=0.02)
    angles = _noisy_angles(rng, n, d(1.0), d(0.3))
    assert np.mean(np.pi / 2 - np.abs(angles[:, 1])) == pytest.approx(mean_margin_found(d(1.0), d(0.3)), rel=3e-3)
    assert np.mean(np.abs(angles[:, 0]) > d(30.0)) == pytest.approx(
        outer_error_beyond(d(30.0), d(1.0), d(0.3)), abs=6e-3
    )
    assert not noise_gain(d(1.0), d(0.3)).linear


def _noisy_angles(rng, n, margin, sigma):
    """3-2-1 angles by scipy of an attitude at this margin disturbed by isotropic noise."""
    true = Rotation.from_euler("ZYX", [0.0, np.pi / 2 - margin, 0.0])
    return (Rotation.from_rotvec(rng.normal(size=(n, 3)) * sigma) * true).as_euler("ZYX")


def test_noise_laws_printed_values():
    """Four digits each, from a separate numerical integration; no publication."""
    assert np.degrees(mean_margin_found(d(1.0), d(0.3))) == pytest.approx(1.0462, abs=5e-5)
    assert outer_error_beyond(d(30.0), d(1.0), d(0.3)) == pytest.approx(0.0955, abs=5e-5)
    assert outer_error_beyond(0.0, d(1.0), d(0.3)) == pytest.approx(1.0, abs=1e-9)


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
