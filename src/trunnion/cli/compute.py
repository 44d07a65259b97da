"""`trunnion compute`: run what is out of date, judge, bind."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.option("--jobs", type=click.IntRange(1), metavar="N", help="Kernels side by side. Default: one a processor.")
@click.option("--only", multiple=True, metavar="ID", help="Run only this calculation (may be repeated).")
@arguments.output
@arguments.as_json
@arguments.quiet
@arguments.no_pdf
@click.option("--allow-local-templates", is_flag=True, help="Run the workbook's own templates; they are programs.")
def command(
    workbook: Path,
    jobs: int | None,
    only: tuple[str, ...],
    output: Path | None,
    as_json: bool,
    quiet: bool,
    no_pdf: bool,
    allow_local_templates: bool,
) -> ExitCode:
    """Compute WORKBOOK: run every calculation that is out of date, judge the requirements, bind the package.

    Exit code 0 when every requirement that counts is met or has an approved deviation, 1 when one is not met or not
    shown, 2 when the spec is wrong or a calculation failed.
    """
    from trunnion.calculations.compute import compute
    from trunnion.cli import packaging, screen
    from trunnion.spec import load_workbook

    loaded = load_workbook(workbook)
    with screen.progress(shown=not (quiet or as_json)) as tell:
        computed = compute(loaded, output=output, only=only, workers=jobs, allow_local=allow_local_templates, tell=tell)
    report = packaging.bind_package(computed, pdf=not no_pdf)
    screen.show_computed(computed, report, as_json=as_json, quiet=quiet)
    if computed.failed:
        return ExitCode.FAILED
    return ExitCode.OK if computed.satisfied else ExitCode.NOT_MET
