"""`trunnion archive`: the archive of an issued revision."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@recording.key
@arguments.output
@click.option("--into", type=click.Path(path_type=Path), metavar="DIR", help="Where to write. Default: …/archive.")
def command(workbook: Path, key: Path | None, output: Path | None, into: Path | None) -> ExitCode:
    """Write the archive of WORKBOOK's issued revision: a BagIt 1.0 bag and its zip, with a README for the finder.

    The key must be listed with the namespace archived@trunnion. Made again without a key, it is the same bytes.
    """
    from trunnion.records.archive import archive
    from trunnion.spec import load_workbook

    made = archive(load_workbook(workbook), key=key, output=output, into=into)
    click.echo(f"Archived, signed by {made.person}: {made.zip}\n  unpacked: {made.folder}")
    return ExitCode.OK
