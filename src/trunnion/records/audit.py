"""The audit of an archive: is it whole, does it agree with itself, who vouches for it, were the rules kept?

One row a check, so that a reader sees what was looked at. Keys come from outside; judged by the archive's own list the
best verdict is that it is consistent with itself.
"""

from __future__ import annotations

import enum
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

from trunnion.calculations import judgement
from trunnion.calculations.digest import content_digest, sha256
from trunnion.calculations.notebooks import canonical_bytes
from trunnion.calculations.results import recorded
from trunnion.calculations.sheets import body_bytes_of
from trunnion.errors import RecordError, TrunnionError
from trunnion.records import bag, layout, moments, rules
from trunnion.records import statements as st
from trunnion.records.archive import plain_json
from trunnion.records.casework import deviations_of, read_findings
from trunnion.records.contents import contents
from trunnion.records.keylist import LARGEST
from trunnion.records.reading import opened, wrong_path
from trunnion.records.rules import Case
from trunnion.records.verification import Keys, Outcome, Verified, verify
from trunnion.records.withdrawal import Notice, notices

LARGEST_JSON = 200_000_000
_RECORD = "data/issued/record"


class Verdict(enum.Enum):
    """What an audit ends in."""

    VALID = "valid"
    CONSISTENT = "consistent with the archive's own list; signers not vouched for"
    UNVERIFIED = "not verified"
    NOT_VALID = "not valid"
    WITHDRAWN = "withdrawn"


class Mark(enum.Enum):
    """The outcome of one check."""

    GOOD = "good"
    FAILS = "FAILS"
    UNVERIFIED = "not verified"
    NOTE = "note"


@dataclass(frozen=True)
class Row:
    """One check, its outcome, and what was found."""

    check: str
    mark: Mark
    found: str = ""


@dataclass(frozen=True)
class Audit:
    """The rows, whether keys came from outside, and notices of withdrawal that verify."""

    rows: tuple[Row, ...]
    vouched: bool
    withdrawn: tuple[Notice, ...] = ()
    document: Mapping[str, Any] = field(default_factory=dict)

    @property
    def verdict(self) -> Verdict:
        """The verdict; one failed check is enough."""
        marks = {row.mark for row in self.rows}
        if Mark.FAILS in marks:
            return Verdict.NOT_VALID
        if Mark.UNVERIFIED in marks:
            return Verdict.UNVERIFIED
        if not self.vouched:
            return Verdict.CONSISTENT
        return Verdict.WITHDRAWN if self.withdrawn else Verdict.VALID

    def plain(self) -> dict[str, Any]:
        """The audit as JSON."""
        return {
            "verdict": self.verdict.value,
            "document": dict(self.document),
            "checks": [{"check": row.check, "outcome": row.mark.value, "found": row.found} for row in self.rows],
            "withdrawn": [notice.text for notice in self.withdrawn],
        }


def audit(path: Path, *, signers: bytes | None = None, revoked: bytes | None = None) -> Audit:
    """Audit an archive; what can't even be opened is a failed check too."""
    try:
        with opened(path) as root:
            auditor = _Auditor(root, signers, revoked)
            rows = tuple(auditor.rows())
            found = auditor.withdrawn(path)
    except RecordError as err:
        return Audit((Row("container", Mark.FAILS, err.fault.cause),), signers is not None)
    withdrawn = tuple(notice for notice in found if notice.verified.good)
    told = tuple(Row("withdrawal", Mark.NOTE, notice.text) for notice in found)
    return Audit((*rows, *told), signers is not None, withdrawn, auditor.document)


