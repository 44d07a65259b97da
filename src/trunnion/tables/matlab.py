"""MAT files, version 5 (scipy) and 7.3 (h5py), read in the confined child.

A column is named as one would type it: `t`, `log.q(:,1)`, `R(3,:)`; indices count from 1.
"""

from __future__ import annotations

from pathlib import Path

from trunnion.tables.assembly import assemble
from trunnion.tables.columnar import columns_of
from trunnion.tables.confine import Limits, read_confined
from trunnion.tables.delimited import wanted_columns
from trunnion.tables.files import Seal
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable

READER = "trunnion.tables.foreign.matlab:read_columns"
LISTING = "trunnion.tables.foreign.matlab:list_arrays"


def read_mat_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """The stated columns of a MAT file."""
    require_answers("mat", statement, {}, path)
    seal = Seal.of(path)
    names = wanted_columns(statement)
    returned = read_confined(READER, path, {"columns": names}, limits)
    seal.require_unchanged(path)
    return assemble(columns_of(returned, len(names)), statement, path, seal.sha256)
