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
    from trunnion.records.signoff import approved
    from trunnion.records.status import signatures_on
    from trunnion.spec import load_workbook

    loaded = load_workbook(workbook)
    found = impact(loaded, output=output, approved=approved(loaded))
    stale = [{one.id for one in entry.calculations if one.out_of_date} for entry in found]
    signed = [signatures_on(loaded, names, output) for names in stale]
    if as_json:
        plain = [{**entry.plain(), "signatures": own} for entry, own in zip(found, signed, strict=True)]
        click.echo(json.dumps(plain, indent=1, ensure_ascii=False))
        return ExitCode.OK
    if not found:
        click.echo("Nothing was computed or issued yet: every calculation is to be run.")
    for entry, own in zip(found, signed, strict=True):
        for line in impact_lines(entry):
            click.echo(line)
        for text in own:
            click.echo(f"  signature that will fall: {text}")
        click.echo()
    return ExitCode.OK
