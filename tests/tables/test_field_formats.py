"""Trajectory text, bags, telemetry, flash logs, MAT files, photos: written by another program or by their layout."""

from __future__ import annotations

import json
import os
import random
import struct

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import TableError
from trunnion.tables import dataflash, exif, mavlink, read_table, statement_from_plain

WORLD = {"world": "x east, y north, z up", "moving axes": "x right, y down, z forward"}
BODY = {"maps": "body to reference", "between samples": "slerp"}
FLOAT32 = 1e-6


def state(name, convention=None, **keys):
    return statement_from_plain(
        {"table": name, **{key.replace("_", " "): value for key, value in keys.items()}}, convention
    )


# --- trajectory text ---------------------------------------------------------------------------------------------


def test_tum_text_is_scalar_last_with_blanks_and_comments(tmp_path, turns):
    rows = "\n".join(
        f"{i * 0.05:.3f}  1 2 3 {q[1]:.17g} {q[2]:.17g} {q[3]:.17g} {q[0]:.17g}" for i, q in enumerate(turns)
    )
    (tmp_path / "run.txt").write_text("# timestamp tx ty tz qx qy qz qw\n" + rows + "\n")
    table = read_table(state("run.txt", format="tum", answers=WORLD, **BODY), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < 1e-14
    with pytest.raises(TableError) as caught:
        read_table(state("run.txt", format="tum"), tmp_path)
    assert len(caught.value.faults) == 4  # direction, between samples, world axes, moving axes


def test_tum_text_names_torn_lines(tmp_path):
    (tmp_path / "run.txt").write_text("0 1 2 3 0 0 0 1\n1 1 2 3 0 0 1\n2 1 2 3 0 0 zero 1\n")
    with pytest.raises(TableError) as caught:
        read_table(state("run.txt", format="tum", answers=WORLD, **BODY), tmp_path)
    assert "line 2: 7 cells where the header has 8" in str(caught.value)
    assert "line 3: 'zero' in column 'qz'" in str(caught.value)


def test_kitti_text_is_three_by_four_by_rows_and_its_clock_is_asked(tmp_path, turns):
    M = matrix_from_quaternion(turns)
    rows = np.concatenate([M, np.ones((len(M), 3, 1))], axis=-1).reshape(-1, 12)
    np.savetxt(tmp_path / "poses.txt", rows, fmt="%.9e")
    table = read_table(state("poses.txt", format="kitti", answers={**WORLD, "clock": "100 ms"}, **BODY), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < 1e-8
    np.testing.assert_allclose(table.times, 0.1 * np.arange(len(turns)), rtol=0, atol=1e-12)
    with pytest.raises(TableError, match="how many seconds lie between two rows"):
        read_table(state("poses.txt", format="kitti", answers=WORLD, **BODY), tmp_path)


# --- MAVLink -----------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def telemetry(turns):
    """A telemetry log packed by pymavlink: heartbeats, quaternions of system 1, angles of systems 1 and 2."""
    os.environ["MAVLINK20"] = "1"
    ardupilot = pytest.importorskip("pymavlink.dialects.v20.ardupilotmega")
    angles = Rotation.from_quat(np.roll(turns, -1, axis=1)).as_euler("ZYX")
    out = []
    senders = {system: ardupilot.MAVLink(None, srcSystem=system, srcComponent=1) for system in (1, 2)}

    def put(row, system, message):
        packed = message.pack(senders[system], force_mavlink1=row % 2 == 0)
        out.append(struct.pack(">Q", 1_700_000_000_000_000 + row * 20_000) + bytes(packed))

    for row, (q, (yaw, pitch, roll)) in enumerate(zip(turns, angles, strict=True)):
        put(row, 1, ardupilot.MAVLink_heartbeat_message(2, 3, 81, 0, 4, 3))
        put(row, 1, ardupilot.MAVLink_attitude_quaternion_message(row * 20, *q, 0.1, 0.2, 0.0))
        put(row, 1, ardupilot.MAVLink_attitude_message(row * 20, roll, pitch, yaw, 0, 0, 0))
        put(row, 2, ardupilot.MAVLink_attitude_message(row * 20, 0, 0, 0, 0, 0, 0))
    return b"".join(out)


def telemetry_statement(**changes):
    plain = {
        "columns": {"time": {"column": "time_boot_ms", "unit": "ms"}, "quaternion": ["q1", "q2", "q3", "q4"]},
        "topic": "ATTITUDE_QUATERNION",
        "scalar": "first",
        **BODY,
    }
    plain.update(changes)
    return state("flight.tlog", **plain)


def test_telemetry_packed_by_another_program(tmp_path, telemetry, turns, ordinary):
    (tmp_path / "flight.tlog").write_bytes(telemetry)
    table = read_table(telemetry_statement(), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < FLOAT32
    columns = {"time": {"column": "log_time", "unit": "us"}, "angles": ["yaw", "pitch", "roll"], "unit": "rad"}
    plain = {"columns": columns, "topic": "ATTITUDE", "between samples": "slerp"}
    with pytest.raises(TableError, match=r"which system's attitude\?\n.*'1/1', '2/1'"):
        read_table(state("flight.tlog", ordinary, **plain), tmp_path)
    table = read_table(state("flight.tlog", ordinary, answers={"system": "1/1"}, **plain), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < FLOAT32
    np.testing.assert_allclose(table.times, 0.02 * np.arange(len(turns)), rtol=0, atol=1e-9)


def test_a_used_display_offset_is_asked_for(tmp_path):
    ardupilot = pytest.importorskip("pymavlink.dialects.v20.ardupilotmega")
    sender = ardupilot.MAVLink(None, srcSystem=1, srcComponent=1)
    tilted = [0.9238795, 0.0, 0.3826834, 0.0]
    message = ardupilot.MAVLink_attitude_quaternion_message(0, 1, 0, 0, 0, 0, 0, 0, tilted)
    (tmp_path / "flight.tlog").write_bytes(struct.pack(">Q", 1) + bytes(message.pack(sender)))
    with pytest.raises(TableError, match="attitude offset field"):
        read_table(telemetry_statement(), tmp_path)


def test_damaged_telemetry_is_reported(tmp_path, telemetry):
    generator = random.Random(5)
    for _ in range(20):
        place = generator.randrange(20, len(telemetry) - 1000)
        zeroed = telemetry[:place] + bytes(1000) + telemetry[place + 1000 :]
        assert mavlink.walk_telemetry(zeroed, "log").damage.troubles()
    changed = bytearray(telemetry)
    spot = telemetry.index(struct.pack("<I", 4000), 100)
    changed[spot + 6] ^= 0x10
    assert any(
        "wrong checksum" in str(found) for found in mavlink.walk_telemetry(bytes(changed), "log").damage.troubles()
    )
    (tmp_path / "flight.tlog").write_bytes(telemetry[:-7])
    with pytest.raises(TableError, match="the last packet is incomplete"):
        read_table(telemetry_statement(), tmp_path)
    (tmp_path / "flight.tlog").write_bytes(b"not a log at all")
    with pytest.raises(TableError, match="no MAVLink telemetry log"):
        read_table(telemetry_statement(), tmp_path)


# --- DataFlash ---------------------------------------------------------------------------------------------------


def flash_format(number, length, name, letters, fields):
    return b"\xa3\x95\x80" + struct.pack(
        "<BB4s16s64s", number, length, name.encode(), letters.encode(), fields.encode()
    )


@pytest.fixture(scope="module")
def flash(turns):
    """A flash log by its published layout: centidegree angles, and quaternions of two estimators."""
    angles = np.degrees(Rotation.from_quat(np.roll(turns, -1, axis=1)).as_euler("ZYX"))
    out = [
        flash_format(128, 89, "FMT", "BBnNZ", "Type,Length,Name,Format,Columns"),
        flash_format(10, 17, "ATT", "Qccc", "TimeUS,Roll,Pitch,Yaw"),
        flash_format(11, 28, "XKQ", "QBffff", "TimeUS,C,Q1,Q2,Q3,Q4"),
        flash_format(12, 75, "MSG", "QZ", "TimeUS,Message"),
    ]
    for row, (q, (yaw, pitch, roll)) in enumerate(zip(turns, angles, strict=True)):
        now = 1_000_000 + row * 40_000
        centi = [round(value * 100) for value in (roll, pitch, yaw)]
        out.append(b"\xa3\x95\x0a" + struct.pack("<Qhhh", now, *centi))
        out.append(b"\xa3\x95\x0b" + struct.pack("<QB4f", now, 0, *q))
        out.append(b"\xa3\x95\x0b" + struct.pack("<QB4f", now, 1, 1, 0, 0, 0))
        if row % 40 == 0:
            out.append(b"\xa3\x95\x0c" + struct.pack("<Q64s", now, b"all well"))
    return b"".join(out)


def flash_statement(**changes):
    plain = {
        "columns": {"time": {"column": "TimeUS", "unit": "us"}, "quaternion": ["Q1", "Q2", "Q3", "Q4"]},
        "topic": "XKQ",
        "scalar": "first",
        "answers": {"phase frame": "no"},
        "format": "dataflash",
        **BODY,
    }
    plain.update(changes)
    return state("flight.bin", **plain)


def test_flash_log_against_the_layout_and_another_reader(tmp_path, flash, turns, ordinary):
    (tmp_path / "flight.bin").write_bytes(flash)
    table = read_table(flash_statement(), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < FLOAT32
    assert any("told apart by field C: instance 0" in note for note in table.notes)
    assert len(read_table(flash_statement(instance=1), tmp_path)) == len(turns)

    reader = pytest.importorskip("pymavlink.DFReader").DFReader_binary(str(tmp_path / "flight.bin"))
    theirs = []
    while (message := reader.recv_match(type="ATT")) is not None:
        theirs.append((message.Roll, message.Pitch, message.Yaw))
    ours = dataflash.fields_of(dataflash.walk_flash(flash, "log"), "ATT")
    np.testing.assert_allclose(
        np.stack([ours[name] for name in ("Roll", "Pitch", "Yaw")], -1), theirs, rtol=0, atol=1e-9
    )

    columns = {"time": {"column": "TimeUS", "unit": "us"}, "angles": ["Yaw", "Pitch", "Roll"], "unit": "deg"}
    plain = {"columns": columns, "topic": "ATT", "between samples": "slerp", "answers": {"phase frame": "no"}}
    table = read_table(state("flight.bin", ordinary, format="dataflash", **plain), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < np.radians(0.01)
    assert any("hundredths" in note for note in table.notes)


def test_damaged_flash_logs_are_reported(tmp_path, flash):
    generator = random.Random(6)
    for _ in range(20):
        place = generator.randrange(400, len(flash) - 1000)
        zeroed = flash[:place] + bytes(1000) + flash[place + 1000 :]
        assert dataflash.walk_flash(zeroed, "log").damage.troubles()
    (tmp_path / "flight.bin").write_bytes(flash[:-5])
    with pytest.raises(TableError, match="the last message is incomplete"):
        read_table(flash_statement(), tmp_path)
    with pytest.raises(TableError, match="did you mean 'XKQ'"):
        read_table(flash_statement(topic="XKQ1"), tmp_path)
    (tmp_path / "flight.bin").write_bytes(flash)
    with pytest.raises(TableError, match="does the meaning of the frame change"):
        read_table(flash_statement(answers={}), tmp_path)


# --- bags --------------------------------------------------------------------------------------------------------

BAG = {"reference": "map", "body": "base_link", "between samples": "slerp", "maps": "base_link to map"}
BAG_ANSWERS = {"world": "x east, y north, z up", "mount": "applied"}


@pytest.fixture(scope="module")
def bag(tmp_path_factory, turns):
    """A ROS 2 bag written by rosbags: transforms between two pairs of frames, an unknown type, an inertial unit."""
    pytest.importorskip("rosbags")
    from rosbags.rosbag2 import Writer
    from rosbags.typesys import Stores, get_typestore

    store = get_typestore(Stores.ROS2_HUMBLE)
    kinds = store.types
    folder = tmp_path_factory.mktemp("bag") / "run"
    with Writer(folder, version=9) as writer:
        tf = writer.add_connection("/tf", "tf2_msgs/msg/TFMessage", typestore=store)
        imu = writer.add_connection("/imu", "sensor_msgs/msg/Imu", typestore=store)
        text = writer.add_connection("/chat", "std_msgs/msg/String", typestore=store)
        vector = kinds["geometry_msgs/msg/Vector3"]
        zero = vector(0.0, 0.0, 0.0)
        for row, (w, x, y, z) in enumerate(turns.tolist()):
            now = 1_700_000_000_000_000_000 + row * 10_000_000
            stamp = kinds["builtin_interfaces/msg/Time"](now // 10**9, now % 10**9)
            q = kinds["geometry_msgs/msg/Quaternion"](x, y, z, w)
            header = kinds["std_msgs/msg/Header"](stamp, "map")
            transform = kinds["geometry_msgs/msg/Transform"](zero, q)
            one = kinds["geometry_msgs/msg/TransformStamped"](header, "base_link", transform)
            other = kinds["geometry_msgs/msg/TransformStamped"](header, "camera", transform)
            message = kinds["tf2_msgs/msg/TFMessage"]([other, one])
            writer.write(tf, now, store.serialize_cdr(message, tf.msgtype))
            covariance = np.array([-1.0, *[0.0] * 8])
            unit = kinds["sensor_msgs/msg/Imu"](header, q, covariance, zero, np.zeros(9), zero, np.zeros(9))
            writer.write(imu, now, store.serialize_cdr(unit, imu.msgtype))
        writer.write(text, now, store.serialize_cdr(kinds["std_msgs/msg/String"]("hello"), text.msgtype))
    return folder


def test_transforms_of_a_bag_between_the_stated_frames(bag, turns):
    table = read_table(state("run", topic="/tf", answers=BAG_ANSWERS, **BAG), bag.parent)
    assert np.max(quaternion_angle(table.quaternions, turns)) < 1e-14
    np.testing.assert_allclose(table.times, 0.01 * np.arange(len(turns)), rtol=0, atol=1e-12)
    assert len(table.sha256) == 64


@pytest.mark.parametrize(
    ("topic", "words"),
    [
        (None, r"which topic holds the attitude\?\n.*/tf \(tf2_msgs"),
        ("/tff", "did you mean '/tf'"),
        ("/chat", "holds no attitude known here"),
        ("/imu", "they hold no orientation"),
    ],
)
def test_topics_that_hold_no_attitude(bag, topic, words):
    extra = {"topic": topic} if topic else {}
    with pytest.raises(TableError, match=words):
        read_table(state("run", answers=BAG_ANSWERS, **BAG, **extra), bag.parent)


def test_a_bag_asks_what_its_messages_do_not_say(bag):
    with pytest.raises(TableError) as caught:
        read_table(state("run", topic="/tf", reference="map", body="base_link"), bag.parent)
    assert [words in str(caught.value) for words in ("which components", "world frame", "sensor's mount")] == [True] * 3


@pytest.mark.parametrize(
    ("library", "name", "extra"), [("rosbags", "run", "bags"), ("mcap", "run.mcap", "bags"), ("h5py", "new.mat", "mat")]
)
def test_a_missing_library_is_named_with_the_extra_that_brings_it(tmp_path, monkeypatch, bag, library, name, extra):
    (tmp_path / "hidden" / library).mkdir(parents=True)
    (tmp_path / "hidden" / library / "__init__.py").write_text(f"raise ImportError('no {library}')")
    monkeypatch.setenv("PYTHONPATH", str(tmp_path / "hidden"))
    root = bag.parent if name == "run" else tmp_path
    if name == "run.mcap":
        (tmp_path / name).write_bytes(b"\x89MCAP0\r\n")
    if name == "new.mat":
        (tmp_path / name).write_bytes(b"\x89HDF\r\n\x1a\n" + bytes(600))
    plain = MAT if name == "new.mat" else {"topic": "/tf", "answers": BAG_ANSWERS, **BAG}
    with pytest.raises(TableError, match=rf"needs the library '{library}'\n.*trunnion\[{extra}\]"):
        read_table(state(name, **plain), root)


@pytest.fixture
def mcap_file(tmp_path, turns):
    """An MCAP file written by its own library: poses as JSON and a channel of another encoding."""
    writer_module = pytest.importorskip("mcap.writer")
    with (tmp_path / "run.mcap").open("wb") as handle:
        writer = writer_module.Writer(handle)
        writer.start()
        schema = writer.register_schema("geometry_msgs/msg/PoseStamped", "jsonschema", b'{"$ref": "#"}')
        channel = writer.register_channel("/pose", "json", schema)
        for row, (w, x, y, z) in enumerate(turns.tolist()):
            stamp = {"sec": 5 + row, "nanosec": 0}
            pose = {"orientation": {"x": x, "y": y, "z": z, "w": w}}
            data = json.dumps({"header": {"stamp": stamp, "frame_id": "map"}, "pose": pose}).encode()
            writer.add_message(channel, row, data, row)
        writer.finish()
    return tmp_path / "run.mcap"


def test_poses_of_an_mcap_file(mcap_file, turns):
    table = read_table(state("run.mcap", topic="/pose", answers=BAG_ANSWERS, **BAG), mcap_file.parent)
    assert np.max(quaternion_angle(table.quaternions, turns)) < 1e-14
    wrong = {**BAG, "reference": "odom", "maps": "base_link to odom"}
    with pytest.raises(TableError, match="reference frame is 'map', stated is 'odom'"):
        read_table(state("run.mcap", topic="/pose", answers=BAG_ANSWERS, **wrong), mcap_file.parent)


def test_cut_and_damaged_mcap_files_are_refused(mcap_file):
    whole = mcap_file.read_bytes()
    statement = state("run.mcap", topic="/pose", answers=BAG_ANSWERS, **BAG)
    generator = random.Random(8)
    for damaged in (
        whole[: generator.randrange(8, len(whole))],
        whole[: len(whole) // 2] + bytes(1000) + whole[len(whole) // 2 + 1000 :],
        b"MCAP" + whole,
        b"",
    ):
        mcap_file.write_bytes(damaged)
        with pytest.raises(TableError):
            read_table(statement, mcap_file.parent)


# --- MAT ---------------------------------------------------------------------------------------------------------

MAT = {
    "columns": {
        "time": {"column": "log.t", "unit": "s"},
        "quaternion": [f"log.q(:,{place})" for place in (1, 2, 3, 4)],
    },
    "scalar": "first",
    **BODY,
}


def test_mat_files_of_both_versions(tmp_path, turns):
    scipy_io = pytest.importorskip("scipy.io")
    h5py = pytest.importorskip("h5py")
    times = np.arange(len(turns)) * 0.01
    scipy_io.savemat(tmp_path / "old.mat", {"log": {"t": times, "q": turns}, "name": "text"})
    with h5py.File(tmp_path / "new.mat", "w", userblock_size=512) as file:
        file["log/t"], file["log/q"] = times[None, :], turns.T
        file["loop"] = h5py.SoftLink("/")
    for name in ("old.mat", "new.mat"):
        table = read_table(state(name, **MAT), tmp_path)
        assert np.max(quaternion_angle(table.quaternions, turns)) < 1e-14
        np.testing.assert_allclose(table.times, times, rtol=0, atol=1e-15)
    wrong = {
        **MAT,
        "columns": {"time": {"column": "log.t", "unit": "s"}, "quaternion": [f"log.q({i},:)" for i in range(1, 5)]},
    }
    with pytest.raises(TableError, match="differ in length"):
        read_table(state("old.mat", **wrong), tmp_path)
    (tmp_path / "old.mat").write_bytes(b"x" * 600)
    with pytest.raises(TableError, match="no MAT file"):
        read_table(state("old.mat", **MAT), tmp_path)


def test_a_compression_bomb_ends_at_the_memory_limit(tmp_path):
    """Eight gigabytes of zeros in an HDF5 file of a few megabytes."""
    h5py = pytest.importorskip("h5py")
    with h5py.File(tmp_path / "bomb.mat", "w", userblock_size=512) as file:
        for name in ("t", "a", "b", "c", "d"):
            file.create_dataset(name, (10**9,), "f8", chunks=(10**6,), compression="gzip", fillvalue=0.0)
    columns = {"time": {"column": "t", "unit": "s"}, "quaternion": ["a", "b", "c", "d"]}
    with pytest.raises(TableError, match="more than 2048 MiB of address space"):
        read_table(state("bomb.mat", **{**MAT, "columns": columns}), tmp_path)


# --- photos ------------------------------------------------------------------------------------------------------

GIMBAL = Convention(
    "gimbal",
    Frame("local", ("north", "east", "down")),
    Frame("camera", ("forward", "starboard", "down")),
    Sequence.ZYX,
    Sense.MOVING,
    ("yaw", "pitch", "roll"),
)
PHOTO = {
    "columns": {"angles": ["GimbalYawDegree", "GimbalPitchDegree", "GimbalRollDegree"], "unit": "deg"},
    "between samples": "samples",
    "format": "photo",
    "answers": {"whose": "gimbal", "pitch zero": "horizon", "roll 180": "turned"},
}


def photo(tags: str, prologue: str = "") -> bytes:
    """A JPEG that ends after its XMP packet."""
    packet = (
        f'{prologue}<x:xmpmeta xmlns:x="adobe:ns:meta/"><rdf:RDF xmlns:rdf="http://www.w3.org/1999/02/22-rdf-syntax-ns#">'
        f"<rdf:Description {tags}/></rdf:RDF></x:xmpmeta>"
    ).encode()
    body = b"http://ns.adobe.com/xap/1.0/\0" + packet
    return b"\xff\xd8\xff\xe1" + struct.pack(">H", len(body) + 2) + body + b"\xff\xd9"


def gimbal_tags(yaw, pitch, roll, more=""):
    return f'd:GimbalYawDegree="{yaw}" d:GimbalPitchDegree="{pitch}" d:GimbalRollDegree="{roll}" {more}'


def test_straight_down_with_roll_180_is_the_camera_turned_half_round(tmp_path):
    """Photogrammetry trackers: (roll 180, pitch -90, yaw 30) is the camera of (0, -90, 210), looking down."""
    (tmp_path / "shots").mkdir()
    (tmp_path / "shots" / "a.jpg").write_bytes(photo(gimbal_tags("+30.0", "-90.0", "+180.0")))
    (tmp_path / "shots" / "b.jpg").write_bytes(photo(gimbal_tags("+210.0", "-90.0", "+0.0")))
    table = read_table(state("shots", GIMBAL, **PHOTO), tmp_path)
    assert quaternion_angle(table.quaternions[0], table.quaternions[1]) < 1e-12
    np.testing.assert_allclose(matrix_from_quaternion(table.quaternions[0])[:, 0], [0, 0, 1], rtol=0, atol=1e-12)


def test_photos_ask_and_name_what_is_missing(tmp_path):
    (tmp_path / "a.jpg").write_bytes(photo('d:GimbalYawDegree="1" d:FlightYawDegree="2" e:FlightYawDegree="3"'))
    with pytest.raises(TableError) as caught:
        read_table(state("a.jpg", GIMBAL, **{**PHOTO, "answers": {}}), tmp_path)
    assert len(caught.value.faults) == 3
    with pytest.raises(TableError, match="there is no tag 'GimbalPitchDegree'"):
        read_table(state("a.jpg", GIMBAL, **PHOTO), tmp_path)
    angles = {"angles": ["FlightYawDegree", "GimbalYawDegree", "d:GimbalYawDegree"], "unit": "deg"}
    with pytest.raises(TableError, match="is there as d:FlightYawDegree and e:FlightYawDegree"):
        read_table(state("a.jpg", GIMBAL, **{**PHOTO, "columns": angles}), tmp_path)


def test_photos_by_their_dates(tmp_path):
    (tmp_path / "shots").mkdir()
    for place, second in enumerate((1, 2, 4)):
        tags = gimbal_tags(place, -90, 0, f'xmp:CreateDate="2031-05-01T10:00:0{second}.250+02:00"')
        (tmp_path / "shots" / f"{place}.jpg").write_bytes(photo(tags))
    columns = {**PHOTO["columns"], "time": {"column": "xmp:CreateDate"}}
    table = read_table(state("shots", GIMBAL, **{**PHOTO, "columns": columns}), tmp_path)
    np.testing.assert_allclose(table.times, [0.0, 1.0, 3.0], rtol=0, atol=1e-9)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (photo("d:A='1'", '<?xpacket begin="" id="W5M"?><!DOCTYPE x [<!ENTITY a "b">]>'), "DTD or entities"),
        (b"\xff\xd8\xff\xd9", "no XMP packet"),
        (photo("d:A='1'").replace(b"</rdf:RDF>", b""), "is broken"),
    ],
)
def test_hostile_and_broken_packets_are_refused(tmp_path, content, words):
    (tmp_path / "a.jpg").write_bytes(content)
    with pytest.raises(TableError, match=words):
        read_table(state("a.jpg", GIMBAL, **PHOTO), tmp_path)


def test_exif_direction_and_date_as_pillow_writes_them(tmp_path):
    image_module = pytest.importorskip("PIL.Image")
    image, written = image_module.new("RGB", (8, 8)), image_module.Exif()
    written.get_ifd(0x8825).update({0x10: "M", 0x11: 271.25})
    written.get_ifd(0x8769)[0x9003] = "2031:05:01 10:00:07"
    image.save(tmp_path / "a.jpg", exif=written)
    packet = photo(gimbal_tags(0, -30, 0))[4:-2]
    whole = (tmp_path / "a.jpg").read_bytes()
    (tmp_path / "a.jpg").write_bytes(whole[:2] + b"\xff\xe1" + packet + whole[2:])
    angles = {"angles": ["exif:GPSImgDirection", "GimbalPitchDegree", "GimbalRollDegree"], "unit": "deg"}
    columns = {**angles, "time": {"column": "exif:DateTimeOriginal"}}
    table = read_table(state("a.jpg", GIMBAL, **{**PHOTO, "columns": columns}), tmp_path)
    expected = Rotation.from_euler("ZYX", [271.25, -30, 0], degrees=True).as_quat()
    assert quaternion_angle(table.quaternions[0], np.roll(expected, 1)) < 1e-12
    assert any("magnetic north" in note for note in table.notes)


@settings(max_examples=100)
@given(st.binary(max_size=200))
def test_exif_of_any_bytes_is_tags_or_nothing(data):
    for head in (b"II*\0\x08\0\0\0", b"MM\0*\0\0\0\x08", b"Exif\0\0II*\0\x08\0\0\0"):
        assert isinstance(exif.exif_tags(head + data), dict)


# --- any bytes ---------------------------------------------------------------------------------------------------


@settings(max_examples=60, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.binary(max_size=600), place=st.integers(0, 3000))
def test_packet_walks_end_on_any_bytes(flash, telemetry, data, place):
    """Every byte is either in a message or counted as damage; nothing but TableError is raised."""
    for walk, whole in ((dataflash.walk_flash, flash), (mavlink.walk_telemetry, telemetry)):
        for mixed in (data, whole[:place] + data, whole[:place] + data + whole[place : place + 500]):
            try:
                walk(mixed, "log")
            except TableError:
                continue
