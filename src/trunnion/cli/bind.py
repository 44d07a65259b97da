"""`trunnion bind`: the package again, from stored results."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@arguments.output
@arguments.no_pdf
def command(workbook: Path, output: Path | None, no_pdf: bool) -> ExitCode:
    """Bind the package of WORKBOOK again from what is computed; runs no notebook."""
    from trunnion.calculations.compute import compute
    from trunnion.cli import packaging, recording
    from trunnion.spec import load_workbook

    bound: list[packaging.Bound] = []
    loaded = load_workbook(workbook)
    compute(
        loaded,
        output=output,
        only=None,
        allow_local=True,
        then=lambda done: bound.append(packaging.bind_package(done, pdf=not no_pdf)),
        **recording.record_options(loaded),
    )
    if bound[0].error:
        click.echo(bound[0].error, err=True)
        return ExitCode.FAILED
    click.echo(f"Open {bound[0].html}")
    return ExitCode.OK
