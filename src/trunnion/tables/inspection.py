"""What attitude data a file holds: series, columns and their ranges, damage, and spec lines to start from."""

from __future__ import annotations

import io
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from trunnion.tables import bags, dataflash, matlab, mavlink, photos
from trunnion.tables.candidates import Found, Series, search
from trunnion.tables.ccsds import load_message, message_parts
from trunnion.tables.confine import Limits, read_confined
from trunnion.tables.delimited import HEAD, read_layout
from trunnion.tables.files import Seal, file_error, first_bytes, read_whole, require_plain
from trunnion.tables.questions import QUESTIONS
from trunnion.tables.trajectories import KITTI_NAMES, TUM_NAMES
from trunnion.tables.ulog_health import examine
from trunnion.tables.ulog_messages import Dictionary, Message, walk_messages
from trunnion.units import shown

SAMPLE_ROWS = 100_000
_MAX_SERIES = 200
_SHOWN_COLUMNS = 40


@dataclass
class Inspection:
    """The report on one file: format, size, digest, series, what speaks against it, remarks, and the spec lines."""

    path: Path
    format: str
    size: int
    sha256: str
    series: list[Series] = field(default_factory=list)
    troubles: list[str] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    spec_lines: list[str] = field(default_factory=list)

    def lines(self) -> list[str]:
        """The report as plain lines."""
        out = [f"{self.path.name}: {self.format}, {self.size} bytes, SHA-256 {self.sha256}"]
        out += [f"  damage: {trouble}" for trouble in self.troubles] + [f"  {remark}" for remark in self.remarks]
        for series in self.series:
            out.append(f"  {series.name or 'columns'}: {series.rows} rows")
            out += [f"    {found.what}: {', '.join(found.columns)} ({found.ground})" for found in series.found]
            out += [f"    {text}" for text in _column_lines(series)]
        if self.spec_lines:
            out += ["suggested spec lines (what stands behind ? the file does not say):"]
            out += [f"  {line}" for line in self.spec_lines]
        return [shown(line, 400) for line in out]


def inspect_file(path: Path | str, limits: Limits | None = None) -> Inspection:
    """Look into a file (or bag folder) without believing it: nothing is converted, every unit is the reader's guess.

    Ranges are over the first 100,000 rows of each series. Raises TableError for a file of no known kind.
    """
    path = Path(path)
    if not path.exists():
        raise file_error(path, "there is no such file")
    require_plain(path)
    name = detect_format(path)
    seal = Seal.of(path.resolve())
    report = Inspection(path, name, seal.size, seal.sha256)
    _INSPECTORS[name](report, limits or Limits())
    for series in report.series:
        search(series)
    report.series.sort(key=_rank)
    if not report.spec_lines:
        report.spec_lines = _suggest(report)
    return report


def _rank(series: Series) -> tuple[bool, bool, str]:
    """Series with an attitude first, those that say so in their name before others."""
    has_attitude = any(found.what != "time" for found in series.found)
    return not has_attitude, "att" not in series.name.lower(), series.name


def detect_format(path: Path) -> str:
    """The format by its first bytes, else by its suffix."""
    if path.is_dir():
        return "bag" if (path / "metadata.yaml").is_file() else "photo"
    head = first_bytes(path, 600)
    for magic, name in _MAGIC:
        if head.startswith(magic):
            return name
    if head[512:520] == b"\x89HDF\r\n\x1a\n":
        return "mat"
    if head.startswith(b"SQLite format 3"):
        raise file_error(path, "this is the database of a bag", "name the folder that holds it and metadata.yaml")
    if path.suffix.lower() == ".tlog" or head[8:9] in (b"\xfd", b"\xfe"):
        return "mavlink"
    if head.lstrip(b"\xef\xbb\xbf \t\r\n")[:1] == b"<":
        return "photo" if path.suffix.lower() == ".xmp" else "ccsds"
    if path.suffix.lower() in photos.SUFFIXES:
        return "photo"
    if b"\0" in head:
        raise file_error(
            path, "this binary file is of no kind known here", f"known are {', '.join(sorted(_INSPECTORS))}"
        )
    return _text_format(path)


