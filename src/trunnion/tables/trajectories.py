"""Trajectory text without a header: TUM (t tx ty tz qx qy qz qw) and KITTI (a 3 x 4 matrix, row by row)."""

from __future__ import annotations

import io
from dataclasses import replace
from pathlib import Path

import numpy as np

from trunnion.errors import UnitError
from trunnion.tables.assembly import assemble
from trunnion.tables.confine import Limits
from trunnion.tables.delimited import Layout, read_patiently
from trunnion.tables.files import Seal, file_error, read_text_bytes
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import Form, Order, Scalar, TableStatement
from trunnion.tables.table import AttitudeTable
from trunnion.units import parse_quantity

TUM_NAMES: tuple[str, ...] = ("t", "tx", "ty", "tz", "qx", "qy", "qz", "qw")
KITTI_NAMES: tuple[str, ...] = tuple(f"m{row}{column}" for row in (1, 2, 3) for column in (1, 2, 3, 4))


def read_tum_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """TUM text: the layout fixes columns, seconds and scalar last; direction and axes are asked."""
    require_answers("tum", statement, {}, path)
    own = replace(
        statement, form=Form.QUATERNION, scalar=Scalar.LAST, time_column="t", time_unit="s", columns=TUM_NAMES[4:]
    )
    return _read(own, path, TUM_NAMES, [TUM_NAMES[0], *TUM_NAMES[4:]])


def read_kitti_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """KITTI text: the layout fixes the matrix by rows; there is no time in it, so the step between rows is asked."""
    require_answers("kitti", statement, {}, path)
    names = [name for name in KITTI_NAMES if not name.endswith("4")]
    own = replace(statement, form=Form.MATRIX, order=Order.ROWS, columns=tuple(names), time_unit="s")
    return _read(own, path, KITTI_NAMES, names, step=_step(statement, path))


def _step(statement: TableStatement, path: Path) -> float:
    """Seconds between two rows, as answered."""
    try:
        return parse_quantity(statement.answers["clock"], kind="time").value
    except UnitError as err:
        raise file_error(path, f"answers.clock: {err.fault.cause}", err.fault.remedy) from err


def _read(
    statement: TableStatement, path: Path, layout_names: tuple[str, ...], names: list[str], step: float | None = None
) -> AttitudeTable:
    seal = Seal.of(path)
    lines = (line.split(b"#")[0] for line in io.BytesIO(read_text_bytes(path)))
    layout = Layout((), 0, layout_names, 0)
    columns = read_patiently(lines, layout, names, "", path)
    if step is not None:
        assert columns.rows is not None
        columns.values = [columns.time.astype(float), *columns.values]
        columns.time = (columns.rows - 1) * np.float64(step)
    columns.notes = [
        "layout of the format: quaternion x y z w" if step is None else "layout of the format: 3 x 4 by rows"
    ]
    return assemble(columns, statement, path, seal.sha256)
