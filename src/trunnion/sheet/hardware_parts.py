"""Gimbals, passes, sectors, surveys, budgets and links from the plain values of the injected cell."""

from __future__ import annotations

import csv
import itertools
from collections.abc import Mapping
from typing import Any

from trunnion.errors import TrunnionError
from trunnion.sheet.describe import words
from trunnion.sheet.parameters import input_path, open_table
from trunnion.spec import build


def gimbal(plain: Mapping[str, Any]) -> Any:
    """The gimbal chain an injected parameter describes."""
    return build.gimbal_from_plain(plain)


def sky_pass(plain: Mapping[str, Any]) -> Any:
    """The pass an injected parameter describes; its table is read from `inputs/`."""
    return build.pass_from_plain(plain, open_pass=_open_pass)


def sector(plain: Mapping[str, Any]) -> Any:
    """The forbidden sector an injected parameter describes."""
    return build.sector_from_plain(plain)


def survey(plain: Mapping[str, Any]) -> dict[str, Any]:
    """The arguments of the survey an injected parameter describes."""
    return build.survey_from_plain(plain)


def budget(plain: Mapping[str, Any]) -> Any:
    """The pointing budget an injected parameter describes."""
    return build.budget_from_plain(plain)


def link(plain: Mapping[str, Any]) -> Any:
    """The link between two frames an injected parameter describes; its table is read from `inputs/`."""
    return build.link_from_plain(plain, open_table=open_table)


def _open_pass(statement: dict[str, Any]) -> Any:
    from trunnion.tables.sky import read_sky_table

    return read_sky_table(statement, input_path(statement["table"]).parent)


def row(kind: str, name: str, plain: Mapping[str, Any]) -> dict[str, str]:
    """One row of the inputs: what part it is, what is stated, and its source."""
    return {"input": f"{kind} {name}", "stated": words(plain), "source": str(plain.get("source", "not stated"))}


def frame_of(plain: Mapping[str, Any]) -> Any:
    """The frame a plain part describes."""
    return build.frame_from_plain(plain)


SIGHTING_COLUMNS = ("sensor_1", "sensor_2", "sensor_3", "host_1", "host_2", "host_3")
MOST_SIGHTINGS = 100_000


def sightings(name: str) -> list[dict[str, Any]]:
    """Sightings of a delimited file in `inputs/`: columns sensor_1 … host_3, and `accuracy` if it varies."""
    path = input_path(name)
    with path.open(encoding="utf-8-sig", newline="") as stream:
        reader = csv.DictReader(stream)
        missing = [column for column in SIGHTING_COLUMNS if column not in (reader.fieldnames or [])]
        if missing:
            raise TrunnionError(
                f"'{name}' has no column '{missing[0]}'", remedy=f"columns {', '.join(SIGHTING_COLUMNS)}"
            )
        return [
            _sighting(row, line, name) for line, row in enumerate(itertools.islice(reader, MOST_SIGHTINGS), start=2)
        ]


def _sighting(row: Mapping[str, Any], line: int, name: str) -> dict[str, Any]:
    try:
        numbers = [float(row[column]) for column in SIGHTING_COLUMNS]
    except (TypeError, ValueError) as err:
        raise TrunnionError(f"'{name}' line {line}: a direction is not three numbers") from err
    found: dict[str, Any] = {"sensor": numbers[:3], "host": numbers[3:]}
    return {**found, "accuracy": row["accuracy"]} if row.get("accuracy") else found
