"""The bench table by plain geometry, and every planted mistake named by the diagnosis."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import HardwareError
from trunnion.hardware import bench, diagnosis, instruments, mistakes, mounts, ranking, right_angles


@pytest.fixture
def unit_on_end(body):
    return mounts.mount_from_axes(
        {"x": "up", "y": "starboard", "z": "forward"},
        body,
        name="inertial unit",
        boresight="z",
        accelerometer=mounts.Reports.SPECIFIC_FORCE,
        tolerance=mounts.MountTolerance(total=np.radians(0.5)),
    )


def test_level_and_at_rest_the_axis_that_points_up_reads_plus_one_g_of_specific_force(unit_on_end):
    """Sign by declaration (common practice: specific force is the support's push, so up reads +1 g)."""
    table = bench.bench_table(unit_on_end)
    level = [p.key for p in table.poses].index("level")
    np.testing.assert_allclose(table.expected.accelerometer[level], [1, 0, 0], atol=1e-15)
    gravity = mounts.Mount("g", unit_on_end.host, unit_on_end.R_bs, accelerometer=mounts.Reports.GRAVITY)
    np.testing.assert_allclose(bench.bench_table(gravity).expected.accelerometer[level], [-1, 0, 0], atol=1e-15)


def test_each_pose_puts_the_named_axis_up(body):
    for pose in bench.six_poses(body):
        word = {"level": "up", "upside down": "down"}.get(pose.key, pose.key.removesuffix(" up"))
        np.testing.assert_allclose(pose.R_lb @ body.direction(word), instruments.UP, atol=1e-15)
        assert np.linalg.det(pose.R_lb) == pytest.approx(1.0)


def test_turns_say_what_moves_where(body):
    """A right-handed turn about forward carries starboard towards down (plain geometry)."""
    for turn in bench.three_turns(body, 0.5):
        words = turn.words.split("its ")
        moves, towards = words[2].split(" axis moves towards ")
        velocity = np.cross(turn.rate_b, body.direction(moves))
        np.testing.assert_allclose(velocity, 0.5 * body.direction(towards), atol=1e-15)


def test_undeclared_accelerometer_is_an_error(body):
    mount = mounts.mount_from_axes({"x": "up", "y": "starboard", "z": "forward"}, body)
    with pytest.raises(HardwareError, match="does not say what its accelerometer reports"):
        bench.bench_table(mount)


def test_gyro_reads_the_body_rate_in_its_own_axes(unit_on_end):
    table = bench.bench_table(unit_on_end, turn_rate=0.5)
    np.testing.assert_allclose(table.expected.gyro, 0.5 * np.array([[0, 0, 1], [0, 1, 0], [-1, 0, 0]]), atol=1e-15)


def test_tolerances_cover_the_worst_turn_of_the_mount(unit_on_end, rng):
    """Random turns of at most the mount's and the bench's tolerance (made by scipy) stay inside the printed limits."""
    table = bench.bench_table(unit_on_end)
    bound = np.radians(0.5) + table.accuracy.placing
    for _ in range(200):
        axis = rng.normal(size=3)
        turn = Rotation.from_rotvec(bound * axis / np.linalg.norm(axis)).as_matrix()
        moved = mistakes.reseated(table, unit_on_end.R_bs @ turn)
        assert np.all(
            np.abs(moved.accelerometer - table.expected.accelerometer)
            <= table.tolerance.accelerometer - table.accuracy.accelerometer + 1e-12
        )


def test_six_poses_and_three_turns_tell_all_24_seats_apart_whatever_the_mount(body, random_rotations):
    for R in [*right_angles.right_angle_rotations()[::12], *random_rotations(1)]:
        mount = mounts.Mount("any", body, R, accelerometer=mounts.Reports.SPECIFIC_FORCE)
        table = bench.bench_table(mount)
        assert diagnosis.evidence(table).sufficient
        for P in right_angles.right_angle_rotations()[1:]:
            found = diagnosis.diagnose(table, mistakes.reseated(table, R @ P))
            assert not found.passed
            words = [found.mistake.words, *found.equally_good]
            assert (
                any(right_angles.turn_in_words(P) in said for said in words)
                or found.mistake.kind == "transposed matrix"
            )


def test_all_static_signs_opposite_is_a_polarity_mix_up_not_an_inverted_mount(unit_on_end):
    table = bench.bench_table(unit_on_end)
    opposite = bench.Channels(accelerometer=-table.expected.accelerometer, gyro=table.expected.gyro)
    found = diagnosis.diagnose(table, opposite)
    assert found.mistake.kind == "specific force / gravity mix-up"
    assert "not inverted" in found.verdict


@pytest.mark.parametrize(
    ("plant", "kind"),
    [
        (lambda e: {"gyro": e.gyro * [1, -1, 1]}, "flipped sign"),
        (lambda e: {"gyro": e.gyro[:, [1, 0, 2]]}, "swapped axes"),
        (lambda e: {"gyro": np.degrees(e.gyro)}, "degrees / radians"),
        (lambda e: {"gyro": np.radians(e.gyro)}, "degrees / radians"),
        (lambda e: {"accelerometer": e.accelerometer + np.array([0.0, 0.12, 0.0])}, "wrong zero"),
        (lambda e: {"accelerometer": e.accelerometer * [1, 1, -1]}, "flipped sign"),
    ],
)
def test_planted_channel_mistakes_are_named(unit_on_end, plant, kind):
    table = bench.bench_table(unit_on_end)
    read = {"accelerometer": table.expected.accelerometer, "gyro": table.expected.gyro}
    read.update(plant(table.expected))
    found = diagnosis.diagnose(table, bench.Channels(**read))
    assert found.mistake.kind == kind


def test_a_skewed_turning_axis_is_named_with_its_size(unit_on_end):
    table = bench.bench_table(unit_on_end)
    gyro = table.expected.gyro.copy()
    gyro[2] = Rotation.from_rotvec([0, np.radians(6), 0]).apply(gyro[2])
    found = diagnosis.diagnose(table, bench.Channels(accelerometer=table.expected.accelerometer, gyro=gyro))
    assert found.mistake.kind == "skewed turning axis"
    assert "about down" in found.mistake.words
    assert "6 deg" in found.mistake.words


def test_a_seat_off_by_a_general_turn_is_named_with_its_size(unit_on_end):
    table = bench.bench_table(unit_on_end)
    moved = unit_on_end.R_bs @ Rotation.from_rotvec([0, np.radians(11), 0]).as_matrix()
    found = diagnosis.diagnose(table, mistakes.reseated(table, moved))
    assert found.mistake.kind == "misaligned seat"
    assert "11 deg" in found.mistake.words


def test_readings_no_mistake_explains_say_so(unit_on_end, rng):
    table = bench.bench_table(unit_on_end)
    noise = bench.Channels(accelerometer=rng.uniform(-1, 1, (6, 3)), gyro=rng.uniform(-1, 1, (3, 3)))
    found = diagnosis.diagnose(table, noise)
    assert found.mistake is None
    assert "none of the known mistakes fits" in found.verdict


def test_level_planar_and_small_tests_are_marked_insufficient(unit_on_end, body):
    poses = bench.six_poses(body)
    level = diagnosis.evidence(bench.bench_table(unit_on_end, poses=poses[4:], turns=()))
    assert not level.sufficient
    assert "too level" in level.marks[0]
    planar = diagnosis.evidence(bench.bench_table(unit_on_end, poses=poses[2:], turns=()))
    assert not planar.sufficient
    assert "planar" in planar.marks[0]
    slow = bench.bench_table(
        unit_on_end,
        poses=(),
        turns=bench.three_turns(body, 0.01),
        accuracy=bench.BenchAccuracy(gyro=0.5),
    )
    assert any("small" in mark for mark in diagnosis.evidence(slow).marks)


def test_readings_that_pass_on_a_level_bench_say_the_evidence_is_insufficient(unit_on_end, body):
    table = bench.bench_table(unit_on_end, poses=bench.six_poses(body)[5:], turns=())
    found = diagnosis.diagnose(table, table.expected)
    assert found.passed
    assert "insufficient" in found.verdict


def test_filled_rows_come_back_in_the_tables_order(unit_on_end):
    table = bench.bench_table(unit_on_end)
    read = bench.readings_from_rows(
        table,
        [
            {"row": "level", "instrument": "accelerometer", "values": [1.0, 0.01, 0.0]},
            {"row": "about down", "instrument": "gyro", "values": [-0.52, 0.0, 0.0]},
        ],
    )
    assert np.sum(np.isfinite(read.accelerometer)) == 3
    np.testing.assert_array_equal(read.accelerometer[5], [1.0, 0.01, 0.0])
    with pytest.raises(HardwareError, match="no row 'nose up'"):
        bench.readings_from_rows(table, [{"row": "nose up", "instrument": "gyro", "values": [0, 0, 0]}])
    with pytest.raises(HardwareError, match="holds no reading"):
        diagnosis.diagnose(table, bench.readings_from_rows(table, []))


def test_clinometer_types_differ_off_level_and_agree_on_one_axis(body):
    """Sine: each axis to the horizontal. Tangent: in the plane with the third axis. Plain trigonometry."""
    R_lb = Rotation.from_euler("ZYX", np.radians([30, 20, 35])).as_matrix()

    def reading(kind):
        mount = mounts.mount_from_axes(
            {"x": "forward", "y": "starboard", "z": "down"},
            body,
            clinometer=kind,
            tilt_axes=("x", "y"),
            instruments=(mounts.Instrument.CLINOMETER,),
        )
        return instruments.clinometer(mount, R_lb)

    sine, tangent = reading(mounts.TiltType.SINE), reading(mounts.TiltType.TANGENT)
    pitch, roll = np.radians([20, 35])
    np.testing.assert_allclose(sine, [pitch, np.arcsin(-np.sin(roll) * np.cos(pitch))], atol=1e-14)
    np.testing.assert_allclose(tangent, [np.arctan2(np.tan(pitch), np.cos(roll)), -roll], atol=1e-14)


@pytest.mark.parametrize(
    ("plant", "said"),
    [
        (lambda v: v * [-1, 1], "tilt x inverted"),
        (lambda v: v[:, ::-1], "tilts x and y exchanged"),
        (np.degrees, "degrees taken for radians"),
        (lambda v: v + np.radians(5), "a constant"),
        (lambda v: np.stack([0.7 * np.cos(9 * v[:, 0]), v[:, 1]], axis=1), None),
    ],
)
def test_clinometer_mistakes_are_named(body, plant, said):
    mount = mounts.mount_from_axes(
        {"x": "forward", "y": "starboard", "z": "down"},
        body,
        clinometer=mounts.TiltType.SINE,
        tilt_axes=("x", "y"),
        instruments=(mounts.Instrument.CLINOMETER,),
    )
    angles = [(0, 30, 0), (0, -20, 10), (0, 10, 40), (0, 15, -35)]
    poses = [
        bench.pose_from_attitude(f"pose {k}", Rotation.from_euler("ZYX", a, degrees=True).as_matrix())
        for k, a in enumerate(angles)
    ]
    table = bench.bench_table(mount, poses=poses)
    found = diagnosis.diagnose(table, bench.Channels(clinometer=plant(table.expected.clinometer)))
    if said is None:
        assert found.mistake is None
    else:  # two tilts cannot tell an inverted channel from the sensor turned over: both are said
        assert any(said in words for words in [found.mistake.words, *found.equally_good])


def test_a_clinometer_of_the_other_type_is_named(body):
    def table(kind):
        mount = mounts.mount_from_axes(
            {"x": "forward", "y": "starboard", "z": "down"},
            body,
            clinometer=kind,
            tilt_axes=("x", "y"),
            instruments=(mounts.Instrument.CLINOMETER,),
        )
        attitudes = Rotation.from_euler("ZYX", [[0, 30, 35], [0, -25, 40]], degrees=True).as_matrix()
        return bench.bench_table(mount, poses=[bench.pose_from_attitude(str(k), R) for k, R in enumerate(attitudes)])

    sine, tangent = table(mounts.TiltType.SINE), table(mounts.TiltType.TANGENT)
    assert diagnosis.diagnose(sine, tangent.expected).mistake.kind == "tilt type"


def test_a_star_trackers_azimuth_and_elevation_are_taken_back(body):
    mount = mounts.mount_from_axes(
        {"x": "forward", "y": "starboard", "z": "down"},
        body,
        boresight="-z",
        instruments=(mounts.Instrument.STAR_TRACKER,),
    )
    table = bench.bench_table(mount)
    entered = [
        {
            "row": pose.key,
            "instrument": "star_tracker",
            "values": np.nan_to_num(instruments.boresight_azimuth_elevation(mount, pose.R_lb)),
        }
        for pose in table.poses
    ]
    assert diagnosis.diagnose(table, bench.readings_from_rows(table, entered)).passed


def test_every_row_reveals_some_mistakes_and_none_reveals_all(unit_on_end):
    powers = diagnosis.row_powers(bench.bench_table(unit_on_end))
    assert len(powers) == 9
    assert all(0 < power.revealed < power.considered for power in powers)


def test_magnetometer_and_star_tracker_columns(body):
    mount = mounts.mount_from_axes(
        {"x": "forward", "y": "starboard", "z": "down"},
        body,
        boresight="-z",
        instruments=(mounts.Instrument.MAGNETOMETER, mounts.Instrument.STAR_TRACKER),
    )
    field = instruments.local_field(strength=48.0, dip=np.radians(66.0))
    table = bench.bench_table(mount, field_l=field)
    level = [p.key for p in table.poses].index("level")
    np.testing.assert_allclose(table.expected.magnetometer[level], field, atol=1e-12)
    np.testing.assert_allclose(table.expected.star_tracker[level], [0, 0, -1], atol=1e-15)
    with pytest.raises(HardwareError, match="field at the bench"):
        bench.bench_table(mount)


def test_ranking_the_24_seats_agrees_with_margins_of_scipys_angles(body, random_rotations):
    """Entry margins of a sampled region; each seat's margin again from scipy's middle angle of the sensor's
    attitude.
    """
    from trunnion.attitude.conventions import Convention
    from trunnion.attitude.frames import Frame
    from trunnion.attitude.sequences import Sense, Sequence

    local, sensor = Frame("local", ("north", "east", "down")), Frame("unit", ("x", "y", "z"))
    convention = Convention("unit", local, sensor, Sequence.ZYX, Sense.MOVING, ("yaw", "pitch", "roll"))
    regions = {"one": random_rotations(40), "two": Rotation.from_euler("ZYX", [0.2, 0.4, 0.1]).as_matrix()[None]}
    tables = {name: np.min(np.arccos(np.minimum(1, np.abs(R))), axis=0) for name, R in regions.items()}
    ranked = ranking.rank_right_angle_mounts(tables, convention, body)
    assert len(ranked) == 24
    assert ranked[0].margin >= ranked[-1].margin
    for seat in ranked:
        for name, R in regions.items():
            middle = Rotation.from_matrix(R @ seat.matrix).as_euler("ZYX")[:, 1]
            assert seat.margins[name] == pytest.approx(np.min(np.pi / 2 - np.abs(middle)), abs=1e-7)
