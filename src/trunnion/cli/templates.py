"""`trunnion templates`: what each template takes and records."""

from __future__ import annotations

import textwrap
from pathlib import Path

import click

from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("workbook", type=click.Path(path_type=Path), required=False)
def command(workbook: Path | None) -> ExitCode:
    """List the shipped templates, and WORKBOOK's own with their SHA-256: what each takes and records."""
    from trunnion.calculations import templates

    own = templates.local(workbook) if workbook is not None else {}
    for name, path in {**templates.shipped(), **own}.items():
        template = templates.load(name, path, is_local=name in own)
        click.echo(f"{name}: {template.title}" + (f"  (own, sha256 {template.file_digest})" if name in own else ""))
        _paragraph(template.purpose)
        for take in template.takes.values():
            _paragraph(f"takes {take.name} ({take.kind}{'' if take.required else ', may be left out'}): {take.help}")
        _paragraph(f"records {', '.join(template.records) or 'nothing'}")
        click.echo()
    return ExitCode.OK


def _paragraph(text: str) -> None:
    if text:
        click.echo(textwrap.fill(text, 100, initial_indent="  ", subsequent_indent="    "))
