"""`trunnion issue`: freeze the revision, once the rules of signing are met."""

from __future__ import annotations

import datetime
from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@arguments.output
@arguments.no_pdf
@click.option("--date", metavar="YYYY-MM-DD", help="The day of issue. Default: today.")
@recording.signers
@recording.revoked
def command(
    workbook: Path, output: Path | None, no_pdf: bool, date: str | None, signers: Path | None, revoked: Path | None
) -> ExitCode:
    """Freeze the computed and signed revision of WORKBOOK: never changed again, only superseded or withdrawn.

    Refused until every calculation is prepared, checked and approved, and nothing bars approval. Results, spec as
    read, digests, statements and signatures go to WORKBOOK/issued/REVISION, to be kept under version control.
    """
    from trunnion.calculations.compute import Computed, compute
    from trunnion.calculations.issue import freeze, require_issuable
    from trunnion.cli import packaging
    from trunnion.errors import RecordError
    from trunnion.records.issuing import record_files, require_ready
    from trunnion.spec import load_workbook

    day = date or datetime.datetime.now(datetime.UTC).date().isoformat()
    loaded = load_workbook(workbook)
    require_issuable(loaded, date=day)
    frozen: list[Path] = []

    def bind_and_freeze(done: Computed) -> None:
        case = require_ready(loaded, done.results, day, recording.trust(signers, revoked))
        bound = packaging.bind_package(done, pdf=not no_pdf, status="issued", date=day)
        if bound.error:
            raise RecordError("the package could not be bound", remedy=bound.error)
        frozen.append(freeze(done, date=day, record=record_files(loaded, case, day)))

    options = recording.record_options(loaded)
    compute(loaded, output=output, only=None, allow_local=True, then=bind_and_freeze, **options)
    click.echo(f"Issued: {frozen[0]}")
    return ExitCode.OK
