"""`trunnion finding`: what is held against a calculation, requirement, input or cell; its answer; its end."""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode

_by = click.option("--by", required=True, metavar="PERSON", help="The id of the person who says so.")


@click.group()
def command() -> None:
    """Add, answer, close and list findings. An open finding bars approval."""


@command.command("add")
@arguments.workbook
@click.option("--against", required=True, metavar="ID", help="As in C02, ATT-04, 'C02 cell 4' or data/log.csv.")
@click.option("--text", required=True, help="What is found.")
@_by
def add(workbook: Path, against: str, text: str, by: str) -> ExitCode:
    """Add a numbered finding."""
    from trunnion.records import findings
    from trunnion.spec import load_workbook

    found = findings.add(load_workbook(workbook), against=against, text=text, by=by)
    click.echo(f"{found.id} is open against {found.against}")
    return ExitCode.OK


@command.command("answer")
@arguments.workbook
@click.argument("finding")
@click.option("--text", required=True, help="The answer.")
@_by
@arguments.output
def answer(workbook: Path, finding: str, text: str, by: str, output: Path | None) -> ExitCode:
    """Answer FINDING; the preparer does."""
    from trunnion.records import casework, findings

    loaded, results = recording.stored(workbook, output)
    named = findings.named(casework.findings_of(loaded, results), finding)
    findings.answer(loaded, named, text=text, by=by)
    click.echo(f"{finding} is answered")
    return ExitCode.OK


@command.command("close")
@arguments.workbook
@click.argument("finding")
@click.option("--because", default="", help="Why the answer is good.")
@_by
@arguments.output
def close(workbook: Path, finding: str, because: str, by: str, output: Path | None) -> ExitCode:
    """Close FINDING; its finder does, or a checker where a calculation recorded it."""
    from trunnion.records import casework, findings

    loaded, results = recording.stored(workbook, output)
    named = findings.named(casework.findings_of(loaded, results), finding)
    findings.close(loaded, named, by=by, because=because)
    click.echo(f"{finding} is closed")
    return ExitCode.OK


@command.command("list")
@arguments.workbook
@arguments.output
@arguments.as_json
def show(workbook: Path, output: Path | None, as_json: bool) -> ExitCode:
    """List findings: those of people, of calculations, and inputs that cite no source."""
    from trunnion.records import casework

    found = casework.findings_of(*recording.stored(workbook, output))
    if as_json:
        click.echo(
            json.dumps([entry.plain() | {"state": entry.state} for entry in found], indent=1, ensure_ascii=False)
        )
    elif found:
        rows = [
            (f.id, f.state, f.against, f.by or "recorded", f.text + (f" → {f.answer}" if f.answer else ""))
            for f in found
        ]
        click.echo(recording.text_table(rows))
    return ExitCode.OK
