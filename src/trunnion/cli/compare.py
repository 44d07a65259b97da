"""`trunnion compare`: two revisions or two folders, old against new."""

from __future__ import annotations

import contextlib
import json
from pathlib import Path

import click

from trunnion.cli import arguments
from trunnion.cli.exits import ExitCode


@click.command()
@click.argument("old")
@click.argument("new")
@click.option("--workbook", type=click.Path(path_type=Path), help="OLD and NEW are revisions of this workbook.")
@arguments.as_json
@click.option("--html", type=click.Path(path_type=Path), metavar="FILE", help="Write the comparison as one page.")
def command(old: str, new: str, workbook: Path | None, as_json: bool, html: Path | None) -> ExitCode:
    """Compare OLD with NEW: archives, folders that hold a results.json, or revisions of --workbook.

    Verdict flips first, then every result that differs, old to new with unit and difference; calculations that came
    and went; changed inputs and figures; decisions to revisit.
    """
    from trunnion.calculations import compare, compare_page, writes
    from trunnion.cli import screen
    from trunnion.records.reading import archived_results

    with contextlib.ExitStack() as stack:
        archives = (
            [None, None] if workbook is not None else [archived_results(stack, Path(text)) for text in (old, new)]
        )
        paths = [held or compare.find_results(text, workbook) for held, text in zip(archives, (old, new), strict=True)]
        found = compare.compare(*paths)
        if html is not None:
            writes.write_text(html, compare_page.page(found, paths[0].parent, paths[1].parent))
    if as_json:
        click.echo(json.dumps(found.plain(), indent=1, ensure_ascii=False))
    else:
        screen.show_comparison(found, html)
    return ExitCode.OK
