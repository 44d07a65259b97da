"""Parquet: read by pyarrow in the confined child; column names checked against the file's own list first."""

from __future__ import annotations

from pathlib import Path

from trunnion.tables.assembly import assemble
from trunnion.tables.columns import Columns
from trunnion.tables.confine import Limits, Returned, read_confined
from trunnion.tables.delimited import wanted_columns
from trunnion.tables.files import Seal
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable

_READER = "trunnion.tables.foreign.parquet:read_columns"


def read_parquet_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """The table of a Parquet file."""
    require_answers("parquet", statement, {}, path)
    seal = Seal.of(path)
    names = wanted_columns(statement)
    returned = read_confined(_READER, path, {"columns": names}, limits)
    seal.require_unchanged(path)
    return assemble(columns_of(returned, len(names)), statement, path, seal.sha256)


def columns_of(returned: Returned, count: int) -> Columns:
    """Columns from a reader that returned arrays named "0", "1", …: time first."""
    arrays = [returned.arrays[str(place)] for place in range(count)]
    return Columns(arrays[0], [values.astype(float, copy=False) for values in arrays[1:]])
