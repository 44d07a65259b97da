"""Switched conventions: check values over all attitudes, bounds against sampling, and a switch that never chatters."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.basis import Basis
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Dispersed, Mounted, Poses, Track, Union
from trunnion.envelope.sampling import sample_region
from trunnion.envelope.switching import rank_switched, switched_margin, switching_rule
from trunnion.errors import RegionError

d = np.radians


@pytest.mark.parametrize(
    ("texts", "expected"),
    [
        (("3-2-1", "3-1-2"), 45.0),  # share the reference's lock axis
        (("3-2-1", "2-3-1"), 45.0),  # share the body's lock axis
        (("3-2-1", "3-1-2", "3-1-3"), np.degrees(np.arccos(1 / np.sqrt(3)))),  # all three body axes: 54.7356
        (("3-2-1", "1-3-2"), 0.0),  # share neither: both can lock at once
    ],
)
def test_check_values_over_all_attitudes(make_convention, texts, expected):
    """A half and a third of a right-angled triad; derivable by hand, no publication."""
    margin = switched_margin(None, [make_convention(text) for text in texts])
    assert np.degrees(margin.lo) <= expected + 1e-9
    assert np.degrees(margin.hi) >= expected - 1e-9
    assert np.degrees(margin.hi - margin.lo) <= 0.011
    assert margin.basis is Basis.CERTIFIED


def test_single_convention_is_its_lock_margin(random_case, count):
    rng = np.random.default_rng(41)
    for n in range(count(100)):
        box, convention = random_case(rng, n)
        bracket = switched_margin(box, [convention], tolerance=d(0.02))
        margin = lock_margin(box, convention).least
        assert bracket.lo <= margin.hi + 1e-12
        assert bracket.hi >= margin.lo - 1e-12


def test_sampling_never_finds_less(random_case, make_convention, count):
    rng = np.random.default_rng(42)
    for n in range(count(60)):
        box, one = random_case(rng, n)
        other = random_case(rng, n + 1)[1]
        bracket = switched_margin(box, [one, other], tolerance=d(0.05))
        R = sample_region(box, 4096, seed=n + 1).matrices
        best = np.maximum(one.lock_margin(R), other.lock_margin(R))
        assert best.min() >= bracket.lo - 1e-13
        assert bracket.hi - bracket.lo <= d(0.0501)
        witness = bracket.witness.matrix
        reached = max(float(one.lock_margin(witness)), float(other.lock_margin(witness)))
        assert reached == pytest.approx(bracket.hi, abs=1e-9)


def test_tail_sitter_pairs(tail_sitter, make_convention):
    """Ordinary 3-2-1 in level flight and 3-1-2 in hover: where both are at their worst 45 deg of bank rule."""
    ranked = rank_switched(tail_sitter, [make_convention(text) for text in ("3-2-1", "3-1-2", "3-1-3")], 2)
    assert len(ranked) == 3
    assert ranked[0].margin.lo >= ranked[-1].margin.lo
    alone = lock_margin(tail_sitter, make_convention("3-1-2")).least
    with_ordinary = switched_margin(tail_sitter, [make_convention("3-2-1"), make_convention("3-1-2")])
    assert with_ordinary.hi >= alone.lo
    assert with_ordinary.governing


def test_other_regions(tail_sitter, make_convention):
    pair = [make_convention("3-2-1"), make_convention("3-1-2")]
    R = Rotation.random(50, random_state=3).as_matrix()
    by_hand = np.maximum(pair[0].lock_margin(R), pair[1].lock_margin(R)).min()
    listed = switched_margin(Poses(R), pair)
    assert listed.lo == pytest.approx(by_hand, abs=1e-12)
    assert switched_margin(Poses(R, 0.1), pair).lo == pytest.approx(by_hand - 0.1, abs=1e-12)
    assert switched_margin(Dispersed(Poses(R), 0.1), pair).hi == pytest.approx(by_hand, abs=1e-12)
    turned = switched_margin(Mounted(Poses(R @ R[0].T), R[0]), pair)
    assert turned.lo == pytest.approx(by_hand, abs=1e-12)
    q = np.roll(Rotation.from_matrix(R).as_quat(), 1, axis=1)
    track = switched_margin(Track(np.arange(50.0), q), pair, tolerance=d(0.01))
    assert track.hi <= by_hand + 1e-12
    assert track.basis is Basis.MEASURED
    union = switched_margin(Union({"poses": Poses(R), "box": tail_sitter.parts["cruise"]}), pair)
    assert union.lo <= by_hand + 1e-12


def test_rule_never_chatters_on_a_fast_random_motion(make_convention):
    """A body turning at its stated rate at random: changes are further apart than the stated dwell."""
    rng = np.random.default_rng(43)
    pair = [make_convention("3-2-1"), make_convention("3-1-2")]
    rule = switching_rule(switched_margin(None, pair).lo, d(35.0), body_rate=1.0)
    assert rule.dwell == pytest.approx(d(10.0), rel=2e-3)
    dt, axis, attitude = 1e-3, np.array([1.0, 0.0, 0.0]), Rotation.identity()
    path = []
    for _ in range(60_000 // 10):
        axis = axis + rng.normal(size=3) * 0.3
        axis /= np.linalg.norm(axis)
        path.append(attitude.as_matrix())
        attitude = Rotation.from_rotvec(axis * dt * 10) * attitude
    margins = np.stack([convention.lock_margin(np.stack(path)) for convention in pair])
    used, changes = 0, []
    for n in range(margins.shape[1]):
        if margins[used, n] < rule.threshold:
            used = int(np.argmax(margins[:, n]))
            changes.append(n * dt * 10)
        assert margins[used, n] >= rule.threshold
    assert len(changes) > 5
    assert np.diff(changes).min() >= rule.dwell - dt * 10
    assert "cannot chatter" in rule.statement()


def test_rule_without_hysteresis_is_refused():
    with pytest.raises(RegionError, match="leaves no hysteresis"):
        switching_rule(d(45.0), d(45.0), 1.0)
    with pytest.raises(RegionError, match="leaves no hysteresis"):
        switching_rule(d(45.0), d(40.0), 1.0, attitude_error=d(3.0))
    with pytest.raises(RegionError, match="no conventions"):
        switched_margin(None, [])
