"""Trial runs: other values of the spec, computed into a scratch folder and never into a revision.

A sweep varies one value, judges every step, and brackets where each verdict flips: between the last tried value with
the old verdict and the first with the new one, each judged on recorded results as always.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

from trunnion.calculations.compute import Computed, compute, run_ahead
from trunnion.calculations.judgement import Judgement
from trunnion.calculations.run import Progress
from trunnion.errors import TrunnionError
from trunnion.units import parse_quantity

SCRATCH = "trial"
BISECTIONS = 6
MOST_STEPS = 101

Load = Callable[[Sequence[tuple[str, str]]], Any]
Tell = Callable[[Progress], None]


@dataclass(frozen=True)
class Step:
    """One value tried: its number in the unit of the sweep, its text, and what came of it."""

    number: float
    text: str
    judgements: tuple[Judgement, ...]
    failed: tuple[str, ...] = ()


@dataclass(frozen=True)
class Flip:
    """Where a verdict changes: from `before` at `start` to `after` at `end`, with nothing known in between."""

    requirement: str
    candidate: str
    start: float
    end: float
    before: str
    after: str
    unit: str

    @property
    def text(self) -> str:
        """The flip in one line."""
        return (
            f"{self.requirement}, {self.candidate}: {self.before} at {self.start:.10g} {self.unit}, "
            f"{self.after} at {self.end:.10g} {self.unit}"
        )


@dataclass(frozen=True)
class Sweep:
    """A varied value: every step in order, and the flips."""

    path: str
    unit: str
    steps: tuple[Step, ...]
    flips: tuple[Flip, ...]

    def plain(self) -> dict[str, Any]:
        """The sweep as JSON."""
        return {
            "varied": self.path,
            "unit": self.unit,
            "steps": [
                {
                    "value": step.text,
                    "number": step.number,
                    "failed": list(step.failed),
                    "verdicts": [_plain(judged) for judged in step.judgements],
                }
                for step in self.steps
            ],
            "flips": [dict(flip.__dict__) for flip in self.flips],
        }

    def requirements(self) -> dict[str, str]:
        """What each requirement is about, with its unit: `lock margin, deg`."""
        made: dict[str, str] = {}
        for step in self.steps:
            for judged in step.judgements:
                units = [part.result.unit for part in judged.parts if part.result is not None]
                if units:
                    made[judged.asked.requirement] = f"{judged.asked.quantity}, {units[0]}"
        return made

    def series(self, requirement: str) -> dict[str, tuple[list[float], list[float]]]:
        """Governing bounds (lo, hi) of a requirement by candidate, one pair a step; NaN where nothing is recorded."""
        made: dict[str, tuple[list[float], list[float]]] = {}
        for step in self.steps:
            for judged in step.judgements:
                if judged.asked.requirement == requirement and not judged.no_lock:
                    low, high = made.setdefault(judged.candidate, ([], []))
                    lo, hi = governing_bounds(judged)
                    low.append(math.nan if lo is None else lo)
                    high.append(math.nan if hi is None else hi)
        return made

    def limits(self) -> dict[str, list[float]]:
        """The limit of each requirement at each step, in the unit of its results."""
        made: dict[str, list[float]] = {}
        for step in self.steps:
            for judged in step.judgements:
                if judged.counts:
                    made.setdefault(judged.asked.requirement, []).append(limit_number(judged))
        return made


def trial(workbook: Any, *, output: Path | None = None, **options: Any) -> Computed:
    """Compute a workbook (loaded with its trial values) into the scratch folder beside its revisions."""
    return compute(workbook, output=output, scratch=SCRATCH, **options)


def vary(
    load: Load,
    path: str,
    values: Sequence[tuple[float, str]],
    unit: str,
    *,
    fixed: Sequence[tuple[str, str]] = (),
    output: Path | None = None,
    bisections: int = BISECTIONS,
    tell: Tell | None = None,
    **options: Any,
) -> Sweep:
    """Try every value of a sweep, then halve the interval of each flip `bisections` times.

    `load` loads the workbook with trial values; `fixed` are trial values that hold throughout.
    """

    def attempt(number: float, text: str) -> Step:
        workbook = load([*fixed, (path, text)])
        computed = trial(workbook, output=output, tell=tell, **options)
        return Step(number, text, computed.judgements, tuple(entry.planned.id for entry in computed.failed))

    def attempt_all(wanted: Sequence[tuple[float, str]]) -> dict[float, Step]:
        if wanted:
            workbooks = [load([*fixed, (path, text)]) for _, text in wanted]
            run_ahead(workbooks, scratch=SCRATCH, output=output, tell=tell, **options)
        return {number: attempt(number, text) for number, text in wanted}

    steps = attempt_all(values)
    for _ in range(bisections):
        steps |= attempt_all([(middle, value_text(middle, unit)) for middle in _middles(steps)])
    ordered = tuple(steps[number] for number in sorted(steps))
    return Sweep(path, unit, ordered, tuple(_flips(ordered, unit)))


def parse_values(text: str) -> tuple[list[tuple[float, str]], str]:
    """Values of a sweep: `10 deg, 15 deg, 30 deg`, or `10 deg .. 30 deg in 5` (ends included); and their unit.

    TrunnionError for fewer than two values, more than MOST_STEPS, or units that differ in kind.
    """
    if ".." in text:
        ends, _, count_text = text.partition(" in ")
        first, _, last = ends.partition("..")
        low, high = parse_quantity(first), parse_quantity(last)
        unit = low.unit
        count = int(count_text) if count_text.strip().isdecimal() else 5
        _require_count(count)
        start, end = low.number, high.in_unit(unit)
        numbers = [start + (end - start) * index / (count - 1) for index in range(count)]
        return [(number, value_text(number, unit)) for number in numbers], unit
    quantities = [parse_quantity(part) for part in text.split(",")]
    _require_count(len(quantities))
    unit = quantities[0].unit
    return sorted((quantity.in_unit(unit), quantity.text) for quantity in quantities), unit


def value_text(number: float, unit: str) -> str:
    """A number of the sweep as the spec has it."""
    return f"{number:.12g} {unit}"


def governing_bounds(judged: Judgement) -> tuple[float | None, float | None]:
    """The bounds of the part that governs a judgement."""
    part = judged.governing_part
    if part is None or part.result is None:
        return None, None
    return part.result.bounds.lo, part.result.bounds.hi


def limit_number(judged: Judgement) -> float:
    """The limit in the unit of the results it is compared with."""
    for part in judged.parts:
        if part.result is not None:
            return float(judged.asked.limit.in_unit(part.result.unit))
    return float(judged.asked.limit.number)


def _require_count(count: int) -> None:
    if not 2 <= count <= MOST_STEPS:
        raise TrunnionError(
            f"{count} values are not between 2 and {MOST_STEPS}", remedy="as in '10 deg .. 30 deg in 5'"
        )


def _verdicts(step: Step) -> dict[tuple[str, str], str]:
    return {(judged.asked.requirement, judged.candidate): judged.verdict.value for judged in step.judgements}


def _middles(steps: Mapping[float, Step]) -> list[float]:
    """The middles of neighbouring values between which a verdict differs."""
    numbers = sorted(steps)
    pairs = [(a, b) for a, b in pairwise(numbers) if _verdicts(steps[a]) != _verdicts(steps[b])]
    return [(a + b) / 2 for a, b in pairs if a < (a + b) / 2 < b]


def _flips(steps: Sequence[Step], unit: str) -> list[Flip]:
    found = []
    for before, after in pairwise(steps):
        now = _verdicts(after)
        for name, verdict in _verdicts(before).items():
            if now.get(name, verdict) != verdict:
                found.append(Flip(*name, before.number, after.number, verdict, now[name], unit))
    return found


def _plain(judged: Judgement) -> dict[str, Any]:
    low, high = governing_bounds(judged)
    return {
        "requirement": judged.asked.requirement,
        "candidate": judged.candidate,
        "counts": judged.counts,
        "verdict": judged.verdict.value,
        "lo": low,
        "hi": high,
    }
