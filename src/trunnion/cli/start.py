"""`trunnion start`: a new workbook."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("folder", type=click.Path(path_type=Path), metavar="DIR")
def command(folder: Path) -> ExitCode:
    """Write a new workbook into DIR: a commented workbook.yaml that computes as it stands, and a small data file."""
    from trunnion.calculations.start import start

    spec = start(folder)
    click.echo(f"Wrote {spec}. Next: trunnion readback {folder}, then trunnion compute {folder}")
    return ExitCode.OK