def _text_format(path: Path) -> str:
    """TUM and KITTI have no header: rows of 8 or 12 bare numbers."""
    text = first_bytes(path, 1 << 16).decode("utf-8", "replace")
    row = next((line for line in text.splitlines() if line.strip() and not line.startswith("#")), "")
    if row.lstrip().startswith("CCSDS_"):
        return "ccsds"
    try:
        numbers = [float(cell) for cell in row.split()]
    except ValueError:
        return "csv"
    return {8: "tum", 12: "kitti"}.get(len(numbers), "csv")


def _inspect_csv(report: Inspection, limits: Limits) -> None:
    import pyarrow as pa
    from pyarrow import csv as arrow_csv

    data = first_bytes(report.path, 16 * HEAD)
    separator = _likely_separator(data)
    layout = read_layout(data[:HEAD], report.path, separator)
    whole = len(data) == report.size
    body = data[layout.data_offset :] if whole else data[layout.data_offset : data.rfind(b"\n") + 1]
    try:
        table = arrow_csv.read_csv(
            io.BytesIO(body or b"\n"),
            read_options=arrow_csv.ReadOptions(column_names=list(layout.names)),
            parse_options=arrow_csv.ParseOptions(delimiter=separator),
        )
    except pa.ArrowInvalid as err:
        raise file_error(report.path, f"the text is no table: {str(err).splitlines()[0][:200]}") from err
    numeric = {
        name: column.to_numpy()[:SAMPLE_ROWS].astype(float)
        for name, column in zip(layout.names, table.columns, strict=True)
        if pa.types.is_integer(column.type) or pa.types.is_floating(column.type)
    }
    report.series.append(Series("", table.num_rows, numeric))
    if not whole:
        report.remarks.append(f"only the first {table.num_rows} rows were looked at")
    if separator != ",":
        report.remarks.append(f"the columns are separated by {separator!r}")
    report.remarks += [f"comment: {line[1:].strip()[:160]}" for line in layout.comments[:20]]


def _likely_separator(data: bytes) -> str:
    lines = [line for line in data[:65536].split(b"\n") if line.strip() and not line.startswith(b"#")]
    first = lines[0] if lines else b""
    return max((",", ";", "\t"), key=lambda mark: first.count(mark.encode()))


def _inspect_parquet(report: Inspection, limits: Limits) -> None:
    returned = read_confined("trunnion.tables.foreign.parquet:sample", report.path, {"rows": SAMPLE_ROWS}, limits)
    report.series.append(Series("", returned.meta["rows"], _floats(returned.arrays)))
    report.remarks += [f"statement: {text[:300]}" for text in returned.meta["statements"]]


def _inspect_mat(report: Inspection, limits: Limits) -> None:
    returned = read_confined(matlab.LISTING, report.path, {"rows": SAMPLE_ROWS}, limits)
    for rows in sorted({len(values) for values in returned.arrays.values()}):
        same = {name: values for name, values in returned.arrays.items() if len(values) == rows}
        report.series.append(Series(f"arrays of {rows}", rows, _floats(same)))


def _floats(arrays: dict[str, np.ndarray]) -> dict[str, np.ndarray]:
    return {name: values.astype(float) for name, values in arrays.items()}


def _inspect_ulog(report: Inspection, limits: Limits) -> None:
    health = examine(report.path)
    report.troubles += [str(trouble) for trouble in (*health.troubles(), *health.doubts())]
    report.remarks.append(
        f"{sum(health.messages.values())} messages; a log cut exactly between two rounds of its logger looks whole"
    )
    held = {series.topic.number: bytearray() for series in health.series.values() if series.count}
    words = Dictionary()
    with report.path.open("rb", buffering=1 << 20) as handle:
        for step in walk_messages(handle, health.size, words, list(health.appended)):
            if isinstance(step, Message) and step.kind == "D":
                _keep_sample(step.payload, words, held)
            elif isinstance(step, Message):
                words.learn(step)
    for number, payloads in list(held.items())[:_MAX_SERIES]:
        samples = np.frombuffer(bytes(payloads), dtype=health.series[number].topic.dtype)
        fields = {name: samples[name].astype(float) for name in samples.dtype.names or ()}
        report.series.append(Series(health.series[number].label, health.series[number].count, fields))


def _keep_sample(payload: bytes, words: Dictionary, held: dict[int, bytearray]) -> None:
    topic = words.topics.get(int.from_bytes(payload[:2], "little"))
    if topic is None or topic.number not in held or not words.size_fits(topic.number, len(payload) - 2):
        return
    if len(held[topic.number]) < SAMPLE_ROWS * topic.dtype.itemsize:
        held[topic.number] += payload[2 : 2 + topic.dtype.itemsize]


