"""Signing: the statement is made, judged by the rules as if it stood, signed through ssh-keygen, verified and kept."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations.digest import sha256
from trunnion.calculations.issue import is_issued
from trunnion.errors import RecordError
from trunnion.records import layout, moments, openssh, rules
from trunnion.records import statements as st
from trunnion.records.casework import Trust, case_of
from trunnion.records.keylist import fingerprint, public_blob
from trunnion.records.rules import Case, State
from trunnion.records.statements import Signed
from trunnion.records.verification import Outcome, Verified

ALL = "all"


@dataclass(frozen=True)
class Wish:
    """What somebody wants to sign: role, calculations, and for a check its method, reference and recomputation."""

    role: str
    calculations: tuple[str, ...] = (ALL,)
    key: Path | None = None
    by: str | None = None
    method: str | None = None
    reference: str = ""
    unchanged: bool = False
    deviation: str | None = None
    time: str | None = None


def sign(workbook: Any, results: dict[str, Any], wish: Wish, trust: Trust | None = None) -> Path:
    """Sign; returns the statement kept. RecordError says which rule or key stands against it."""
    revision = workbook.document.revision
    if is_issued(workbook.root, revision):
        raise RecordError(f"revision {revision} is issued; nothing is added to it", remedy="trunnion revise WORKBOOK")
    case = case_of(workbook, results, trust)
    key, blob = _key(case, wish)
    person = _person(workbook, case, wish, blob)
    time = moments.stated(wish.time)
    statement = _statement(workbook, case, wish, person, time)
    _require_rules(case, statement, blob)
    content = st.canonical(statement)
    signature = openssh.sign(content, namespace=layout.namespace(wish.role), key=key)
    verified = st.verify_statement(content, signature, statement, case.keys)
    if not verified.good:
        raise RecordError(
            f"the signature made is {verified.text}", remedy=_listing(person["id"], wish.role, fingerprint(blob))
        )
    return st.keep(layout.signatures_folder(workbook.root, workbook.document.revision), statement, signature)


def resolve_key(case: Case, role: str, key: Path | None) -> tuple[Path, bytes]:
    """The key to sign with and its public blob: as named, or the one key of the agent that may sign as `role`."""
    return _key(case, Wish(role, key=key))


def _key(case: Case, wish: Wish) -> tuple[Path, bytes]:
    if wish.key is not None:
        return wish.key, openssh.public_key(wish.key)
    home = Path.home() / ".ssh"
    offered = {public_blob(line)[1] for line in openssh.agent_keys()}
    for path in sorted(home.glob("*.pub")):
        blob = openssh.public_key(path)
        if blob in offered and any(e.grants(layout.namespace(wish.role)) for e in case.keys.listed.of(blob)):
            return path, blob
    raise RecordError(
        "no key is named, and the agent offers none that may sign here", remedy="name one: --key ~/.ssh/id_ed25519"
    )


def _person(workbook: Any, case: Case, wish: Wish, blob: bytes) -> dict[str, str]:
    space = layout.namespace(wish.role)
    granted = [entry for entry in case.keys.listed.of(blob) if entry.grants(space)]
    own = [person for person in workbook.people if any(entry.stands_for(person.id) for entry in granted)]
    if wish.by is not None:
        own = [person for person in own if person.id == wish.by]
    if len(own) != 1:
        whose = " and ".join(person.id for person in own) if own else f"nobody who signs as {wish.role}"
        raise RecordError(
            f"by the key list this key speaks for {whose}",
            remedy=_listing(wish.by or "PERSON", wish.role, fingerprint(blob))
            if not own
            else "say who signs with --by",
        )
    if wish.role not in (own[0].signs_as or ()):
        raise RecordError(
            f"{own[0].id} does not sign as {wish.role} in this workbook", remedy="people: signs as, in workbook.yaml"
        )
    return {"id": own[0].id, "name": own[0].name}


def _listing(person: str, role: str, key: str) -> str:
    return (
        f"the key list ({layout.KEYS}) needs a line such as\n"
        f'    {person} namespaces="{layout.namespace(role)}" ssh-ed25519 AAAA…   (the public key {key})'
    )


def _statement(workbook: Any, case: Case, wish: Wish, person: dict[str, str], time: str) -> dict[str, Any]:
    if wish.deviation is not None:
        return _deviation(case, wish, person, time)
    names = _names(case, wish)
    made = rules.statement_of(case, names, role=wish.role, person=person, time=time)
    if wish.unchanged:
        return {**made, "calculations": [_by_reference(case, entry, wish.role) for entry in made["calculations"]]}
    if wish.role != "checked":
        return made
    if wish.method not in st.METHODS:
        raise RecordError(
            "a check has a method", remedy="--method with one of: " + "; ".join(repr(method) for method in st.METHODS)
        )
    if not wish.reference.strip():
        raise RecordError("a check has a reference", remedy="--reference 'hand calculation HC-3, pages 1 to 4'")
    made["method"] = {"of check": wish.method, "reference": wish.reference.strip()}
    made["recomputed"] = _recomputed(workbook, case)
    return made


def _deviation(case: Case, wish: Wish, person: dict[str, str], time: str) -> dict[str, Any]:
    if wish.role != "approved":
        raise RecordError("a deviation is signed by an approver", remedy="--as approved --deviation ID")
    if wish.deviation not in case.deviations:
        known = ", ".join(case.deviations) or "none"
        raise RecordError(f"there is no deviation {wish.deviation}", remedy=f"known: {known}")
    return {
        "schema": st.SCHEMA,
        "kind": st.DEVIATION,
        "document": {name: case.document[name] for name in ("number", "revision")},
        "role": wish.role,
        "person": person,
        "time": time,
        "deviation": rules.deviation_content(case, str(wish.deviation)),
    }


def _names(case: Case, wish: Wish) -> list[str]:
    known = [entry["id"] for entry in case.results["calculations"]]
    ready = case.contents
    if wish.unchanged and ALL in wish.calculations:
        found = [name for name in ready if _former(case, name, wish.role) is not None]
        if not found:
            raise RecordError("no calculation is unchanged since it was signed", remedy="check them in full")
        return found
    wanted = known if ALL in wish.calculations else list(dict.fromkeys(wish.calculations))
    unknown = [name for name in wanted if name not in known]
    if unknown:
        raise RecordError(f"there is no calculation {', '.join(unknown)}", remedy=f"known: {', '.join(known)}")
    lacking = [name for name in wanted if name not in ready]
    if lacking or not wanted:
        raise RecordError(f"not complete: {', '.join(lacking) or 'no calculation'}", remedy="trunnion compute WORKBOOK")
    return wanted


def _former(case: Case, name: str, role: str) -> Signed | None:
    """The last signed statement of an earlier revision of this document that covers the very content."""
    content = case.contents[name]
    found = [
        signed
        for signed in case.former.values()
        if signed.verified.good and signed.kind == st.SIGNATURE and signed.role == role
        and signed.statement["document"]["number"] == case.document["number"]
        and signed.statement["document"]["revision"] != case.document["revision"]
        and name in signed.entries and rules.covers(signed.entries[name], content)
    ]  # fmt: skip
    return max(found, key=lambda signed: signed.time, default=None)


def _by_reference(case: Case, entry: dict[str, Any], role: str) -> dict[str, Any]:
    former = _former(case, entry["id"], role)
    if former is None:
        raise RecordError(
            f"{entry['id']} is not what was signed as {role} at an earlier revision", remedy="sign it in full"
        )
    revision = former.statement["document"]["revision"]
    return {
        **entry,
        "by_reference": {
            "revision": revision,
            "statement": former.digest,
            "words": f"unchanged since {revision}, {role} there by {former.person_name} on {former.time[:10]}",
        },
    }


def _recomputed(workbook: Any, case: Case) -> dict[str, Any] | None:
    """The comparison of a recomputation, where one was made of these very results."""
    path = layout.recomputed_file(workbook.root, str(case.document["revision"]))
    if not path.is_file():
        return None
    from trunnion.calculations.baselines import read_json

    found = read_json(path)
    bodies = {name: content.body for name, content in case.contents.items()}
    if found.get("of") != bodies:
        return None
    return {"summary": found["summary"], "platform": found["platform"], "sha256": sha256(path.read_bytes())}


def _require_rules(case: Case, statement: dict[str, Any], blob: bytes) -> None:
    """Refuse what the rules would call broken, before anybody touches a key."""
    verified = Verified(Outcome.GOOD, "", fingerprint(blob))
    supposed = Signed("supposed", st.canonical(statement), b"", statement, verified)
    before = rules.judge(case)
    after = rules.judge(dataclasses.replace(case, signed=[*case.signed, supposed]))
    broken = [text for text in after.broken if text not in before.broken]
    if statement["kind"] == st.DEVIATION:
        mark = rules.deviation_mark(dataclasses.replace(case, signed=[supposed]), statement["deviation"]["id"])
        broken += [f"{mark.calculation}: {mark.why or mark.state.value}"] if mark.state is not State.SIGNED else []
    else:
        broken += _missing_before(after, statement)
        if statement["role"] == "approved":
            broken += [f"{text} (bars approval)" for text in after.bars]
    if broken:
        raise RecordError("this signature would break the rules:\n" + "\n".join(f"    {text}" for text in broken),
                          remedy="trunnion status WORKBOOK shows who has signed what and what is missing")  # fmt: skip


def _missing_before(standing: rules.Standing, statement: dict[str, Any]) -> list[str]:
    found = []
    for entry in statement["calculations"]:
        for role in layout.ROLES[: layout.ROLES.index(statement["role"]) + 1]:
            mark = standing.marks[entry["id"], role]
            if mark.state is not State.SIGNED:
                found.append(f"{entry['id']}, {role}: {mark.state.value}" + (f" ({mark.why})" if mark.why else ""))
    return found


def statements_used(standing: rules.Standing, case: Case) -> Sequence[Signed]:
    """The statements a revision rests on: those behind marks that stand, and approved deviations."""
    used = {mark.signed.name: mark.signed for mark in standing.marks.values()
            if mark.signed and mark.state is State.SIGNED}  # fmt: skip
    for name in standing.approved_deviations:
        signed = rules.deviation_mark(case, name).signed
        if signed is not None:
            used[signed.name] = signed
    return list(used.values())
