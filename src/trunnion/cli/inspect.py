"""`trunnion inspect`: what attitude data a file holds."""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("file", type=click.Path(path_type=Path))
@arguments.as_json
def command(file: Path, as_json: bool) -> ExitCode:
    """Say what attitude data FILE holds: series, columns with their ranges as found, damage, and spec lines.

    Nothing is converted and nothing believed: every unit is a guess from the numbers, and `?` in the spec lines stands
    for what only the author of the file knows.
    """
    from trunnion.tables.inspection import inspect_file, plain_of

    report = inspect_file(file)
    click.echo(json.dumps(plain_of(report), indent=1, ensure_ascii=False) if as_json else "\n".join(report.lines()))
    return ExitCode.OK
