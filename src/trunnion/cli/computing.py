"""What `trunnion compute` does: one run into a revision or the scratch folder, or a sweep of trial runs."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import click

from trunnion.calculations import trial as trials
from trunnion.calculations import writes
from trunnion.calculations.compute import Computed, compute
from trunnion.calculations.store import revision_folder
from trunnion.calculations.templates import own_of
from trunnion.cli import packaging, screen
from trunnion.cli.exits import ExitCode
from trunnion.records import signoff
from trunnion.spec import load_workbook


@dataclass(frozen=True)
class Look:
    """How the outcome is shown."""

    as_json: bool = False
    quiet: bool = False

    @property
    def chatty(self) -> bool:
        """Whether progress is shown."""
        return not (self.as_json or self.quiet)


def once(
    workbook: Path, values: Sequence[str], look: Look, options: Mapping[str, Any], *, trial: bool, pdf: bool
) -> ExitCode:
    """Compute once, into the revision or (`trial`, or any trial value) into the scratch folder."""
    overrides = [pair(text, "--set") for text in values]
    if overrides and not trial:
        raise click.UsageError("--set tries a value and needs --trial: a revision is computed from the spec as it is")
    loaded = load_workbook(workbook, overrides)
    if options["allow_local"] and not look.quiet:
        screen.show_own_templates(own_of(loaded))
    bound: list[packaging.Bound] = []

    def bind(done: Computed) -> None:
        bound.append(packaging.bind_package(done, pdf=pdf and not trial, status="trial" if trial else "draft"))

    with screen.progress(shown=look.chatty) as tell:
        run: Callable[..., Computed] = trials.trial if trial else compute
        signed = {} if trial else {"signatures": signoff.sheet_rows}
        computed = run(loaded, tell=tell, then=bind, approved=signoff.approved(loaded), **signed, **options)
    screen.show_computed(computed, bound[0], as_json=look.as_json, quiet=look.quiet)
    if computed.failed or bound[0].error:
        return ExitCode.FAILED
    return ExitCode.OK if computed.satisfied else ExitCode.NOT_MET


def sweep(workbook: Path, vary: str, values: Sequence[str], look: Look, options: Mapping[str, Any]) -> ExitCode:
    """Sweep one value in trial runs: a table on the screen, table and plot as files in the scratch folder."""
    path, text = pair(vary, "--vary")
    if options["allow_local"] and not look.quiet:
        screen.show_own_templates(own_of(load_workbook(workbook)))
    steps, unit = trials.parse_values(text)
    fixed = [pair(value, "--set") for value in values]
    with screen.progress(shown=look.chatty) as tell:
        found = trials.vary(
            lambda overrides: load_workbook(workbook, overrides), path, steps, unit, fixed=fixed, tell=tell, **options
        )
    root = load_workbook(workbook).root
    folder = revision_folder(root, trials.SCRATCH, options["output"]).path
    writes.write_json(folder / "sweep.json", found.plain())
    plots = _plots(found, folder)
    if look.as_json:
        click.echo(json.dumps(found.plain(), indent=1, ensure_ascii=False))
    elif not look.quiet:
        screen.show_sweep(found, [folder / "sweep.json", *plots])
    return ExitCode.FAILED if any(step.failed for step in found.steps) else ExitCode.OK


def _plots(found: trials.Sweep, folder: Path) -> list[Path]:
    """One picture a requirement: its bounds against the varied value, limit and flips marked."""
    from trunnion.figures.charts import varied_value

    paths = []
    limits, names = found.limits(), found.requirements()
    for requirement in names:
        series = found.series(requirement)
        if not series:
            continue
        svg = varied_value(
            [step.number for step in found.steps],
            series,
            x_label=f"{found.path}, {found.unit}",
            y_label=names[requirement],
            limits={requirement: limits[requirement]} if requirement in limits else None,
            flips=[(flip.start, flip.end) for flip in found.flips if flip.requirement == requirement],
        )
        paths.append(folder / f"sweep-{requirement}.svg")
        writes.write_text(paths[-1], svg)
    return paths


def pair(text: str, option: str) -> tuple[str, str]:
    """`path=value` of a command line option."""
    path, equals, value = text.partition("=")
    if not (equals and path.strip() and value.strip()):
        raise click.UsageError(f"{option} needs PATH=VALUE, as in 'requirements.R1.at least=25 deg', not '{text}'")
    return path.strip(), value.strip()
