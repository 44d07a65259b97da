"""Nine margins: against mpmath down to zero, scipy's middle angle, the rotation metric, and quaternion tables."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.margins import (
    entry_margins,
    entry_margins_from_quaternions,
    least_entry_margins,
    line_angle,
)
from trunnion.attitude.rotations import matrix_from_quaternion, rotation_angle, scalar_first
from trunnion.errors import AttitudeError


def margin_50_digits(q: np.ndarray, i: int, k: int) -> mpmath.mpf:
    """Angle between the carried axis k and the line of axis i, from the quaternion, with 50 digits."""
    with mpmath.workdps(50):
        w, x, y, z = (mpmath.mpf(float(value)) for value in q)
        n = w * w + x * x + y * y + z * z
        R = [
            [w * w + x * x - y * y - z * z, 2 * (x * y - w * z), 2 * (x * z + w * y)],
            [2 * (x * y + w * z), w * w - x * x + y * y - z * z, 2 * (y * z - w * x)],
            [2 * (x * z - w * y), 2 * (y * z + w * x), w * w - x * x - y * y + z * z],
        ]
        others = [R[row][k] / n for row in range(3) if row != i]
        return mpmath.atan2(mpmath.sqrt(others[0] ** 2 + others[1] ** 2), abs(R[i][k] / n))


@pytest.mark.parametrize("distance", [1e-3, 1e-6, 1e-9, 1e-12, 1e-15])
@pytest.mark.parametrize(("i", "k"), [(i, k) for i in range(3) for k in range(3)])
def test_relative_accuracy_down_to_lock(distance: float, i: int, k: int) -> None:
    rng = np.random.default_rng(100 * i + 10 * k)
    to_axis, _ = Rotation.align_vectors([np.eye(3)[i]], [np.eye(3)[k]])
    across = np.roll(np.eye(3)[i], 1)
    for sign in (0.0, np.pi):
        near = Rotation.from_rotvec((sign + distance) * across) * to_axis
        spin = Rotation.from_rotvec(rng.uniform(-3, 3) * np.eye(3)[k])
        q = scalar_first((near * spin).as_quat())
        q /= np.linalg.norm(q)
        exact = float(margin_50_digits(q, i, k))
        found = entry_margins_from_quaternions(q[None])[0, i, k]
        assert abs(found - exact) <= 8 * np.finfo(float).eps * exact + 1e-16 * (distance < 1e-14)
        assert least_entry_margins(q[None])[i, k] == found


def test_matrix_and_quaternion_forms_agree(random_attitudes: Rotation) -> None:
    q = scalar_first(random_attitudes.as_quat())
    np.testing.assert_allclose(
        entry_margins_from_quaternions(q), entry_margins(random_attitudes.as_matrix()), rtol=0, atol=2e-15
    )
    np.testing.assert_allclose(
        least_entry_margins(q), entry_margins(random_attitudes.as_matrix()).min(axis=0), rtol=0, atol=2e-15
    )


@pytest.mark.parametrize(
    "letters", ["XYZ", "YZX", "ZXY", "XZY", "YXZ", "ZYX", "XYX", "YXY", "ZXZ", "XZX", "YZY", "ZYZ"]
)
def test_one_entry_serves_each_sequence_as_scipys_middle_angle_says(letters: str, random_attitudes: Rotation) -> None:
    middle = random_attitudes.as_euler(letters)[:, 1]
    repeated = letters[0] == letters[2]
    theirs = np.minimum(middle, np.pi - middle) if repeated else np.pi / 2 - np.abs(middle)
    i, k = "XYZ".index(letters[0]), "XYZ".index(letters[2])
    np.testing.assert_allclose(entry_margins(random_attitudes.as_matrix())[:, i, k], theirs, rtol=0, atol=1e-12)
    fixed_middle = random_attitudes.as_euler(letters.lower())[:, 1]
    theirs = np.minimum(fixed_middle, np.pi - fixed_middle) if repeated else np.pi / 2 - np.abs(fixed_middle)
    np.testing.assert_allclose(entry_margins(random_attitudes.as_matrix())[:, k, i], theirs, rtol=0, atol=1e-12)


def test_margins_change_no_faster_than_the_attitude_turns() -> None:
    one, two = Rotation.random(20_000, random_state=2), Rotation.random(20_000, random_state=3)
    small = Rotation.from_rotvec(1e-4 * two.as_rotvec())
    for other in (two, one * small):
        change = np.abs(entry_margins(one.as_matrix()) - entry_margins(other.as_matrix()))
        angle = (one.inv() * other).magnitude()
        assert np.max(change - angle[:, None, None]) < 1e-15


def test_chunks_signs_lengths_and_output_array(random_attitudes: Rotation) -> None:
    q = np.tile(scalar_first(random_attitudes.as_quat()), (4, 1))  # more rows than one chunk
    expected = entry_margins_from_quaternions(q)
    np.testing.assert_array_equal(entry_margins_from_quaternions(-q), expected)
    long = q * (1.0 + 3e-7)
    np.testing.assert_allclose(entry_margins_from_quaternions(long), expected, rtol=1e-14, atol=1e-15)
    np.testing.assert_allclose(least_entry_margins(long), least_entry_margins(q), rtol=1e-14, atol=1e-15)
    out = np.empty((len(q), 3, 3))
    assert entry_margins_from_quaternions(q, out=out) is out
    np.testing.assert_array_equal(out, expected)
    np.testing.assert_array_equal(least_entry_margins(q), expected.min(axis=0))


@pytest.mark.parametrize(
    ("q", "message"),
    [
        (np.zeros((0, 4)), "shape"),
        (np.ones((3, 3)), "shape"),
        (np.array([[1.0, 0, 0, 0], [1.0, 1.0, 0, 0]]), "quaternion 1 has length 1.41421356"),
        (np.array([[1.0, 0, 0, 0], [np.nan, 0, 0, 0]]), "quaternion 1 has length nan"),
    ],
)
def test_tables_that_are_refused(q: np.ndarray, message: str) -> None:
    for task in (least_entry_margins, entry_margins_from_quaternions):
        with pytest.raises(AttitudeError, match=message):
            task(q)


def test_line_angle_keeps_digits_where_arccos_gives_steps() -> None:
    tiny = 3.3e-10
    assert line_angle([1.0, 0, 0], [1.0, tiny, 0]) == pytest.approx(tiny, rel=1e-15)
    assert line_angle([1.0, 0, 0], [-2.0, 0, 2 * tiny]) == pytest.approx(tiny, rel=1e-15)
    assert line_angle([1.0, 0, 0], [0, 5.0, 0]) == np.pi / 2


def test_rotation_angle_keeps_digits_near_zero_and_near_half_a_turn() -> None:
    axis = np.array([2.0, -3.0, 6.0]) / 7.0
    for angle in (0.0, 1e-12, 1e-8, 1.0, np.pi - 1e-8, np.pi):
        R = Rotation.from_rotvec(angle * axis).as_matrix()
        assert rotation_angle(np.eye(3), R) == pytest.approx(angle, abs=4e-16)


def test_quaternion_and_matrix_at_half_turns() -> None:
    for axis in ([1.0, 0, 0], [0, 1.0, 0], [0, 0, 1.0], [0.6, -0.8, 0], [-0.36, 0.48, 0.8]):
        R = Rotation.from_rotvec(np.pi * np.array(axis)).as_matrix()
        q = np.concatenate([[0.0], axis])
        np.testing.assert_allclose(matrix_from_quaternion(q), R, rtol=0, atol=1e-15)
