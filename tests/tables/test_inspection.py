"""A look into a file tells what is there, suggests spec lines, and never answers what only the author knows."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import TableError
from trunnion.tables import inspect_file, write_parquet
from trunnion.tables.reading import read_table

DATA = Path(__file__).parent / "data"


def what(report):
    """(kind, columns) of everything suggested."""
    return [(found.what, found.columns) for series in report.series for found in series.found]


def test_a_csv_with_quaternions_matrices_and_angles(write_rows, turns):
    R = Rotation.from_quat(np.roll(turns, -1, axis=1))
    angles = np.degrees(R.as_euler("ZYX"))
    rows = np.column_stack([np.arange(400) * 0.02, turns, R.as_matrix().reshape(-1, 9), angles, np.arange(400) ** 2])
    names = "time,qa,qb,qc,qd,m1,m2,m3,m4,m5,m6,m7,m8,m9,yaw,pitch,roll,count"
    report = inspect_file(write_rows(names, rows.tolist()) / "table.csv")
    assert what(report) == [
        ("time", ("time",)),
        ("quaternion", ("qa", "qb", "qc", "qd")),
        ("matrix", tuple(f"m{place}" for place in range(1, 10))),
        ("angles", ("yaw", "pitch", "roll")),
    ]
    text = "\n".join(report.lines())
    assert "too large for radians" in text
    assert "columns: {time: {column: time, unit: ?}, quaternion: [qa, qb, qc, qd]}" in text
    assert "scalar: ?" in text
    assert "maps: ?" in text


def test_a_mirrored_matrix_is_called_a_reflection(write_rows, turns):
    M = Rotation.from_quat(np.roll(turns, -1, axis=1)).as_matrix() @ np.diag([1, 1, -1])
    report = inspect_file(write_rows(",".join(f"m{i}" for i in range(9)), M.reshape(-1, 9).tolist()) / "table.csv")
    assert "left-handed" in report.series[0].found[0].ground


def test_a_flight_log(tmp_path, log_writer, turns):
    (tmp_path / "flight.ulg").write_bytes(log_writer(turns))
    report = inspect_file(tmp_path / "flight.ulg")
    assert report.troubles == []
    assert report.series[0].name == "vehicle_attitude"
    assert {series.name for series in report.series} == {"vehicle_attitude", "body_rates", "path_points", "noise"}
    assert "topic: vehicle_attitude" in report.spec_lines
    whole = (tmp_path / "flight.ulg").read_bytes()
    (tmp_path / "flight.ulg").write_bytes(whole[:-3])
    assert any("incomplete" in trouble for trouble in inspect_file(tmp_path / "flight.ulg").troubles)


def test_messages_trajectories_and_parquet(tmp_path, csv_statement, write_rows, turns):
    report = inspect_file(DATA / "constant-rate.aem")
    assert len(report.series) == 3
    assert "reference: ?                  # EME2000 or SC_BODY_1" in report.spec_lines
    np.savetxt(tmp_path / "run.txt", np.column_stack([np.arange(400.0), np.ones((400, 3)), np.roll(turns, -1, axis=1)]))
    report = inspect_file(tmp_path / "run.txt")
    assert report.format == "tum"
    assert ("quaternion", ("qx", "qy", "qz", "qw")) in what(report)
    root = write_rows("t,w,x,y,z", np.column_stack([np.arange(400), turns]).tolist())
    write_parquet(read_table(csv_statement(), root), tmp_path / "out.parquet")
    report = inspect_file(tmp_path / "out.parquet")
    assert ("quaternion", ("qw", "qx", "qy", "qz")) in what(report)
    assert any("scalar first" in remark for remark in report.remarks)


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [
        ("a.db3", b"SQLite format 3\0" + bytes(100), "database of a bag"),
        ("a.xyz", bytes(range(256)), "of no kind known here"),
        ("a.csv", b"a,b\n1,2,3\n", "the text is no table"),
        ("a.ulg", b"ULog\x01\x12\x35", "ends inside its header"),
        ("a.parquet", b"PAR1" + bytes(50), "refuses the file"),
        ("a.mcap", b"\x89MCAP0\r\n" + bytes(50), "a.mcap"),
        ("a.mat", b"MATLAB 5.0" + bytes(200), "a.mat"),
        ("a.jpg", b"\xff\xd8\xff\xe1", "no XMP packet"),
        ("a.xml", b"<!DOCTYPE a [<!ENTITY b 'c'>]><a/>", "DTD or entities"),
        ("missing.csv", None, "no such file"),
    ],
)
def test_files_that_hold_nothing_end_in_one_message(tmp_path, name, content, words):
    if content is not None:
        (tmp_path / name).write_bytes(content)
    with pytest.raises(TableError, match=words):
        inspect_file(tmp_path / name)
