"""From the plain values of the injected cell back to numerical objects, and from input names to files."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from trunnion.errors import CalculationError

INPUTS_VARIABLE = "TRUNNION_INPUTS"


def input_path(name: str) -> Path:
    """The input file `name`, in `inputs/` beside the notebook (the working folder) or one folder up.

    A notebook reads only what was copied for it: a name with a folder in it is refused.
    """
    if Path(name).name != name or name in ("", ".", ".."):
        raise CalculationError(f"'{name}' is not the name of an input file", remedy="inputs are plain names in inputs/")
    elsewhere = os.environ.get(INPUTS_VARIABLE)  # inputs above the copied size, while a calculation is run
    for folder in (Path("inputs"), Path("..") / "inputs", *([Path(elsewhere)] if elsewhere else [])):
        path = folder / name
        if path.is_file():
            return path
    raise CalculationError(
        f"input file '{name}' is not in inputs/ beside this notebook",
        remedy="run the notebook in its revision folder, where `trunnion compute` copied the inputs",
    )


def frame(plain: Mapping[str, Any]) -> Any:
    """The frame an injected parameter describes."""
    from trunnion.spec.build import frame_from_plain

    return frame_from_plain(plain)


def convention(plain: Mapping[str, Any]) -> Any:
    """The convention an injected parameter describes."""
    from trunnion.spec.build import convention_from_plain

    return convention_from_plain(plain)


def region(plain: Mapping[str, Any], tables: list[Any] | None = None) -> Any:
    """The region (envelope) an injected parameter describes; its tables are read from `inputs/`.

    The tables read on the way are added to `tables`, for what their readers noticed.
    """
    from trunnion.spec.build import region_from_plain

    def opened(statement: Mapping[str, Any]) -> Any:
        table = open_table(statement)
        if tables is not None:
            tables.append(table)
        return table

    return region_from_plain(plain, open_table=opened)


def mount(plain: Mapping[str, Any]) -> Any:
    """The mount an injected parameter describes."""
    from trunnion.spec.build import mount_from_plain

    return mount_from_plain(plain)


def open_table(plain: Mapping[str, Any]) -> Any:
    """Read the attitude table a plain statement describes, from the copied input file it names."""
    from trunnion.tables import read_table

    return read_table(table_statement(plain), input_path(plain["table"]).parent)


def table_statement(plain: Mapping[str, Any]) -> Any:
    """The statement of a table's file from its plain keys (`table`, `columns`, `scalar`, …)."""
    from trunnion.tables import statement_from_plain

    written = plain.get("convention")
    built = convention(written) if isinstance(written, Mapping) else None
    stated = {**plain, "convention": built.name} if built is not None else dict(plain)
    return statement_from_plain(stated, built)
