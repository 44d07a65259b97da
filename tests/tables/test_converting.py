"""Conversion over a table: the same attitudes, margins along the way, and files that state what they hold."""

from __future__ import annotations

import json

import numpy as np
import pyarrow.parquet as pq
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import quaternion_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import StoreError, TableError
from trunnion.tables import convert_table, read_table, statement_from_plain, write_csv, write_parquet
from trunnion.tables.converting import frame_change

EAST_NORTH_UP = Frame("map", ("east", "north", "up"))
FORWARD_LEFT_UP = Frame("base", ("forward", "port", "up"))


@pytest.fixture
def table(csv_statement, write_rows, turns):
    root = write_rows("t,w,x,y,z", np.column_stack([np.arange(400) * 0.1, turns]).tolist())
    return read_table(csv_statement(reference="local", body="body", maps="body to local"), root)


@pytest.mark.parametrize("sequence", [Sequence.ZYX, Sequence.ZXY, Sequence.ZYZ])
@pytest.mark.parametrize("sense", list(Sense))
def test_angles_and_margins_against_scipy(table, turns, ordinary, sequence, sense):
    target = Convention("target", ordinary.reference, ordinary.body, sequence, sense, ("a", "b", "c"))
    converted = convert_table(table, ordinary, target, near_lock=np.radians(20.0))
    letters = sequence.name if sense is Sense.MOVING else sequence.name.lower()
    theirs = Rotation.from_euler(letters, converted.angles)
    assert np.max(quaternion_angle(np.roll(theirs.as_quat(), 1, axis=1), turns)) < 1e-12
    middle = converted.angles[:, 1]
    margin = np.abs(np.sin(middle)) if sequence.repeated else np.abs(np.cos(middle))
    np.testing.assert_allclose(np.sin(converted.margins), margin, rtol=0, atol=1e-12)
    np.testing.assert_array_equal(converted.near, converted.margins < np.radians(20.0))


def test_north_east_down_to_east_north_up_turns_the_body_axes_too(table, turns, ordinary):
    """Robotics practice (axes of REP 103, value from memory): heading north is a quarter turn of yaw there."""
    target = Convention("enu", EAST_NORTH_UP, FORWARD_LEFT_UP, Sequence.ZYX, Sense.MOVING, ("yaw", "pitch", "roll"))
    C_reference = np.array([[0, 1, 0], [1, 0, 0], [0, 0, -1]])
    C_body = np.diag([1, -1, -1])
    np.testing.assert_array_equal(frame_change(ordinary.reference, EAST_NORTH_UP), C_reference)
    np.testing.assert_array_equal(frame_change(ordinary.body, FORWARD_LEFT_UP), C_body)
    converted = convert_table(table, ordinary, target)
    R = Rotation.from_quat(np.roll(turns, -1, axis=1)).as_matrix()
    expected = Rotation.from_matrix(C_reference @ R @ C_body.T)
    assert np.max(quaternion_angle(converted.table.quaternions, np.roll(expected.as_quat(), 1, axis=1))) < 1e-14
    theirs = Rotation.from_euler("ZYX", converted.angles)
    assert np.max((theirs.inv() * expected).magnitude()) < 1e-12


def test_frames_that_share_no_words_are_not_related(ordinary):
    lettered = Frame("sensor", ("x", "y", "z"))
    with pytest.raises(TableError, match="can't be related by the names of their axes"):
        frame_change(ordinary.body, lettered)
    with pytest.raises(TableError, match="can't be related"):
        frame_change(lettered, Frame("other", ("x", "y", "z")))
    np.testing.assert_array_equal(frame_change(lettered, Frame("sensor", ("x", "y", "z"))), np.eye(3))


def test_rows_near_lock_are_flagged_and_counted(csv_statement, write_rows, ordinary):
    pitch = np.array([0.0, 84.0, 86.0, 89.999, 90.0, 80.0])
    q = Rotation.from_euler("ZYX", np.column_stack([pitch * 0 + 30, pitch, pitch * 0 + 10]), degrees=True).as_quat()
    root = write_rows("t,x,y,z,w", np.column_stack([np.arange(6), q]).tolist())
    columns = {"time": {"column": "t", "unit": "s"}, "quaternion": list("xyzw")}
    converted = convert_table(read_table(csv_statement(columns=columns, scalar="last"), root), ordinary, ordinary)
    np.testing.assert_array_equal(converted.near, [False, False, True, True, True, False])
    assert "3 of 6 rows are within 5 deg of the lock of 'ordinary' (rows 3, 4, 5; " in converted.warnings()[0]
    assert converted.least_margin[1] == 5


def test_written_csv_states_its_convention_and_reads_back(table, ordinary, tmp_path):
    target = Convention(
        "wing last", ordinary.reference, ordinary.body, Sequence.ZXY, Sense.MOVING, ("heading", "bank", "elevation")
    )
    converted = convert_table(table, ordinary, target)
    path = tmp_path / "out.csv"
    write_csv(converted, path)
    text = path.read_text(encoding="utf-8")
    for words in ("# made from: table.csv, SHA-256", "sequence: 3-1-2", "about: moving axes", "maps body to local",
                  "x north, y east, z down", "growing heading swings"):  # fmt: skip
        assert words in text
    clock = {"time": {"column": "t", "unit": "s"}}
    by_quaternion = statement_from_plain(
        {
            "table": "out.csv",
            "columns": {**clock, "quaternion": ["qw", "qx", "qy", "qz"]},
            "scalar": "first",
            "maps": "body to reference",
            "between samples": "slerp",
        }
    )
    again = read_table(by_quaternion, tmp_path)
    np.testing.assert_allclose(again.quaternions, table.quaternions, rtol=0, atol=1e-15)  # made unit once more
    by_angles = statement_from_plain(
        {
            "table": "out.csv",
            "columns": {**clock, "angles": ["heading", "bank", "elevation"], "unit": "deg"},
            "between samples": "slerp",
        },
        target,
    )
    assert np.max(quaternion_angle(read_table(by_angles, tmp_path).quaternions, table.quaternions)) < 1e-12


def test_written_parquet_carries_the_statement_in_its_schema(table, ordinary, tmp_path):
    write_parquet(convert_table(table, ordinary, ordinary), tmp_path / "out.parquet")
    statement = json.loads(pq.read_schema(tmp_path / "out.parquet").metadata[b"trunnion.statement"])
    assert statement["convention"]["sequence"] == "3-2-1"
    assert statement["made from"].endswith(table.sha256)
    assert pq.read_table(tmp_path / "out.parquet").column_names[1:6] == [
        "heading", "elevation", "bank", "lock margin", "near lock",
    ]  # fmt: skip


def test_an_unwritable_folder_ends_in_one_message_and_leaves_nothing(table, tmp_path):
    with pytest.raises(StoreError, match="can't be written"):
        write_csv(table, tmp_path / "missing" / "out.csv")
    write_csv(table, tmp_path / "plain.csv")
    assert sorted(part.name for part in tmp_path.iterdir()) == ["plain.csv", "table.csv"]
