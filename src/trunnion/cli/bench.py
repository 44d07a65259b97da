"""`trunnion bench`: the bench check of a mount, printed to be filled in, and judged when it has been."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.argument("mount")
@click.option("--readings", type=click.Path(path_type=Path), metavar="FILE", help="Judge the filled-in readings.")
@click.option("--to", "folder", type=click.Path(path_type=Path), metavar="DIR", help="Where sheet and file go.")
def command(workbook: Path, mount: str, readings: Path | None, folder: Path | None) -> ExitCode:
    """Write the bench check sheet of MOUNT in WORKBOOK: a page to print, and a readings file to fill in.

    With --readings the filled-in file is judged: exit code 0 when it passes on sufficient evidence, 1 when it fails
    (the mistake that fits is named) or the poses read could not have shown a mistake, 2 when it can't be read.
    """
    from trunnion.calculations import bench
    from trunnion.calculations.store import outputs_of
    from trunnion.spec import load_workbook

    loaded = load_workbook(workbook)
    if readings is not None:
        found = bench.judge(loaded, mount, readings)
        click.echo("\n".join(bench.judgement_lines(found)))
        return ExitCode.OK if bench.conclusive(found) else ExitCode.NOT_MET
    target = folder or outputs_of(loaded.root, None) / loaded.root.resolve().name / bench.FOLDER
    for path in bench.write_sheet(loaded, mount, target):
        click.echo(path)
    return ExitCode.OK
