"""One suite of laws over all 24 (twelve sequences, moving and fixed axes), fixed seeds, regular and near lock.

A law is an identity that any right implementation obeys; the values themselves are checked against the outside in
tests/published and tests/attitude.
"""

from __future__ import annotations

import numpy as np
import pytest

from trunnion.attitude.extraction import Policy, chain_angles, chain_matrix, second_triple
from trunnion.attitude.margins import entry_margins
from trunnion.attitude.rates import (
    RateAxes,
    angle_rate_matrix,
    body_rate_matrix,
    middle_margin,
    rate_determinant,
    rate_gains,
    reference_rate_matrix,
)
from trunnion.attitude.rotations import (
    determinant,
    matrix_from_quaternion,
    quaternion_from_matrix,
    rotation_angle,
    rotation_vector,
)
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

DEG = np.pi / 180.0
ALL = [(sequence, sense) for sequence in Sequence for sense in Sense]
IDS = [f"{sequence.name}-{sense.name.lower()}" for sequence, sense in ALL]
PER_CASE = pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
ROUNDING = 2e-15
DISTANCES = (0.0, 1e-16, 1e-15, 1e-12, 1e-9, 1e-6, 1e-3)


def singular_values(sequence: Sequence) -> tuple[float, float]:
    return (0.0, np.pi) if sequence.repeated else (np.pi / 2, -np.pi / 2)


def triples(sequence: Sequence) -> np.ndarray:
    """Regular triples, among them (10, -35, 50) deg (35 for a repeated axis), and triples at and near lock."""
    rng = np.random.default_rng(2026)
    middle = 35.0 if sequence.repeated else -35.0
    regular = [(10 * DEG, middle * DEG, 50 * DEG), (-170 * DEG, middle * DEG, 175 * DEG)]
    low = 0.0 if sequence.repeated else -np.pi / 2
    spread = np.column_stack(
        [rng.uniform(-np.pi, np.pi, 200), rng.uniform(low, low + np.pi, 200), rng.uniform(-np.pi, np.pi, 200)]
    )
    near = []
    for value in singular_values(sequence):
        inward = 1.0 if value == 0.0 or value == -np.pi / 2 else -1.0
        near += [(10 * DEG, value + inward * d, 50 * DEG) for d in DISTANCES]
    return np.concatenate([regular, spread, near])


@PER_CASE
def test_chain_is_a_rotation(sequence: Sequence, sense: Sense) -> None:
    E = chain_matrix(triples(sequence), sequence=sequence, sense=sense)
    np.testing.assert_allclose(np.swapaxes(E, -1, -2) @ E, np.broadcast_to(np.eye(3), E.shape), rtol=0, atol=ROUNDING)
    np.testing.assert_allclose(determinant(E), 1.0, rtol=0, atol=ROUNDING)


@PER_CASE
def test_there_and_back_rebuilds_the_rotation_at_every_margin(sequence: Sequence, sense: Sense) -> None:
    E = chain_matrix(triples(sequence), sequence=sequence, sense=sense)
    for policy in Policy:
        for other_branch in (False, True):
            found = chain_angles(E, sequence=sequence, sense=sense, policy=policy, other_branch=other_branch)
            again = chain_matrix(found.angles, sequence=sequence, sense=sense)
            assert rotation_angle(E, again).max() < ROUNDING


@PER_CASE
def test_regular_angles_come_back(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)[:202]
    E = chain_matrix(angles, sequence=sequence, sense=sense)
    found = chain_angles(E, sequence=sequence, sense=sense)
    assert np.max(np.abs(found.angles - angles) * np.sin(found.margin)[:, None]) < ROUNDING
    assert not found.singular.any()


