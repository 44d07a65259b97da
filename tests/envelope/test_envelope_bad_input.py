"""What a region refuses, and with which words."""

import numpy as np
import pytest

from trunnion.envelope.findings import region_findings
from trunnion.envelope.regions import Between, Box, Cone, Dispersed, Mounted, Poses, Roll, Track, Union
from trunnion.errors import AttitudeError, RegionError

LEVEL = [1.0, 0.0, 0.0, 0.0]


def box(make_convention, *ranges):
    return Box(make_convention("3-2-1"), tuple(tuple(np.radians(span)) for span in ranges))


def test_reversed_range_names_the_angle_and_both_readings(make_convention):
    with pytest.raises(RegionError, match="range of second is reversed: 25 deg to -20 deg") as caught:
        box(make_convention, (0, 0), (25, -20), (0, 0))
    assert "[-20 deg, 25 deg]" in caught.value.fault.remedy
    assert "[25 deg, 340 deg]" in caught.value.fault.remedy


def test_range_wider_than_a_turn_is_a_full_turn(make_convention):
    low, high = box(make_convention, (-200, 400), (0, 0), (0, 0)).ranges[0]
    assert high - low == pytest.approx(2 * np.pi)


def test_range_that_is_no_number(make_convention):
    with pytest.raises(RegionError, match="range of third holds a value that is no number"):
        box(make_convention, (0, 0), (0, 0), (0, np.nan))


def test_box_with_two_ranges(make_convention):
    with pytest.raises(RegionError, match="three ranges, got 2"):
        box(make_convention, (0, 0), (0, 0))


@pytest.mark.parametrize(("near", "far"), [(0.3, 0.2), (-0.1, 0.2), (0.0, 3.2), (0.0, np.nan)])
def test_empty_or_reversed_cone(near, far):
    with pytest.raises(RegionError, match="empty or reversed"):
        Cone([1, 0, 0], [0, 0, 1], near, far)


def test_cone_without_a_direction():
    with pytest.raises(AttitudeError, match="body axis of the cone"):
        Cone([0, 0, 0], [0, 0, 1], 0.0, 0.1)


def test_roll_zero_along_the_held_axis():
    with pytest.raises(RegionError, match="lies along the cone's own body axis"):
        Cone([1, 0, 0], [0, 0, 1], 0.0, 0.1, Roll(0.0, 1.0, [2, 0, 0]))


def test_no_poses_and_a_mirrored_pose():
    with pytest.raises(RegionError, match="empty list of poses"):
        Poses(np.zeros((0, 3, 3)))
    with pytest.raises(AttitudeError, match="reflection"):
        Poses([np.eye(3), np.diag([1.0, 1.0, -1.0])])


@pytest.mark.parametrize("radius", [-0.1, 1.6, np.nan])
def test_dispersion_larger_than_any_margin(radius):
    with pytest.raises(RegionError, match="outside 0 deg to 90 deg"):
        Dispersed(Poses(np.eye(3)), radius)


def test_mirrored_mount():
    with pytest.raises(AttitudeError, match="mounting matrix is a reflection"):
        Mounted(Poses(np.eye(3)), -np.eye(3))


def test_union_of_nothing():
    with pytest.raises(RegionError, match="union of no parts"):
        Union({})


def test_track_shapes_and_numbers():
    with pytest.raises(RegionError, match="N times and N x 4"):
        Track([0.0, 1.0], [LEVEL])
    with pytest.raises(RegionError, match="without rows"):
        Track(np.zeros(0), np.zeros((0, 4)))
    with pytest.raises(RegionError, match=r"row 2 holds a value that is no number \(one such row\)"):
        Track([0.0, 1.0], [LEVEL, [np.nan, 0, 0, 1]])


def test_time_goes_back_or_stands_still():
    with pytest.raises(RegionError, match="time goes back after row 2"):
        Track([0.0, 1.0, 0.5], [LEVEL] * 3)
    with pytest.raises(RegionError, match=r"row 1 and the next bear the same time \(2 such rows\)"):
        Track([1e9, 1e9, 1e9 + 1e-8], [LEVEL] * 3)


def test_quaternion_without_unit_length():
    with pytest.raises(RegionError, match=r"quaternion of row 2 has length 1\.1"):
        Track([0.0, 1.0], [LEVEL, [1.1, 0, 0, 0]])


def test_single_precision_quaternions_are_taken_and_their_error_kept():
    q = np.array([0.5, 0.5, 0.5, 0.5]) * (1 + 3e-7)
    track = Track([0.0], [q])
    assert track.norm_error == pytest.approx(3e-7, rel=1e-6)
    assert np.linalg.norm(track.quaternions[0]) == pytest.approx(1.0, abs=1e-15)


def test_rate_limited_motion_without_its_rate():
    with pytest.raises(RegionError, match="needs that rate"):
        Track([0.0, 1.0], [LEVEL] * 2, Between.RATE_LIMITED)


def test_attitude_error_beyond_reason():
    with pytest.raises(RegionError, match="attitude error is 200 deg"):
        Track([0.0], [LEVEL], attitude_error=np.radians(200.0))


def test_gap_that_is_not_positive():
    with pytest.raises(RegionError, match="longest gap must be positive"):
        Track([0.0], [LEVEL], longest_gap=0.0)


def test_box_that_locks_its_own_convention_is_found(make_convention):
    """Elevation 80 … 90, bank -10 … 10: the wing stays within asin(sin 10 cos 80) = 1.73 deg of level, by hand."""
    names = ("heading", "elevation", "bank")
    upright = Box(make_convention("3-2-1", names=names), ((-np.pi, np.pi), (1.4, 1.7), (-0.17, 0.17)))
    assert len(region_findings(upright)) == 1
    hover = Box(
        make_convention("3-2-1", names=names),
        tuple(tuple(np.radians(span)) for span in ([-180, 180], [80, 90], [-10, 10])),
    )
    (finding,) = region_findings(Union({"hover": Dispersed(hover, 0.1)}))
    assert "hover: this box holds the lock of its own convention, where heading and bank" in finding
    assert "limits the starboard axis to 1.73 deg from square to down" in finding
    level = Box(make_convention("3-2-1"), ((-np.pi, np.pi), (-0.3, 0.3), (-0.7, 0.7)))
    assert region_findings(level) == []
