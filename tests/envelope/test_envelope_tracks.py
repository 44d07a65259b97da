"""Tracks: exact in continuous time under slerp, floors under a body rate, and what is refused."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation, Slerp

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about, quaternion_from_matrix
from trunnion.envelope.floors import direction_floor, simple_floor
from trunnion.envelope.margins import direction_clearance, entry_margin_table, lock_margin
from trunnion.envelope.regions import Between, Track
from trunnion.envelope.subdivision import self_check
from trunnion.envelope.tracks import track_report
from trunnion.errors import RegionError


def walk(rng, rows, size):
    """A random path by scipy, scalar first, with random signs of the quaternions."""
    steps = Rotation.from_rotvec(rng.normal(size=(rows, 3)) * size)
    path = [Rotation.random(random_state=int(rng.integers(2**31)))]
    for step in steps[1:]:
        path.append(path[-1] * step)
    q = np.roll(Rotation.concatenate(path).as_quat(), 1, axis=1)
    return np.arange(float(rows)), q * rng.choice([-1.0, 1.0], rows)[:, None]


def dense(track, per_step):
    """scipy's Slerp at many instants, as matrices."""
    times = np.linspace(track.times[0], track.times[-1], (len(track.times) - 1) * per_step + 1)
    slerp = Slerp(track.times, Rotation.from_quat(np.roll(track.quaternions, -1, axis=1)))
    return times, slerp(times).as_matrix()


def table_of(R):
    """Nine line angles of scipy's matrices (n, 3, 3, 3)."""
    entry = np.abs(R)
    rest = np.sqrt(np.stack([entry[:, 1] ** 2 + entry[:, 2] ** 2, entry[:, 0] ** 2 + entry[:, 2] ** 2,
                             entry[:, 0] ** 2 + entry[:, 1] ** 2], axis=1))  # fmt: skip
    return np.arctan2(rest, entry)


@pytest.mark.parametrize("size", [1e-9, 1e-5, 0.002, 0.05, 0.4])
def test_slerp_extremes_against_dense_scipy_slerp(size, count):
    """Never above 1,000 instants a step, and below them by no more than their spacing allows."""
    rng = np.random.default_rng(21)
    for _ in range(count(30)):
        times, q = walk(rng, 14, size)
        track = Track(times, q, Between.SLERP, attitude_error=0.0)
        table = entry_margin_table(track)
        sampled = table_of(dense(track, 1000)[1])
        spacing = track_report(track).largest_step / 1000
        assert np.all(table.least <= sampled.min(axis=0) + 1e-14)
        assert np.all(table.least >= sampled.min(axis=0) - spacing - 1e-13)
        assert np.all(table.largest >= sampled.max(axis=0) - 1e-14)
        assert np.all(table.largest <= sampled.max(axis=0) + spacing + 1e-13)


def test_slerp_witness_time_by_scipy(make_convention, count):
    rng = np.random.default_rng(22)
    for _ in range(count(100)):
        times, q = walk(rng, 40, 0.3)
        track = Track(times, q, Between.SLERP, attitude_error=0.0)
        slerp = Slerp(times, Rotation.from_quat(np.roll(track.quaternions, -1, axis=1)))
        table = entry_margin_table(track)
        for i in range(3):
            for k in range(3):
                for extreme in (table.ranges[i][k].least, table.ranges[i][k].largest):
                    R = slerp(extreme.witness.time).as_matrix()
                    assert np.allclose(R, extreme.witness.matrix, rtol=0.0, atol=1e-12)
                    assert extreme.lo - 1e-14 <= extreme.witness.value <= extreme.hi + 1e-14


def test_long_slow_and_fast_tracks_need_every_screening_road(make_convention):
    """Thousands of rows: tumbling, hardly moving, standing still, and with repeated rows."""
    rng = np.random.default_rng(23)
    convention = make_convention("3-2-1")
    for size, rows in ((0.003, 5000), (1e-6, 3000), (0.0, 500), (0.6, 700)):
        times, q = walk(rng, rows, size)
        q[10:20] = q[10]
        track = Track(times, q, Between.SLERP, attitude_error=0.0)
        margin = lock_margin(track, convention)
        check = self_check(track, convention, tolerance=np.radians(1e-5))
        assert check.finished
        assert check.lo - 1e-13 <= margin.least.hi
        assert margin.least.lo <= check.hi + 1e-13
        sampled = table_of(dense(track, 8)[1])[:, 2, 0]
        assert margin.least.lo <= sampled.min() + 1e-14
        assert margin.largest.hi >= sampled.max() - 1e-14


