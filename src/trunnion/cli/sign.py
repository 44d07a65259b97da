"""`trunnion sign`: sign calculations as prepared, checked or approved; or a deviation."""

from __future__ import annotations

from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@arguments.workbook
@click.option("--as", "role", required=True, type=click.Choice(["prepared", "checked", "approved"]), help="The role.")
@click.option(
    "--calculation", "calculations", multiple=True, default=("all",), metavar="ID", help="Which; default all."
)
@recording.key
@click.option("--by", metavar="PERSON", help="The person's id, where the key speaks for more than one.")
@click.option("--method", help="Of a check: alternate calculation, comparison with test, review of inputs and results.")
@click.option("--reference", default="", help="Of a check: where it is written down.")
@click.option("--unchanged", is_flag=True, help="Sign what is unchanged since an earlier revision, by reference to it.")
@click.option("--deviation", metavar="ID", help="Sign this deviation as approved.")
@click.option("--time", metavar="TIME", help="The stated time, as 2031-05-28T12:00:00Z. Default: now.")
@arguments.output
def command(
    workbook: Path,
    role: str,
    calculations: tuple[str, ...],
    key: Path | None,
    by: str | None,
    method: str | None,
    reference: str,
    unchanged: bool,
    deviation: str | None,
    time: str | None,
    output: Path | None,
) -> ExitCode:
    """Sign WORKBOOK through `ssh-keygen -Y sign`; Trunnion itself opens no private key.

    The key must be listed in WORKBOOK/records/allowed_signers for the person and the role, as in
    `p1 namespaces="prepared@trunnion" ssh-ed25519 AAAA…`. Prepared, then checked, then approved, by three people.
    """
    from trunnion.records.signing import Wish, sign

    computed = recording.current(workbook, output)
    wish = Wish(role, calculations, key, by, method, reference, unchanged, deviation, time)
    path = sign(computed.workbook, dict(computed.results), wish)
    click.echo(f"Signed as {role}: {path}")
    click.echo("The stated time is the signer's word, not proven. Bind again to show it: trunnion bind WORKBOOK")
    return ExitCode.OK
