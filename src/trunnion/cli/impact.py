"""`trunnion impact`: what a change touches; nothing is run."""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@arguments.output
@arguments.as_json
def command(workbook: Path, output: Path | None, as_json: bool) -> ExitCode:
    """Say what differs in WORKBOOK from the last issued revision and from the last computed state. Nothing is run.

    Which calculations are out of date and why, which verdicts are certain and which may change, and what rests on
    them.
    """
    from trunnion.calculations.impact import impact
    from trunnion.calculations.impact_text import impact_lines
    from trunnion.spec import load_workbook

    found = impact(load_workbook(workbook), output=output)
    if as_json:
        click.echo(json.dumps([entry.plain() for entry in found], indent=1, ensure_ascii=False))
        return ExitCode.OK
    if not found:
        click.echo("Nothing was computed or issued yet: every calculation is to be run.")
    for entry in found:
        for line in impact_lines(entry):
            click.echo(line)
        click.echo()
    return ExitCode.OK
