"""The package of a computed workbook: what was computed and judged, put into the binder's plain record."""

from __future__ import annotations

import datetime
import json
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion import __version__
from trunnion.binding import package as p
from trunnion.calculations import store, writes
from trunnion.calculations.baselines import issued_baseline
from trunnion.calculations.compute import FAILED, MISSING, Computed, Done
from trunnion.calculations.digest import sha256, sha256_json
from trunnion.calculations.issue import issue_date
from trunnion.calculations.judgement import Judgement
from trunnion.errors import BindingError
from trunnion.records import signoff

RECORD = "bound.json"
_STATES = {FAILED: p.SheetState.FAILED, MISSING: p.SheetState.MISSING}


@dataclass(frozen=True)
class Bound:
    """The page to open, whether it was made just now, what a careful reader should know, or why it could not be."""

    html: Path | None
    fresh: bool
    warnings: tuple[str, ...] = ()
    error: str = ""


def package_input(computed: Computed, *, status: str = "draft", date: str = "") -> p.PackageInput:
    """Everything the package of a computed workbook shows."""
    workbook, signed = computed.workbook, signoff.sign_off(computed)
    return p.PackageInput(
        document=_document(computed, status, date),
        sheets=tuple(_sheet(entry, signed) for entry in computed.done),
        people=tuple(p.Person(who.id, who.name, ", ".join(who.signs_as or ())) for who in workbook.people),
        signatures=signed.signatures,
        requirements=tuple(_requirement(entry, workbook, signed) for entry in computed.judgements),
        decisions=tuple(_decision(decision, computed) for decision in workbook.decisions),
        assumptions=tuple(p.Assumption(a.id, a.text, a.status, a.owner) for a in workbook.assumptions),
        findings=(*signed.findings, *_failed_checks(computed)),
        deviations=tuple(
            p.Deviation(d.id, d.requirement, d.reason, d.limits, d.expires, signed.deviations[d.id])
            for d in workbook.deviations
        ),
        revisions=tuple(p.Revision(r.revision, r.date or "", r.reason) for r in workbook.revisions),
        inputs=tuple(_inputs(computed)),
        changes=tuple(p.Change(*row) for row in changes_since_superseded(computed)),
        statements=tuple(_statements(computed)),
        summary=_summary(computed),
        cautions=(*signed.cautions, *_cautions(computed)),
        environment=tuple(_environment(computed)),
        spec_text=workbook.text,
    )


def _statements(computed: Computed) -> Iterator[p.StatementPage]:
    """One page a convention of the workbook, to be handed over on its own."""
    from trunnion.sheet.convention_page import page_drawing, stated_page
    from trunnion.spec.build import convention_from_plain
    from trunnion.spec.plain import plain_part

    workbook = computed.workbook
    derived = {
        calculation.parameters.get("convention"): calculation.id
        for calculation in workbook.calculations
        if calculation.template == "convention-derivation"
    }
    for name in workbook.names("conventions"):
        plain = plain_part(workbook, "conventions", name)
        page = stated_page(plain)
        svg, alt, caption = page_drawing(page, convention_from_plain(plain), columns=4)
        parts = tuple((part.title, part.paragraphs) for part in page.parts)
        yield p.StatementPage(name, page.title, (), derived.get(name, ""), parts, svg, alt, caption)


def changes_since_superseded(computed: Computed) -> list[tuple[str, str, str, str]]:
    """The rows of the change report against the issued revision this one supersedes; none if it is not issued."""
    from trunnion.calculations.compare import change_rows, compare_results

    superseded = computed.workbook.document.supersedes
    baseline = issued_baseline(computed.workbook.root, superseded) if superseded else None
    if baseline is None:
        return []
    return change_rows(compare_results(baseline.results, computed.results, superseded, "this revision"))


def bind_package(computed: Computed, *, pdf: bool, status: str = "draft", date: str = "") -> Bound:
    """Bind the package of a computed workbook into its revision folder, unless what is there is what would be made."""
    folder, house_file = computed.folder.path, computed.workbook.house
    issued = issue_date(computed.workbook.root, computed.folder.path.name)
    if issued is not None:
        status, date = "issued", issued
        if (folder / "package.html").is_file():  # as issued; never bound again over it
            return Bound(folder / "package.html", False)
    key = _package_key(computed, pdf, status, date)
    record = folder / RECORD
    if _stands(folder, record, key):
        return Bound(folder / "package.html", False)
    from trunnion.binding.bind import bind
    from trunnion.binding.house import load_house

    writes.remove(record)
    house = load_house(house_file) if house_file is not None else None
    try:
        report = bind(package_input(computed, status=status, date=date), folder, pdf=pdf, house=house)
    except BindingError as err:  # results and verdicts stand without their package, and are shown first
        return Bound(None, False, error=str(err))
    if not pdf:
        writes.remove(folder / "package.pdf")
    writes.write_json(record, {"key": key, "files": dict(report.digests)})
    return Bound(report.html, True, tuple(report.warnings))


