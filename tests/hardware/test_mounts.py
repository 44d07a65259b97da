"""Mounts in every form they are stated in, against scipy's Rotation and plain geometry."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame
from trunnion.errors import HardwareError
from trunnion.hardware import mount_check, mounts, properness, right_angles

ROUNDING = 1e-13


def test_axis_words_give_columns_that_point_where_they_say(body):
    mount = mounts.mount_from_axes({"x": "up", "y": "starboard", "z": "forward"}, body)
    np.testing.assert_array_equal(mount.R_bs, [[0, 0, 1], [0, 1, 0], [-1, 0, 0]])
    assert mount_check.pointing_words(mount.R_bs, body) == [
        "x points up",
        "y points starboard",
        "z points forward",
    ]


def test_two_axis_words_are_completed_right_handed(body):
    two = mounts.mount_from_axes({"y": "starboard", "z": "forward"}, body)
    three = mounts.mount_from_axes({"x": "up", "y": "starboard", "z": "forward"}, body)
    np.testing.assert_array_equal(two.R_bs, three.R_bs)


def test_mirrored_axis_words_are_refused_and_every_single_cure_is_named(body):
    with pytest.raises(HardwareError, match="mirrors") as caught:
        mounts.mount_from_axes({"x": "down", "y": "starboard", "z": "forward"}, body, name="unit")
    cures = caught.value.fault.remedy
    assert "turn x round: x up, y starboard, z forward" in cures
    assert "exchange x and y" in cures
    assert cures.count(";") == 5  # three flips and three exchanges, all of them cure a mirror


@pytest.mark.parametrize(
    ("axes", "message"),
    [
        ({"x": "up"}, "only 1 of its axes"),
        ({"x": "up", "y": "down"}, "along one line"),
        ({"x": "up", "y": "sideways"}, "no axis 'sideways'"),
        ({"x": "up", "q": "port"}, "no sensor axis 'q'"),
    ],
)
def test_axis_words_that_say_nothing_usable(body, axes, message):
    with pytest.raises(HardwareError, match=message):
        mounts.mount_from_axes(axes, body)


def test_quaternion_and_matrix_agree_with_scipy_in_both_directions(body, random_rotations):
    for R in random_rotations(20):
        scalar_last = Rotation.from_matrix(R).as_quat()
        last = mounts.mount_from_quaternion(scalar_last, body, scalar_first=False)
        first = mounts.mount_from_quaternion(
            np.roll(scalar_last, 1), body, scalar_first=True, maps_sensor_to_host=False
        )
        np.testing.assert_allclose(last.R_bs, R, atol=ROUNDING, rtol=0)
        np.testing.assert_allclose(first.R_bs, R.T, atol=ROUNDING, rtol=0)
        np.testing.assert_allclose(
            mounts.mount_from_matrix(R.T, body, maps_sensor_to_host=False).R_bs, R, atol=ROUNDING, rtol=0
        )


def test_quaternion_off_its_norm_is_an_error_that_states_the_norm(body):
    with pytest.raises(HardwareError, match=r"norm 1\.019"):
        mounts.mount_from_quaternion([1.0, 0.1, 0.1, 0.1366], body, scalar_first=True)


def test_a_matrix_rounded_to_four_decimals_needs_its_digits_stated(body):
    R = Rotation.from_euler("ZYX", [0.3, -0.5, 0.7]).as_matrix()
    rounded = np.round(R, 4)
    with pytest.raises(HardwareError, match="not a rotation"):
        mounts.mount_from_matrix(rounded, body)
    mount = mounts.mount_from_matrix(rounded, body, digits=4)
    assert Rotation.from_matrix(mount.R_bs.T @ R).magnitude() < 1e-4


def test_a_scaled_matrix_is_reported_not_repaired(body):
    """scipy takes a matrix scaled by 1.02 and returns the clean rotation; a checking tool must say so
    instead.
    """
    M = 1.02 * Rotation.from_euler("ZYX", [0.3, -0.5, 0.7]).as_matrix()
    measure = properness.properness(M, body)
    assert not measure.proper
    assert measure.orthonormality == pytest.approx(1.02**2 - 1, abs=1e-12)
    assert measure.distance == pytest.approx(0.02 * np.sqrt(3), abs=1e-12)
    with pytest.raises(HardwareError, match=r"0\.0346 away"):
        mounts.mount_from_matrix(M, body)


def test_two_directions_meet_the_first_exactly_and_report_the_disagreement(body, random_rotations):
    R = random_rotations(1)[0]
    in_sensor = np.array([[1.0, 0.2, -0.3], [0.1, 1.0, 0.4]])
    in_host = in_sensor @ R.T
    in_host[1] = Rotation.from_rotvec(1e-3 * np.cross(in_host[0], in_host[1])).apply(in_host[1])
    mount, pair = mounts.mount_from_directions(in_sensor, in_host, body)
    found = mount.R_bs @ in_sensor[0] / np.linalg.norm(in_sensor[0])
    np.testing.assert_allclose(found, in_host[0] / np.linalg.norm(in_host[0]), atol=ROUNDING, rtol=0)
    assert abs(pair.disagreement) > 1e-4
    reference, _ = Rotation.align_vectors(in_host, in_sensor, weights=[np.inf, 1.0])
    np.testing.assert_allclose(mount.R_bs, reference.as_matrix(), atol=1e-12, rtol=0)


def test_two_nearly_parallel_directions_are_refused(body):
    with pytest.raises(HardwareError, match="from parallel"):
        mounts.mount_from_directions([[1, 0, 0], [1, 1e-4, 0]], [[1, 0, 0], [1, 1e-4, 0]], body)


def test_the_24_right_angle_mounts_are_scipys_octahedral_group(body):
    ours = {tuple(np.round(M).astype(int).ravel()) for M in right_angles.right_angle_rotations()}
    scipys = {tuple(np.round(M).astype(int).ravel()) for M in Rotation.create_group("O").as_matrix()}
    assert ours == scipys
    assert len(ours) == 24


def test_nearest_right_angle_mount_and_deviation_against_scipy(body, random_rotations):
    group = Rotation.create_group("O")
    for R in random_rotations(50):
        found = right_angles.nearest_right_angle(R, body)
        expected = np.min((group.inv() * Rotation.from_matrix(R)).magnitude())
        assert found.deviation == pytest.approx(expected, abs=1e-12)
        assert found.second_deviation >= found.deviation


def test_boresight_and_clocking_are_taken_apart(body):
    """Built by scipy from a known tilt across the boresight after a known turn about it."""
    drawing = mounts.mount_from_axes({"x": "up", "y": "starboard", "z": "forward"}, body)
    clocked = Rotation.from_rotvec([0, 0, np.radians(-7.0)]).as_matrix()
    tilted = Rotation.from_rotvec(np.radians(2.0) * np.array([0.6, 0.8, 0.0])).as_matrix()
    errors = mount_check.pointing_errors(drawing.R_bs @ tilted @ clocked, drawing.R_bs, [0, 0, 1])
    assert np.degrees(errors.boresight) == pytest.approx(2.0, abs=1e-10)
    assert np.degrees(errors.clocking) == pytest.approx(-7.0, abs=1e-10)
    assert np.cos(errors.total / 2) == pytest.approx(
        np.cos(errors.boresight / 2) * np.cos(errors.clocking / 2), abs=1e-14
    )
    assert mount_check.pointing_errors(drawing.R_bs @ np.diag([1.0, -1, -1]), drawing.R_bs, [0, 0, 1]).clocking is None


def test_transposed_and_mirrored_matrices_are_named_when_they_fit_better(body):
    drawing = mounts.mount_from_matrix(Rotation.from_euler("ZYX", [0.9, 0.4, -0.2]).as_matrix(), body)
    transposed = mount_check.check_matrix(drawing.R_bs.T, body, drawing=drawing)
    assert transposed.better == "transposed"
    assert not transposed.accepted
    mirrored = mount_check.check_matrix(drawing.R_bs @ np.diag([1.0, -1, 1]), body, drawing=drawing)
    assert mirrored.better == "mirror image (y reads -y)"
    assert mirrored.properness.mirrored
    assert mount_check.check_matrix(drawing.R_bs, body, drawing=drawing).accepted


def test_rep_103_optical_frame_as_axis_words():
    """The optical frame of REP-103 (check: right-handed z forward, x right, y down), as axis words on its
    body frame.
    """
    flu = Frame("body", ("forward", "left", "up"))
    mount = mounts.mount_from_axes({"z": "forward", "x": "right", "y": "down"}, flu)
    np.testing.assert_array_equal(mount.R_bs, [[0, 0, 1], [-1, 0, 0], [0, -1, 0]])
    np.testing.assert_allclose(np.abs(mounts.mount_quaternion(mount)), [0.5, 0.5, 0.5, 0.5], atol=1e-15, rtol=0)


def test_a_mount_on_a_left_handed_host_is_refused():
    chart = Frame("chart", ("starboard", "forward", "down"), left_handed=True)
    with pytest.raises(HardwareError, match="left-handed frame 'chart'"):
        mounts.mount_from_axes({"x": "forward", "y": "starboard"}, chart)
