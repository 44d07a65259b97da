"""The rules of signing, applied to a revision: who signed what, what has fallen, what bars approval.

Pure judgement on plain records: nothing is read or written here, so that workbook and archive are judged alike.
"""

from __future__ import annotations

import datetime
import enum
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from trunnion.calculations.digest import sha256_json
from trunnion.records import layout, moments
from trunnion.records import statements as st
from trunnion.records.contents import Content, contents, incomplete, open_verdicts, requirements_digest
from trunnion.records.findings import CLOSED, Finding
from trunnion.records.statements import Signed
from trunnion.records.verification import Keys, Outcome


class State(enum.Enum):
    """The state of one role on one calculation."""

    SIGNED = "signed"
    NOT_SIGNED = "not signed"
    STALE = "signed, but the content has changed since"
    INVALID = "signature is not good"
    UNVERIFIED = "not verified"


@dataclass(frozen=True)
class Case:
    """A revision to be judged: results, people, keys, statements, and what else bears on approval.

    `former` holds signed statements of earlier revisions that signatures by reference name, by digest; `latest` the
    last time a statement may bear (an archive's day of issue).
    """

    results: Mapping[str, Any]
    roles: Mapping[str, tuple[str, ...]]
    keys: Keys
    signed: Sequence[Signed] = ()
    former: Mapping[str, Signed] = field(default_factory=dict)
    approver_may_check: bool = False
    open_assumptions: Sequence[str] = ()
    findings: Sequence[Finding] = ()
    deviations: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    latest: str | None = None

    @property
    def document(self) -> Mapping[str, Any]:
        """Number and revision."""
        return self.results["document"]

    @property
    def contents(self) -> dict[str, Content]:
        """What there is to sign, by calculation."""
        return contents(self.results)


@dataclass(frozen=True)
class Mark:
    """The state of one role on one calculation, the statement it rests on, and why."""

    calculation: str
    role: str
    state: State
    signed: Signed | None = None
    why: str = ""


@dataclass(frozen=True)
class Standing:
    """The judgement: marks by calculation and role, broken rules, and what bars approval."""

    marks: Mapping[tuple[str, str], Mark]
    broken: tuple[str, ...]
    bars: tuple[str, ...]
    approved_deviations: frozenset[str]

    @property
    def missing(self) -> list[str]:
        """Marks that are not signatures which stand, in words."""
        found = []
        for mark in self.marks.values():
            if mark.state is not State.SIGNED:
                why = f" ({mark.why})" if mark.why else ""
                found.append(f"{mark.calculation}, {mark.role}: {mark.state.value}{why}")
        return found

    @property
    def complete(self) -> bool:
        """Whether the revision may be issued."""
        return not (self.missing or self.broken or self.bars)


def judge(case: Case) -> Standing:
    """Apply every rule to a revision."""
    deviations = approved_deviations(case)
    marks = {
        (name, role): _mark(case, name, content, role)
        for name, content in _every(case).items()
        for role in layout.ROLES
    }  # fmt: skip
    broken = [*_persons(case, marks), *_own_deviations(case, marks, deviations), *_order(marks), *_latest(case, marks)]
    return Standing(marks, tuple(dict.fromkeys(broken)), tuple(bars(case, deviations)), deviations)


def bars(case: Case, deviations: frozenset[str]) -> list[str]:
    """What bars approval whatever is signed."""
    found = [f"assumption {name} is open" for name in case.open_assumptions]
    found += [f"finding {f.id} is {f.state}: {f.text}" for f in case.findings if f.state != CLOSED]
    found += incomplete(case.results)
    found += open_verdicts(case.results, deviations)
    return found


def approved_deviations(case: Case) -> frozenset[str]:
    """Deviations an approver has signed as they stand now."""
    return frozenset(name for name in case.deviations if deviation_mark(case, name).state is State.SIGNED)


