"""The main job: plan, run what is out of date, judge, write results and sheets.

Binding the package is not done here: this room lies above `binding`. What it needs is in `Computed`.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from trunnion import __version__
from trunnion.calculations import judgement, keys, sheets, store, writes
from trunnion.calculations.baselines import issued_baseline
from trunnion.calculations.digest import content_digest, sha256
from trunnion.calculations.judgement import Judgement
from trunnion.calculations.notebooks import canonical_bytes
from trunnion.calculations.plan import Planned, plan
from trunnion.calculations.results import Recorded, recorded
from trunnion.calculations.run import Job, Outcome, Progress, run
from trunnion.calculations.store import RevisionFolder
from trunnion.errors import SpecError, StoreError, TrunnionError

COMPUTED, FAILED, MISSING = "computed", "failed", "missing"
SignatureRows = Mapping[str, Sequence[Sequence[str]]]


@dataclass(frozen=True)
class Done:
    """One calculation after the run: its state, its body and what it records, or why there is none."""

    planned: Planned
    state: str
    fresh: bool = False
    body: bytes | None = None
    digest: str = ""
    recorded: Recorded | None = None
    error: str = ""
    failure: Outcome | None = None


@dataclass(frozen=True)
class Computed:
    """A workbook after `compute`: calculations in the order of the spec, and the judgements."""

    workbook: Any
    folder: RevisionFolder
    done: tuple[Done, ...]
    judgements: tuple[Judgement, ...]
    results: Mapping[str, Any] = field(default_factory=dict)

    @property
    def failed(self) -> list[Done]:
        """Calculations that failed."""
        return [entry for entry in self.done if entry.state == FAILED]

    @property
    def satisfied(self) -> bool:
        """Whether every requirement that counts is met, or accepted by an approved deviation."""
        return all(entry.satisfied for entry in self.judgements if entry.counts)


def compute(
    workbook: Any,
    *,
    output: Path | None = None,
    only: Collection[str] | None = (),
    workers: int | None = None,
    allow_local: bool = False,
    approved: Collection[str] = (),
    signatures: Callable[[Computed], SignatureRows] | None = None,
    scratch: str | None = None,
    tell: Callable[[Progress], None] | None = None,
    then: Callable[[Computed], None] | None = None,
) -> Computed:
    """Compute a loaded workbook into its revision folder.

    Runs only what is out of date (of `only`, if given; None: nothing may be due); every other body is
    kept byte for byte. A failed calculation does not stop the others. `approved` are ids of deviations an
    approver has signed, `signatures` gives the sign-off rows (role, name, date, state) of sheets by calculation
    id. `scratch` names a folder beside the revisions for a trial. `then` is called at the end, while the
    folder is still held: the package is bound there. Raises SpecError, TemplateError or StoreError before
    anything is run; what a calculation raises is in `Computed.failed`.
    """
    _require_known(workbook, only or ())
    planned = plan(workbook, allow_local=allow_local, only=frozenset(only or ()))
    folder = store.revision_folder(workbook.root, scratch or workbook.document.revision, output)
    if scratch is None:
        _require_open(workbook, folder, planned)
    with folder.locked():
        _copy_inputs(folder, planned)
        kept, due = _sort(folder, planned, only)
        outcomes = _run(folder, due, workers, tell)
        done = tuple(_done(folder, entry, kept, outcomes) for entry in planned)
        _remove_stale(folder, done)
        _write_state(folder, done)
        computed = _judged(workbook, folder, done, approved)
        _write_sheets(computed, signatures(computed) if signatures is not None else {})
        writes.write_if_changed(folder.path / "results.json", canonical_bytes(computed.results))
        writes.write_if_changed(folder.path / "workbook.yaml", workbook.text.encode("utf-8"))
        if then is not None:
            then(computed)
    return computed


def _require_open(workbook: Any, folder: RevisionFolder, planned: Sequence[Planned]) -> None:
    """An issued revision is not computed into: only an output that is gone is rebuilt, from the spec as issued."""
    revision = workbook.document.revision
    issued = issued_baseline(workbook.root, revision)
    if workbook.overrides:
        raise TrunnionError("trial values are never computed into a revision", remedy="add --trial")
    if issued is None:
        return
    if issued.spec.read_bytes() != workbook.text.encode("utf-8"):
        raise StoreError(
            f"revision {revision} is issued, and the spec says something else now",
            remedy="open the next revision: trunnion revise WORKBOOK --reason …",
        )
    stale = [entry.id for entry in planned if issued.key(entry.id) != entry.key]
    if stale and (folder.path / "results.json").exists():
        raise StoreError(
            f"revision {revision} is issued, and program or data differ now for {', '.join(stale)}; it stays as issued",
            remedy="compute it elsewhere with --output DIR, or open the next revision: trunnion revise",
        )


def _require_known(workbook: Any, only: Collection[str]) -> None:
    known = [calculation.id for calculation in workbook.calculations]
    unknown = sorted(set(only) - set(known))
    if unknown:
        raise TrunnionError(f"there is no calculation {', '.join(unknown)}", remedy=f"known: {', '.join(known)}")


def _copy_inputs(folder: RevisionFolder, planned: Sequence[Planned]) -> None:
    for entry in {file.held: file for one in planned for file in one.inputs.values()}.values():
        if entry.content is not None:
            folder.keep_input(entry.path, entry.content)


def _sort(
    folder: RevisionFolder, planned: Sequence[Planned], only: Collection[str] | None
) -> tuple[dict[str, bytes], list[Planned]]:
    """Bodies that stand, by calculation id, and the calculations to run (StoreError if `only` is None and
    there are any).
    """
    checksums = folder.read_state().get("bodies", {})
    kept: dict[str, bytes] = {}
    due = []
    for entry in planned:
        content = folder.sound_body(entry.key, checksums.get(entry.key)) or _elsewhere(folder, entry.key)
        if content is not None:
            kept[entry.id] = content
        elif not only or entry.id in only:
            due.append(entry)
    if only is None and due:
        raise StoreError(
            f"out of date or failed: {', '.join(entry.id for entry in due)}", remedy="run trunnion compute first"
        )
    for entry in due:
        folder.set_aside(entry.key)
    return kept, due


def _elsewhere(folder: RevisionFolder, key: str) -> bytes | None:
    """A sound body of the key from another revision, copied byte for byte; only where its checksum is recorded."""
    if folder.body(key).exists():
        return None
    for other in store.other_revisions(folder):
        checksum = other.read_state().get("bodies", {}).get(key)
        content = folder.take_body_from(other, key, checksum) if checksum else None
        if content is not None:
            return content
    return None


def _run(
    folder: RevisionFolder, due: Sequence[Planned], workers: int | None, tell: Callable[[Progress], None] | None
) -> dict[str, Outcome]:
    jobs = [_job(folder, entry) for entry in due]
    return run(jobs, workers=workers, tell=tell) if jobs else {}


def _job(folder: RevisionFolder, entry: Planned, name: str = "") -> Job:
    return Job(
        calculation=entry.id,
        template=entry.template.path,
        parameters=entry.parameters,
        folder=folder.path,
        body=folder.body(entry.key),
        failed=folder.failed(entry.id, entry.template.name),
        not_held={file.held: file.origin for file in entry.inputs.values() if not file.copied},
        name=name,
    )


def run_ahead(
    workbooks: Sequence[Any],
    *,
    scratch: str,
    output: Path | None = None,
    workers: int | None = None,
    allow_local: bool = False,
    tell: Callable[[Progress], None] | None = None,
) -> None:
    """Run, all side by side, what trial workbooks lack in their common scratch folder.

    What fails here fails again, and is told, when its workbook is computed.
    """
    folder = store.revision_folder(workbooks[0].root, scratch, output)
    with folder.locked():
        lacking: dict[str, Planned] = {}
        for workbook in workbooks:
            planned = plan(workbook, allow_local=allow_local)
            _copy_inputs(folder, planned)
            lacking |= {entry.key: entry for entry in _sort(folder, planned, ())[1]}
        jobs = [_job(folder, entry, f"{entry.id}, {key[:8]}") for key, entry in lacking.items()]
        if jobs:
            run(jobs, workers=workers, tell=tell)


def _done(folder: RevisionFolder, entry: Planned, kept: Mapping[str, bytes], outcomes: Mapping[str, Outcome]) -> Done:
    outcome = outcomes.get(entry.id)
    if outcome is not None and not outcome.done:
        return Done(entry, FAILED, error=outcome.error, failure=outcome)
    content = kept.get(entry.id)
    if outcome is not None:
        content = folder.body(entry.key).read_bytes()
    if content is None:
        return Done(entry, MISSING, error="out of date and not asked for")
    body = store.read_body(content)
    try:
        found = recorded(entry.id, body)
    except TrunnionError as err:
        return Done(entry, FAILED, body=content, error=str(err))
    return Done(entry, COMPUTED, outcome is not None, content, content_digest(body), found)


def _remove_stale(folder: RevisionFolder, done: Sequence[Done]) -> None:
    """Take away sheets and failed notebooks of what is not in this state any more; all can be made again."""
    names = {(entry.planned.id, entry.planned.template.name) for entry in done}
    for name, former in folder.read_state()["calculations"].items():
        names.add((name, former.get("parts", {}).get("template", {}).get("name", "")))
    standing = {folder.sheet(e.planned.id, e.planned.template.name) for e in done if e.body is not None}
    failed = {folder.failed(e.planned.id, e.planned.template.name) for e in done if e.state == FAILED}
    for name in names:
        for path in {folder.sheet(*name), folder.failed(*name)} - standing - failed:
            writes.remove(path)


def _write_state(folder: RevisionFolder, done: Sequence[Done]) -> None:
    state = folder.read_state()
    entries = {}
    for entry in done:
        former = state["calculations"].get(entry.planned.id)
        if entry.body is not None:
            entries[entry.planned.id] = {
                "key": entry.planned.key,
                "parts": dict(entry.planned.parts),
                "sha256": sha256(entry.body),
                "digest": entry.digest,
                "state": entry.state,
                "inputs": {path: file.sha256 for path, file in entry.planned.inputs.items()},
            }
        elif former is not None:
            entries[entry.planned.id] = former
    bodies = {key: digest for key, digest in state.get("bodies", {}).items() if folder.body(key).exists()}
    bodies |= {entry.planned.key: sha256(entry.body) for entry in done if entry.body is not None}
    code = dict(keys.surroundings().code)
    folder.write_state({**state, "calculations": entries, "bodies": bodies, "code": code})


def _judged(workbook: Any, folder: RevisionFolder, done: tuple[Done, ...], approved: Collection[str]) -> Computed:
    records = {entry.planned.id: entry.recorded for entry in done if entry.recorded is not None}
    judgements = judgement.judge_all(
        workbook.requirements,
        workbook.decisions,
        records,
        conventions=workbook.conventions,
        deviations=workbook.deviations,
        approved=approved,
        place=workbook.place,
    )
    broken = judgement.broken_promises(
        workbook.calculations, workbook.requirements, judgements, set(records), workbook.place
    )
    if broken:
        raise SpecError(broken)
    computed = Computed(workbook, folder, done, tuple(judgements))
    return Computed(workbook, folder, done, tuple(judgements), results_of(computed))


def results_of(computed: Computed) -> dict[str, Any]:
    """`results.json` as plain JSON: no times, no paths, the same for the same spec, data and program."""
    document = computed.workbook.document
    return {
        "schema": 1,
        "program": {"name": "trunnion", "version": __version__},
        "document": {
            "number": document.number,
            "title": document.title,
            "revision": document.revision,
            "supersedes": document.supersedes,
        },
        "calculations": [_plain_calculation(entry) for entry in computed.done],
        "requirements": judgement.plain_requirements(computed.judgements),
        "decisions": [
            {
                "id": decision.id,
                "chosen": decision.chosen,
                "over": list(decision.over),
                "rests_on": list(decision.rests_on),
            }
            for decision in computed.workbook.decisions
        ],
    }


def _plain_calculation(entry: Done) -> dict[str, Any]:
    found = entry.recorded
    return {
        "id": entry.planned.id,
        "title": entry.planned.title,
        "template": entry.planned.template.name,
        "local_template": entry.planned.template.local,
        "key": entry.planned.key,
        "digest": entry.digest,
        "state": entry.state,
        "error": entry.error,
        "inputs": [
            {"path": file.path, "held": file.held if file.copied else None, "sha256": file.sha256, "size": file.size}
            for file in entry.planned.inputs.values()
        ],
        "libraries": {**entry.planned.parts["libraries"], "python": entry.planned.parts["python"]},
        "results": [result.plain() for result in found.results] if found else [],
        "checks": [dict(check) for check in found.checks] if found else [],
        "findings": [dict(finding) for finding in found.findings] if found else [],
        "figures": [dict(figure) for figure in found.figures] if found else [],
    }


def _write_sheets(computed: Computed, signatures: SignatureRows) -> None:
    for entry in computed.done:
        if entry.body is None:
            continue
        sheet = sheets.sheet_of(
            store.read_body(entry.body), sheet_text(computed, entry, signatures.get(entry.planned.id, ()))
        )
        path = computed.folder.sheet(entry.planned.id, entry.planned.template.name)
        writes.write_if_changed(path, canonical_bytes(sheet))


def sheet_text(computed: Computed, entry: Done, signed: Sequence[Sequence[str]] = ()) -> sheets.SheetText:
    """What the generated cells of one sheet say."""
    document, planned = computed.workbook.document, entry.planned
    libraries = ", ".join(f"{name} {version}" for name, version in planned.parts["libraries"].items())
    rows = [
        ("document", f"{document.number}, revision {document.revision}"),
        ("calculation", f"{planned.number}: {planned.title}"),
        ("date", document.date or "not issued"),
        ("template", planned.template.name + (" (the workbook's own)" if planned.template.local else "")),
        ("program", f"trunnion {__version__}; Python {planned.parts['python']}, {libraries}"),
        ("content digest", entry.digest),
    ]
    warnings = (
        [f"Independent check {name} does not agree." for name in entry.recorded.failed_checks] if entry.recorded else []
    )
    if planned.template.local:
        warnings.append(f"Made with a template of the workbook's own (sha256 {planned.template.file_digest}).")
    return sheets.SheetText(planned.id, rows, requirement_rows(computed, planned.id), signed, warnings)


def requirement_rows(computed: Computed, calculation: str) -> list[tuple[str, ...]]:
    """The requirements that rest on a calculation, one row a candidate."""
    rows: list[tuple[str, ...]] = []
    for judged in computed.judgements:
        if any(part.result is not None and part.result.calculation == calculation for part in judged.parts):
            asked = judged.asked
            accepted = f" ({judged.deviation})" if judged.deviation else ""
            chosen = judged.candidate + (" (chosen)" if judged.counts and asked.of != judged.candidate else "")
            verdict = judged.verdict.value + accepted
            rows.append((asked.requirement, asked.text, chosen, judged.value_text, judged.basis_text, verdict))
    return rows