def test_spin_between_rows_is_seen(make_convention):
    """50 deg a row about a tilted axis: the rows alone are degrees too good."""
    spin = np.stack([about([0.1, 0.2, 1.0], np.radians(50.0) * n) for n in range(8)])
    q = quaternion_from_matrix(spin @ about([0, 1, 0], 1.2))
    convention = make_convention("3-1-2")
    exact = lock_margin(Track(np.arange(8.0), q, Between.SLERP, attitude_error=0.0), convention)
    rows = lock_margin(Track(np.arange(8.0), q, Between.SAMPLES, attitude_error=0.0), convention)
    assert exact.least.lo < rows.least.lo
    assert rows.least.basis is Basis.SAMPLED


def test_log_without_error_statement_is_measured_and_with_it_a_ball_comes_off(make_convention):
    rng = np.random.default_rng(24)
    times, q = walk(rng, 30, 0.02)
    convention = make_convention("3-2-1")
    recorded = lock_margin(Track(times, q), convention)
    stated = lock_margin(Track(times, q, attitude_error=np.radians(1.0)), convention)
    assert recorded.least.basis is Basis.MEASURED
    assert stated.least.basis is Basis.CERTIFIED
    assert stated.least.lo == pytest.approx(recorded.least.lo - np.radians(1.0), abs=1e-14)
    assert stated.least.witness.value == pytest.approx(stated.least.lo, abs=1e-12)


@pytest.mark.parametrize(
    ("m0", "m1", "azimuth", "way", "simple", "sharp"),
    [
        (20.0, 18.0, 5.0, 10.0, 14.000, 14.050),
        (20.0, 20.0, 30.0, 12.0, 14.000, 16.171),
        (20.0, 20.0, 60.0, 22.0, 9.000, 12.567),
        (20.0, 20.0, 60.0, 30.0, 5.000, 6.123),
    ],
)
def test_direction_floor_values(m0, m1, azimuth, way, simple, sharp):
    """Three decimals, from a separate computation of the ellipse's distance; no publication."""
    d = np.radians
    u = np.array([[0.0], [0.0], [1.0]])
    start = np.array([[np.sin(d(m0))], [0.0], [np.cos(d(m0))]])
    stop = np.array([[np.sin(d(m1)) * np.cos(d(azimuth))], [np.sin(d(m1)) * np.sin(d(azimuth))], [np.cos(d(m1))]])
    reach = np.array([d(way)])
    assert np.degrees(simple_floor(d(np.array([m0])), d(np.array([m1])), reach))[0] == pytest.approx(simple, abs=5e-4)
    assert np.degrees(direction_floor(start, stop, reach, u))[0] == pytest.approx(sharp, abs=5e-4)


def test_direction_floor_is_never_above_a_reachable_point(count):
    """Points c with distances to the two ends adding up to at most the way: none is nearer than the floor."""
    rng = np.random.default_rng(25)
    for _ in range(count(500)):
        w = rng.normal(size=(3, 3))
        start, stop, u = (x / np.linalg.norm(x) for x in w)
        if rng.uniform() < 0.5:
            stop = start + 0.1 * rng.normal(size=3)
            stop /= np.linalg.norm(stop)
        way = np.arccos(np.clip(start @ stop, -1, 1)) * (1.0 + 10.0 ** rng.uniform(-9, 0)) + 1e-12
        c = rng.normal(size=(4000, 3)) * 0.3 + 0.5 * (start + stop)
        c /= np.linalg.norm(c, axis=1)[:, None]
        reachable = c[np.arccos(np.clip(c @ start, -1, 1)) + np.arccos(np.clip(c @ stop, -1, 1)) <= way]
        floor = direction_floor(start[:, None], stop[:, None], np.array([way]), u[:, None])[0]
        simple = simple_floor(np.arccos(start @ u), np.arccos(stop @ u), way)
        assert floor >= simple - 1e-13
        if len(reachable):
            assert floor <= np.arccos(np.clip(reachable @ u, -1, 1)).min() + 1e-12