def _inspect_mavlink(report: Inspection, limits: Limits) -> None:
    log = mavlink.walk_telemetry(read_whole(report.path), report.path)
    report.troubles += [str(trouble) for trouble in log.damage.troubles()]
    for key in sorted(log.samples):
        samples = mavlink.unpack(log, key)
        fields = {name: samples[name][:SAMPLE_ROWS].astype(float) for name in samples.dtype.names or ()}
        report.series.append(Series(f"{key[0]} of system {key[1]}/{key[2]}", len(samples), fields))


def _inspect_dataflash(report: Inspection, limits: Limits) -> None:
    log = dataflash.walk_flash(read_whole(report.path), report.path)
    report.troubles += [str(trouble) for trouble in log.damage.troubles()]
    for name in sorted(log.samples)[:_MAX_SERIES]:
        samples = dataflash.fields_of(log, name)
        numeric = [key for key in samples.dtype.names or () if samples.dtype[key].kind in "iuf"]
        report.series.append(
            Series(name, len(samples), {key: samples[key][:SAMPLE_ROWS].astype(float) for key in numeric})
        )


def _inspect_bag(report: Inspection, limits: Limits) -> None:
    for topic in bags.list_topics(report.path, limits):
        ground = "one attitude a message" if topic["attitude"] else "no attitude known here"
        series = Series(f"{topic['name']} ({topic['type']}; {ground})", int(str(topic["count"])), {})
        report.series.append(series)
    report.spec_lines = [
        f"table: {report.path.name}",
        "topic: ?                      # one of those above",
        "reference: ?                  # as the message headers name it",
        "body: ?",
        "maps: ?                       # body to reference, by the practice of these messages",
        "between samples: ?            # slerp, rate limited, samples",
        "answers: {world: ?, mount: ?}",
    ]


def _inspect_ccsds(report: Inspection, limits: Limits) -> None:
    message = load_message(report.path)
    report.troubles += [f"line {breach.line}: {breach.words}" for breach in message.breaches[:20]]
    message.require_readable(report.path)
    parts = message_parts(message, report.path)
    for part in parts:
        columns = {"time": part.times_ns * 1e-9, **dict(zip(("qc", "q1", "q2", "q3"), part.quaternions.T, strict=True))}
        label = f"{part.label}, {part.frame_a} (A) to {part.frame_b} (B), {part.time_system}"
        report.series.append(Series(label, len(part.times_ns), columns))
    report.remarks.append(f"{message.kind}, edition {message.edition}")
    lines = [f"table: {report.path.name}", "format: ccsds"]
    lines += [f"segment: 1                    # of {len(parts)}"] if len(parts) > 1 else []
    first = parts[0] if parts else None
    frames = f"{first.frame_a} or {first.frame_b}" if first else "?"
    report.spec_lines = [*lines, f"reference: ?                  # {frames}", "body: ?", "between samples: ?"]


def _inspect_photos(report: Inspection, limits: Limits) -> None:
    files = photos.photo_files(report.path)
    values: dict[str, list[float]] = {}
    for photo in files[:1000]:
        for name, text in photos.photo_tags(photo).items():
            try:
                values.setdefault(name, []).append(float(text))
            except ValueError:
                continue
    columns = {name: np.array(held) for name, held in values.items() if len(held) == len(files[:1000])}
    report.series.append(Series("photos", len(files), columns))
    report.remarks.append(
        "asked of every photo: gimbal's or aircraft's angles, where pitch is zero, what roll 180 means"
    )


def _inspect_trajectory(report: Inspection, limits: Limits) -> None:
    lines = first_bytes(report.path, 4 * HEAD).decode("utf-8", "replace").splitlines()[:SAMPLE_ROWS]
    rows = [line.split() for line in lines if line.strip() and not line.startswith("#")]
    width = 8 if report.format == "tum" else 12
    try:
        values = np.array([row for row in rows if len(row) == width], dtype=float).reshape(-1, width)
    except ValueError as err:
        raise file_error(report.path, f"a cell is no number: {err}") from err
    torn = sum(len(row) != width for row in rows)
    if torn:
        report.troubles.append(f"{torn} rows do not have {width} numbers (the last may be cut by this look)")
    names = TUM_NAMES if report.format == "tum" else KITTI_NAMES
    report.series.append(Series("", len(values), dict(zip(names, values.T, strict=True))))
    report.spec_lines = [
        f"table: {report.path.name}",
        f"format: {report.format}",
        "maps: ?                       # moving frame to world, by the practice of this layout",
        "between samples: ?            # slerp, rate limited, samples",
        "answers: {world: ?, moving axes: ?" + (", clock: ?}" if report.format == "kitti" else "}"),
    ]


