"""What a change touches, told without running anything.

Against the last issued revision and against the last computed state: what differs in spec, data, templates, program
and libraries; which calculations are out of date and why; which verdicts are certain now and which may change; what
rests on them. Recorded intervals decide where they can: a limit that moved gets its new verdict without a run.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import keys, store
from trunnion.calculations.baselines import Baseline, computed_baseline, issued_baseline
from trunnion.calculations.judgement import Judgement, judge_all
from trunnion.calculations.plan import Planned, plan
from trunnion.calculations.reasons import Reason, ReasonKind, reasons
from trunnion.calculations.results import Recorded
from trunnion.calculations.specdiff import SpecChange, plain_spec, plain_workbook, spec_changes


@dataclass(frozen=True)
class CalculationImpact:
    """One calculation: why it is out of date; no reasons when it is not."""

    id: str
    reasons: tuple[Reason, ...]

    @property
    def out_of_date(self) -> bool:
        """Whether it must be run again."""
        return bool(self.reasons)


@dataclass(frozen=True)
class VerdictImpact:
    """One requirement and candidate: its verdict then, and now where that is certain without a run."""

    requirement: str
    candidate: str
    counts: bool
    old: str | None
    new: str | None  # None: it may change, and only a run can tell
    value: str = ""
    rests_on: tuple[str, ...] = ()

    @property
    def certain(self) -> bool:
        """Whether the verdict is known without a run."""
        return self.new is not None

    @property
    def flips(self) -> bool:
        """Whether the verdict is certain to be another one."""
        return self.certain and self.old is not None and self.old != self.new


@dataclass(frozen=True)
class SourceImpact:
    """A source that went up an edition, and everything that cites it: to be confirmed."""

    id: str
    old: str
    new: str
    to_be_confirmed: tuple[str, ...]


@dataclass(frozen=True)
class Impact:
    """The comparison with one baseline."""

    baseline: str
    revision: str
    spec: tuple[SpecChange, ...]
    calculations: tuple[CalculationImpact, ...]
    removed: tuple[str, ...]
    verdicts: tuple[VerdictImpact, ...]
    decisions: tuple[str, ...]
    findings: tuple[str, ...]
    sources: tuple[SourceImpact, ...]
    program: tuple[Reason, ...]

    @property
    def nothing(self) -> bool:
        """Whether nothing at all differs."""
        touched = any(entry.out_of_date for entry in self.calculations)
        flips = any(entry.flips or not entry.certain for entry in self.verdicts)
        return not (self.spec or touched or self.removed or flips or self.program)

    def plain(self) -> dict[str, Any]:
        """The impact as JSON."""
        return {
            "against": self.baseline,
            "revision": self.revision,
            "spec": [change.plain() for change in self.spec],
            "calculations": [
                {"id": entry.id, "out_of_date": entry.out_of_date, "because": [r.plain() for r in entry.reasons]}
                for entry in self.calculations
            ],
            "removed": list(self.removed),
            "verdicts": [{**entry.__dict__, "certain": entry.certain, "flips": entry.flips} for entry in self.verdicts],
            "decisions_to_revisit": list(self.decisions),
            "findings_touched": list(self.findings),
            "sources": [dict(entry.__dict__) for entry in self.sources],
            "program": [reason.plain() for reason in self.program],
        }


def impact(
    workbook: Any, *, output: Path | None = None, allow_local: bool = True, approved: Collection[str] = ()
) -> list[Impact]:
    """The impact of the workbook as it stands, against each baseline there is (issued first). Nothing is written.

    Local templates are read here but not run, so no consent is asked by default.
    """
    planned = plan(workbook, allow_local=allow_local)
    code = keys.surroundings().code
    folder = store.revision_folder(workbook.root, workbook.document.revision, output)
    found = (issued_baseline(workbook.root), computed_baseline(folder.path))
    return [_against(baseline, workbook, planned, code, approved) for baseline in found if baseline is not None]


def out_of_date(
    baseline: Baseline | None, planned: Sequence[Planned], code: Mapping[str, str]
) -> list[CalculationImpact]:
    """Why each planned calculation is out of date against a baseline (all new where there is none)."""
    return [CalculationImpact(entry.id, tuple(_reasons(baseline, entry, code))) for entry in planned]


def _reasons(baseline: Baseline | None, entry: Planned, code: Mapping[str, str]) -> list[Reason]:
    former = None if baseline is None else baseline.calculations.get(entry.id)
    if baseline is None or former is None:
        return reasons(None, entry.parts)
    found = reasons(former["parts"], entry.parts, old_code=baseline.code, new_code=code)
    if not found and baseline.recorded(entry.id) is None:
        return [Reason(ReasonKind.BODY, "not computed in the last run")]
    return found


def _against(
    baseline: Baseline, workbook: Any, planned: Sequence[Planned], code: Mapping[str, str], approved: Collection[str]
) -> Impact:
    calculations = out_of_date(baseline, planned, code)
    stale = {entry.id for entry in calculations if entry.out_of_date}
    verdicts = _verdicts(baseline, workbook, planned, stale, approved)
    changes = spec_changes(plain_spec(baseline.spec), plain_workbook(workbook))
    current = {entry.id for entry in planned}
    return Impact(
        baseline=baseline.name,
        revision=baseline.revision,
        spec=tuple(changes),
        calculations=tuple(calculations),
        removed=tuple(name for name in baseline.calculations if name not in current),
        verdicts=tuple(verdicts),
        decisions=tuple(_decisions(workbook, stale, verdicts)),
        findings=tuple(_findings(baseline, stale)),
        sources=tuple(_sources(changes, workbook)),
        program=tuple(_program(calculations)),
    )


def _verdicts(
    baseline: Baseline, workbook: Any, planned: Sequence[Planned], stale: set[str], approved: Collection[str]
) -> list[VerdictImpact]:
    fresh: dict[str, Recorded] = {}
    known: dict[str, Recorded] = {}
    for entry in planned:
        found = baseline.recorded(entry.id)
        if found is not None:
            known[entry.id] = found
            if entry.id not in stale:
                fresh[entry.id] = found
    options: dict[str, Any] = {
        "conventions": workbook.conventions,
        "deviations": workbook.deviations,
        "approved": approved,
    }
    now = judge_all(workbook.requirements, workbook.decisions, fresh, **options)
    then = judge_all(workbook.requirements, workbook.decisions, known, **options)
    former = _former_verdicts(baseline)
    may_record = {name for entry in planned if entry.id in stale for name in entry.template.records}
    return [_verdict(judged, before, former, stale, may_record) for judged, before in zip(now, then, strict=True)]


def _verdict(
    judged: Judgement, before: Judgement, former: Mapping[tuple[str, str], str], stale: set[str], may_record: set[str]
) -> VerdictImpact:
    """Certain where every region rests on a result that stands, and nothing out of date can add one."""
    rests = tuple(sorted({part.result.calculation for part in before.parts if part.result is not None}))
    missing = any(part.result is None for part in judged.parts)
    open_yet = bool(stale & set(rests)) or (missing and judged.asked.quantity in may_record)
    new = None if open_yet else judged.verdict.value
    return VerdictImpact(
        requirement=judged.asked.requirement,
        candidate=judged.candidate,
        counts=judged.counts,
        old=former.get((judged.asked.requirement, judged.candidate)),
        new=new,
        value="" if open_yet else judged.value_text,
        rests_on=rests,
    )


def _former_verdicts(baseline: Baseline) -> dict[tuple[str, str], str]:
    return {
        (row["id"], candidate["name"]): candidate["verdict"]
        for row in baseline.results.get("requirements", [])
        for candidate in row["candidates"]
    }


def _decisions(workbook: Any, stale: set[str], verdicts: Sequence[VerdictImpact]) -> list[str]:
    """Decisions that rest on something out of date, or one of whose requirements changes its verdict."""
    moved = {entry.requirement for entry in verdicts if entry.flips}
    touched = []
    for decision in workbook.decisions:
        own = {requirement.id for requirement in workbook.requirements if requirement.of == decision.id}
        if stale & set(decision.rests_on) or moved & own:
            touched.append(decision.id)
    return touched


def _findings(baseline: Baseline, stale: set[str]) -> list[str]:
    return [
        f"{entry['id']}, {finding['id']}: {finding['text']}"
        for entry in baseline.results.get("calculations", [])
        if entry["id"] in stale
        for finding in entry["findings"]
    ]


def _sources(changes: Sequence[SpecChange], workbook: Any) -> list[SourceImpact]:
    editions = {}
    for change in changes:
        steps = change.path.split(".")
        if change.section == "sources" and len(steps) == 3 and steps[2] in ("edition", "number"):
            editions[steps[1]] = change
    cited = cited_sources(plain_workbook(workbook))
    return [
        SourceImpact(name, str(change.old or ""), str(change.new or ""), tuple(cited.get(name, ())))
        for name, change in editions.items()
    ]


def cited_sources(spec: Mapping[str, Any]) -> dict[str, list[str]]:
    """Where each source is cited: key paths by source id (the first word of a `source` text)."""
    found: dict[str, list[str]] = {}

    def walk(value: Any, path: str) -> None:
        if isinstance(value, Mapping):
            if isinstance(value.get("source"), str):
                found.setdefault(value["source"].split()[0], []).append(path)
            for key, entry in value.items():
                walk(entry, f"{path}.{key}" if path else str(key))
        elif isinstance(value, list):
            for index, entry in enumerate(value, 1):
                named = entry.get("id", index) if isinstance(entry, Mapping) else index
                walk(entry, f"{path}.{named}")

    walk(spec, "")
    return found


def without_source(workbook: Any) -> list[str]:
    """Inputs that cite no source, by key path: each is a finding on the cover."""
    inputs = ("envelopes", "mounts")
    listed = [f"{section}.{name}" for section in inputs for name in workbook.names(section)
              if not workbook.part(section, name).source]  # fmt: skip
    return listed + [f"requirements.{entry.id}" for entry in workbook.requirements if not entry.source]


def _program(calculations: Sequence[CalculationImpact]) -> list[Reason]:
    kinds = (ReasonKind.CODE, ReasonKind.PYTHON, ReasonKind.LIBRARY)
    return list(dict.fromkeys(r for entry in calculations for r in entry.reasons if r.kind in kinds))
