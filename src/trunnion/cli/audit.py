"""`trunnion audit`: is an archive whole, who vouches for it, were the rules kept?"""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("archive", type=click.Path(path_type=Path))
@recording.signers
@recording.revoked
@arguments.as_json
def command(archive: Path, signers: Path | None, revoked: Path | None, as_json: bool) -> ExitCode:
    """Audit ARCHIVE (a zip, or the folder it was unpacked to): bag, signatures, digests, rules, requirements.

    Exit codes: 0 valid; 1 not valid; 3 consistent with the archive's own list only, because no --signers vouch for
    it; 4 withdrawn; 5 not verified, since ssh-keygen is needed; 2 could not be done.
    """
    from trunnion.records.audit import Verdict, audit
    from trunnion.records.keylist import read_keys

    trusted = read_keys(signers).text if signers is not None else None
    found = audit(archive, signers=trusted, revoked=revoked.read_bytes() if revoked is not None else None)
    codes = {
        Verdict.VALID: ExitCode.OK,
        Verdict.NOT_VALID: ExitCode.NOT_MET,
        Verdict.CONSISTENT: ExitCode.NOT_VOUCHED,
        Verdict.WITHDRAWN: ExitCode.WITHDRAWN,
        Verdict.UNVERIFIED: ExitCode.UNVERIFIED,
    }
    if as_json:
        click.echo(json.dumps(found.plain(), indent=1, ensure_ascii=False))
    else:
        click.echo(recording.text_table([(row.check, row.mark.value, row.found) for row in found.rows]))
        click.echo(f"{found.verdict.value}")
    return codes[found.verdict]
