"""Read one attitude table, whatever its format."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

from trunnion.tables import (
    bags,
    ccsds,
    columnar,
    dataflash,
    delimited,
    matlab,
    mavlink,
    photos,
    trajectories,
    ulog,
)
from trunnion.tables.assembly import assemble
from trunnion.tables.confine import Limits
from trunnion.tables.files import file_error, locate, read_text_bytes
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.questions import QUESTIONS, require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable

#: What a file is by its name, where nothing else is stated.
BY_SUFFIX = {
    ".csv": "csv",
    ".parquet": "parquet",
    ".pq": "parquet",
    ".ulg": "ulog",
    ".aem": "ccsds",
    ".apm": "ccsds",
    ".tlog": "mavlink",
    ".mcap": "bag",
    ".mat": "mat",
    ".jpg": "photo",
    ".jpeg": "photo",
}


def read_table(statement: TableStatement, root: Path | str, limits: Limits | None = None) -> AttitudeTable:
    """Read the table `statement` names, relative to the folder `root`.

    Every question of the format must be answered by the statement or the file. Returns times (s) and unit quaternions,
    scalar first, body to reference, with notes, findings and the digest of the file. Raises TableError with all faults
    (row numbers and counts) for a file that can't be read as stated; rows are left out only under `accept_damaged`.
    `limits` bound the child process that reads binary formats; without them the statement's own, else the default.
    """
    path = locate(statement.path, root)
    name = format_of(statement, path)
    table = _READERS[name](statement, path, limits or limits_of(statement))
    if statement.sha256 not in (None, table.sha256):
        raise file_error(
            path, f"the file's SHA-256 is {table.sha256}", f"stated is {statement.sha256}: find the right file"
        )
    return table


def limits_of(statement: TableStatement) -> Limits:
    """The default limits of the reading process, raised or lowered as the statement says."""
    default = Limits()
    seconds = statement.reader_time or default.wall_seconds
    return Limits(int(statement.reader_memory or default.address_space), seconds, seconds)


def format_of(statement: TableStatement, path: Path) -> str:
    """The format's name: as stated, else by the file's suffix. Raises TableError for one that is not known."""
    name = statement.format or BY_SUFFIX.get(path.suffix.lower())
    if statement.format is None and path.is_dir() and (path / "metadata.yaml").is_file():
        return "bag"
    if name in _READERS:
        return str(name)
    if statement.format is None:
        remedy = f"state format: one of {', '.join(sorted(_READERS))}"
        raise file_error(path, f"the suffix '{path.suffix}' does not tell the format", remedy)
    raise file_error(path, f"there is no format '{name}'", nearest_hint(str(name), sorted(_READERS)))


def _read_csv(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    require_answers("csv", statement, {}, path)
    data = read_text_bytes(path)
    with ThreadPoolExecutor(1) as aside:  # hashing lets go of the interpreter, so it costs little beside the parsing
        digest = aside.submit(lambda: hashlib.sha256(data).hexdigest())
        columns = delimited.read_csv(data, statement, path)
        return assemble(columns, statement, path, digest.result())


_READERS: dict[str, Callable[[TableStatement, Path, Limits], AttitudeTable]] = {
    "csv": _read_csv,
    "parquet": columnar.read_parquet_table,
    "ulog": ulog.read_ulog_table,
    "ccsds": ccsds.read_ccsds_table,
    "tum": trajectories.read_tum_table,
    "kitti": trajectories.read_kitti_table,
    "mavlink": mavlink.read_mavlink_table,
    "dataflash": dataflash.read_dataflash_table,
    "bag": bags.read_bag_table,
    "mat": matlab.read_mat_table,
    "photo": photos.read_photo_table,
}

assert set(_READERS) <= set(QUESTIONS)
