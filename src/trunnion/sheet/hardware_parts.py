"""Gimbals, passes, sectors, surveys, budgets and links from the plain values of the injected cell."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

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
