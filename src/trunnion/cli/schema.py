"""`trunnion schema`: the JSON Schema of workbook.yaml."""

from __future__ import annotations

import json

import click

from trunnion.cli.exits import ExitCode


@click.command()
def command() -> ExitCode:
    """Print the JSON Schema of workbook.yaml, for editors that complete and check while one types."""
    from trunnion.spec import json_schema

    click.echo(json.dumps(json_schema(), indent=1, ensure_ascii=False))
    return ExitCode.OK
