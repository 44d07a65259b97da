"""Reading in parts gives what reading whole gives, in memory that does not grow with the file."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from trunnion.errors import TableError
from trunnion.tables import iter_chunks, read_table


def assert_same_as_whole(statement, root, rows):
    """The parts joined are the whole table, and each holds at most `rows` rows."""
    parts = list(iter_chunks(statement, root, rows=rows))
    whole = read_table(statement, root)
    assert len(parts) > 2
    assert max(map(len, parts)) <= rows
    np.testing.assert_array_equal(np.concatenate([part.times for part in parts]), whole.times)
    np.testing.assert_array_equal(np.concatenate([part.quaternions for part in parts]), whole.quaternions)
    np.testing.assert_array_equal(np.concatenate([part.rows for part in parts]), whole.rows)
    assert {part.sha256 for part in parts} == {whole.sha256}


@pytest.fixture(scope="module")
def long_turns(turns):
    return np.tile(turns, (120, 1)) * np.where(np.arange(48_000) % 7 == 0, -1.0, 1.0)[:, None]


def test_csv_in_parts(csv_statement, write_rows, long_turns):
    times = 8e8 + np.arange(len(long_turns)) / 64.0
    root = write_rows("t,w,x,y,z", np.column_stack([times, long_turns]).tolist())
    assert_same_as_whole(csv_statement(), root, 9_999)


def test_csv_in_parts_with_accepted_damage(csv_statement, write_rows, turns):
    rows = [[i, *q] for i, q in enumerate(turns.tolist())]
    rows[150][2] = "torn"
    rows[151][0] = 3
    root = write_rows("t,w,x,y,z", rows)
    statement = csv_statement(accept_damaged="torn by hand")
    assert_same_as_whole(statement, root, 97)
    with pytest.raises(TableError, match="row 151: line 152: 'torn' in column 'x'"):
        list(iter_chunks(csv_statement(), root, rows=97))


def test_a_time_before_the_part_before_is_a_fault(csv_statement, write_rows):
    rows = [(i, 1, 0, 0, 0) for i in range(20)]
    rows[10] = (5, 1, 0, 0, 0)
    with pytest.raises(TableError, match="row 11: the time is not after the rows of the part before"):
        list(iter_chunks(csv_statement(), write_rows("t,w,x,y,z", rows), rows=10))


def test_parquet_in_parts(csv_statement, tmp_path, long_turns):
    columns = {"t": np.arange(len(long_turns)) + 10**18, **dict(zip("wxyz", long_turns.T, strict=True))}
    pq.write_table(pa.table(columns), tmp_path / "table.parquet", row_group_size=5_000)
    clock = {"time": {"column": "t", "unit": "ns"}, "quaternion": list("wxyz")}
    assert_same_as_whole(csv_statement(table="table.parquet", columns=clock), tmp_path, 16_000)


def test_a_log_in_parts(log_statement, tmp_path, log_writer, turns):
    (tmp_path / "flight.ulg").write_bytes(log_writer(turns))
    assert_same_as_whole(log_statement(), tmp_path, 90)


def test_gigabyte_lines_cost_one_block(csv_statement, tmp_path):
    """A sparse file of 1 GiB without a line end after the header is refused without reading it all."""
    with (tmp_path / "table.csv").open("wb") as handle:
        handle.write(b"t,w,x,y,z\n0,1,0,0,0\n1,")
        handle.seek(1 << 30)
        handle.write(b"0")
    for read in (lambda: read_table(csv_statement(), tmp_path), lambda: list(iter_chunks(csv_statement(), tmp_path))):
        with pytest.raises(TableError, match="line"):
            read()


@pytest.mark.full
def test_memory_stays_flat_over_a_long_csv(tmp_path):
    """Six times the rows may cost at most 60 MiB more; read whole they would cost over 150 MiB more."""
    peaks = []
    for count in (500_000, 3_000_000):
        path = tmp_path / f"{count}.csv"
        with path.open("w") as handle:
            handle.write("t,w,x,y,z\n")
            for start in range(0, count, 50_000):
                handle.write("".join(f"{i},0.6,0,0,0.8\n" for i in range(start, start + 50_000)))
        program = (
            "import resource\nfrom trunnion.tables import iter_chunks, statement_from_plain\n"
            f"plain = {{'table': '{path.name}', 'columns': {{'time': {{'column': 't', 'unit': 's'}}, "
            "'quaternion': ['w', 'x', 'y', 'z']}, 'scalar': 'first', 'maps': 'body to reference', "
            "'between samples': 'slerp'}\n"
            f"n = sum(len(part) for part in iter_chunks(statement_from_plain(plain), '{tmp_path}', rows=50_000))\n"
            "print(n, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)\n"
        )
        out = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout
        seen, peak_kib = map(int, out.split())
        assert seen == count
        peaks.append(peak_kib)
    assert peaks[1] - peaks[0] < 60 * 1024
