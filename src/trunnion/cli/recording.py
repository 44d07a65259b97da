"""What the commands about records share: the workbook as it stands, key options, and how states are printed."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import click

from trunnion.calculations.compute import Computed, compute
from trunnion.records import signoff
from trunnion.records.casework import Trust, stored_results
from trunnion.spec import load_workbook

signers = click.option(
    "--signers", type=click.Path(path_type=Path), metavar="FILE", help="Keys to trust, in allowed_signers form."
)
revoked = click.option(
    "--revoked",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Revoked keys: public keys, one a line, or a KRL.",
)
key = click.option(
    "--key", type=click.Path(path_type=Path), metavar="FILE", help="The key file, or its .pub with an agent."
)


def current(workbook: Path, output: Path | None) -> Computed:
    """The workbook as it stands: nothing is run, and what is out of date is not complete."""
    loaded = load_workbook(workbook)
    return compute(loaded, output=output, only=None, allow_local=True, **record_options(loaded))


def stored(workbook: Path, output: Path | None) -> tuple[Any, dict[str, Any]]:
    """The workbook and its last results, as computed or as issued; nothing is written."""
    loaded = load_workbook(workbook)
    return loaded, stored_results(loaded, output)


def record_options(loaded: Any) -> dict[str, Any]:
    """What `compute` is told of records: approved deviations, and the sign-off of sheets."""
    return {"approved": signoff.approved(loaded), "signatures": signoff.sheet_rows}


def trust(signers: Path | None, revoked: Path | None) -> Trust:
    """Keys from outside where they are given."""
    return Trust(signers, revoked)


def text_table(rows: Sequence[tuple[str, ...]]) -> str:
    """Rows in columns of plain text, for terminals and files alike."""
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]) - 1)] if rows else []
    lines = [
        "  ".join([*(cell.ljust(width) for cell, width in zip(row, widths, strict=False)), row[-1]]) for row in rows
    ]
    return "\n".join(line.rstrip() for line in lines)
