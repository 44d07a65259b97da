"""CSV and Parquet: attitudes come out as scipy reads them; every wrong row is named."""

from __future__ import annotations

import hashlib
import os
import re

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import about, quaternion_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import TableError
from trunnion.tables import Between, read_table, statement_from_plain

ATOL = 1e-12  # rad; double precision through a text of 17 digits
FRAMES = Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down"))
ANGLES = np.array([[10.0, -35.0, 50.0], [179.0, -36.0, 51.0], [-179.0, -37.0, 52.0], [-170.0, -38.0, 190.0]])


def scalar_first(turns):
    """scipy's scalar-last quaternions in the order used inside."""
    return np.roll(turns.as_quat(), 1, axis=-1)


def assert_same(table, turns):
    """Same rotations, whatever the sign."""
    assert np.max(quaternion_angle(table.quaternions, scalar_first(turns))) < ATOL


def test_quaternion_columns_in_both_orders_and_both_directions(csv_statement, write_rows, turns):
    times = np.arange(len(turns)) * 0.02
    root = write_rows("t,w,x,y,z", np.column_stack([times, turns]).tolist())
    table = read_table(csv_statement(), root)
    assert np.max(quaternion_angle(table.quaternions, turns)) < ATOL
    np.testing.assert_allclose(table.times, times, rtol=0, atol=1e-15)
    assert table.sha256 == hashlib.sha256((root / "table.csv").read_bytes()).hexdigest()

    last = csv_statement(scalar="last", columns={"time": {"column": "t", "unit": "s"}, "quaternion": list("xyzw")})
    np.testing.assert_array_equal(read_table(last, root).quaternions, table.quaternions)
    back = read_table(csv_statement(maps="reference to body"), root)
    np.testing.assert_array_equal(back.quaternions * [1, -1, -1, -1], table.quaternions)


def test_sign_flips_are_undone_and_counted(csv_statement, write_rows, turns):
    flipped = turns.copy()
    flipped[100:200] *= -1.0
    own_flips = int(np.sum(np.sum(flipped[1:] * flipped[:-1], axis=1) < 0.0))
    root = write_rows("t,w,x,y,z", np.column_stack([np.arange(len(turns)), flipped]).tolist())
    table = read_table(csv_statement(), root)
    assert np.all(np.sum(table.quaternions[1:] * table.quaternions[:-1], axis=1) > 0.0)
    assert any(f"flips {own_flips} times" in note for note in table.notes)


@pytest.mark.parametrize("order", ["rows", "columns"])
@pytest.mark.parametrize("direction", ["body to local", "local to body"])
def test_nine_entries_by_rows_or_columns_and_both_directions(csv_statement, write_rows, order, direction):
    turns = Rotation.from_euler("ZYX", ANGLES, degrees=True)
    stated = turns.as_matrix() if direction == "body to local" else turns.inv().as_matrix()
    entries = stated if order == "rows" else np.swapaxes(stated, 1, 2)
    names = [f"m{place}" for place in range(9)]
    root = write_rows("t," + ",".join(names), np.column_stack([np.arange(4), entries.reshape(4, 9)]).tolist())
    columns = {"time": {"column": "t", "unit": "s"}, "matrix": names}
    statement = csv_statement(columns=columns, order=order, maps=direction, scalar=None, reference="local", body="body")
    assert_same(read_table(statement, root), turns)


@pytest.mark.parametrize("unit", ["deg", "rad"])
@pytest.mark.parametrize("sequence", list(Sequence))
@pytest.mark.parametrize("sense", list(Sense))
def test_angles_in_every_sequence_against_scipy(csv_statement, write_rows, sequence, sense, unit):
    convention = Convention("c", *FRAMES, sequence, sense, ("a", "b", "c"))
    letters = sequence.name if sense is Sense.MOVING else sequence.name.lower()
    turns = Rotation.from_euler(letters, ANGLES, degrees=True)
    values = ANGLES if unit == "deg" else np.radians(ANGLES)
    root = write_rows("t,a,b,c", np.column_stack([np.arange(4), values]).tolist())
    columns = {"time": {"column": "t", "unit": "s"}, "angles": ["a", "b", "c"], "unit": unit}
    statement = csv_statement(convention, columns=columns, scalar=None, maps=None)
    assert_same(read_table(statement, root), turns)