def deviation_mark(case: Case, name: str) -> Mark:
    """The state of the approver's signature on a deviation."""
    wanted = deviation_content(case, name)
    best = Mark(name, "approved", State.NOT_SIGNED)
    for signed in case.signed:
        if signed.kind != st.DEVIATION or signed.statement["deviation"].get("id") != name:
            continue
        mark = _judged(case, signed, name, dict(signed.statement["deviation"]) == wanted)
        if mark.state is State.SIGNED and signed.person != wanted["approved by"]:
            mark = Mark(name, "approved", State.INVALID, signed, f"{wanted['approved by']} is to approve it")
        if mark.state is State.SIGNED and _expired(str(wanted["expires"]), case.latest or signed.time):
            mark = Mark(name, "approved", State.STALE, signed, f"expired on {wanted['expires']}")
        best = mark if best.state is State.NOT_SIGNED or mark.state is State.SIGNED else best
    return best


def deviation_content(case: Case, name: str) -> dict[str, Any]:
    """What is signed of a deviation: its own words, and the limit it deviates from."""
    deviation = dict(case.deviations[name])
    row = next((row for row in case.results["requirements"] if row["id"] == deviation["requirement"]), None)
    return {**deviation, "id": name, "asks": row["asks"] if row else None}


def covers(entry: Mapping[str, Any], content: Content) -> bool:
    """Whether a statement's entry is about this very content."""
    wanted = content.plain()
    return all(entry.get(name) == wanted[name] for name in wanted)


def _every(case: Case) -> dict[str, Content | None]:
    known = case.contents
    return {entry["id"]: known.get(entry["id"]) for entry in case.results["calculations"]}


def _mark(case: Case, name: str, content: Content | None, role: str) -> Mark:
    """The best signature of a role on a calculation: one that stands, the last of them; else what is wrong."""
    if content is None:
        return Mark(name, role, State.NOT_SIGNED, None, "the calculation is not complete")
    marks = [
        _judged_entry(case, signed, signed.entries[content.id], content)
        for signed in case.signed
        if signed.kind == st.SIGNATURE and signed.role == role and content.id in signed.entries
    ]
    order = [State.SIGNED, State.STALE, State.UNVERIFIED, State.INVALID]
    marks.sort(key=lambda mark: (-order.index(mark.state), mark.signed.time if mark.signed else ""))
    return marks[-1] if marks else Mark(content.id, role, State.NOT_SIGNED)


def _judged_entry(case: Case, signed: Signed, entry: Mapping[str, Any], content: Content) -> Mark:
    same = covers(entry, content)
    if signed.role == "approved":
        same = same and signed.statement.get("requirements") == requirements_digest(case.results)
    mark = _judged(case, signed, content.id, same)
    if mark.state is not State.SIGNED:
        return mark
    why = _reference_fault(case, signed, entry, content)
    if not why and signed.role == "checked" and not entry.get("by_reference"):
        method = signed.statement.get("method")
        why = (
            "" if isinstance(method, dict) and method.get("of check") in st.METHODS else "no method of check is stated"
        )
    return Mark(content.id, signed.role, State.INVALID, signed, why) if why else mark


def _judged(case: Case, signed: Signed, name: str, same: bool) -> Mark:
    verified = signed.verified
    state, why = State.SIGNED, ""
    if verified.outcome is not Outcome.GOOD:
        state = State.UNVERIFIED if verified.outcome is Outcome.UNVERIFIED else State.INVALID
        why = verified.why
    elif not signed.is_for(case.document):
        there = signed.statement["document"]
        state, why = State.INVALID, f"signed for {there.get('number')} revision {there.get('revision')}"
    elif signed.role not in case.roles.get(signed.person, ()):
        state, why = State.INVALID, f"{signed.person} does not sign as {signed.role} in this workbook"
    elif not same:
        state = State.STALE
    return Mark(name, signed.role, state, signed, why)


def _reference_fault(case: Case, signed: Signed, entry: Mapping[str, Any], content: Content) -> str:
    """Why a signature by reference does not hold; "" if it does, or if it is none."""
    reference = entry.get("by_reference")
    if not reference:
        return ""
    former = case.former.get(str(reference.get("statement")))
    if former is None:
        return "the signature it refers to is not there"
    if not former.verified.good or former.kind != st.SIGNATURE or former.role != signed.role:
        return f"the signature it refers to does not hold ({former.verified.text})"
    number, revision = (former.statement["document"].get(key) for key in ("number", "revision"))
    if (
        number != case.document["number"]
        or revision != reference.get("revision")
        or revision == case.document["revision"]
    ):
        return "the signature it refers to is of another document or revision"
    if moments.seconds(former.time) > moments.seconds(signed.time):
        return "the signature it refers to is later than this one"
    there = former.entries.get(content.id)
    if there is None or not covers(there, content):
        return f"{content.id} is not what was signed at {revision}"
    return _reference_fault(case, former, there, content) if there.get("by_reference") else ""


