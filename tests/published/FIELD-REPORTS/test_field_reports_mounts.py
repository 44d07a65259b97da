"""Mounting mistakes from public reports: each is diagnosed by the check that should have found it.

This is the published check of sensor-mount-check: the same functions, numbers printed by others.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import HardwareError
from trunnion.hardware import bench, diagnosis, mistakes, mount_check, mounts, properness, right_angles, surveys
from trunnion.hardware.misalignment import worst_angle_errors

CASES = json.loads((Path(__file__).parent / "mounts.json").read_text())
FRD = Frame("body", ("forward", "right", "down"))
BOARD = Frame("board", ("x", "y", "z"))
THREE_DECIMALS = 0.001  # deg, as computed


def convention(sequence: Sequence, sense: Sense = Sense.MOVING) -> Convention:
    return Convention("entry", FRD, BOARD, sequence, sense, ("first", "second", "third"))


def aligned(**details):
    return mounts.mount_from_axes(
        {"x": "forward", "y": "right", "z": "down"}, FRD, accelerometer=mounts.Reports.SPECIFIC_FORCE, **details
    )


def test_a_rate_sensor_half_a_turn_round_passes_orthogonality_and_is_named_by_its_signs():
    mount = aligned()
    table = bench.bench_table(mount)
    turned = mount.R_bs @ np.diag(CASES["half turn"]["computed"]["channel_signs"])
    assert properness.properness(turned, FRD).proper
    found = diagnosis.diagnose(table, mistakes.reseated(table, turned))
    assert found.mistake.kind in ("inverted mount", "transposed matrix")
    assert "half turn about x" in found.verdict
    assert found.evidence.sufficient
    only_still = bench.bench_table(mount, poses=table.poses[-1:], turns=())
    assert not diagnosis.evidence(only_still).sufficient  # the level pose alone could not have shown it either way


def test_one_reading_at_rest_ranks_the_seats_and_leaves_the_turn_about_the_vertical_open():
    case = CASES["on its edge"]
    reading = np.array(case["given"]["gravity_g"])
    assert np.linalg.norm(reading) == pytest.approx(case["computed"]["norm_g"], abs=0.001)
    host = Frame("robot", ("forward", "left", "up"))
    mount = mounts.mount_from_axes(
        {"x": "forward", "y": "left", "z": "up"}, host, accelerometer=mounts.Reports.SPECIFIC_FORCE
    )
    # the source's map carries the sensor's -y to where z should read, so gravity comes to lie along z
    mapped = np.array(case["given"]["map_rows"]) @ reading
    roll, pitch = np.arctan2(mapped[1], mapped[2]), np.arctan2(-mapped[0], np.hypot(mapped[1], mapped[2]))
    np.testing.assert_allclose(np.degrees([roll, pitch]), case["computed"]["roll_pitch_after"], atol=THREE_DECIMALS)
    seats = diagnosis.seats_from_rest(mount, reading)
    best = seats[0].away
    assert np.degrees(best) == pytest.approx(np.degrees(np.hypot(0.061, 0.091) / 1.0189), abs=0.1)
    assert sum(seat.away < best + 1e-9 for seat in seats) == 4
    source_map = np.array(case["given"]["map_rows"], dtype=float)
    assert any(np.array_equal(seat.matrix, source_map) for seat in seats[:4])


def test_a_tilt_trim_lands_on_the_other_axis_of_a_turned_board():
    case = CASES["tilt trim"]
    tilt, board = np.radians(case["given"]["tilt"]), np.radians(case["given"]["board_yaw"])
    mount = mounts.mount_from_turns([("down", board), ("right", tilt)], Sense.FIXED, FRD)
    entry = mount_check.numbers_to_enter(mount, convention(Sequence.ZYX))
    np.testing.assert_allclose(np.degrees(entry.angles), case["computed"]["yaw_pitch_roll"], atol=THREE_DECIMALS)
    naive = mounts.mount_from_angles([board, tilt, 0.0], convention(Sequence.ZYX), FRD)
    assert np.degrees(rotation_angle(mount.R_bs, naive.R_bs)) == pytest.approx(
        case["computed"]["error_if_entered_as_pitch"], abs=THREE_DECIMALS
    )


def test_pitch_180_then_yaw_90_faces_left_or_right_by_the_kind_of_axes():
    case = CASES["left or right"]["given"]
    turns = [("right", np.pi), ("down", np.pi / 2)]
    fixed = mounts.mount_from_turns(turns, Sense.FIXED, FRD)
    own = mounts.mount_from_turns(turns, Sense.MOVING, FRD)
    np.testing.assert_allclose(fixed.R_bs[:, 0], case["fixed"], atol=1e-9)
    np.testing.assert_allclose(own.R_bs[:, 0], case["own"], atol=1e-9)
    assert mount_check.pointing_words(np.round(fixed.R_bs), FRD)[0] == "x points left"
    assert mount_check.pointing_words(np.round(own.R_bs), FRD)[0] == "x points right"


def test_three_labels_are_one_mount_under_either_reading_and_half_a_turn_apart_between_them():
    case = CASES["three labels"]
    readings = {}
    for sense in Sense:
        readings[sense] = [
            mounts.mount_from_turns([(axis, np.radians(a)) for axis, a in label], sense, FRD).R_bs
            for label in case["given"]["labels"]
        ]
        for R in readings[sense][1:]:
            assert np.degrees(rotation_angle(readings[sense][0], R)) < 1e-6
    for one, other in zip(readings[Sense.FIXED], readings[Sense.MOVING], strict=True):
        assert np.degrees(rotation_angle(one, other)) == pytest.approx(case["computed"]["fixed_against_own"], abs=1e-6)


def test_two_signs_keep_the_hand_one_or_three_do_not():
    case = CASES["upside down"]
    for signs, determinant in zip(case["given"]["signs"], case["computed"]["determinants"], strict=True):
        measure = properness.properness(np.diag(signs), FRD)
        assert measure.determinant == determinant
        assert measure.mirrored == (determinant < 0)
        assert bool(measure.repairs) == measure.mirrored


def test_degrees_in_a_radian_field_are_named():
    case = CASES["degrees as radians"]
    entered = mounts.mount_from_angles(
        [np.pi / 2, 0, 0], convention(Sequence.ZYX), FRD, accelerometer=mounts.Reports.GRAVITY
    )
    table = bench.bench_table(entered)
    wrong = convention(Sequence.ZYX).matrix(np.array([90.0, 0.0, 0.0]))
    assert np.degrees(rotation_angle(np.eye(3), wrong)) == pytest.approx(case["computed"]["modulo"], abs=THREE_DECIMALS)
    found = diagnosis.diagnose(table, mistakes.reseated(table, wrong))
    assert found.mistake.kind == "degrees / radians"
    assert "degrees entered where radians" in found.verdict


def test_one_star_tracker_mount_in_two_languages():
    case = CASES["two languages"]
    mount = mounts.mount_from_quaternion(case["given"]["quaternion_xyzw"], FRD, scalar_first=False)
    both = convention(Sequence.YXZ)
    entry = mount_check.numbers_to_enter(mount, both)
    np.testing.assert_allclose(np.degrees(entry.angles), case["computed"]["angles_213"], atol=THREE_DECIMALS)
    other = mounts.mount_from_quaternion(
        case["given"]["quaternion_xyzw"], FRD, scalar_first=False, maps_sensor_to_host=False
    )
    inverse = mount_check.numbers_to_enter(other, both)
    np.testing.assert_allclose(np.degrees(inverse.angles), case["computed"]["angles_213_inverse"], atol=THREE_DECIMALS)
    assert np.degrees(entry.inverse_separation) == pytest.approx(case["computed"]["same_way_twice"], abs=THREE_DECIMALS)


def test_a_tilt_reading_is_not_a_pitch_angle():
    """Tilts 10 and 15 deg of the tangent type: pitch atan(tan 10 cos 15), total tilt atan(sqrt(tan^2 10 + tan^2
    15)).
    """
    case = CASES["tilt is no pitch"]["computed"]
    tilts = np.radians([case["tilt"], case["roll"]])
    up = surveys.up_from_tilts(tilts, mounts.TiltType.TANGENT)
    assert np.degrees(np.arctan2(np.hypot(up[0], up[1]), up[2])) == pytest.approx(
        case["total_tilt"], abs=THREE_DECIMALS
    )
    assert np.degrees(np.arcsin(up[0])) == pytest.approx(case["matrix_pitch"], abs=THREE_DECIMALS)


def test_a_camera_basis_of_determinant_minus_one_is_refused():
    columns = np.array(CASES["mirrored camera"]["given"]["columns"], dtype=float).T
    with pytest.raises(HardwareError, match="mirrors") as caught:
        mounts.mount_from_matrix(columns, FRD)
    assert "turn x round" in caught.value.fault.remedy.split(";")[0]


def test_the_other_direction_of_a_nearly_aligned_camera_hides():
    case = CASES["camera and unit"]
    mount = mounts.mount_from_matrix(case["given"]["r_ci"], FRD, digits=7)
    entry = mount_check.numbers_to_enter(mount, convention(Sequence.ZYX))
    assert np.degrees(rotation_angle(np.eye(3), mount.R_bs)) == pytest.approx(
        case["computed"]["mounting_angle"], abs=THREE_DECIMALS
    )
    assert np.degrees(entry.inverse_separation) == pytest.approx(
        case["computed"]["inverse_separation"], abs=THREE_DECIMALS
    )
    camera = mounts.Mount("camera", FRD, mount.R_bs, accelerometer=mounts.Reports.SPECIFIC_FORCE)
    transposed = [m for m in mistakes.mistakes(bench.bench_table(camera)) if m.kind == "transposed matrix"]
    shown = diagnosis.evidence(bench.bench_table(camera))
    assert transposed[0].words in shown.unseen  # a bench good to a degree cannot tell the two directions apart
    fine = bench.BenchAccuracy(placing=1e-4, accelerometer=1e-4, gyro=1e-4)
    assert diagnosis.evidence(bench.bench_table(camera, accuracy=fine)).sufficient


def test_a_hand_eye_matrix_that_looks_wrong_is_right():
    case = CASES["hand-eye"]
    base = Frame("base", ("x", "y", "z"))
    check = mount_check.check_matrix(case["given"]["matrix"], base)
    assert not check.properness.mirrored
    assert check.properness.orthonormality < 2e-7
    assert check.pointing[0].split("from ")[1].startswith(case["computed"]["x_nearest"])
    down = np.degrees(np.arccos(-check.properness.nearest[2, 2]))
    assert down == pytest.approx(case["computed"]["z_from_straight_down"], abs=THREE_DECIMALS)
    assert "-z" in check.pointing[2]


def test_a_drawing_matrix_in_fixed_axis_angles():
    case = CASES["head sensor"]["given"]
    host = Frame("head", ("x", "y", "z"))
    mount = mounts.mount_from_matrix(case["matrix"], host)
    fixed = Convention("file", host, BOARD, Sequence.XYZ, Sense.FIXED, ("roll", "pitch", "yaw"))
    entry = mount_check.numbers_to_enter(mount, fixed)
    rebuilt = fixed.matrix(np.array(case["rpy_fixed_rad"]))
    assert rotation_angle(fixed.matrix(entry.angles), rebuilt) < 1e-7
    np.testing.assert_allclose(np.abs(entry.angles), case["rpy_fixed_rad"], atol=1e-7)
    found = right_angles.nearest_right_angle(mount.R_bs, host)
    assert found.deviation == 0.0


def test_an_array_half_a_turn_away_has_a_boresight_error_of_180_and_no_clocking():
    half = np.radians(CASES["array half a turn away"]["given"]["turn"])
    drawing = aligned(boresight="z")
    found = mounts.mount_from_turns([("right", half)], Sense.FIXED, FRD)
    errors = mount_check.pointing_errors(found.R_bs, drawing.R_bs, [0, 0, 1])
    assert np.degrees(errors.boresight) == pytest.approx(180.0, abs=1e-9)
    assert errors.clocking is None


def test_growth_near_the_pole_is_one_over_the_cosine():
    """1/cos of 0, 60, 80, 85, 89 deg: onset reported at 45 to 60 deg (xioTechnologies/Fusion issue 98)."""
    margins = np.radians(90.0 - np.array([0, 60, 80, 85, 89]))
    gains = worst_angle_errors(1e-9, margins)[:, 0] / 1e-9
    np.testing.assert_allclose(gains, [1.0, 2.0, 5.75877, 11.47371, 57.29869], atol=1e-4)
