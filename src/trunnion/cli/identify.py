"""`trunnion identify`: which convention a file's numbers are in."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode
from trunnion.cli.identify_options import options

_CONSTANTS = ("none", "relabelled", "body side", "reference side", "both sides")


@click.command()
@click.argument("file", type=click.Path(path_type=Path))
@options
@click.option(
    "--constants", type=click.Choice(_CONSTANTS), default="none", help="Constant rotations that may be unknown."
)
@click.option("--offsets", is_flag=True, help="Each angle may have an unknown offset.")
@click.option("--noise", metavar="ANGLE", help="Largest noise an axis, such as '0.1 deg'. Default: from the fit.")
@arguments.as_json
def command(file: Path, constants: str, offsets: bool, noise: str | None, as_json: bool, **given: Any) -> ExitCode:
    """Find every convention in which the numbers of FILE give the known attitudes, and say so honestly.

    Name the columns in question (--numbers for three angles; --in-question quaternion or matrix for those) and what is
    known: a quaternion, a matrix, angles in a known convention, gravity with a heading, poses in words, or body rates.
    With --agree nothing is known and the file's own statements are held against each other. Exit code 0 when exactly
    one function fits, 1 when several or none do.
    """
    from trunnion.calculations.identifying import identify_file
    from trunnion.crosswalk.told import lines_of, plain_of

    made = identify_file(file, given, constants=constants, offsets=offsets, noise=noise)
    click.echo(json.dumps(plain_of(made), indent=1, ensure_ascii=False) if as_json else "\n".join(lines_of(made)))
    return ExitCode.OK if made.answer.name == "IDENTIFIED" else ExitCode.NOT_MET
