"""Whatever the bytes, reading ends in a table or in TableError, within bounded time and memory."""

from __future__ import annotations

import contextlib
import math

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from trunnion.errors import TableError
from trunnion.tables import inspect_file, iter_chunks, read_table, statement_from_plain
from trunnion.tables.ulog_health import examine
from trunnion.tables.ulog_messages import Break, Dictionary, walk_messages

SHARED_FOLDER = settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow]
)
CELL = st.one_of(
    st.floats(allow_nan=True, allow_infinity=True).map(repr),
    st.integers(-(10**20), 10**20).map(str),
    st.sampled_from(["", "nan", "1,5", "1e400", "-0.0", "0x1", "1_0", "\u0663", '"', '"1"', " 1 ", "+1", "1e-310"]),
)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("fuzz")


@SHARED_FOLDER
@given(data=st.binary(max_size=300) | st.text(max_size=300).map(lambda text: text.encode("utf-8", "replace")))
@pytest.mark.parametrize("start", [b"", b"t,w,x,y,z\n", b"# note\nt,w,x,y,z\n0,1,0,0,0\n"])
def test_any_text_after_any_start(folder, csv_statement, start, data):
    (folder / "table.csv").write_bytes(start + data)
    for read in (
        lambda s: read_table(s, folder),
        lambda s: list(iter_chunks(s, folder)),
        lambda s: inspect_file(folder / "table.csv"),
    ):
        with contextlib.suppress(TableError):
            read(csv_statement())


@SHARED_FOLDER
@given(rows=st.lists(st.lists(CELL, min_size=5, max_size=5), min_size=1, max_size=12))
def test_the_fast_and_the_patient_reading_agree(folder, csv_statement, rows):
    """With damage accepted both ways give the same rows; without it, both stop or neither does."""
    (folder / "table.csv").write_text("t,w,x,y,z\n" + "\n".join(",".join(row) for row in rows) + "\n", encoding="utf-8")
    outcomes = []
    for read in (lambda s: [read_table(s, folder)], lambda s: list(iter_chunks(s, folder, rows=1000))):
        try:
            outcomes.append(np.concatenate([part.quaternions for part in read(csv_statement(accept_damaged="a test"))]))
        except TableError:
            outcomes.append(None)
    if outcomes[0] is None or outcomes[1] is None:
        assert outcomes[0] is outcomes[1] is None
    else:
        np.testing.assert_array_equal(*outcomes)


@SHARED_FOLDER
@given(
    quaternions=st.lists(
        st.tuples(*[st.floats(-1, 1)] * 4).filter(lambda q: math.hypot(*q) > 0.1), min_size=1, max_size=20
    )
)
def test_what_is_printed_in_full_comes_back(folder, csv_statement, quaternions):
    q = np.array(quaternions)
    q /= np.linalg.norm(q, axis=1, keepdims=True)
    rows = "\n".join(f"{place}," + ",".join(map(repr, row)) for place, row in enumerate(q.tolist()))
    (folder / "table.csv").write_text("t,w,x,y,z\n" + rows + "\n")
    back = read_table(csv_statement(), folder).quaternions
    np.testing.assert_allclose(np.abs(np.sum(back * q, axis=1)), 1.0, rtol=0, atol=1e-15)


@SHARED_FOLDER
@given(data=st.binary(max_size=200), place=st.floats(0, 1), length=st.integers(0, 400))
def test_a_log_with_any_bytes_in_it_is_accounted_for_to_the_last_byte(folder, log_writer, turns, data, place, length):
    whole = log_writer(turns[:40])
    start = int(place * len(whole))
    mixed = whole[:start] + data + whole[start + length :]
    path = folder / "flight.ulg"
    path.write_bytes(mixed)
    try:
        health = examine(path)
    except TableError:
        return
    words, counted = Dictionary(), 16
    with path.open("rb") as handle:
        for step in walk_messages(handle, len(mixed), words, health.appended):
            counted += step.skipped if isinstance(step, Break) else 3 + len(step.payload)
            if not isinstance(step, Break):
                words.learn(step)
    assert counted == len(mixed)
    if mixed == whole:
        assert health.troubles() == []


def test_a_columnar_bomb_ends_at_the_memory_limit(tmp_path):
    """Repeated values let 4 * 10^7 rows of five columns (1.6 GB) fit in a file of a megabyte."""
    part = pa.table({name: np.zeros(10**6) for name in "twxyz"})
    with pq.ParquetWriter(tmp_path / "bomb.parquet", part.schema, use_dictionary=True, compression="zstd") as writer:
        for _ in range(40):
            writer.write_table(part)
    assert (tmp_path / "bomb.parquet").stat().st_size < 2 << 20
    plain = {
        "table": "bomb.parquet",
        "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": list("wxyz")},
        "scalar": "first",
        "maps": "body to reference",
        "between samples": "slerp",
        "reader memory": "1 GB",
    }
    with pytest.raises(TableError, match=r"more than 954 MiB of address space\n.*reader memory"):
        read_table(statement_from_plain(plain), tmp_path)


@pytest.mark.parametrize("cut", [4, 100, -8, -1])
def test_cut_parquet_is_refused(tmp_path, csv_statement, cut):
    pq.write_table(pa.table({name: np.ones(100) for name in "twxyz"}), tmp_path / "table.parquet")
    whole = (tmp_path / "table.parquet").read_bytes()
    (tmp_path / "table.parquet").write_bytes(whole[:cut])
    with pytest.raises(TableError, match="refuses the file"):
        read_table(csv_statement(table="table.parquet"), tmp_path)
