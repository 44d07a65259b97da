"""`trunnion handover`: a convention with everything another party needs to prove that they read it alike."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.argument("convention")
@click.option("--answers", type=click.Path(path_type=Path), metavar="FILE", help="Judge the other party's answers.")
@click.option("--to", "folder", type=click.Path(path_type=Path), metavar="DIR", help="Where the kit goes.")
def command(workbook: Path, convention: str, answers: Path | None, folder: Path | None) -> ExitCode:
    """Hand CONVENTION of WORKBOOK over: statement, reference attitudes (CSV, JSON), C and Python with self-tests.

    With --answers the other party's outputs are judged by rotation angle instead: exit code 0 when they pass, 1 when
    they fail, with the wrong reading that explains every row if there is one.
    """
    from trunnion.calculations import handover
    from trunnion.calculations.store import outputs_of
    from trunnion.spec import load_workbook

    loaded = load_workbook(workbook)
    if answers is not None:
        reference, found = handover.judge_answers(loaded, convention, answers)
        click.echo("\n".join(handover.answer_lines(reference, found)))
        return ExitCode.OK if found.passed else ExitCode.NOT_MET
    target = folder or outputs_of(loaded.root, None) / loaded.root.resolve().name / handover.FOLDER / convention
    for path in handover.hand_over(loaded, convention, target):
        click.echo(path)
    return ExitCode.OK
