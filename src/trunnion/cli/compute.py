"""`trunnion compute`: run what is out of date, judge, bind; or try other values without touching a revision."""

from __future__ import annotations

from pathlib import Path
from typing import Any

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
@click.option("--trial", is_flag=True, help="Compute into a scratch folder, never into a revision.")
@click.option(
    "--set",
    "values",
    multiple=True,
    metavar="PATH=VALUE",
    help="A trial value, as in 'requirements.R1.at least=25 deg'.",
)
@click.option("--scheduler", metavar="ADDRESS", help="Hand campaign runs to the Dask cluster at this address.")
@click.option("--vary", metavar="PATH=VALUES", help="Sweep a value in trial runs: '10 deg .. 30 deg in 5', or a list.")
def command(
    workbook: Path,
    jobs: int | None,
    only: tuple[str, ...],
    output: Path | None,
    as_json: bool,
    quiet: bool,
    no_pdf: bool,
    allow_local_templates: bool,
    trial: bool,
    values: tuple[str, ...],
    vary: str | None,
    scheduler: str | None,
) -> ExitCode:
    """Compute WORKBOOK: run what is out of date, judge the requirements, bind the package.

    Exit code 0 when every requirement that counts is met or has an approved deviation, 1 when one is not met or not
    shown, 2 when the spec is wrong or a calculation failed.
    """
    from trunnion.cli import computing
    from trunnion.sheet import sharing

    sharing.set_scheduler(scheduler)
    options: dict[str, Any] = {"output": output, "workers": jobs, "allow_local": allow_local_templates}
    look = computing.Look(as_json=as_json, quiet=quiet)
    if vary is not None:
        return computing.sweep(workbook, vary, values, look, options)
    return computing.once(workbook, values, look, {**options, "only": only}, trial=trial, pdf=not no_pdf)
