"""`trunnion recompute`: run recorded calculations again and compare result by result."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

import click

from trunnion.cli import arguments, recording, screen
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("subject", metavar="WORKBOOK|ARCHIVE", type=click.Path(path_type=Path))
@arguments.output
@arguments.as_json
@click.option("--archived-templates", is_flag=True, help="Run the archive's template where the installed one differs.")
@click.option("--consent", "consents", multiple=True, metavar="SHA256", help="Consent to a template by its content.")
def command(
    subject: Path, output: Path | None, as_json: bool, archived_templates: bool, consents: tuple[str, ...]
) -> ExitCode:
    """Run the calculations of a computed WORKBOOK or of an ARCHIVE again and compare every recorded result.

    Templates that are not installed ones are programs and run as you, without isolation; each asks for consent to its
    very content. Of a workbook the comparison is kept and attached to the checker's signature. Exit code 0 when all is
    reproduced, 1 when something is not.
    """
    from trunnion.calculations import writes
    from trunnion.records import layout, reading, recompute

    def consent(template: Any) -> bool:
        words = f"Template {template.name}, sha256 {template.file_digest}, is a program; it runs as you, not isolated."
        if template.file_digest in consents or not sys.stdin.isatty():
            click.echo(words, err=True)
            return template.file_digest in consents
        return click.confirm(f"{words}\nRun it?", err=True)

    with screen.progress(shown=not as_json) as tell:
        if subject.is_dir() and (subject / "workbook.yaml").is_file():
            loaded, results = recording.stored(subject, output)
            found = recompute.recompute_workbook(loaded, results, consent=consent, tell=tell)
            kept = layout.recomputed_file(loaded.root, loaded.document.revision)
            writes.make_folder(kept.parent)
            writes.write_json(kept, found.plain())
        else:
            with reading.opened(subject) as root:
                found = recompute.recompute_archive(root, consent=consent, own_templates=archived_templates, tell=tell)
    if as_json:
        click.echo(json.dumps(found.plain(), indent=1, ensure_ascii=False))
    else:
        click.echo(recording.text_table([(row.calculation, row.result, row.state, row.why) for row in found.rows]))
        for line in (*found.templates, *(f"version differs: {text}" for text in found.versions)):
            click.echo(line)
        click.echo(found.summary)
    return ExitCode.OK if found.good else ExitCode.NOT_MET
