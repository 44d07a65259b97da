"""`trunnion withdraw`: a signed notice that a revision must not be used."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import recording
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("archive", type=click.Path(path_type=Path))
@click.option("--reason", required=True, help="Why it must not be used.")
@click.option("--key", type=click.Path(path_type=Path), metavar="FILE", required=True, help="An approver's key.")
@click.option("--by", metavar="PERSON", help="The person's id, where the key speaks for more than one.")
@click.option("--time", metavar="TIME", help="The stated time, as 2031-05-28T12:00:00Z. Default: now.")
@recording.signers
def command(archive: Path, reason: str, key: Path, by: str | None, time: str | None, signers: Path | None) -> ExitCode:
    """Withdraw the revision in ARCHIVE: writes a signed notice beside it, which audit and find show."""
    from trunnion.records.keylist import read_keys
    from trunnion.records.verification import Keys
    from trunnion.records.withdrawal import withdraw

    keys = Keys(read_keys(signers).text) if signers is not None else None
    path = withdraw(archive, reason=reason, key=key, keys=keys, by=by, time=time)
    click.echo(f"Withdrawn: {path}. Send it to everybody who has the archive.")
    return ExitCode.OK
