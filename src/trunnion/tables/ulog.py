"""Flight logs in ULog: read through pyulog in the confined child, believed only after our own walk of every message."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from trunnion.tables.assembly import assemble, refuse_damage
from trunnion.tables.checks import gap_troubles
from trunnion.tables.columnar import columns_of
from trunnion.tables.columns import seconds
from trunnion.tables.confine import Limits, Returned, read_confined
from trunnion.tables.delimited import wanted_columns
from trunnion.tables.files import Seal, file_error
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable, Trouble
from trunnion.tables.ulog_health import Health, Series, examine

_READER = "trunnion.tables.foreign.ulog:read_topic"


def read_ulog_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """One topic of a log. Damage of any kind (see `ulog_health`) stops it unless the statement accepts damage."""
    seal = Seal.of(path)
    health, series, names = open_log(statement, path, keep=statement.topic)
    damage = health.troubles()
    options = {"topic": series.topic.name, "instance": series.topic.instance, "columns": names}
    returned = read_confined(_READER, path, options, limits)
    seal.require_unchanged(path)
    damage += _disagreements(returned, series) + _gap_damage(series, statement)
    columns = columns_of(returned, len(names))
    columns.damage = damage
    columns.findings = health.doubts()
    columns.notes = [_summary(health, series)]
    return assemble(columns, statement, path, seal.sha256)


def open_log(statement: TableStatement, path: Path, keep: str | None) -> tuple[Health, Series, list[str]]:
    """The walked log, the stated topic's series and the wanted fields, time first; TableError where one is missing.

    Damage of the file itself comes before all questions, unless the statement accepts it.
    """
    health = examine(path, keep)
    damage = health.troubles()
    if any(trouble.kind == "damaged log" for trouble in damage):
        refuse_damage([*damage, *health.doubts()], statement, path)
    require_answers("ulog", statement, {}, path)
    series = require_topic(health, statement, path)
    names = wanted_columns(statement)
    require_fields(series, names, path)
    return health, series, names


def require_topic(health: Health, statement: TableStatement, path: Path) -> Series:
    """The stated topic's series, or TableError with the topics the log holds."""
    series = health.find(statement.topic or "", statement.instance)
    if series is None or not series.count:
        held = sorted({other.label for other in health.series.values() if other.count})
        which = f"'{statement.topic}'" + (f" instance {statement.instance}" if statement.instance else "")
        raise file_error(path, f"the log holds no samples of topic {which}", nearest_hint(statement.topic or "", held))
    return series


def require_fields(series: Series, names: list[str], path: Path) -> None:
    """Raise TableError naming each field the topic does not have."""
    known = series.topic.dtype.names or ()
    for name in names:
        if name not in known:
            raise file_error(path, f"topic '{series.label}' has no field '{name}'", nearest_hint(name, known, 24))


def _disagreements(returned: Returned, series: Series) -> list[Trouble]:
    """Where the library's reading and our walk differ, and its own flag for damage."""
    found = []
    if returned.meta["corrupt"]:
        found.append(Trouble("damaged log", "the log reader found damage in the file", 1))
    stamps = returned.arrays["stamps"].astype(np.uint64)
    walked = np.frombuffer(series.stamps or b"", dtype=np.uint64)
    if len(stamps) != len(walked):
        text = f"the log reader gives {len(stamps)} samples, the walk through the file {len(walked)}"
        found.append(Trouble("damaged log", text, abs(len(stamps) - len(walked))))
    elif not np.array_equal(stamps, walked):
        text = "the log reader's time stamps differ from those in the file"
        found.append(Trouble("damaged log", text, int(np.count_nonzero(stamps != walked))))
    return found


def _gap_damage(series: Series, statement: TableStatement) -> list[Trouble]:
    """Gaps of the logged time stamps above the stated largest one; in a log they stop the reading."""
    if statement.max_gap is None:
        return []
    stamps = np.frombuffer(series.stamps or b"", dtype=np.uint64)
    times, _, _ = seconds(stamps.astype(np.int64), "us")
    findings, _ = gap_troubles(times, np.arange(1, len(times) + 1), statement.max_gap)
    return findings


def _summary(health: Health, series: Series) -> str:
    total = sum(health.messages.values())
    return (
        f"{series.count} samples of '{series.label}' among {total} messages in {health.size} bytes; "
        "the format has no closing record, so a log cut exactly between two rounds of its logger looks whole"
    )
