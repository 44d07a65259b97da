"""Read a table part by part, with memory that does not grow with the file: for campaigns of many long logs."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np
from numpy.typing import NDArray

from trunnion.tables import columnar, delimited
from trunnion.tables.assembly import Before, assemble, refuse_damage
from trunnion.tables.columns import Columns, raw_origin
from trunnion.tables.confine import Limits, read_confined
from trunnion.tables.files import Seal, file_error, first_bytes, locate
from trunnion.tables.questions import require_answers
from trunnion.tables.reading import format_of, limits_of
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable
from trunnion.tables.ulog import open_log
from trunnion.tables.ulog_health import Series
from trunnion.tables.ulog_messages import Dictionary, Message, walk_messages

_DESCRIBE = "trunnion.tables.foreign.parquet:row_groups"
_READ_GROUPS = "trunnion.tables.foreign.parquet:read_row_groups"
_EXACT_WHOLE = 2**53  # whole numbers below this are exact as floats


def iter_chunks(
    statement: TableStatement, root: Path | str, rows: int = 200_000, limits: Limits | None = None
) -> Iterator[AttitudeTable]:
    """Yield the table in parts of at most `rows` rows: CSV, Parquet and ULog, in memory that does not grow with it.

    The parts share one time origin, row numbers count through, and quaternion signs run on from part to part. Raises
    TableError as `read_table` does, for row troubles when the part that holds them is reached. A Parquet part is at
    least one row group.
    """
    path = locate(statement.path, root)
    name = format_of(statement, path)
    if name not in _STREAMS:
        raise file_error(path, f"format '{name}' is not read in parts", "use read_table")
    seal = Seal.of(path)
    before = Before()
    for columns in _STREAMS[name](statement, path, rows, limits or limits_of(statement)):
        if before.origin is None:
            before = replace(before, origin=raw_origin(columns.time, statement.time_unit or "s"))
        part = assemble(columns, statement, path, seal.sha256, before)
        before = replace(
            before, time=float(part.times[-1]), quaternion=part.quaternions[-1], rows=_last_row(columns, before)
        )
        yield part
    if before.origin is None:
        raise file_error(path, "the file holds no rows")
    seal.require_unchanged(path)


def _last_row(columns: Columns, before: Before) -> int:
    return int(columns.rows[-1]) if columns.rows is not None else before.rows + len(columns.time)


def _regrouped(parts: Iterator[Columns], rows: int) -> Iterator[Columns]:
    """The same rows in parts of exactly `rows`, but for the last."""
    held: list[list[NDArray[Any]]] = []
    count = 0
    for part in parts:
        held.append([part.time, *part.values])
        count += len(part.time)
        while count >= rows:
            joined = [np.concatenate(pieces) for pieces in zip(*held, strict=True)]
            yield Columns(joined[0][:rows], [values[:rows] for values in joined[1:]])
            held, count = [[values[rows:] for values in joined]], count - rows
    if count:
        joined = [np.concatenate(pieces) for pieces in zip(*held, strict=True)]
        yield Columns(joined[0], joined[1:])


def _csv_parts(statement: TableStatement, path: Path, rows: int, limits: Limits) -> Iterator[Columns]:
    require_answers("csv", statement, {}, path)
    layout = delimited.read_layout(first_bytes(path, delimited.HEAD), path, statement.separator)
    names = delimited.wanted_columns(statement)
    delimited.require_columns(names, layout, path, statement.separator)
    if statement.accept_damaged:
        return _patient_parts(statement, path, layout, names, rows)
    return _regrouped(_fast_parts(statement, path, layout, names), rows)


def _fast_parts(statement: TableStatement, path: Path, layout: delimited.Layout, names: list[str]) -> Iterator[Columns]:
    """Batches from pyarrow; where it stops, the patient reader goes through the file and says which rows are wrong."""
    import pyarrow as pa

    try:
        for batch in _open_batches(path, layout, names, statement.separator):
            yield delimited.columns_of_table(pa.Table.from_batches([batch]), names)
    except pa.ArrowInvalid as err:
        with path.open("rb") as handle:
            handle.seek(layout.data_offset)
            faults = delimited.find_faults(_short_lines(handle), layout, names, statement.separator, path)
        refuse_damage(faults, statement, path)
        raise file_error(
            path, "the time column changes its kind of number on the way", "write all times alike"
        ) from err


def _open_batches(path: Path, layout: delimited.Layout, names: list[str], separator: str) -> Iterator[Any]:
    """pyarrow batches; small whole-number clocks are read as floats, so that decimals may follow."""
    import pyarrow as pa

    first = next(iter(delimited.open_batches(path, layout, names, separator, None)), None)
    if first is None:
        return iter(())
    kind = first.schema.field(names[0]).type
    whole = pa.types.is_integer(kind) and abs(first.column(0)[0].as_py() or 0) >= _EXACT_WHOLE
    fixed = kind if whole or pa.types.is_timestamp(kind) else pa.float64()
    return delimited.open_batches(path, layout, names, separator, fixed)


def _patient_parts(
    statement: TableStatement, path: Path, layout: delimited.Layout, names: list[str], rows: int
) -> Iterator[Columns]:
    """Row by row, for files whose damage is accepted: wrong rows are left out and reported with their part."""
    done, line = 0, layout.header_line
    with path.open("rb") as handle:
        handle.seek(layout.data_offset)
        lines = _short_lines(handle)
        while True:
            block = _take(lines, rows)
            if not block:
                return
            start = replace(layout, header_line=line)
            columns = delimited.read_patiently(iter(block), start, names, statement.separator, path, done + 1)
            done += sum(1 for text in block if text.strip())
            line += len(block)
            if len(columns.time):
                yield columns


def _take(lines: Iterator[bytes], count: int) -> list[bytes]:
    return [line for _, line in zip(range(count), lines, strict=False)]


def _short_lines(handle: BinaryIO) -> Iterator[bytes]:
    """Lines of a file, an endless one cut into pieces of bounded size (each of which is then reported)."""
    while line := handle.readline(delimited.MAX_LINE + 2):
        yield line


def _parquet_parts(statement: TableStatement, path: Path, rows: int, limits: Limits) -> Iterator[Columns]:
    require_answers("parquet", statement, {}, path)
    names = delimited.wanted_columns(statement)
    sizes = read_confined(_DESCRIBE, path, {}, limits).meta["rows"]
    first = 0
    while first < len(sizes):
        last, held = first + 1, sizes[first]
        while last < len(sizes) and held + sizes[last] <= rows:
            held += sizes[last]
            last += 1
        options = {"columns": names, "groups": list(range(first, last))}
        yield columnar.columns_of(read_confined(_READ_GROUPS, path, options, limits), len(names))
        first = last


def _log_parts(statement: TableStatement, path: Path, rows: int, limits: Limits) -> Iterator[Columns]:
    """Samples of one topic from our own walk (no library), after the whole log was examined."""
    health, series, names = open_log(statement, path, keep=None)
    if damage := health.troubles():
        refuse_damage([*damage, *health.doubts()], statement, path)
    return _regrouped(_samples(path, health.size, list(health.appended), series, names), rows)


def _samples(path: Path, size: int, appended: list[int], series: Series, names: list[str]) -> Iterator[Columns]:
    topic, words, held = series.topic, Dictionary(), bytearray()
    wanted = topic.dtype.itemsize
    head = topic.number.to_bytes(2, "little")
    with path.open("rb", buffering=1 << 20) as handle:
        for step in walk_messages(handle, size, words, appended):
            if not isinstance(step, Message):
                continue
            if step.kind == "D" and step.payload[:2] == head:
                if wanted <= len(step.payload) - 2 <= topic.padded_size:
                    held += step.payload[2 : 2 + wanted]
            elif step.kind in "FA":
                words.learn(step)
            if len(held) >= 1 << 20:
                yield _columns_of_payloads(bytes(held), topic.dtype, names)
                held.clear()
    if held:
        yield _columns_of_payloads(bytes(held), topic.dtype, names)


def _columns_of_payloads(payloads: bytes, dtype: np.dtype, names: list[str]) -> Columns:
    samples = np.frombuffer(payloads, dtype=dtype)
    return Columns(samples[names[0]].copy(), [samples[name].astype(float) for name in names[1:]])


_STREAMS: dict[str, Callable[[TableStatement, Path, int, Limits], Iterator[Columns]]] = {
    "csv": _csv_parts,
    "parquet": _parquet_parts,
    "ulog": _log_parts,
}