def _column_lines(series: Series) -> list[str]:
    lines = []
    for name in list(series.columns)[:_SHOWN_COLUMNS]:
        span = series.span(name)
        lines.append(f"{name}: {span[0]:.9g} … {span[1]:.9g}" if span else f"{name}: no finite number")
    more = len(series.columns) - _SHOWN_COLUMNS
    return lines + ([f"… and {more} more columns"] if more > 0 else [])


def _suggest(report: Inspection) -> list[str]:
    """Spec lines from the first series with an attitude; `?` where only its author knows."""
    for series in report.series:
        forms = [found for found in series.found if found.what != "time"]
        if forms:
            return _spec_lines(report, series, forms[0])
    return []


def _spec_lines(report: Inspection, series: Series, form: Found) -> list[str]:
    clock = next((found.columns[0] for found in series.found if found.what == "time"), "?")
    listed = ", ".join(f'"{name}"' if "[" in name or "(" in name or ":" in name else name for name in form.columns)
    unit = ", unit: ?" if form.what == "angles" else ""
    lines = [
        f"table: {report.path.name}",
        *([f"format: {report.format}"] if report.format in ("dataflash", "photo") else []),
    ]
    if report.format in ("ulog", "mavlink", "dataflash"):
        lines.append(f"topic: {series.name.partition(' of ')[0].partition('[')[0]}")
    lines.append(f"columns: {{time: {{column: {clock}, unit: ?}}, {form.what}: [{listed}]{unit}}}")
    if form.what == "quaternion":
        lines.append("scalar: ?                     # first or last")
    if form.what == "matrix":
        lines.append("order: ?                      # rows or columns")
    if form.what == "angles":
        lines.append("convention: ?")
    else:
        lines.append("maps: ?                       # body to reference, or reference to body")
    lines.append("between samples: ?            # slerp, rate limited, samples")
    asked = [question.key for question in QUESTIONS[report.format] if _only_in_answers(question.remedy)]
    return lines + ([f"answers: {{{', '.join(f'{key}: ?' for key in asked)}}}"] if asked else [])


def _only_in_answers(remedy: str) -> bool:
    return remedy.startswith("state answers")


_MAGIC = (
    (b"ULog\x01\x12\x35", "ulog"),
    (b"PAR1", "parquet"),
    (b"\x89MCAP0\r\n", "bag"),
    (b"\x89HDF\r\n\x1a\n", "mat"),
    (b"MATLAB 5.0", "mat"),
    (b"\xa3\x95\x80", "dataflash"),
    (b"\xff\xd8\xff", "photo"),
    (b"CCSDS_", "ccsds"),
)
_INSPECTORS: dict[str, Callable[[Inspection, Limits], None]] = {
    "csv": _inspect_csv,
    "parquet": _inspect_parquet,
    "mat": _inspect_mat,
    "ulog": _inspect_ulog,
    "mavlink": _inspect_mavlink,
    "dataflash": _inspect_dataflash,
    "bag": _inspect_bag,
    "ccsds": _inspect_ccsds,
    "photo": _inspect_photos,
    "tum": _inspect_trajectory,
    "kitti": _inspect_trajectory,
}


def plain_of(report: Inspection) -> dict[str, object]:
    """The report as JSON values."""
    return {
        "file": report.path.name,
        "format": report.format,
        "size": report.size,
        "sha256": report.sha256,
        "damage": list(report.troubles),
        "remarks": list(report.remarks),
        "series": [
            {
                "name": series.name,
                "rows": series.rows,
                "columns": {name: series.span(name) for name in series.columns},
                "found": [{"what": f.what, "columns": list(f.columns), "ground": f.ground} for f in series.found],
            }
            for series in report.series
        ],
        "spec": list(report.spec_lines),
    }