def test_angles_with_signs_offsets_and_constants_on_both_sides(csv_statement, write_rows):
    left, right = about([1, 2, 3], 0.7), about([-1, 0.5, 2], -1.1)
    convention = Convention(
        "c", *FRAMES, Sequence.ZXZ, Sense.FIXED, ("a", "b", "c"), (1, -1, 1), (0.1, 0.2, -0.3), left, right
    )
    chain = np.array([1, -1, 1]) * (np.radians(ANGLES) - np.array([0.1, 0.2, -0.3]))
    turns = Rotation.from_matrix(left) * Rotation.from_euler("zxz", chain) * Rotation.from_matrix(right)
    root = write_rows("t,a,b,c", np.column_stack([np.arange(4), ANGLES]).tolist())
    columns = {"time": {"column": "t", "unit": "s"}, "angles": ["a", "b", "c"], "unit": "deg"}
    assert_same(read_table(csv_statement(convention, columns=columns, scalar=None, maps=None), root), turns)


def test_a_wrapped_column_is_noticed_and_harmless(csv_statement, write_rows, ordinary):
    heading = (np.arange(100) * 11.0) % 360.0
    root = write_rows("t,h,e,b", [(i, h, 5.0, -3.0) for i, h in enumerate(heading)])
    columns = {"time": {"column": "t", "unit": "s"}, "angles": ["h", "e", "b"], "unit": "deg"}
    table = read_table(csv_statement(ordinary, columns=columns, scalar=None, maps=None), root)
    assert any("'heading' wraps 3 times" in note for note in table.notes)
    steps = quaternion_angle(table.quaternions[1:], table.quaternions[:-1])
    assert np.ptp(steps) < ATOL  # a constant heading rate stays constant across every wrap


def test_every_bad_row_is_named_by_kind_and_row_number(csv_statement, write_rows):
    good = [1.0, 0.0, 0.0, 0.0]
    rows = [(i / 10, *good) for i in range(12)]
    rows[2] = (0.2, "nan", 0, 0, 0)
    rows[4] = (0.4, 1.2, 0, 0, 0)
    rows[6] = (0.05, *good)
    rows[8] = (0.7, *good)
    rows[9] = ("", *good)
    with pytest.raises(TableError) as caught:
        read_table(csv_statement(), write_rows("t,w,x,y,z", rows))
    text = str(caught.value)
    assert "row 3: a quaternion cell is empty or not a finite number" in text
    assert "row 5: the quaternion's length is off 1 by more than 0.001 (worst 1.2 in row 5)" in text
    assert "row 7: the time does not fit between those of its neighbours" in text
    assert re.search(r"row [89]: the time is that of another row: it lost resolution", text)
    assert "row 10: the time is empty or not a finite number" in text
    assert re.search(r"table\.csv:4: row 3", text)
    assert "accept damaged" in text

    table = read_table(csv_statement(accept_damaged="rows lost in transfer"), write_rows("t,w,x,y,z", rows))
    assert len(table) == 7
    assert {trouble.kind for trouble in table.dropped} == {
        "no number", "not unit", "time goes back", "time repeats", "time missing",
    }  # fmt: skip
    assert np.all(np.diff(table.times) > 0.0)


