"""Campaign reductions: the same answer however the rows are cut, whoever reduces them, and as often as one likes."""

import multiprocessing
import pickle
from concurrent.futures import ProcessPoolExecutor
from functools import partial

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.basis import Basis
from trunnion.envelope.campaign import (
    Part,
    Plan,
    gathered,
    merged,
    reduce_campaign,
    reduce_chunk,
    reduce_chunks,
    reduce_part,
)
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Between, Track
from trunnion.errors import RegionError


def rows(seed, count, size=0.03):
    rng = np.random.default_rng(seed)
    steps = Rotation.from_rotvec(rng.normal(size=(count, 3)) * size)
    path = [Rotation.random(random_state=seed)]
    for step in steps[1:]:
        path.append(path[-1] * step)
    q = np.roll(Rotation.concatenate(path).as_quat(), 1, axis=1) * rng.choice([-1.0, 1.0], count)[:, None]
    return np.cumsum(rng.uniform(0.5, 1.5, count)), q


def read_pieces(source):
    """A reader other processes can import: (seed, count, start, stop) in chunks of 37 rows."""
    seed, count, start, stop = source
    times, q = rows(seed, count)
    for at in range(start, stop, 37):
        yield times[at : min(at + 37, stop)], q[at : min(at + 37, stop)]


def same(one, other):
    assert np.allclose(one.spread.lo, other.spread.lo, rtol=0.0, atol=1e-14)
    assert np.allclose(one.spread.hi, other.spread.hi, rtol=0.0, atol=1e-14)
    assert np.allclose(one.histogram, other.histogram, rtol=0.0, atol=1e-9)
    assert (one.rows, one.sign_flips, one.gaps) == (other.rows, other.sign_flips, other.gaps)
    assert one.joined_time == pytest.approx(other.joined_time)


@pytest.mark.parametrize("between", [Between.SLERP, Between.SAMPLES])
def test_cutting_anywhere_changes_nothing(make_convention, between, count):
    plan = Plan.of([make_convention(text) for text in ("3-2-1", "3-1-2", "3-1-3")], between=between)
    rng = np.random.default_rng(61)
    for seed in range(count(50)):
        times, q = rows(seed, 120)
        whole = reduce_chunk((times, q), plan)
        cuts = np.sort(rng.integers(0, 121, 6))
        same(whole, reduce_chunks(zip(np.split(times, cuts), np.split(q, cuts), strict=True), plan))


def test_merging_is_associative(make_convention):
    plan = Plan.of([make_convention("3-2-1")], longest_gap=1.4)
    times, q = rows(3, 90)
    a, b, c = (reduce_chunk((times[part], q[part]), plan) for part in (slice(0, 30), slice(30, 50), slice(50, 90)))
    same(merged(merged(a, b, plan), c, plan), merged(a, merged(b, c, plan), plan))


def test_reduction_is_the_lock_margin_of_the_track(make_convention):
    convention = make_convention("3-2-1")
    plan = Plan.of([convention], attitude_error=0.01)
    times, q = rows(4, 200)
    campaign = gathered({"run": reduce_chunk((times, q), plan)}, plan)
    margin = lock_margin(Track(times, q, attitude_error=0.01), convention)
    found = campaign.margins["3-2-1"]
    assert found.least.lo == pytest.approx(margin.least.lo, abs=1e-15)
    assert found.largest.hi == pytest.approx(margin.largest.hi, abs=1e-15)
    assert found.least.witness.time == pytest.approx(margin.least.witness.time)
    assert found.least.basis is Basis.CERTIFIED


def test_histogram_holds_all_the_time_and_follows_numpy(make_convention):
    convention = make_convention("3-2-1")
    plan = Plan.of([convention])
    times, q = rows(5, 300)
    reduction = reduce_chunk((times, q), plan)
    weights = np.gradient(times) * 0.0
    weights[:-1] += 0.5 * np.diff(times)
    weights[1:] += 0.5 * np.diff(times)
    margins = convention.lock_margin(Rotation.from_quat(np.roll(q, -1, axis=1)).as_matrix())
    expected, _ = np.histogram(margins, plan.edges, weights=weights)
    assert np.allclose(reduction.histogram[0], expected, rtol=0.0, atol=1e-9)
    assert reduction.histogram.sum() == pytest.approx(times[-1] - times[0])


def test_runs_in_parts_in_other_processes_name_the_worst_run(make_convention):
    """Parts in any order, two processes, against one process and whole tracks."""
    conventions = [make_convention(text) for text in ("3-2-1", "2-3-1")]
    plan = Plan.of(conventions)
    parts = [
        Part(f"run {seed}", order, (seed, 400, 200 * order, 200 * order + 200)) for seed in (7, 8) for order in (1, 0)
    ]
    seen = []
    here = reduce_campaign(parts, read_pieces, plan, progress=seen.append)
    with ProcessPoolExecutor(2, mp_context=multiprocessing.get_context("fork")) as pool:
        there = reduce_campaign(parts, read_pieces, plan, mapper=pool.map)
    assert seen == [1, 2, 3, 4]
    assert here.rows == there.rows == 800
    for convention in conventions:
        least = {seed: lock_margin(Track(*rows(seed, 400)), convention).least for seed in (7, 8)}
        worst = min(least, key=lambda seed: least[seed].lo)
        for campaign in (here, there):
            found = campaign.margins[convention.name].least
            assert found.lo == pytest.approx(least[worst].lo, abs=1e-14)
            assert f"run {worst}" in found.governing
            assert f"run {worst}" in found.witness.where


def test_work_and_results_travel_between_processes(make_convention):
    """What a cluster sends to and fro survives pickling and is the same when done twice."""
    plan = Plan.of([make_convention("3-2-1")])
    work = pickle.loads(pickle.dumps(partial(reduce_part, read=read_pieces, plan=plan)))
    part = Part("run", 0, (3, 100, 0, 100))
    once, twice = work(part), pickle.loads(pickle.dumps(work(part)))
    same(once, twice)


def test_gap_between_chunks_is_not_joined(make_convention):
    plan = Plan.of([make_convention("3-2-1")], longest_gap=5.0)
    times, q = rows(9, 60)
    times[30:] += 100.0
    reduction = reduce_chunks([(times[:30], q[:30]), (times[30:], q[30:])], plan)
    assert reduction.gaps == 1
    assert reduction.longest_gap > 100.0
    assert reduction.joined_time < 90.0


def test_bad_rows_name_run_part_and_row(make_convention):
    plan = Plan.of([make_convention("3-2-1")])

    def broken(source):
        times, q = rows(1, 40)
        q[25] = np.nan
        yield times[:20], q[:20]
        yield times[20:], q[20:]

    with pytest.raises(RegionError, match="run 'one', part 0: after row 20: row 6 holds a value that is no number"):
        reduce_campaign([Part("one", 0, None)], broken, plan)
    times, q = rows(1, 40)
    with pytest.raises(RegionError, match="time goes back"):
        reduce_chunks([(times[20:], q[20:]), (times[:20], q[:20])], plan)
    with pytest.raises(RegionError, match="without runs"):
        reduce_campaign([], broken, plan)
    with pytest.raises(RegionError, match="without rows"):
        reduce_chunks([], plan)
