"""All twelve sequences x moving and fixed axes x both matrix directions against scipy's Rotation and CSPICE."""

from __future__ import annotations

import warnings
from collections.abc import Callable

import numpy as np
import pytest
import spiceypy
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy, chain_angles, chain_matrix
from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_from_matrix, scalar_first
from trunnion.attitude.sequences import Sense, Sequence

ALL = [(sequence, sense) for sequence in Sequence for sense in Sense]
IDS = [f"{sequence.name}-{sense.name.lower()}" for sequence, sense in ALL]
# Angles of a matrix with entries rounded at 1.1e-16 are known to that over the margin; 10^4 random attitudes come
# within 0.01 rad of lock, and scipy rounds as well.
ANGLE = 2e-13
ENTRY = 1e-15


def scipy_letters(sequence: Sequence, sense: Sense) -> str:
    return sequence.name if sense is Sense.MOVING else sequence.name.lower()


def circle(angles: np.ndarray) -> np.ndarray:
    return np.exp(1j * angles)


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
@pytest.mark.parametrize("maps_body_to_reference", [True, False])
def test_ten_thousand_random_attitudes_against_scipy(
    sequence: Sequence,
    sense: Sense,
    maps_body_to_reference: bool,
    convention: Callable[..., Convention],
    random_attitudes: Rotation,
) -> None:
    ours = convention(sequence, sense, maps_body_to_reference=maps_body_to_reference)
    body_to_reference = random_attitudes if maps_body_to_reference else random_attitudes.inv()
    theirs = body_to_reference.as_euler(scipy_letters(sequence, sense))
    stated = random_attitudes.as_matrix()  # the matrix that is exchanged, in either direction
    R_rb = ours.from_stated_matrix(stated)
    found = ours.angles(R_rb)
    assert not found.singular.any()
    assert np.max(np.abs(circle(found.angles) - circle(theirs))) < ANGLE
    np.testing.assert_allclose(ours.stated_matrix(ours.matrix(found.angles)), stated, rtol=0, atol=2 * ENTRY)
    again = Rotation.from_euler(scipy_letters(sequence, sense), found.angles).as_matrix()
    np.testing.assert_allclose(ours.matrix(found.angles), again, rtol=0, atol=2 * ENTRY)
    q = ours.stated_quaternion(R_rb)
    same_sign = scalar_first(random_attitudes.as_quat(canonical=True))
    np.testing.assert_allclose(q * np.sign(q[:, :1] * same_sign[:, :1]), same_sign, rtol=0, atol=ENTRY)


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
@pytest.mark.parametrize("distance", [0.0, 1e-12, 1e-9, 1e-7, 1e-5, 1e-3])
@pytest.mark.parametrize("policy", list(Policy))
def test_at_and_around_both_singular_values_as_attitudes(
    sequence: Sequence, sense: Sense, distance: float, policy: Policy
) -> None:
    rng = np.random.default_rng(24)
    singular = np.array([0.0, np.pi]) if sequence.repeated else np.array([np.pi / 2, -np.pi / 2])
    inward = np.array([1.0, -1.0]) if sequence.repeated else np.array([-1.0, 1.0])
    outer = rng.uniform(-np.pi, np.pi, (50, 2))
    middle = np.tile(singular + inward * distance, 25)
    triples = np.column_stack([outer[:, 0], middle, outer[:, 1]])
    theirs = Rotation.from_euler(scipy_letters(sequence, sense), triples)
    found = chain_angles(theirs.as_matrix(), sequence=sequence, sense=sense, policy=policy)
    rebuilt = Rotation.from_euler(scipy_letters(sequence, sense), found.angles)
    assert (rebuilt * theirs.inv()).magnitude().max() < 2e-15
    assert np.all(np.abs(found.margin - distance) < 1e-15)
    if distance == 0.0:
        zero = 0 if policy is Policy.FIRST_ZERO else 2
        assert found.singular.all()
        assert np.all(found.angles[:, zero] == 0.0)
        assert np.all(found.angles[:, 1] == np.tile(singular, 25))


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
def test_locked_triples_equal_scipys_where_scipy_zeroes_the_last_angle(sequence: Sequence, sense: Sense) -> None:
    singular = (0.0, np.pi) if sequence.repeated else (np.pi / 2, -np.pi / 2)
    rotations = Rotation.from_euler(scipy_letters(sequence, sense), [(0.3, value, -0.7) for value in singular])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UserWarning)  # scipy says that it set the third angle to zero
        theirs = rotations.as_euler(scipy_letters(sequence, sense))
    ours = chain_angles(rotations.as_matrix(), sequence=sequence, sense=sense, policy=Policy.LAST_ZERO).angles
    np.testing.assert_allclose(circle(ours), circle(theirs), rtol=0, atol=ENTRY)


@pytest.mark.parametrize("sequence", list(Sequence), ids=lambda sequence: sequence.name)
def test_random_attitudes_against_cspice(
    sequence: Sequence, random_attitudes: Rotation, count: Callable[[int], int]
) -> None:
    i, j, k = (axis + 1 for axis in sequence.axes)
    R = random_attitudes.as_matrix()[: count(10_000)]
    C = np.ascontiguousarray(np.swapaxes(R, -1, -2))
    moving = np.array([spiceypy.m2eul(M, k, j, i)[::-1] for M in C])
    found = chain_angles(R, sequence=sequence, sense=Sense.MOVING)
    # CSPICE takes the middle angle by arccos or arcsin: eps over the margin, for all three angles.
    assert np.max(np.abs(circle(found.angles) - circle(moving)) * found.margin[:, None]) < 1e-14
    fixed = np.array([spiceypy.m2eul(M, i, j, k) for M in C])
    found = chain_angles(R, sequence=sequence, sense=Sense.FIXED)
    assert np.max(np.abs(circle(found.angles) - circle(fixed)) * found.margin[:, None]) < 1e-14
    built = np.array([spiceypy.eul2m(*angles[::-1], k, j, i) for angles in moving])
    ours = chain_matrix(moving, sequence=sequence, sense=Sense.MOVING)
    np.testing.assert_allclose(np.swapaxes(built, -1, -2), ours, rtol=0, atol=ENTRY)


def test_quaternions_against_cspice(random_attitudes: Rotation) -> None:
    R = random_attitudes.as_matrix()[:500]
    theirs = np.array([spiceypy.m2q(M) for M in R])
    ours = quaternion_from_matrix(R)
    np.testing.assert_allclose(ours, theirs, rtol=0, atol=ENTRY)
    np.testing.assert_allclose(matrix_from_quaternion(theirs), [spiceypy.q2m(q) for q in theirs], rtol=0, atol=ENTRY)


def test_check_value_of_common_practice_first_angle_zero() -> None:
    """x-y-z about moving axes (0.3, pi/2, 0.5) is (0, pi/2, 0.8): common practice, no source."""
    E = chain_matrix((0.3, np.pi / 2, 0.5), sequence=Sequence.XYZ, sense=Sense.MOVING)
    found = chain_angles(E, sequence=Sequence.XYZ, sense=Sense.MOVING, policy=Policy.FIRST_ZERO)
    assert found.singular
    assert found.angles[0] == 0.0
    assert found.angles[1] == np.pi / 2
    assert found.angles[2] == pytest.approx(0.8, abs=ENTRY)
