"""`trunnion status`: who has signed what, what has fallen, what is missing."""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@arguments.output
@recording.signers
@recording.revoked
@arguments.as_json
def command(workbook: Path, output: Path | None, signers: Path | None, revoked: Path | None, as_json: bool) -> ExitCode:
    """Show who has signed what in WORKBOOK, what has fallen, what is missing, and changes of keys and roles.

    Exit code 0 when the revision may be issued, 1 when something is missing. Keys are those of the workbook's own list,
    which proves only consistency, unless --signers gives a list from outside.
    """
    from trunnion.records.status import status

    found = status(*recording.stored(workbook, output), recording.trust(signers, revoked))
    if as_json:
        click.echo(json.dumps(found.plain(), indent=1, ensure_ascii=False))
        return ExitCode.OK if found.ready else ExitCode.NOT_MET
    plain = found.plain()
    click.echo(f"Revision {found.revision}, {'issued' if found.issued else 'in work'}")
    rows = [
        (m["calculation"], m["role"], m["state"], m["person"] or "", (m["time"] or "")[:10], m["key"] or "", m["why"])
        for m in plain["signatures"]
    ]
    click.echo(recording.text_table(rows))
    lists = {"Broken rules": "broken", "Bars approval": "bars", "Keys and roles": "changes_of_keys_and_roles"}
    lists |= {"Out of date": "out_of_date"}
    for title, name in {**lists, "Not readable": "unreadable"}.items():
        if plain[name]:
            click.echo(f"{title}:\n" + "\n".join(f"  {text}" for text in plain[name]))
    click.echo("Ready to be issued." if found.ready else "Not ready to be issued.")
    click.echo("Times are stated by the signers, not proven.")
    return ExitCode.OK if found.ready else ExitCode.NOT_MET
