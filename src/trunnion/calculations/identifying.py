"""From what people type about a file to an answer: the same way for the command and for scripts."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from trunnion.attitude.frames import Frame
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.study import Study, study
from trunnion.errors import TrunnionError
from trunnion.tables.samples import evidence_of
from trunnion.units import parse_quantity

CONSTANTS = {
    "none": Constants.NONE,
    "relabelled": Constants.RELABELLED,
    "body side": Constants.RIGHT,
    "reference side": Constants.LEFT,
    "both sides": Constants.BOTH,
}
_NO_COLUMN = ("workbook", "convention", "reference_axes", "body_axes", "agree", "time", "time_unit")


def identify_file(
    file: Path, given: Mapping[str, Any], *, constants: str = "none", offsets: bool = False, noise: str | None = None
) -> Study:
    """Answer for the columns of a file. given: the options of `trunnion identify`, None for those left out."""
    from trunnion.calculations.handover import convention_of

    known = None
    if given.get("convention") is not None:
        if given.get("workbook") is None:
            raise TrunnionError("the known convention is of no workbook", remedy="name it with --workbook")
        from trunnion.spec import load_workbook

        known = convention_of(load_workbook(given["workbook"]), given["convention"])
    agree = bool(given.get("agree"))
    evidence = evidence_of(
        _plain(file, given),
        file.parent,
        convention=known,
        reference=known.reference if known else _frame("reference", given.get("reference_axes")),
        body=known.body if known else _frame("body", given.get("body_axes")),
        agree=agree,
    )
    allowed = None if noise is None else parse_quantity(noise, kind="angle").value
    return study(evidence, constants=CONSTANTS[constants], noise=allowed, offsets=offsets, agree=agree)


def _plain(file: Path, given: Mapping[str, Any]) -> dict[str, Any]:
    """The options as the plain statement of samples."""
    plain = {
        key.replace("_", " "): value for key, value in given.items() if value is not None and key not in _NO_COLUMN
    }
    if given.get("time") is not None:
        plain["time"] = {"column": given["time"], "unit": given.get("time_unit")}
    return {"table": file.name, **plain}


def _frame(name: str, axes: str | None) -> Frame | None:
    if axes is None:
        return None
    words = tuple(part.strip() for part in axes.split(","))
    return Frame(name, words)  # type: ignore[arg-type]