def test_cells_and_rows_that_are_no_table_are_named_with_their_lines(csv_statement, tmp_path):
    text = '# comment\nt,w,x,y,z\n0,1,0,0,0\n\n1,1,0,0\n2,1,abc,0,0\n3,1,0,0,0,9\n4,"1,0",0,0,0\n5,1,0,0,0\n'
    (tmp_path / "table.csv").write_text(text)
    with pytest.raises(TableError) as caught:
        read_table(csv_statement(), tmp_path)
    words = str(caught.value)
    assert "rows 2, 4: line 5: 4 cells where the header has 5; line 7: 6 cells where the header has 5" in words
    assert "rows 3, 5: line 6: 'abc' in column 'x'; line 8: '1,0' in column 'w'" in words
    table = read_table(csv_statement(accept_damaged="torn by hand"), tmp_path)
    assert table.rows.tolist() == [1, 6]


def test_a_wrong_column_names_the_nearest_and_a_wrong_separator_is_recognised(csv_statement, write_rows):
    root = write_rows("time;w;x;y;z", [(0, 1, 0, 0, 0)], separator=";")
    with pytest.raises(
        TableError, match=r"there is no column 'w'\n    the columns are separated by ;: state separator: ';'"
    ):
        read_table(csv_statement(), root)
    with pytest.raises(TableError, match=r"there is no column 't'\n    there are: time, w"):
        read_table(csv_statement(separator=";"), root)
    columns = {"time": {"column": "time", "unit": "s"}, "quaternion": list("wxyz")}
    assert len(read_table(csv_statement(separator=";", columns=columns), root)) == 1


def test_nanoseconds_since_1970_keep_every_digit(csv_statement, write_rows):
    start = 1_700_000_000_123_456_789
    root = write_rows("t,w,x,y,z", [(start + 17 * i, 1, 0, 0, 0) for i in range(50)])
    columns = {"time": {"column": "t", "unit": "ns"}, "quaternion": list("wxyz")}
    table = read_table(csv_statement(columns=columns), root)
    np.testing.assert_allclose(table.times, 17e-9 * np.arange(50), rtol=0, atol=1e-15)
    assert table.origin == pytest.approx(start * 1e-9, abs=1e-6)


def test_a_clock_printed_with_too_few_digits_is_refused(csv_statement, write_rows):
    root = write_rows("t,w,x,y,z", [(f"{100000 + i * 0.004:.2f}", 1, 0, 0, 0) for i in range(100)])
    with pytest.raises(TableError, match="the time is that of another row: it lost resolution"):
        read_table(csv_statement(), root)


def test_a_32_bit_clock_that_lost_resolution_is_refused(csv_statement, tmp_path):
    times = np.float32(200_000.0) + np.arange(50, dtype=np.float32) * np.float32(1 / 32)
    columns = {"t": times, "w": np.ones(50), **{name: np.zeros(50) for name in "xyz"}}
    pq.write_table(pa.table(columns), tmp_path / "table.parquet")
    with pytest.raises(TableError, match=r"the time column resolves 0\.0156 s, its usual step is 0\.0312 s"):
        read_table(csv_statement(table="table.parquet"), tmp_path)


def test_one_wild_time_costs_one_row_only(csv_statement, write_rows):
    rows = [(i, 1, 0, 0, 0) for i in range(200)]
    rows[50] = (1e6, 1, 0, 0, 0)
    table = read_table(csv_statement(accept_damaged="one wild stamp"), write_rows("t,w,x,y,z", rows))
    assert len(table) == 199
    assert 51 not in table.rows


def test_gaps_longer_than_stated_are_findings(csv_statement, write_rows):
    times = [0.0, 0.1, 0.2, 0.9, 1.0, 3.0, 3.1]
    root = write_rows("t,w,x,y,z", [(t, 1, 0, 0, 0) for t in times])
    (gap,) = read_table(csv_statement(max_gap="0.5 s"), root).findings
    assert (gap.count, gap.rows) == (2, (3, 5))
    assert "largest gap is 2 s" in str(gap)
    assert any("largest gap 2 s after row 5" in note for note in read_table(csv_statement(), root).notes)