def _package_key(computed: Computed, pdf: bool, status: str, date: str) -> str:
    """What a package depends on: results, bodies, spec text, house, the binder itself, and how it is asked for."""
    house = computed.workbook.house
    superseded = computed.workbook.document.supersedes
    baseline = issued_baseline(computed.workbook.root, superseded) if superseded else None
    return sha256_json(
        {
            "results": computed.results,
            "bodies": [sha256(entry.body) for entry in computed.done if entry.body is not None],
            "spec": computed.workbook.text,
            "house": sha256(house.read_bytes()) if house is not None else None,
            "superseded": dict(baseline.results) if baseline is not None else None,
            "program": binder_digest(),
            "signed": signoff.sign_off(computed).plain(),
            "asked": [pdf, status, date],
        }
    )


def binder_digest() -> str:
    """SHA-256 over all files the package's look comes from: binder, records, this room, fonts and characters."""
    package = Path(__file__).parents[1]
    rooms = [path for room in ("binding", "records", "cli", "fonts") for path in (package / room).rglob("*")]
    files = sorted(path for path in [*rooms, package / "glyphs.py"] if path.is_file() and path.suffix != ".pyc")
    return sha256_json({path.relative_to(package).as_posix(): sha256(path.read_bytes()) for path in files})


def _stands(folder: Path, record: Path, key: str) -> bool:
    try:
        made = json.loads(record.read_bytes())
        return made["key"] == key and all(
            sha256((folder / name).read_bytes()) == digest for name, digest in made["files"].items()
        )
    except (OSError, ValueError, KeyError, TypeError, AttributeError):
        return False


def stated_date(workbook: Any) -> str:
    """The date the spec gives its revision, in title block or revision table; "" where it gives none.

    Without one a draft bears the day on which this content was first bound; it is not bound again for another day.
    """
    document = workbook.document
    rows = [row.date for row in workbook.revisions if row.revision == document.revision]
    return document.date or next((date for date in rows if date), "") or ""


def _document(computed: Computed, status: str, date: str) -> p.Document:
    document = computed.workbook.document
    return p.Document(
        number=document.number,
        title=document.title,
        revision=document.revision,
        date=date or stated_date(computed.workbook) or datetime.date.today().isoformat(),
        status=status,
        supersedes=document.supersedes or "",
        extra=dict(document.fields or {}),
    )


def _sheet(entry: Done, signed: signoff.SignOff) -> p.Sheet:
    planned = entry.planned
    return p.Sheet(
        id=planned.id,
        title=planned.title,
        template=planned.template.name,
        notebook=store.read_body(entry.body) if entry.body is not None else None,
        body=entry.body,
        number=planned.number,
        state=_STATES.get(entry.state, p.SheetState.COMPUTED),
        reason=entry.error,
        key=planned.key,
        digest=entry.digest,
        local_template=planned.template.local,
        signatures=signed.sheets[planned.id],
    )


def _requirement(entry: Judgement, workbook: Any, signed: signoff.SignOff) -> p.RequirementRow:
    asked = entry.asked
    requirement = workbook.part("requirements", asked.requirement)
    of_decision = asked.of != entry.candidate
    return p.RequirementRow(
        id=asked.requirement,
        text=requirement.text,
        asks=asked.text,
        verdict=p.Verdict(entry.verdict.value),
        source=requirement.source or "",
        candidate=entry.candidate if of_decision else "",
        counts=entry.counts,
        result=entry.value_text,
        basis=entry.basis_text,
        basis_asked=asked.basis.value,
        evidence=tuple(_evidence(entry)),
        accepted=entry.deviation if entry.deviation_holds else "",
        signature=signed.words(sorted({part.calculation for part in _evidence(entry)})),
        why=entry.why,
    )


def _evidence(entry: Judgement) -> list[p.Evidence]:
    found = [p.Evidence(part.result.calculation, part.result.id) for part in entry.parts if part.result is not None]
    return list(dict.fromkeys(found))


