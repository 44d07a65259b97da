"""What commands print: progress while kernels run, the verdict table, failures with cell and error quoted."""

from __future__ import annotations

import json
import sys
import time
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path

from rich.console import Console
from rich.table import Table
from rich.text import Text

from trunnion.calculations.compare import Comparison, change_rows
from trunnion.calculations.compute import Computed, Done
from trunnion.calculations.judgement import Judgement
from trunnion.calculations.run import Progress
from trunnion.calculations.trial import Sweep
from trunnion.calculations.verdicts import Verdict
from trunnion.cli.packaging import Bound

STYLES = {Verdict.MEETS: "green", Verdict.DOES_NOT_MEET: "bold red", Verdict.NOT_SHOWN: "yellow"}

Tell = Callable[[Progress], None]


@contextmanager
def progress(*, shown: bool) -> Iterator[Tell | None]:
    """A line a running calculation (calculation, cell, elapsed) on a terminal; one line at its end elsewhere."""
    if not shown:
        yield None
        return
    console = Console(stderr=True)
    if not console.is_terminal:
        yield lambda event: _line(console, event)
        return
    from rich.live import Live

    rows: dict[str, tuple[Progress, float]] = {}

    def tell(event: Progress) -> None:
        rows[event.calculation] = (event, time.monotonic())

    with Live(console=console, refresh_per_second=5, transient=True, get_renderable=lambda: _running(rows)):
        yield tell


def show_own_templates(own: Mapping[Path, str]) -> None:
    """The workbook's own templates, by file and SHA-256, before they run: programs the user has consented to."""
    for path, digest in own.items():
        print(f"running the workbook's own template {path}  sha256 {digest}", file=sys.stderr)


def show_computed(computed: Computed, bound: Bound, *, as_json: bool, quiet: bool) -> None:
    """The end of `compute`: failures on stderr; the verdict table, or JSON; the page to open."""
    for entry in computed.failed:
        print(failure_text(entry), file=sys.stderr)
    if bound.error:
        print(f"The package could not be bound.\n{bound.error}", file=sys.stderr)
    if as_json:
        print(json.dumps(computed.results, indent=1, ensure_ascii=False))
        return
    if quiet:
        return
    console = wide_console()
    console.print(_summary(computed))
    if computed.judgements:
        console.print(verdict_table(computed.judgements))
    else:
        console.print("The spec states no requirements: nothing is judged.")
    for warning in bound.warnings:
        console.print(f"note: {warning}", highlight=False, markup=False)
    if bound.html is not None:
        console.print(f"Open {bound.html}", soft_wrap=True, highlight=False, markup=False)


def show_sweep(found: Sweep, files: list[Path]) -> None:
    """The table of a sweep, its flips, and the files that keep it."""
    console = wide_console()
    counting = [judged for judged in found.steps[0].judgements if judged.counts]
    table = Table(box=None, pad_edge=False, header_style="bold")
    table.add_column(found.path)
    for judged in counting:
        table.add_column(f"{judged.asked.requirement} ({judged.candidate})")
    for step in found.steps:
        cells = [Text(f"{entry.value_text} {entry.verdict.value}", style=STYLES[entry.verdict])
                 for entry in step.judgements if entry.counts]  # fmt: skip
        table.add_row(Text(step.text), *cells)
    console.print(table)
    for flip in found.flips:
        console.print(flip.text, highlight=False, markup=False)
    if not found.flips:
        console.print("No verdict flips between these values.")
    for path in files:
        console.print(str(path), soft_wrap=True, highlight=False, markup=False)


def show_comparison(found: Comparison, html: Path | None) -> None:
    """The rows of a comparison, verdict flips first."""
    console = wide_console()
    console.print(f"{found.old} → {found.new}", highlight=False, markup=False)
    rows = change_rows(found)
    if not rows:
        console.print("Nothing differs.")
    table = Table(box=None, pad_edge=False, header_style="bold")
    for heading in ("what", "before", "after", "effect"):
        table.add_column(heading, overflow="fold")
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    if rows:
        console.print(table)
    if html is not None:
        console.print(f"Open {html}", soft_wrap=True, highlight=False, markup=False)


def wide_console() -> Console:
    """Standard output; where it is no terminal, wide enough that tables keep their rows."""
    console = Console()
    return console if console.is_terminal else Console(width=140)


def verdict_table(judgements: tuple[Judgement, ...]) -> Table:
    """Every requirement and candidate; what does not count is dimmed."""
    table = Table(box=None, pad_edge=False, header_style="bold")
    for heading in ("requirement", "asks", "candidate", "result", "basis", "verdict"):
        table.add_column(heading, overflow="fold")
    for entry in judgements:
        accepted = f" ({_deviation_words(entry)})" if entry.deviation else ""
        why = f": {entry.why}" if entry.why and entry.counts else ""
        verdict = Text(entry.verdict.value, style=STYLES[entry.verdict]) + Text(accepted + why)
        cells = (entry.asked.requirement, entry.asked.text, entry.candidate, entry.value_text, entry.basis_text)
        words = [Text(cell) for cell in cells]
        table.add_row(*words, verdict, style=None if entry.counts else "dim")
    return table


def failure_text(entry: Done) -> str:
    """A failed calculation: which, in which cell, the cell's text, the error, and where the notebook was kept."""
    failure = entry.failure
    head = f"{entry.planned.id} ({entry.planned.template.name}) failed"
    if failure is None or failure.cell is None:
        return f"{head}: {entry.error}"
    source = "\n".join(f"    | {line}" for line in failure.source.split("\n"))
    kept = f"\n    kept: {failure.kept}" if failure.kept else ""
    return f"{head} in cell {failure.cell + 1} of {failure.of}:\n{source}\n    {entry.error}{kept}"


def _summary(computed: Computed) -> Text:
    ran = sum(entry.fresh for entry in computed.done)
    stood = sum(entry.state == "computed" and not entry.fresh for entry in computed.done)
    missing = [entry.planned.id for entry in computed.done if entry.state == "missing"]
    text = f"{ran} calculation{'' if ran == 1 else 's'} run, {stood} up to date"
    if computed.failed:
        text += f", {len(computed.failed)} failed"
    if missing:
        text += f"; out of date and not run: {', '.join(missing)}"
    return Text(text)


def _deviation_words(entry: Judgement) -> str:
    return f"accepted by {entry.deviation}" if entry.deviation_holds else f"{entry.deviation} not approved"


def _running(rows: dict[str, tuple[Progress, float]]) -> Table:
    """Calculation, cell and elapsed time, which runs on between cells."""
    table = Table(box=None, pad_edge=False, show_header=False)
    for event, told in list(rows.values()):
        done = event.state in ("done", "failed")
        elapsed = event.elapsed if done else event.elapsed + time.monotonic() - told
        where = event.state if done else f"cell {event.cell + 1} of {event.of}" if event.of else "starting kernel"
        table.add_row(event.calculation, Text(f"{where}: {event.note}" if event.note else where), f"{elapsed:.1f} s")
    return table


def _line(console: Console, event: Progress) -> None:
    if event.state in ("done", "failed"):
        console.print(f"{event.calculation} {event.state} after {event.elapsed:.1f} s", highlight=False, markup=False)
