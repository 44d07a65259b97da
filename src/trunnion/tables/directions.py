"""Directions that move, as delimited text: time and three components in the reference frame by named columns."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import TableError
from trunnion.tables import delimited
from trunnion.tables.assembly import refuse_damage
from trunnion.tables.columns import seconds
from trunnion.tables.files import file_error, locate, read_text_bytes
from trunnion.tables.statements import TableStatement
from trunnion.units import parse_quantity

_EXAMPLE = "{table: data/sun.csv, columns: {time: {column: t_s, unit: s}, direction: [x, y, z]}}"
_SHORTEST = 1e-9  # a vector shorter than this, among numbers of its own row, is no direction


@dataclass(frozen=True, eq=False)
class DirectionTable:
    """Times (N,) s counted from `origin` (s on the file's own clock) and unit directions (N, 3)."""

    times: NDArray[np.float64]
    directions: NDArray[np.float64]
    origin: float


def read_direction_table(statement: Mapping[str, Any], folder: Path) -> DirectionTable:
    """Read `{table, columns: {time: {column, unit}, direction: [x, y, z]}, separator}` from `folder`.

    Lengths do not matter, so that positions relative to the vehicle serve as well. TableError for a statement that is
    incomplete, columns that are missing, cells that are no numbers, rows without a direction.
    """
    stated = _statement(statement)
    path = locate(stated.path, folder)
    columns = delimited.read_csv(read_text_bytes(path), stated, path)
    refuse_damage(columns.damage, stated, path)
    times, origin, _ = seconds(columns.time, stated.time_unit or "s")
    vectors = np.stack(columns.values, axis=1)
    lengths = np.linalg.norm(vectors, axis=1)
    bad = ~(np.isfinite(times) & np.isfinite(lengths) & (lengths > _SHORTEST * np.abs(vectors).max(initial=0.0)))
    bad |= lengths == 0.0
    if not len(times):
        raise file_error(path, "the file holds no rows")
    if bad.any():
        raise file_error(path, f"row {int(np.argmax(bad)) + 1:,} holds no direction", "three numbers, not all zero")
    return DirectionTable(times, vectors / lengths[:, None], origin)


def _statement(plain: Mapping[str, Any]) -> TableStatement:
    columns = plain.get("columns")
    time = columns.get("time") if isinstance(columns, Mapping) else None
    names = columns.get("direction") if isinstance(columns, Mapping) else None
    sound = isinstance(time, Mapping) and "column" in time and "unit" in time
    if not sound or not isinstance(names, list) or len(names) != 3 or not isinstance(plain.get("table"), str):
        raise _incomplete("a moving direction needs its file, its time column with unit, and three columns")
    stray = sorted(set(plain) - {"table", "columns", "separator", "source"})
    if stray:
        raise _incomplete(f"a moving direction knows no '{stray[0]}'")
    assert isinstance(time, Mapping)
    parse_quantity(f"1 {time['unit']}", kind="time")
    return TableStatement(
        path=str(plain["table"]),
        columns=tuple(str(name) for name in names),
        time_column=str(time["column"]),
        time_unit=str(time["unit"]),
        separator=str(plain.get("separator", ",")),
    )


def _incomplete(cause: str) -> TableError:
    return file_error("reference direction", cause, f"write it as in {_EXAMPLE}")
