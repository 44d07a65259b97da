"""`trunnion revise`: open the next revision."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.option("--reason", required=True, help="Why there is a new revision; stands in the revision table.")
@click.option("--revision", help="The next revision, where it is not the next letter of the series.")
@click.option("--date", metavar="YYYY-MM-DD", help="The date for the revision table.")
def command(workbook: Path, reason: str, revision: str | None, date: str | None) -> ExitCode:
    """Open the next revision of WORKBOOK, superseding the issued one: edits title block and revision table."""
    from trunnion.calculations.revise import revise
    from trunnion.spec import load_workbook

    done = revise(load_workbook(workbook), reason=reason, revision=revision, date=date)
    click.echo(f"Revision {done.revision} is open, superseding {done.supersedes}: {done.spec}")
    return ExitCode.OK
