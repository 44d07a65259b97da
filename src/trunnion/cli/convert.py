"""`trunnion convert`: a whole log in another convention, with margins along the way."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.argument("envelope")
@click.argument("convention")
@click.argument("out", type=click.Path(path_type=Path))
@click.option("--near-lock", default="5 deg", metavar="ANGLE", show_default=True, help="Flag rows nearer to lock.")
@click.option(
    "--head", multiple=True, metavar="KEY=TEXT", help="What an attitude message must say; names all when missing."
)
@click.option("--angles", is_flag=True, help="Write Euler angles into an attitude message, not the quaternion.")
def command(
    workbook: Path, envelope: str, convention: str, out: Path, near_lock: str, head: tuple[str, ...], angles: bool
) -> ExitCode:
    """State the table that ENVELOPE of WORKBOOK names in CONVENTION, into OUT: .csv, .parquet, .aem or .apm.

    The file's header states the convention; CSV and Parquet carry the distance from lock in every row and a flag where
    the convention is near it. Rows at lock stop an attitude message of angles. Exit code 1 when rows are flagged.
    """
    from trunnion.calculations.converting import convert_file

    done = convert_file(workbook, envelope, convention, out, near_lock=near_lock, head=head, angles=angles)
    click.echo("\n".join(done.lines))
    return ExitCode.NOT_MET if done.flagged else ExitCode.OK
