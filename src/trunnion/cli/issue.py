"""`trunnion issue`: freeze the revision."""

from __future__ import annotations

import datetime
from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@arguments.output
@arguments.no_pdf
@click.option("--date", metavar="YYYY-MM-DD", help="The day of issue. Default: today.")
def command(workbook: Path, output: Path | None, no_pdf: bool, date: str | None) -> ExitCode:
    """Freeze the computed revision of WORKBOOK: it is never changed again, only superseded or withdrawn.

    Results, spec as read and digests go to WORKBOOK/issued/REVISION, to be kept under version control.
    """
    from trunnion.calculations.compute import compute
    from trunnion.calculations.issue import freeze, require_issuable
    from trunnion.cli import packaging
    from trunnion.errors import RecordError
    from trunnion.spec import load_workbook

    day = date or datetime.date.today().isoformat()
    loaded = load_workbook(workbook)
    require_issuable(loaded, date=day)
    frozen: list[Path] = []

    def bind_and_freeze(done: object) -> None:
        bound = packaging.bind_package(done, pdf=not no_pdf, status="issued", date=day)  # type: ignore[arg-type]
        if bound.error:
            raise RecordError("the package could not be bound", remedy=bound.error)
        frozen.append(freeze(done, date=day))  # type: ignore[arg-type]

    compute(loaded, output=output, only=None, allow_local=True, then=bind_and_freeze)
    click.echo(f"Issued: {frozen[0]}")
    return ExitCode.OK
