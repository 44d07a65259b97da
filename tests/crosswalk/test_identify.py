"""Identification: the right function is always found, never a wrong one alone; poor data give the exact list left.

The counts of readings left by poor data follow from the definition (two products of three turns agree there) and were
found by fingerprinting all 4,608 names; scipy stands behind every attitude used here.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import (
    Answer,
    identify_angles,
    identify_attitudes,
    matrix_readings,
    quaternion_readings,
)
from trunnion.crosswalk.next_measurement import next_measurement
from trunnion.crosswalk.readings import Chain, all_chains
from trunnion.errors import AttitudeError

NOISE = np.radians(0.1)
GENERIC_PLUS_ONE = {
    Constants.NONE: 2,
    Constants.RELABELLED: 2,
    Constants.RIGHT: 3,
    Constants.LEFT: 3,
    Constants.BOTH: 5,
}


def scipy_matrices(chain: Chain, numbers: np.ndarray) -> np.ndarray:
    """The chain carried out by scipy: moving axes, leftmost factor first."""
    letters = "".join("XYZ"[axis] for axis in chain.axes)
    turns = numbers[:, list(chain.columns)] * np.array(chain.signs)
    return Rotation.from_euler(letters, turns, degrees=chain.degrees).as_matrix()


def axes_class(chain: Chain) -> tuple:
    """What two unknown constants leave of a chain: columns, unit, repeated or not, and one sign."""
    if chain.axes[0] == chain.axes[2]:
        return chain.columns, chain.degrees, True, chain.signs[0] * chain.signs[2]
    frame = np.zeros((3, 3))
    frame[range(3), chain.axes] = chain.signs
    return chain.columns, chain.degrees, False, int(np.sign(np.linalg.det(frame)))


def draw(generator: np.random.Generator, mode: Constants, count: int) -> tuple[Chain, np.ndarray, np.ndarray]:
    """A random chain with the mode's constants: numbers over +-60 degrees, attitudes with 0.1 degree of noise."""
    chain = all_chains()[generator.integers(len(all_chains()))]
    numbers = generator.uniform(-60.0, 60.0, size=(count, 3))
    numbers = numbers if chain.degrees else np.radians(numbers)
    left = (
        Rotation.random(random_state=generator).as_matrix() if mode in (Constants.LEFT, Constants.BOTH) else np.eye(3)
    )
    right = np.eye(3)
    if mode in (Constants.RIGHT, Constants.BOTH):
        right = Rotation.random(random_state=generator).as_matrix()
    if mode is Constants.RELABELLED:
        right = right_angle_rotations()[generator.integers(24)]
    noise = Rotation.from_rotvec(generator.normal(0.0, NOISE, size=(count, 3))).as_matrix()
    return chain, numbers, left @ scipy_matrices(chain, numbers) @ right @ noise


@pytest.mark.parametrize("mode", list(Constants))
def test_the_right_function_is_never_excluded_and_never_replaced(mode: Constants, count) -> None:
    generator = np.random.default_rng(20260 + list(Constants).index(mode))
    trials, alone = count(1000), 0
    for _ in range(trials):
        chain, numbers, truth = draw(generator, mode, GENERIC_PLUS_ONE[mode])
        found = identify_angles(numbers, truth, constants=mode, noise=NOISE)
        fits = [finding.reading.chain for finding in found.fits]
        if mode is Constants.BOTH:
            assert axes_class(chain) in [axes_class(fit) for fit in fits if fit]
        else:
            assert chain in fits
        alone += found.answer is Answer.IDENTIFIED
    assert alone >= 0.99 * trials


@pytest.mark.parametrize(
    ("numbers", "left"),
    [
        ([[10, 0, 0], [20, 0, 0], [-35, 0, 0]], 96),  # one column moves
        ([[10, 0, 0], [0, 20, 0], [0, 0, 30]], 6),  # one axis at a time
        ([[12, 25, 0], [-40, 33, 0], [55, -17, 0], [-8, -51, 0]], 10),  # third column always zero
        ([[30, 30, 30]], 6),
        ([[90, 90, 90]], 48),
        ([[10, 20, 30]], 1),
    ],
)
def test_poor_data_leave_exactly_these_readings(numbers: list, left: int) -> None:
    chain = all_chains()[100]
    given = np.array(numbers, dtype=float)
    found = identify_angles(given, scipy_matrices(chain, given))
    assert len(found.fits) == left
    assert chain in [finding.reading.chain for finding in found.fits]
    assert found.answer is (Answer.IDENTIFIED if left == 1 else Answer.AMBIGUOUS)
    assert bool(found.reasons) == (left > 1)


def test_the_next_measurement_separates_what_is_left() -> None:
    chain = all_chains()[100]
    given = np.array([[10.0, 0, 0], [0, 20, 0], [0, 0, 30]])
    found = identify_angles(given, scipy_matrices(chain, given))
    asked = next_measurement(found)
    assert asked is not None
    assert asked.least_separation > np.radians(120.0)
    more = np.vstack([given, asked.numbers])
    assert identify_angles(more, scipy_matrices(chain, more)).answer is Answer.IDENTIFIED