def test_rate_limited_track_brackets_any_motion_between_the_rows(make_convention, count):
    """A fine path keeps a rate; every 20th row of it, with that rate stated, must bound the whole path."""
    rng = np.random.default_rng(26)
    convention = make_convention("3-2-1")
    for _ in range(count(50)):
        times, q = walk(rng, 401, 0.005)
        fine = Track(times, q, Between.SLERP, attitude_error=0.0)
        rate = track_report(fine).largest_step
        coarse = Track(times[::20], q[::20], Between.RATE_LIMITED, max_rate=rate, attitude_error=0.0)
        whole, bound = lock_margin(fine, convention), lock_margin(coarse, convention)
        assert bound.least.basis is Basis.CERTIFIED
        assert bound.least.lo <= whole.least.lo + 1e-13
        assert bound.largest.hi >= whole.largest.hi - 1e-13
        assert bound.least.hi >= bound.least.lo


def test_rate_limited_track_with_an_error_of_its_rows(make_convention, count):
    """Rows off by up to 1 deg each its own way: the bound still holds for the true path between them."""
    rng = np.random.default_rng(28)
    convention = make_convention("3-2-1")
    for _ in range(count(50)):
        times, q = walk(rng, 201, 0.005)
        fine = Track(times, q, Between.SLERP, attitude_error=0.0)
        rate = track_report(fine).largest_step
        axis = rng.normal(size=(11, 3))
        off = Rotation.from_rotvec(np.radians(1.0) * axis / np.linalg.norm(axis, axis=1)[:, None])
        recorded = (Rotation.from_quat(np.roll(q[::20], -1, axis=1)) * off).as_quat()
        rows = np.roll(recorded, 1, axis=1)
        coarse = Track(times[::20], rows, Between.RATE_LIMITED, max_rate=rate, attitude_error=np.radians(1.0))
        whole, bound = lock_margin(fine, convention), lock_margin(coarse, convention)
        assert bound.least.lo <= whole.least.lo + 1e-13
        assert bound.largest.hi >= whole.largest.hi - 1e-13


def test_rate_contradicted_by_the_rows_names_them():
    q = quaternion_from_matrix(np.stack([about([0, 0, 1], t) for t in (0.0, 0.1, 0.9, 1.0)]))
    with pytest.raises(RegionError, match="between rows 2 and 3 the body turns faster than the stated maximum"):
        Track(np.arange(4.0), q, Between.RATE_LIMITED, max_rate=0.2)


def test_gap_is_a_finding_and_is_not_joined(make_convention):
    """Two level rows with a long gap; under slerp across it the nose would pass through the vertical."""
    q = quaternion_from_matrix(np.stack([about([0, 1, 0], t) for t in (0.0, 0.1, 3.0, 3.1)]))
    times = np.array([0.0, 1.0, 60.0, 61.0])
    joined = lock_margin(Track(times, q), make_convention("3-2-1"))
    apart = Track(times, q, longest_gap=5.0)
    margin = lock_margin(apart, make_convention("3-2-1"))
    assert joined.least.lo == 0.0
    assert margin.least.lo == pytest.approx(3.0 - np.pi / 2, abs=1e-12)
    assert any("rows 2 and 3 are 59 apart" in line for line in track_report(apart).findings())


def test_sign_flips_are_counted_and_change_nothing(make_convention):
    rng = np.random.default_rng(27)
    times, q = walk(rng, 50, 0.1)
    straight = q.copy()
    for n in range(1, 50):
        straight[n] *= np.sign(straight[n] @ straight[n - 1])
    flipped = straight * np.where(np.arange(50) % 2, -1.0, 1.0)[:, None]
    assert track_report(Track(times, straight)).sign_flips == 0
    assert track_report(Track(times, flipped)).sign_flips == 49
    one = lock_margin(Track(times, straight), make_convention("3-2-1"))
    other = lock_margin(Track(times, flipped), make_convention("3-2-1"))
    assert one.least.lo == pytest.approx(other.least.lo, abs=1e-15)


def test_step_near_half_a_turn_is_flagged():
    q = quaternion_from_matrix(np.stack([about([0, 0, 1], t) for t in (0.0, np.radians(175.0))]))
    report = track_report(Track(np.arange(2.0), q))
    assert report.near_half_turn == (1,)
    assert "nearly half a turn" in report.findings()[0]


def test_single_row_is_a_track(make_convention):
    track = Track([0.0], [[1.0, 0.0, 0.0, 0.0]])
    assert lock_margin(track, make_convention("3-2-1")).least.lo == pytest.approx(np.pi / 2, abs=1e-13)
    assert direction_clearance(track, [1, 0, 0], [0, 1, 0]).least.lo == pytest.approx(np.pi / 2, abs=1e-13)