def _persons(case: Case, marks: Mapping[tuple[str, str], Mark]) -> list[str]:
    """Three different people; two ids with one key are one person."""
    who = case.keys.listed.identities(case.roles)
    broken = []
    for name in dict.fromkeys(calculation for calculation, _ in marks):
        found: dict[str, str] = {}
        for role in layout.ROLES:
            mark = marks[name, role]
            if mark.state is not State.SIGNED or mark.signed is None:
                continue
            for other, person in found.items():
                allowed = case.approver_may_check and {role, other} == {"checked", "approved"}
                if _same(mark.signed, person, marks[name, other].signed, who) and not allowed:
                    broken.append(f"{name}: {other} and {role} by the same person ({person}, {mark.signed.person})")
            found[role] = mark.signed.person
    return broken


def _own_deviations(case: Case, marks: Mapping[tuple[str, str], Mark], deviations: frozenset[str]) -> list[str]:
    """Nobody approves a deviation from a requirement on his own calculation."""
    who = case.keys.listed.identities(case.roles)
    preparers = [m.signed for m in marks.values() if m.role == "prepared" and m.state is State.SIGNED and m.signed]
    broken = []
    for name in sorted(deviations):
        signed = deviation_mark(case, name).signed
        if signed is not None and any(_same(signed, other.person, other, who) for other in preparers):
            broken.append(f"deviation {name}: approved by the preparer ({signed.person})")
    return broken


def _same(signed: Signed, person: str, other: Signed | None, who: Mapping[str, str]) -> bool:
    one_key = other is not None and signed.verified.fingerprint == other.verified.fingerprint
    return one_key or who.get(signed.person, signed.person) == who.get(person, person)


def _order(marks: Mapping[tuple[str, str], Mark]) -> list[str]:
    """Prepared, then checked, then approved; stated times do not decrease."""
    broken = []
    for name in dict.fromkeys(calculation for calculation, _ in marks):
        before: Signed | None = None
        for role in layout.ROLES:
            mark = marks[name, role]
            signed = mark.signed if mark.state is State.SIGNED else None
            if before and signed and moments.seconds(signed.time) < moments.seconds(before.time):
                broken.append(f"{name}: {role} is stated before {before.role} ({signed.time} < {before.time})")
            if signed and before is None and role != layout.ROLES[0]:
                broken.append(f"{name}: {role} without {layout.ROLES[layout.ROLES.index(role) - 1]}")
            before = signed
    return broken


def _latest(case: Case, marks: Mapping[tuple[str, str], Mark]) -> list[str]:
    if case.latest is None:
        return []
    last = moments.seconds(case.latest)
    late = {m.signed.name: m.signed for m in marks.values() if m.signed and moments.seconds(m.signed.time) > last}
    return [
        f"{signed.role} by {signed.person} is stated at {signed.time}, after {case.latest}" for signed in late.values()
    ]


def _expired(expires: str, at: str) -> bool:
    """Whether an ISO day of expiry is past; an expiry in words can't be judged and is shown as it stands."""
    try:
        day = datetime.date.fromisoformat(expires)
    except ValueError:
        return False
    return moments.seconds(at) > moments.seconds(moments.end_of(day.isoformat()))


def statement_of(
    case: Case, names: Sequence[str], *, role: str, person: Mapping[str, str], time: str
) -> dict[str, Any]:
    """The statement of a signature over some calculations, without what only a checker adds."""
    known = case.contents
    made: dict[str, Any] = {
        "schema": st.SCHEMA,
        "kind": st.SIGNATURE,
        "document": {name: case.document[name] for name in ("number", "revision")},
        "role": role,
        "person": dict(person),
        "time": time,
        "calculations": [known[name].plain() for name in names],
        "open_assumptions": list(case.open_assumptions),
        "findings": [{"id": f.id, "state": f.state, "sha256": sha256_json(f.plain())} for f in case.findings],
    }
    if role == "approved":
        made["requirements"] = requirements_digest(case.results)
    return made
