"""What the package shows of signatures, findings and deviations, as the binder's plain records."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from trunnion.binding import package as p
from trunnion.calculations.compute import Computed
from trunnion.calculations.judgement import asked_of
from trunnion.records import layout, rules
from trunnion.records.casework import case_of
from trunnion.records.findings import RECORDED, Finding
from trunnion.records.rules import Mark, Standing, State

_STATES = {
    State.SIGNED: p.SignatureState.SIGNED,
    State.NOT_SIGNED: p.SignatureState.NOT_SIGNED,
    State.STALE: p.SignatureState.STALE,
    State.INVALID: p.SignatureState.INVALID,
    State.UNVERIFIED: p.SignatureState.INVALID,
}
MAY_CHECK = "By declaration of this workbook the approver may also have checked."


@dataclass(frozen=True)
class SignOff:
    """The sign-off of one computed workbook."""

    signatures: tuple[p.Signature, ...]
    sheets: Mapping[str, tuple[p.Signature, ...]]
    deviations: Mapping[str, str]
    findings: tuple[p.Finding, ...]
    cautions: tuple[str, ...]

    def plain(self) -> dict[str, Any]:
        """The sign-off as JSON, for the digest that says whether a package must be bound again."""
        listed = {name: [_plain(row) for row in rows] for name, rows in self.sheets.items()}
        findings = [asdict(finding) for finding in self.findings]
        return {
            "document": [_plain(row) for row in self.signatures],
            "sheets": listed,
            "deviations": dict(self.deviations),
            "findings": findings,
            "cautions": list(self.cautions),
        }

    def words(self, calculations: Sequence[str]) -> str:
        """The roles that stand on all of some calculations, in words."""
        good = [
            row.does
            for index, row in enumerate(self.sheets.get(calculations[0], ()) if calculations else ())
            if all(self.sheets[name][index].state is p.SignatureState.SIGNED for name in calculations)
        ]
        return ", ".join(good) or "not signed"


def sign_off(computed: Computed) -> SignOff:
    """The sign-off of what was computed; a trial has none."""
    workbook = computed.workbook
    trial = workbook.overrides or computed.folder.path.name != workbook.document.revision
    case = case_of(workbook, computed.results)
    if trial:
        case = rules.Case(case.results, case.roles, case.keys, findings=case.findings)
    standing = rules.judge(case)
    names = [entry.planned.id for entry in computed.done]
    return SignOff(
        signatures=tuple(_together(standing, names, role) for role in layout.ROLES),
        sheets={name: tuple(_row(standing.marks[name, role]) for role in layout.ROLES) for name in names},
        deviations={name: _deviation_words(rules.deviation_mark(case, name)) for name in case.deviations},
        findings=tuple(_finding(finding) for finding in case.findings),
        cautions=(MAY_CHECK,) if workbook.document.approver_may_check else (),
    )


def approved(workbook: Any) -> frozenset[str]:
    """Deviations of a workbook that an approver has signed as they stand; needs nothing computed."""
    if not workbook.deviations:
        return frozenset()
    rows = [{"id": entry.id, "asks": asked_of(entry).text} for entry in workbook.requirements]
    document = {"number": workbook.document.number, "revision": workbook.document.revision}
    return rules.approved_deviations(
        case_of(workbook, {"document": document, "requirements": rows, "calculations": []})
    )


def sheet_rows(computed: Computed) -> dict[str, list[tuple[str, str, str, str]]]:
    """The sign-off rows of every sheet (role, name, date, state with key), as the engine writes them."""
    return {
        name: [(row.does, row.name, row.date, row.state.value + (f"; {row.note}" if row.note else "")) for row in rows]
        for name, rows in sign_off(computed).sheets.items()
    }


def _row(mark: Mark) -> p.Signature:
    signed = mark.signed
    if signed is None:
        return p.Signature(mark.role, note=mark.why)
    words = str((signed.entries.get(mark.calculation, {}).get("by_reference") or {}).get("words", ""))
    notes = [signed.verified.fingerprint, _method(signed.statement), words, mark.why]
    note = "; ".join(text for text in notes if text)
    return p.Signature(mark.role, signed.person_name, signed.time[:10], _STATES[mark.state], note)


def _method(statement: Mapping[str, Any]) -> str:
    method = statement.get("method")
    if not isinstance(method, dict):
        return ""
    recomputed = statement.get("recomputed")
    tail = f"; recomputed: {recomputed.get('summary', '')}" if isinstance(recomputed, dict) else ""
    return f"{method.get('of check', '')}: {method.get('reference', '')}{tail}"


def _together(standing: Standing, names: Sequence[str], role: str) -> p.Signature:
    """One row for the whole document: signed only if every calculation is."""
    rows = [_row(standing.marks[name, role]) for name in names]
    signed = [row for row in rows if row.state is p.SignatureState.SIGNED]
    if signed and len(signed) == len(rows):
        people = " and ".join(dict.fromkeys(row.name for row in rows))
        keys = "; ".join(dict.fromkeys(row.note.split("; ")[0] for row in rows))
        return p.Signature(role, people, max(row.date for row in rows), p.SignatureState.SIGNED, keys)
    bad = [row for row in rows if row.state in (p.SignatureState.INVALID, p.SignatureState.STALE)]
    note = f"{len(signed)} of {len(rows)} calculations" if signed else ""
    if bad:
        return p.Signature(role, bad[0].name, bad[0].date, bad[0].state, note)
    return p.Signature(role, note=note)


def _deviation_words(mark: Mark) -> str:
    if mark.signed is None:
        return "not signed"
    who = f"{mark.signed.person_name}, {mark.signed.time[:10]}"
    return f"signed: {who}" if mark.state is State.SIGNED else f"{mark.state.value}: {mark.why or who}"


def _finding(finding: Finding) -> p.Finding:
    closed = f" Closed by {finding.closed_by}. {finding.closed_because}".rstrip() if finding.closed_by else ""
    told = f"{finding.answer} ({finding.answered_by}).{closed}" if finding.answered_by else ""
    who = finding.by or RECORDED
    return p.Finding(finding.id, finding.against, f"{finding.text} ({who})", finding.state, told)


def _plain(row: p.Signature) -> list[str]:
    return [row.does, row.name, row.date, row.state.value, row.note]
