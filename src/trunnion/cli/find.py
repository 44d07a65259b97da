"""`trunnion find`: search many archives."""

from __future__ import annotations

import json
from pathlib import Path

import click

from trunnion.cli import arguments, recording
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("folder", type=click.Path(path_type=Path))
@click.argument("words", nargs=-1, required=True)
@click.option("--rebuild", is_flag=True, help="Read every archive again.")
@arguments.as_json
def command(folder: Path, words: tuple[str, ...], rebuild: bool, as_json: bool) -> ExitCode:
    """Search the archives below FOLDER for documents, people, requirements, decisions, calculations, results, findings.

    Shows what holds every one of WORDS. What is found is what an archive says of itself: audit it before use.
    """
    from trunnion.records.find import find

    found = find(folder, words, rebuild=rebuild)
    if as_json:
        plain = {"hits": [hit.__dict__ for hit in found.hits], "unread": dict(found.unread), "archives": found.archives}
        click.echo(json.dumps(plain, indent=1, ensure_ascii=False))
    else:
        rows = [
            (hit.document + (" WITHDRAWN" if hit.withdrawn else ""), hit.kind, hit.text, hit.archive)
            for hit in found.hits
        ]
        click.echo(recording.text_table(rows) if rows else "Nothing found.")
        for name, why in found.unread:
            click.echo(f"{name} can't be read: {why}", err=True)
    return ExitCode.OK if found.hits else ExitCode.NOT_MET