def test_parquet_gives_what_csv_gives(csv_statement, tmp_path, turns):
    times = np.arange(len(turns), dtype=np.int64)
    columns = {"t": times, **dict(zip("wxyz", turns.T, strict=True))}
    pq.write_table(pa.table(columns), tmp_path / "table.parquet")
    table = read_table(csv_statement(table="table.parquet"), tmp_path)
    assert np.max(quaternion_angle(table.quaternions, turns)) < ATOL
    wrong = {"time": {"column": "t", "unit": "s"}, "quaternion": list("vxyz")}
    with pytest.raises(TableError, match="there is no column 'v'"):
        read_table(csv_statement(table="table.parquet", columns=wrong), tmp_path)


def test_mirrored_and_stretched_matrices_are_named(csv_statement, write_rows):
    rows = [np.eye(3), np.diag([1, 1, -1]), 1.1 * np.eye(3)]
    names = [f"m{place}" for place in range(9)]
    root = write_rows("t," + ",".join(names), [(i, *M.reshape(9)) for i, M in enumerate(rows)])
    columns = {"time": {"column": "t", "unit": "s"}, "matrix": names}
    with pytest.raises(TableError) as caught:
        read_table(csv_statement(columns=columns, order="rows", scalar=None), root)
    assert "row 2: the matrix is a reflection" in str(caught.value)
    assert "row 3: not a rotation" in str(caught.value)


def test_everything_not_stated_is_asked_at_once(csv_statement, write_rows):
    root = write_rows("t,w,x,y,z", [(0, 1, 0, 0, 0)])
    bare = {"time": {"column": "t"}, "quaternion": list("wxyz")}
    with pytest.raises(TableError) as caught:
        read_table(csv_statement(columns=bare, scalar=None, maps=None, between_samples=None), root)
    text = str(caught.value)
    for words in ("which column is the time, in which unit", "scalar part", "which components", "between two samples"):
        assert words in text
    assert len(caught.value.faults) == 4


@pytest.mark.parametrize(
    ("name", "content", "cause"),
    [
        ("utf16.csv", "t,w\n".encode("utf-16"), "UTF-16"),
        ("binary.csv", b"t,w\0\n", "binary"),
        ("empty.csv", b"", "no header line"),
        ("latin.csv", b"t,w\xe9,x,y,z\n", "not UTF-8"),
        ("endless.csv", b"t" * (3 << 20), "line is longer"),
        ("headeronly.csv", b"t,w,x,y,z\n", "no row of the file can be used"),
        ("missing.csv", None, "no such file"),
    ],
)
def test_files_that_are_no_table_end_in_one_message(csv_statement, tmp_path, name, content, cause):
    if content is not None:
        (tmp_path / name).write_bytes(content)
    with pytest.raises(TableError, match=cause):
        read_table(csv_statement(table=name), tmp_path)


def test_a_path_that_leaves_the_folder_is_refused(csv_statement, tmp_path):
    for name in ("../table.csv", "/etc/passwd"):
        with pytest.raises(TableError, match="leaves the workbook"):
            read_table(csv_statement(table=name), tmp_path)


def test_a_stated_digest_must_match(csv_statement, write_rows):
    root = write_rows("t,w,x,y,z", [(0, 1, 0, 0, 0)])
    digest = hashlib.sha256((root / "table.csv").read_bytes()).hexdigest()
    assert read_table(csv_statement(sha256=digest.upper()), root).sha256 == digest
    with pytest.raises(TableError, match="find the right file"):
        read_table(csv_statement(sha256="0" * 64), root)


def test_the_statement_collects_all_its_faults():
    plain = {"table": "t.csv", "colums": {}, "scalar": "second", "max gap": "5 deg", "maps": "here", "instance": -1}
    with pytest.raises(TableError) as caught:
        statement_from_plain(plain)
    text = str(caught.value)
    for words in ("did you mean 'columns'", "say one of: first, last", "a time is meant here", "'maps' is 'here'"):
        assert words in text
    assert len(caught.value.faults) == 5