@pytest.mark.parametrize("mode", [Constants.NONE, Constants.RELABELLED, Constants.RIGHT, Constants.LEFT])
def test_a_tenth_of_false_samples_does_no_harm_and_is_named(mode: Constants) -> None:
    generator = np.random.default_rng(77)
    chain, numbers, truth = draw(generator, mode, 50)
    false = np.sort(generator.permutation(50)[:5])
    truth[false] = Rotation.random(5, random_state=4).as_matrix()
    found = identify_angles(numbers, truth, constants=mode, noise=NOISE)
    assert [finding.reading.chain for finding in found.fits] == [chain]
    assert found.outliers == tuple(int(row) + 1 for row in false)


def test_three_samples_leave_the_reversed_chain_when_both_constants_are_unknown() -> None:
    generator = np.random.default_rng(5)
    chain = Chain((2, 1, 0), (1, 1, 1), (0, 1, 2), True)
    numbers = generator.uniform(-60, 60, size=(3, 3))
    left, right = Rotation.random(2, random_state=1).as_matrix()
    found = identify_angles(numbers, left @ scipy_matrices(chain, numbers) @ right, constants=Constants.BOTH)
    assert len(found.fits) == 2
    assert axes_class(chain) in [axes_class(finding.reading.chain) for finding in found.fits if finding.reading.chain]


def test_three_angles_that_are_no_sequence_get_none_fits_and_the_best_miss() -> None:
    # Angles of a matrix's single-axis parts taken for a sequence: strasdat/Sophus issue 519 (2023), printed values.
    numbers = np.array([[0.08053162693977356, -0.18407464027404785, -0.10685093700885773]])
    rows = np.array(
        [
            [0.9775347709655762, 0.09823847562074661, -0.18648047745227814],
            [-0.11292145401239395, 0.9911494255065918, -0.06979621201753616],
        ]
    )
    truth = np.vstack([rows, np.cross(*rows)])
    U, _, Vt = np.linalg.svd(truth)
    found = identify_angles(numbers, (U @ Vt)[None], noise=1e-6)
    assert found.answer is Answer.NONE_FITS
    assert found.next_best is not None
    assert np.degrees(found.next_best.miss) == pytest.approx(0.74545, abs=1e-4)


def test_a_transposed_chain_is_told_from_its_neighbour_by_the_printed_digits() -> None:
    # Three single-axis matrices and their product: opencv/opencv issue 18189 (2020), printed values.
    x, y = np.arcsin(0.00563752), np.arcsin(-0.02401887)
    z = np.arctan2(-0.97434785, -0.22504727)
    rows = np.array([[-0.22498234, -0.97430189, -0.0108982], [0.97406675, -0.22517562, 0.022133]])
    U, _, Vt = np.linalg.svd(np.vstack([rows, np.cross(*rows)]))
    found = identify_angles(np.array([[x, y, z]]), (U @ Vt)[None], noise=1e-6)
    assert found.answer is Answer.IDENTIFIED
    (finding,) = found.fits
    assert any("1-2-3 about moving axes" in name and "reference to body" in name for name in finding.reading.names)
    assert found.next_best is not None
    assert found.next_best.miss == pytest.approx(1.3e-4, rel=0.5)


@pytest.mark.parametrize(
    ("columns", "words"),
    [
        ([0, 1, 2, 3], "scalar first, maps body to reference"),
        ([1, 2, 3, 0], "scalar last, maps body to reference"),
    ],
)
def test_quaternions_of_unknown_order_and_direction(columns: list, words: str) -> None:
    truth = Rotation.random(6, random_state=9)
    first = truth.as_quat()[:, [3, 0, 1, 2]] * np.array([[1], [-1], [1], [1], [-1], [1]])
    found = identify_attitudes(quaternion_readings(first[:, columns]), truth.as_matrix())
    assert [finding.reading.words for finding in found.fits] == [words]
    back = identify_attitudes(quaternion_readings(first[:, columns]), truth.inv().as_matrix())
    assert [finding.reading.words for finding in back.fits] == [words.replace("body to reference", "reference to body")]


def test_matrices_by_columns_and_mirrored_matrices() -> None:
    truth = Rotation.random(4, random_state=2).as_matrix()
    by_columns = truth.transpose(0, 2, 1).reshape(-1, 9)
    found = identify_attitudes(matrix_readings(by_columns), truth)
    assert [finding.reading.words for finding in found.fits] == [
        "entries by columns, or by rows and maps reference to body"
    ]
    with pytest.raises(AttitudeError, match="left-handed"):
        matrix_readings((truth @ np.diag([1.0, 1.0, -1.0])).reshape(-1, 9))


def test_samples_that_do_not_go_together_are_refused() -> None:
    with pytest.raises(AttitudeError, match="do not go together"):
        identify_angles([[1.0, 2.0, 3.0]], np.stack([np.eye(3)] * 2))
    with pytest.raises(AttitudeError, match="sample 1 holds"):
        identify_angles([[1.0, np.nan, 3.0]], np.eye(3)[None])
