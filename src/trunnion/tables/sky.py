"""Passes over a pointing mount as delimited text: time, azimuth and elevation by named columns."""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import TrunnionError
from trunnion.units import parse_quantity

LARGEST_ROWS = 2_000_000


@dataclass(frozen=True, eq=False)
class SkyTable:
    """Times (N,) s, azimuth (north through east) and elevation (N,) rad, as the file has them."""

    times: NDArray[np.float64]
    azimuth: NDArray[np.float64]
    elevation: NDArray[np.float64]


def read_sky_table(statement: dict[str, Any], folder: Path) -> SkyTable:
    """Read `{table, columns: {time: {column, unit}, azimuth, elevation, unit}}` from `folder`."""
    path, columns = folder / statement["table"], statement["columns"]
    names = (columns["time"]["column"], columns["azimuth"], columns["elevation"])
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            rows = _rows(csv.reader(stream), names, path.name)
    except (OSError, UnicodeDecodeError, csv.Error) as err:
        raise TrunnionError(
            f"'{path.name}' can't be read as delimited text", remedy="UTF-8, commas between columns"
        ) from err
    numbers = np.array(rows, dtype=float).reshape(-1, 3)
    angle, time = (parse_quantity(f"1 {unit}").value for unit in (columns["unit"], columns["time"]["unit"]))
    return SkyTable(time * numbers[:, 0], angle * numbers[:, 1], angle * numbers[:, 2])


def _rows(reader: Any, names: tuple[str, str, str], file: str) -> list[list[float]]:
    heading = next(reader, None) or []
    places = []
    for name in names:
        if name not in heading:
            raise TrunnionError(
                f"'{file}' has no column '{name}'", remedy=f"its columns: {', '.join(heading) or 'none'}"
            )
        places.append(heading.index(name))
    rows: list[list[float]] = []
    for number, row in enumerate(reader, start=2):
        if not row:
            continue
        if len(rows) == LARGEST_ROWS:
            raise TrunnionError(f"'{file}' has more than {LARGEST_ROWS} rows", remedy="split it into passes")
        rows.append([_number(row, place, name, number, file) for place, name in zip(places, names, strict=True)])
    return rows


def _number(row: list[str], place: int, name: str, line: int, file: str) -> float:
    text = row[place] if place < len(row) else ""
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise TrunnionError(f"'{file}' line {line}: '{text[:40]}' in column '{name}' is not a number")
    return value