def test_the_statement_in_the_form_of_the_spec():
    plain = {
        "table": "data/transition.csv",
        "columns": {"time": {"column": "t_s", "unit": "s"}, "quaternion": ["qw", "qx", "qy", "qz"]},
        "scalar": "first",
        "maps": "body to local",
        "between samples": "slerp",
        "attitude error": "1 deg",
    }
    statement = statement_from_plain(plain)
    assert statement.body_to_reference is True
    assert statement.between is Between.SLERP
    assert statement.attitude_error == np.radians(1.0)


def test_control_characters_of_a_file_never_reach_the_screen(csv_statement, write_rows):
    """A cell or a column name could carry an escape sequence for the terminal."""
    root = write_rows("t,w,x,y,z\x1b[2J", [(0, 1, "\x1b]0;evil\x07", 0, 0)])
    columns = {"time": {"column": "t", "unit": "s"}, "quaternion": ["w", "x", "y", "z\x1b[2J"]}
    for statement in (csv_statement(), csv_statement(columns=columns)):
        with pytest.raises(TableError) as caught:
            read_table(statement, root)
        assert "\x1b" not in str(caught.value)
        assert "[U+001B]" in str(caught.value)


@pytest.mark.parametrize("name", ["a\0b.csv", "x" * 5000 + ".csv"])
def test_names_that_are_no_file_names_end_in_one_message(csv_statement, tmp_path, name):
    with pytest.raises(TableError, match="no usable file name"):
        read_table(csv_statement(table=name), tmp_path)


def test_a_pipe_is_not_waited_for(csv_statement, tmp_path):
    os.mkfifo(tmp_path / "table.csv")
    with pytest.raises(TableError, match="neither a file nor a folder"):
        read_table(csv_statement(), tmp_path)


@pytest.mark.parametrize("separator", ["", ",,", '"', "\n", "1", "."])
def test_a_separator_is_one_mark_that_stands_in_no_number(csv_statement, separator):
    with pytest.raises(TableError, match="'separator' is"):
        csv_statement(separator=separator)


def test_a_link_out_of_the_folder_is_refused(csv_statement, tmp_path):
    (tmp_path / "book").mkdir()
    (tmp_path / "outside.csv").write_text("t,w,x,y,z\n0,1,0,0,0\n")
    (tmp_path / "book" / "table.csv").symlink_to(tmp_path / "outside.csv")
    with pytest.raises(TableError, match="leaves the workbook"):
        read_table(csv_statement(), tmp_path / "book")


@pytest.mark.parametrize("torn", [False, True])
def test_dates_are_times_whatever_unit_is_stated(csv_statement, write_rows, torn):
    """The fast and the patient reading give the same seconds."""
    rows = [(f"2031-05-01 10:00:{i * 0.25:09.6f}", 1, 0, 0, 0) for i in range(20)]
    if torn:
        rows[7] = (rows[7][0], "torn", 0, 0, 0)
    table = read_table(csv_statement(accept_damaged="a test"), write_rows("t,w,x,y,z", rows))
    expected = [i * 0.25 for i in range(20) if not (torn and i == 7)]
    np.testing.assert_allclose(table.times, expected, rtol=0, atol=1e-9)
    assert any("holds dates" in note for note in table.notes)


def test_a_doubtful_unit_and_rounded_quaternions_are_noted(csv_statement, write_rows):
    root = write_rows("t,w,x,y,z", [(i * 20_000, 0.6, 0, 0, 0.8003) for i in range(20)])
    notes = read_table(csv_statement(), root).notes
    assert any("is the time in 's'?" in note for note in notes)
    assert any("made unit: lengths were off 1 by up to 0.00024" in note for note in notes)


def test_columns_nobody_asked_for_may_be_anything(csv_statement, write_rows):
    root = write_rows("a,t,w,x,a,y,z,note", [("?", i, 1, 0, "b,".strip(","), 0, 0, "text") for i in range(3)])
    assert len(read_table(csv_statement(), root)) == 3
