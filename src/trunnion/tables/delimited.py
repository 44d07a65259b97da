"""CSV: the fast way through pyarrow when all is well, and a patient second pass that says which row is wrong.

Lines that begin with # before the header are comments. Row numbers count data rows from 1.
"""

from __future__ import annotations

import csv
import datetime
import io
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from trunnion.errors import Fault, Place, TableError
from trunnion.tables.columns import Columns
from trunnion.tables.files import file_error
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import SHOWN_ROWS, Trouble
from trunnion.units import shown

MAX_LINE = 1 << 20  # bytes; a longer line is no table
HEAD = 4 << 20
_EMPTY = ("", "nan", "NaN", "NA", "N/A", "null", "NULL", "None")


@dataclass(frozen=True)
class Layout:
    """Where the data start: comment lines, line number of the header, its fields, and byte offset after it."""

    comments: tuple[str, ...]
    header_line: int
    names: tuple[str, ...]
    data_offset: int


def read_layout(head: bytes, path: Path, separator: str) -> Layout:
    """The layout of a CSV from its first bytes. Raises TableError for other encodings, endless lines, no header."""
    if head[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise file_error(path, "the file is UTF-16 text", "save it as UTF-8")
    if b"\0" in head[:4096]:
        raise file_error(path, "the file is binary, not a text table", "state its format: parquet, ulog, …")
    offset, number, comments = 0, 0, []
    while offset < len(head):
        end = head.find(b"\n", offset, offset + MAX_LINE)
        if end < 0 and len(head) - offset >= MAX_LINE:
            raise file_error(path, f"a line is longer than {MAX_LINE} bytes", "this is no table of text", number + 1)
        end = len(head) if end < 0 else end + 1
        line = _decode(head[offset:end].removeprefix(b"\xef\xbb\xbf"), path, number + 1).rstrip("\r\n")
        offset, number = end, number + 1
        if line.startswith("#"):
            comments.append(line)
        elif line.strip():
            try:
                names = next(csv.reader([line], delimiter=separator))
            except csv.Error as err:
                raise file_error(
                    path, "the header line is no line of a table", "end each line with a line feed", number
                ) from err
            return Layout(tuple(comments), number, tuple(name.strip() for name in names), offset)
    raise file_error(path, "there is no header line with column names", "the first line must name the columns")


def _decode(line: bytes, path: Path, number: int) -> str:
    try:
        return line.decode("utf-8")
    except UnicodeDecodeError as err:
        raise file_error(path, "the text is not UTF-8", "save it as UTF-8", number) from err


def require_columns(wanted: list[str], layout: Layout, path: Path, separator: str) -> None:
    """Raise TableError naming each wanted column that is missing (with the nearest name) or there twice."""
    faults = []
    for name in wanted:
        count = layout.names.count(name)
        if count == 0:
            faults.append(Fault(f"there is no column '{name}'", _column_hint(name, layout, separator), Place(path)))
        elif count > 1:
            faults.append(Fault(f"there are {count} columns '{name}'", "rename one of them", Place(path)))
    if faults:
        raise TableError(faults)


def _column_hint(name: str, layout: Layout, separator: str) -> str:
    for other, spoken in ((",", ","), (";", ";"), ("\t", "tab"), (" ", "blank")):
        if other != separator and name in [part.strip() for part in layout.names[0].split(other)]:
            return f"the columns are separated by {spoken}: state separator: {other!r}"
    return nearest_hint(name, layout.names)


def wanted_columns(statement: TableStatement) -> list[str]:
    """Time column first, then the value columns, in stated order."""
    assert statement.time_column is not None  # asked for by questions.require_answers
    return [statement.time_column, *statement.columns]


def read_csv(data: memoryview, statement: TableStatement, path: Path) -> Columns:
    """The stated columns of a CSV given as bytes."""
    import pyarrow as pa

    layout = read_layout(bytes(data[:HEAD]), path, statement.separator)
    names = wanted_columns(statement)
    require_columns(names, layout, path, statement.separator)
    for time_type in (None, pa.float64()):
        try:
            columns = columns_of_table(_read_fast(data, layout, names, statement.separator, time_type), names)
            columns.line_of = lambda row: _line_of(data, layout, row)
            return columns
        except pa.ArrowInvalid:
            continue
    return read_patiently(_lines(data, layout), layout, names, statement.separator, path)


def _read_fast(data: memoryview, layout: Layout, names: list[str], separator: str, time_type: object) -> object:
    import pyarrow as pa
    from pyarrow import csv as arrow_csv

    return arrow_csv.read_csv(
        pa.py_buffer(data).slice(layout.data_offset) if layout.data_offset < len(data) else pa.py_buffer(b"\n"),
        read_options=arrow_csv.ReadOptions(column_names=list(layout.names), block_size=MAX_LINE),
        parse_options=arrow_csv.ParseOptions(delimiter=separator),
        convert_options=convert_options(names, time_type),
    )


def convert_options(names: list[str], time_type: object) -> object:
    """pyarrow conversion of the wanted columns only: values to float64, the time inferred unless `time_type` says."""
    import pyarrow as pa
    from pyarrow import csv as arrow_csv

    types = {name: pa.float64() for name in names[1:]}
    if time_type is not None:
        types[names[0]] = time_type
    return arrow_csv.ConvertOptions(include_columns=names, column_types=types, null_values=list(_EMPTY))


def columns_of_table(table: object, names: list[str]) -> Columns:
    """Columns of an arrow table; a time column that is no number raises ArrowInvalid, so the patient way is taken."""
    import pyarrow as pa

    if table.num_rows and not _is_clock(table.schema.field(names[0]).type):  # type: ignore[attr-defined]
        raise pa.ArrowInvalid("time column is not numeric")
    arrays = [to_numpy(table.column(name)) for name in names]  # type: ignore[attr-defined]
    return Columns(arrays[0], [values.astype(float, copy=False) for values in arrays[1:]])


def open_batches(path: Path, layout: Layout, names: list[str], separator: str, time_type: object) -> Iterator[Any]:
    """Record batches of about 1 MiB of text, as pyarrow reads them from the file."""
    import pyarrow as pa
    from pyarrow import csv as arrow_csv

    with pa.OSFile(str(path), "rb") as handle:
        handle.seek(layout.data_offset)
        if layout.data_offset >= handle.size():
            return
        reader = arrow_csv.open_csv(
            pa.input_stream(handle),
            read_options=arrow_csv.ReadOptions(column_names=list(layout.names), block_size=MAX_LINE, use_threads=False),
            parse_options=arrow_csv.ParseOptions(delimiter=separator),
            convert_options=convert_options(names, time_type),
        )
        yield from reader


def find_faults(lines: Iterator[bytes], layout: Layout, names: list[str], separator: str, path: Path) -> list[Trouble]:
    """Go through all rows, keep none, and report the wrong ones."""
    report = _Report()
    for _ in _parsed_rows(lines, layout, names, separator, report, 1):
        pass
    return report.troubles()


def _is_clock(kind: object) -> bool:
    import pyarrow as pa

    return pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_timestamp(kind)


def to_numpy(column: object) -> np.ndarray:
    """A numpy array of an arrow column; whole numbers and dates with holes become floats with NaN or NaT."""
    values = column.to_numpy()  # type: ignore[attr-defined]
    return np.ascontiguousarray(values)


def _line_of(data: memoryview, layout: Layout, row: int) -> int | None:
    """The line number of data row `row`; blank lines are no rows."""
    seen = 0
    for number, line in enumerate(_lines(data, layout), layout.header_line + 1):
        seen += bool(line.strip())
        if seen == row:
            return number
    return None


def _lines(data: memoryview, layout: Layout) -> Iterator[bytes]:
    return iter(io.BytesIO(data[layout.data_offset :]))


@dataclass
class _Report:
    """Counts and first rows of each kind of wrong row."""

    counts: dict[str, int] = field(default_factory=dict)
    dates: int = 0
    plain_times: int = 0
    firsts: dict[str, list[tuple[int, int, str]]] = field(default_factory=dict)

    def add(self, kind: str, row: int, line: int, detail: str) -> None:
        self.counts[kind] = self.counts.get(kind, 0) + 1
        kept = self.firsts.setdefault(kind, [])
        if len(kept) < SHOWN_ROWS:
            kept.append((row, line, detail))

    def troubles(self) -> list[Trouble]:
        found = []
        for kind, firsts in self.firsts.items():
            details = "; ".join(f"line {line}: {detail}" for _, line, detail in firsts)
            rows = tuple(row for row, _, _ in firsts)
            found.append(Trouble(kind, details, self.counts[kind], rows, _REMEDIES[kind]))
        return found


_REMEDIES = {
    "ragged row": "every row must have as many cells as the header has names",
    "no number": "a cell must be a number with a decimal point, without unit or thousands mark",
    "endless line": "this is no table of text",
    "not text": "the file is damaged or not UTF-8 text",
}


def read_patiently(
    lines: Iterator[bytes], layout: Layout, names: list[str], separator: str, path: Path, first_row: int = 1
) -> Columns:
    """Read row by row, keep the rows that can be read, and report each that can't with row and line number."""
    report = _Report()
    kept = list(_parsed_rows(lines, layout, names, separator, report, first_row))
    matrix = np.array([numbers for _, numbers in kept], dtype=float).reshape(-1, len(names))
    rows = np.array([row for row, _ in kept], dtype=np.int64)
    times: np.ndarray = matrix[:, 0]
    if report.dates:
        times = np.array([numbers[0] for _, numbers in kept], dtype=np.int64).astype("datetime64[ns]")
    return Columns(times, list(matrix[:, 1:].T), rows, damage=report.troubles())


def _parsed_rows(
    lines: Iterator[bytes], layout: Layout, names: list[str], separator: str, report: _Report, first_row: int
) -> Iterator[tuple[int, list[float]]]:
    """(row number, numbers) of each row that can be read; the others go on the report."""
    places = [layout.names.index(name) for name in names]
    row = first_row - 1
    for number, line in enumerate(lines, layout.header_line + 1):
        if not line.strip():
            continue
        row += 1
        numbers = _parse_row(line, separator, len(layout.names), places, layout.names, report, row, number)
        if numbers is not None:
            yield row, numbers


def _parse_row(
    line: bytes,
    separator: str,
    width: int,
    places: list[int],
    names: tuple[str, ...],
    report: _Report,
    row: int,
    number: int,
) -> list[float] | None:
    """The numbers of one line, or None with the reason put on the report."""
    if len(line) > MAX_LINE:
        report.add("endless line", row, number, f"{len(line)} bytes")
        return None
    try:
        cells = split_line(line.decode("utf-8"), separator)
    except (UnicodeDecodeError, csv.Error):
        report.add("not text", row, number, "bytes that are no text")
        return None
    if len(cells) != width:
        report.add("ragged row", row, number, f"{len(cells)} cells where the header has {width}")
        return None
    numbers: list[float] = []
    for place in places:
        cell = cells[place].strip()
        try:
            is_time = not numbers
            numbers.append(_time_number(cell, report) if is_time else _cell_number(cell))
        except ValueError:
            report.add("no number", row, number, f"'{shown(cell, 30)}' in column '{shown(names[place])}'")
            return None
    return numbers


def split_line(text: str, separator: str) -> list[str]:
    """The cells of one line; an empty separator stands for any run of blanks."""
    return next(csv.reader([text.rstrip("\r\n")], delimiter=separator), []) if separator else text.split()


def _time_number(cell: str, report: _Report) -> float:
    """A time as written, or a date as whole nanoseconds since 1970; a file has one or the other."""
    if report.dates == 0:
        try:
            number = _cell_number(cell)
        except ValueError:
            if report.plain_times:
                raise
        else:
            report.plain_times += 1
            return number
    moment = datetime.datetime.fromisoformat(cell)
    zone = datetime.UTC if moment.tzinfo else None
    microseconds = (moment - datetime.datetime(1970, 1, 1, tzinfo=zone)) // datetime.timedelta(microseconds=1)
    report.dates += 1
    return microseconds * 1000


def _cell_number(cell: str) -> float:
    if cell in _EMPTY:
        return float("nan")
    if "_" in cell:  # Python's float reads 1_000; a table's writer did not mean that
        raise ValueError(cell)
    return float(cell)
