"""`trunnion readback`: the spec in plain sentences; nothing is run."""

from __future__ import annotations

import textwrap
from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
def command(workbook: Path) -> ExitCode:
    """Read the spec of WORKBOOK back in plain sentences, to be confirmed aloud, then the plan. Nothing is run."""
    from trunnion.calculations.readback import readback
    from trunnion.spec import load_workbook

    for section in readback(load_workbook(workbook)):
        click.echo(section.title)
        for line in section.lines:
            laid_out = line.startswith("    ")
            click.echo(
                f"  {line}" if laid_out else textwrap.fill(line, 100, initial_indent="  ", subsequent_indent="    ")
            )
        click.echo()
    return ExitCode.OK
