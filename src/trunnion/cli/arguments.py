"""Arguments that several commands share."""

from __future__ import annotations

from pathlib import Path

import click

workbook = click.argument("workbook", type=click.Path(path_type=Path))
output = click.option(
    "--output",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Where outputs go: DIR/<workbook>/<revision>. Default: the nearest outputs/ at or above the workbook.",
)
as_json = click.option("--json", "as_json", is_flag=True, help="Print machine-readable results instead of a table.")
quiet = click.option("--quiet", is_flag=True, help="Print only what is wrong.")
no_pdf = click.option("--no-pdf", is_flag=True, help="Bind the HTML page only.")