def _decision(decision: Any, computed: Computed) -> p.Decision:
    alternatives = []
    judged = [j for j in computed.judgements if j.asked.of == decision.id]
    for name in dict.fromkeys([*decision.over, *(j.candidate for j in judged)]):
        own = [j for j in judged if j.candidate == name]
        verdicts = "; ".join(f"{j.asked.requirement}: {j.verdict.value}" for j in own)
        grounds = "; ".join(f"{j.asked.requirement}: {j.value_text}" for j in own)
        alternatives.append(p.Alternative(name, verdicts, grounds, name == decision.chosen))
    return p.Decision(
        id=decision.id,
        question=decision.title or "",
        chosen=decision.chosen,
        because=decision.because,
        alternatives=tuple(alternatives),
        rests_on=tuple(p.Evidence(name) for name in decision.rests_on),
    )


def _failed_checks(computed: Computed) -> list[p.Finding]:
    """Independent checks that do not agree: no finding to be answered, but a calculation to be mended."""
    return [
        p.Finding(name, entry.planned.id, "the independent check does not agree")
        for entry in computed.done
        if entry.recorded is not None
        for name in entry.recorded.failed_checks
    ]


def _inputs(computed: Computed) -> list[p.InputFile]:
    files = {file.path: file for entry in computed.done for file in entry.planned.inputs.values()}
    sources = {
        getattr(envelope, "table", None): envelope.source or "" for envelope in computed.workbook.envelopes.values()
    }
    return [
        p.InputFile(file.path, file.sha256, file.size, source=sources.get(file.path, ""), held=file.copied)
        for file in files.values()
    ]


def _summary(computed: Computed) -> p.Summary:
    counting = [entry for entry in computed.judgements if entry.counts]
    open_yet = [entry for entry in counting if not entry.satisfied]
    if not counting:
        answer = "No requirement is stated."
    elif open_yet:
        words = ", ".join(f"{entry.asked.requirement} ({entry.verdict.value})" for entry in open_yet)
        answer = f"{len(counting) - len(open_yet)} of {len(counting)} requirements are met; open: {words}."
    else:
        answer = f"All {len(counting)} requirements are met."
    decisions = computed.workbook.decisions
    asked = [decision.title for decision in decisions if decision.title]
    chosen = [f"{decision.id}: {decision.chosen}." for decision in decisions]
    margins = tuple(
        (
            f"{entry.asked.quantity} of {entry.candidate}",
            entry.value_text,
            f"{entry.asked.requirement}: {entry.asked.text}",
        )
        for entry in counting
    )
    return p.Summary(
        question=" ".join([*asked, "Are the requirements met, and how near does each come to its limit?"]),
        answer=" ".join([*chosen, answer]),
        margins=margins,
        figure=_figure(computed),
    )


def _figure(computed: Computed) -> p.Evidence | None:
    """The first figure of the calculation the first counting requirement rests on."""
    records = {entry.planned.id: entry.recorded for entry in computed.done if entry.recorded is not None}
    for judged in computed.judgements:
        for part in judged.parts:
            if judged.counts and part.result is not None and records[part.result.calculation].figures:
                figure = records[part.result.calculation].figures[0]
                return p.Evidence(part.result.calculation, figure["id"])
    return None


def _cautions(computed: Computed) -> list[str]:
    cautions = []
    templates = [entry.planned.template for entry in computed.done if entry.planned.template.local]
    own = sorted({f"{template.name} (SHA-256 {template.file_digest})" for template in templates})
    if own:
        cautions.append(f"Made with templates of the workbook's own: {', '.join(own)}.")
    missing = [file.path for file in {f.path: f for e in computed.done for f in e.planned.inputs.values()}.values()
               if not file.copied]  # fmt: skip
    if missing:
        cautions.append(f"Inputs not held with the package, listed by digest only: {', '.join(missing)}.")
    if computed.workbook.overrides:
        values = "; ".join(f"{path} = {value}" for path, value in computed.workbook.overrides)
        cautions.append(f"A trial, not a revision: {values}.")
    return cautions


def _environment(computed: Computed) -> list[tuple[str, str]]:
    rows = [("trunnion", __version__)]
    for entry in computed.done[:1]:
        rows.append(("Python", str(entry.planned.parts["python"])))
        rows += [(name, str(version)) for name, version in entry.planned.parts["libraries"].items()]
    return rows