class _Auditor:
    """One archive under audit. Reads nothing beyond its bounds, believes nothing before the manifests agree."""

    def __init__(self, root: Path, signers: bytes | None, revoked: bytes | None) -> None:
        self.root = root
        self.outside = signers is not None
        own = self.read(f"{_RECORD}/{layout.KEYS}", LARGEST, b"") if signers is None else signers
        if revoked is None and signers is None:
            revoked = self.read(f"{_RECORD}/{layout.REVOKED}", LARGEST, b"") or None
        self.keys = Keys(own, revoked)

    def rows(self) -> Iterator[Row]:
        """Every check in order; the later ones only where the bag is whole."""
        yield Row("container", Mark.GOOD, "opened safely")
        wrong = bag.problems(self.root)
        yield from _listed("bag (RFC 8493) and tag manifest", wrong, "every file listed once and unchanged")
        if wrong:
            return
        checks: dict[str, Callable[[], Iterator[Row]]] = {
            "archive signature": self._signature,
            "issue record": self._issue,
            "executed notebooks": self._bodies,
            "specification": self._spec,
            "signatures and rules": self._rules,
            "requirements": self._requirements,
        }
        for name, check in checks.items():
            try:
                yield from check()
            except TrunnionError as err:
                yield Row(name, Mark.FAILS, err.fault.cause)
            except (ValueError, KeyError, TypeError, AttributeError, IndexError, OSError, RecursionError) as err:
                yield Row(name, Mark.FAILS, f"not in order ({type(err).__name__}: {err})")

    def withdrawn(self, path: Path) -> list[Notice]:
        """Notices beside the archive that are about its document and revision."""
        try:
            return notices(path, self.document, self.keys)
        except (TrunnionError, ValueError, KeyError, TypeError, OSError):
            return []

    # --- files ---

    def read(self, name: str, limit: int = LARGEST_JSON, default: bytes | None = None) -> bytes:
        """A file of the archive, within a limit."""
        path = self.root / name
        if not path.is_file():
            if default is not None:
                return default
            raise RecordError(f"{name} is not in the archive", remedy="take another copy")
        if path.stat().st_size > limit:
            raise RecordError(f"{name} is larger than {limit} bytes", remedy="take another copy")
        return path.read_bytes()

    @cached_property
    def results(self) -> dict[str, Any]:
        """`results.json` as issued."""
        found = plain_json(self.read("data/issued/results.json"))
        contents(found)
        return found

    @cached_property
    def digests(self) -> dict[str, Any]:
        """`digests.json` as issued."""
        return dict(plain_json(self.read("data/issued/digests.json")))

    @cached_property
    def record(self) -> dict[str, Any]:
        """The record frozen at issue."""
        return dict(plain_json(self.read(f"{_RECORD}/record.json")))

    @cached_property
    def document(self) -> dict[str, Any]:
        """Number, revision, title."""
        try:
            return dict(self.results["document"])
        except (TrunnionError, ValueError, KeyError, TypeError, OSError):
            return {}

    @cached_property
    def day(self) -> str:
        """The day of issue; it is the archive's time."""
        return str(self.digests["document"]["issued"])

    @cached_property
    def workbook(self) -> Any:
        """The specification, loaded from the archive; inputs not held are stood in for by empty files elsewhere."""
        from trunnion.records.scratch import workbook_of

        return workbook_of(self.root, self.results)

    # --- checks ---

    def _signature(self) -> Iterator[Row]:
        info = bag.info_of(self.root)
        person = info.get("Trunnion-Archived-By", "")
        if info.get("Bagging-Date") != self.day:
            yield Row("archive signature", Mark.FAILS, "Bagging-Date is not the day of issue")
        at = moments.end_of(self.day)
        signature = self.read(bag.SIGNATURE, LARGEST)
        space = layout.namespace(layout.ARCHIVED)
        found = verify(self.read(bag.TAGS), signature, person=person, namespace=space, at=at, keys=self.keys)
        yield Row("archive signature", _mark(found), f"{person}, key {found.fingerprint}: {found.text}")

    def _issue(self) -> Iterator[Row]:
        digests = self.digests
        wrong = []
        for folder, listed in (("data/issued", digests["files"]), ("data/package", digests["outputs"])):
            for name, digest in listed.items():
                path = self.root / folder / name
                if not path.is_file() or bag.file_digest(path) != digest:
                    wrong.append(f"{folder}/{name} is not what was issued")
            present = {
                name.removeprefix(f"{folder}/") for name in bag.files_of(self.root) if name.startswith(folder + "/")
            }
            wrong += [f"{folder}/{name} was not issued" for name in sorted(present - set(listed) - {"digests.json"})]
        if self.read("data/issued/workbook.yaml") != self.read("data/workbook/workbook.yaml"):
            wrong.append("the specification is not the one that was issued")
        if self.read("data/issued/results.json") != self.read("data/package/results.json"):
            wrong.append("the package holds other results than were issued")
        wrong += self._documents()
        wrong += self._inputs()
        yield from _listed("issue record", wrong, f"issued on {self.day}; files as issued")

    def _documents(self) -> Iterator[str]:
        number, revision = self.document["number"], self.document["revision"]
        named = {"digests.json": self.digests["document"], "record.json": self.record["document"]}
        for name, document in named.items():
            if (document["number"], document["revision"]) != (number, revision):
                yield f"{name} is of another document or revision"
        if self.record["day"] != self.day:
            yield "record.json names another day of issue"
        if bag.info_of(self.root).get("External-Identifier") != f"{number} revision {revision}":
            yield "bag-info.txt names another document or revision"

    def _inputs(self) -> Iterator[str]:
        for entry in self.results["calculations"]:
            for file in entry["inputs"]:
                path = self.root / "data/workbook" / str(file["path"])
                there = path.is_file() and not wrong_path(str(file["path"]))
                if file["held"] is not None and not (there and bag.file_digest(path) == file["sha256"]):
                    yield f"input {file['path']} of {entry['id']} is not the one that was read"

    def _bodies(self) -> Iterator[Row]:
        wrong: list[str] = []
        for entry in self.results["calculations"]:
            wrong += self._body(entry)
        count = len(self.results["calculations"])
        yield from _listed(
            "executed notebooks", wrong, f"{count} say what results.json says; sheets hold them unchanged"
        )

    def _body(self, entry: Mapping[str, Any]) -> Iterator[str]:
        name = str(entry["id"])
        content = self.read(f"data/package/bodies/{entry['key']}.ipynb")
        body = plain_json(content)
        if content_digest(body) != entry["digest"]:
            yield f"the notebook of {name} has another content digest"
        if self.digests["calculations"][name]["sha256"] != sha256(content):
            yield f"the notebook of {name} is not the one issued"
        found = recorded(name, body)
        said = {"results": [r.plain() for r in found.results], "checks": [dict(c) for c in found.checks],
                "findings": [dict(f) for f in found.findings]}  # fmt: skip
        if canonical_bytes(said) != canonical_bytes({key: entry[key] for key in said}):
            yield f"results.json says something else of {name} than its notebook"
        sheet = plain_json(self.read(f"data/package/{name}-{entry['template']}.ipynb"))
        if body_bytes_of(sheet) != content:
            yield f"the sheet of {name} does not hold its notebook unchanged"

    def _spec(self) -> Iterator[Row]:
        try:
            workbook = self.workbook
        except TrunnionError as err:
            yield Row("specification", Mark.FAILS, f"can't be loaded: {err.fault.cause}")
            return
        wrong = []
        document = workbook.document
        if (document.number, document.revision) != (self.document["number"], self.document["revision"]):
            wrong.append("it is of another document or revision than the results")
        people = [{"id": p.id, "name": p.name, "signs_as": list(p.signs_as or ())} for p in workbook.people]
        if people != self.record["people"] or bool(document.approver_may_check) != self.record["approver_may_check"]:
            wrong.append("people or their roles are not those of the issue")
        if [e.id for e in workbook.calculations] != [e["id"] for e in self.results["calculations"]]:
            wrong.append("it has other calculations than the results")
        if self._judged_again(workbook) != canonical_bytes({"rows": self.results["requirements"]}):
            wrong.append("its requirements, judged again on the recorded results, give other verdicts")
        yield from _listed("specification", wrong, "loads; judged again, it gives the recorded verdicts")

    def _judged_again(self, workbook: Any) -> bytes:
        records = {
            entry["id"]: recorded(entry["id"], plain_json(self.read(f"data/package/bodies/{entry['key']}.ipynb")))
            for entry in self.results["calculations"]
        }
        judged = judgement.judge_all(
            workbook.requirements,
            workbook.decisions,
            records,
            conventions=workbook.conventions,
            deviations=workbook.deviations,
            place=workbook.place,
        )
        return canonical_bytes({"rows": judgement.plain_requirements(judged)})

    @cached_property
    def _case(self) -> tuple[Case, list[str]]:
        """The case as it was issued, judged by the keys in force; and statements that can't be read."""
        workbook = self.workbook
        signed, wrong = st.read_signed(st.files_in(self.root / _RECORD / "signatures"), self.keys)
        former, bad = st.read_signed(st.files_in(self.root / _RECORD / "former"), self.keys)
        case = Case(
            results=self.results,
            roles={person.id: tuple(person.signs_as or ()) for person in workbook.people},
            keys=self.keys,
            signed=signed,
            former={entry.digest: entry for entry in former},
            approver_may_check=bool(workbook.document.approver_may_check),
            open_assumptions=[entry.id for entry in workbook.assumptions if entry.status == "open"],
            findings=read_findings(self.read(f"{_RECORD}/findings.json")),
            deviations=deviations_of(workbook),
            latest=moments.end_of(self.day),
        )
        return case, [*wrong, *bad]

    def _rules(self) -> Iterator[Row]:
        case, wrong = self._case
        standing = rules.judge(case)
        for text in wrong:
            yield Row("statement", Mark.FAILS, text)
        for signed in (*case.signed, *case.former.values()):
            told = f"{signed.role} by {signed.person}, {signed.time} (stated by the signer, not proven), "
            yield Row(
                "signature", _mark(signed.verified), told + f"key {signed.verified.fingerprint}: {signed.verified.text}"
            )
        for mark in standing.marks.values():
            if mark.state is not rules.State.SIGNED:
                state = Mark.UNVERIFIED if mark.state is rules.State.UNVERIFIED else Mark.FAILS
                yield Row(
                    "rules of signing", state, f"{mark.calculation}, {mark.role}: {mark.state.value} {mark.why}".strip()
                )
        unlike = sorted(set(self.record["approved_deviations"]) ^ set(standing.approved_deviations))
        broken = [*standing.broken, *(f"deviation {name} is not approved as recorded" for name in unlike)]
        yield from _listed("rules of signing", broken, "three people in order, over this content")

    def _requirements(self) -> Iterator[Row]:
        case, _ = self._case
        barred = rules.bars(case, rules.approved_deviations(case))
        count = len(self.results["requirements"])
        yield from _listed("requirements", barred, f"all {count} met or deviated; nothing open")


def _listed(check: str, wrong: list[str], good: str) -> Iterator[Row]:
    if not wrong:
        yield Row(check, Mark.GOOD, good)
    for text in wrong[:50]:
        yield Row(check, Mark.FAILS, text)
    if len(wrong) > 50:
        yield Row(check, Mark.FAILS, f"and {len(wrong) - 50} more")


def _mark(found: Verified) -> Mark:
    return {Outcome.GOOD: Mark.GOOD, Outcome.BAD: Mark.FAILS, Outcome.UNVERIFIED: Mark.UNVERIFIED}[found.outcome]