@PER_CASE
def test_ranges_of_both_branches(sequence: Sequence, sense: Sense) -> None:
    E = chain_matrix(triples(sequence), sequence=sequence, sense=sense)
    one = chain_angles(E, sequence=sequence, sense=sense).angles
    two = chain_angles(E, sequence=sequence, sense=sense, other_branch=True).angles
    for angles in (one, two):
        assert np.all(angles[:, [0, 2]] > -np.pi)
        assert np.all(angles[:, [0, 2]] <= np.pi)
    if sequence.repeated:
        assert np.all((one[:, 1] >= 0.0) & (one[:, 1] <= np.pi))
        assert np.all((two[:, 1] <= 0.0) | (two[:, 1] == np.pi))
    else:
        assert np.all(np.abs(one[:, 1]) <= np.pi / 2)
        assert np.all(np.abs(two[:, 1]) >= np.pi / 2)


@PER_CASE
def test_second_triple_is_the_same_attitude(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)
    E = chain_matrix(angles, sequence=sequence, sense=sense)
    other = chain_matrix(second_triple(angles, repeated=sequence.repeated), sequence=sequence, sense=sense)
    assert rotation_angle(E, other).max() < ROUNDING


@PER_CASE
def test_moving_axes_are_fixed_axes_in_reverse(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)
    turned = Sense.FIXED if sense is Sense.MOVING else Sense.MOVING
    reverse = Sequence[sequence.name[::-1]]
    one = chain_matrix(angles, sequence=sequence, sense=sense)
    two = chain_matrix(angles[:, ::-1], sequence=reverse, sense=turned)
    np.testing.assert_allclose(one, two, rtol=0, atol=ROUNDING)


@PER_CASE
def test_inverse_is_the_reversed_sequence_of_opposite_angles(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)
    E = chain_matrix(angles, sequence=sequence, sense=sense)
    inverse = chain_matrix(-angles[:, ::-1], sequence=Sequence[sequence.name[::-1]], sense=sense)
    np.testing.assert_allclose(np.swapaxes(E, -1, -2), inverse, rtol=0, atol=ROUNDING)


@PER_CASE
def test_one_entry_carries_the_middle_angle_and_the_margin(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)
    E = chain_matrix(angles, sequence=sequence, sense=sense)
    i, _, k = sequence.axes
    row, column = (i, k) if sense is Sense.MOVING else (k, i)
    parity = sequence.parity if sense is Sense.MOVING else -sequence.parity
    function = np.cos(angles[:, 1]) if sequence.repeated else parity * np.sin(angles[:, 1])
    np.testing.assert_allclose(E[:, row, column], function, rtol=0, atol=ROUNDING)
    found = chain_angles(E, sequence=sequence, sense=sense)
    np.testing.assert_allclose(found.margin, entry_margins(E)[:, row, column], rtol=0, atol=ROUNDING)
    np.testing.assert_allclose(found.margin, middle_margin(angles[:, 1], sequence), rtol=0, atol=ROUNDING)


@PER_CASE
def test_locked_solutions_are_one_line_of_triples(sequence: Sequence, sense: Sense) -> None:
    """Adding t to the first angle and taking it from the last by the sign of the combination changes nothing."""
    for value in singular_values(sequence):
        E = chain_matrix((10 * DEG, value, 50 * DEG), sequence=sequence, sense=sense)
        found = chain_angles(E, sequence=sequence, sense=sense)
        assert found.singular
        first = chain_angles(E, sequence=sequence, sense=sense, policy=Policy.FIRST_ZERO).angles
        sign = np.sign(found.angles[0] * first[2])
        for t in (0.3, -2.0):
            line = found.angles + np.array([t, 0.0, -sign * t])
            assert rotation_angle(chain_matrix(line, sequence=sequence, sense=sense), E) < ROUNDING


@PER_CASE
def test_chosen_margin_snaps_the_middle_angle_and_costs_at_most_the_margin(sequence: Sequence, sense: Sense) -> None:
    for value in singular_values(sequence):
        inward = 1.0 if value in (0.0, -np.pi / 2) else -1.0
        for distance in (1e-9, 1e-4, 0.009):
            E = chain_matrix((0.4, value + inward * distance, -1.9), sequence=sequence, sense=sense)
            for policy in Policy:
                found = chain_angles(E, sequence=sequence, sense=sense, policy=policy, lock_within=0.01)
                assert found.singular
                assert found.angles[1] == value
                assert found.angles[0 if policy is Policy.FIRST_ZERO else 2] == 0.0
                cost = rotation_angle(E, chain_matrix(found.angles, sequence=sequence, sense=sense))
                assert cost <= distance * (1 + 1e-9) + ROUNDING
            assert not chain_angles(E, sequence=sequence, sense=sense).singular


@PER_CASE
def test_quaternion_there_and_back(sequence: Sequence, sense: Sense) -> None:
    E = chain_matrix(triples(sequence), sequence=sequence, sense=sense)
    q = quaternion_from_matrix(E)
    np.testing.assert_allclose(np.linalg.norm(q, axis=-1), 1.0, rtol=0, atol=ROUNDING)
    np.testing.assert_allclose(matrix_from_quaternion(q), E, rtol=0, atol=ROUNDING)


@PER_CASE
def test_rate_matrices_are_the_derivative_of_the_chain(sequence: Sequence, sense: Sense) -> None:
    angles, step = triples(sequence)[:50], 1e-5
    rates = np.random.default_rng(7).normal(size=(50, 3))
    ahead = chain_matrix(angles + step * rates, sequence=sequence, sense=sense)
    behind = chain_matrix(angles - step * rates, sequence=sequence, sense=sense)
    transposed = np.swapaxes(behind, -1, -2)
    w_body, w_reference = (
        rotation_vector(transposed @ ahead) / (2 * step),
        rotation_vector(ahead @ transposed) / (2 * step),
    )
    B = body_rate_matrix(angles, sequence=sequence, sense=sense)
    A = reference_rate_matrix(angles, sequence=sequence, sense=sense)
    central_difference = 2e-9  # step squared times a third derivative of order ten
    np.testing.assert_allclose(np.einsum("nij,nj->ni", B, rates), w_body, rtol=0, atol=central_difference)
    np.testing.assert_allclose(np.einsum("nij,nj->ni", A, rates), w_reference, rtol=0, atol=central_difference)


@PER_CASE
def test_rate_matrix_inverse_determinant_and_gains(sequence: Sequence, sense: Sense) -> None:
    angles = triples(sequence)[:202]
    margin = middle_margin(angles[:, 1], sequence)
    how = {"sequence": sequence, "sense": sense}
    for axes, build in ((RateAxes.BODY, body_rate_matrix), (RateAxes.REFERENCE, reference_rate_matrix)):
        B, inverse = build(angles, **how), angle_rate_matrix(angles, **how, axes=axes).matrix
        residual = np.abs(inverse @ B - np.eye(3)).max(axis=(1, 2))
        assert np.max(residual * np.sin(margin)) < 4e-15
        np.testing.assert_allclose(determinant(B), rate_determinant(angles, **how), rtol=0, atol=ROUNDING)
        lengths = np.linalg.norm(inverse, axis=-1)
        gains = rate_gains(margin)
        np.testing.assert_allclose(lengths, np.stack([gains.outer, gains.middle, gains.outer], -1), rtol=1e-12)


@PER_CASE
def test_angle_rates_are_refused_at_lock(sequence: Sequence, sense: Sense) -> None:
    for value in singular_values(sequence):
        with pytest.raises(AttitudeError, match="from lock"):
            angle_rate_matrix((0.1, value, 0.2), sequence=sequence, sense=sense, least_margin=1e-12)


@PER_CASE
def test_no_number_is_taken_for_an_angle_silently(sequence: Sequence, sense: Sense) -> None:
    E = chain_matrix((0.1, np.nan, 0.2), sequence=sequence, sense=sense)
    found = chain_angles(E, sequence=sequence, sense=sense)
    assert np.isnan(found.margin)
    assert not found.singular
