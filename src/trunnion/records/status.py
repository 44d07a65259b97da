"""Who has signed what, what has fallen, what is missing, and what changed about keys and roles since the last issue."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations.baselines import issued_folder, issued_revisions, read_json
from trunnion.calculations.issue import is_issued
from trunnion.calculations.plan import plan
from trunnion.errors import RecordError
from trunnion.records import layout, rules
from trunnion.records import statements as st
from trunnion.records.casework import Trust, case_of, signature_files, stored_results
from trunnion.records.keylist import KeyList, parse_keys
from trunnion.records.rules import Case, Standing


@dataclass(frozen=True)
class Status:
    """The state of a revision."""

    revision: str
    issued: bool
    case: Case
    standing: Standing
    changes: tuple[str, ...]
    wrong: tuple[str, ...]
    unread: tuple[str, ...]
    out_of_date: tuple[str, ...] = ()

    @property
    def ready(self) -> bool:
        """Whether it may be issued (or was)."""
        return self.standing.complete and not (self.wrong or self.out_of_date)

    def plain(self) -> dict[str, Any]:
        """The status as JSON."""
        marks = [
            {"calculation": mark.calculation, "role": mark.role, "state": mark.state.value, "why": mark.why,
             "person": mark.signed.person if mark.signed else None, "time": mark.signed.time if mark.signed else None,
             "key": mark.signed.verified.fingerprint if mark.signed else None}
            for mark in self.standing.marks.values()
        ]  # fmt: skip
        return {
            "revision": self.revision,
            "issued": self.issued,
            "ready": self.ready,
            "signatures": marks,
            "broken": list(self.standing.broken),
            "bars": list(self.standing.bars),
            "changes_of_keys_and_roles": list(self.changes),
            "out_of_date": list(self.out_of_date),
            "unreadable": [*self.wrong, *self.unread],
            "findings": [{"id": f.id, "state": f.state, "text": f.text} for f in self.case.findings],
        }


def status(workbook: Any, results: Mapping[str, Any], trust: Trust | None = None) -> Status:
    """The status of a loaded workbook."""
    case = case_of(workbook, results, trust)
    revision = workbook.document.revision
    _, wrong = st.read_signed(signature_files(workbook.root, revision), case.keys)
    unread = tuple(f"line {line} of the key list: {why}" for line, why in case.keys.listed.unread)
    return Status(
        revision=revision,
        issued=is_issued(workbook.root, revision),
        case=case,
        standing=rules.judge(case),
        changes=tuple(changes_since_issue(workbook.root, case)),
        wrong=tuple(wrong),
        unread=unread,
        out_of_date=() if is_issued(workbook.root, revision) else tuple(_out_of_date(workbook, results)),
    )


def _out_of_date(workbook: Any, results: Mapping[str, Any]) -> list[str]:
    """Calculations whose last results are not of the spec, data and program of today."""
    computed = {entry["id"]: entry["key"] for entry in results["calculations"]}
    planned = plan(workbook, allow_local=True)
    return [f"{entry.id} is to be computed again" for entry in planned if computed.get(entry.id) != entry.key]


def signatures_on(workbook: Any, calculations: Collection[str], output: Path | None = None) -> list[str]:
    """Signatures that stand now and rest on some calculations, which they lose when these change."""
    try:
        results = stored_results(workbook, output)
    except RecordError:
        return []
    marks = rules.judge(case_of(workbook, results)).marks.values()
    return [
        f"{mark.calculation}: {mark.role} by {mark.signed.person_name}, {mark.signed.time[:10]}"
        for mark in marks
        if mark.signed is not None and mark.state is rules.State.SIGNED and mark.calculation in calculations
    ]


def changes_since_issue(root: Path, case: Case) -> list[str]:
    """Keys and roles that came, went or changed since the last issue of another revision."""
    issued = [name for name in issued_revisions(root) if name != case.document["revision"]]
    folder = issued_folder(root) / issued[-1] / layout.RECORD if issued else None
    if folder is None or not (folder / "record.json").is_file():
        return []
    try:
        record = read_json(folder / "record.json")
        roles = {person["id"]: tuple(person["signs_as"]) for person in record["people"]}
        keys = parse_keys((folder / layout.KEYS).read_bytes())
    except (OSError, KeyError, TypeError) as err:
        raise RecordError(f"the record of revision {issued[-1]} can't be read", remedy="see version control") from err
    return [*_roles(roles, case.roles, issued[-1]), *_keys(keys, case.keys.listed, issued[-1])]


def _roles(old: Mapping[str, tuple[str, ...]], new: Mapping[str, tuple[str, ...]], since: str) -> list[str]:
    return [
        f"{name}: signs as {_words(old.get(name))} → {_words(new.get(name))} since {since}"
        for name in dict.fromkeys((*old, *new))
        if old.get(name) != new.get(name)
    ]


def _words(roles: tuple[str, ...] | None) -> str:
    return "(not a person of it)" if roles is None else ", ".join(roles) or "nothing"


def _keys(old: KeyList, new: KeyList, since: str) -> list[str]:
    before = {_line(entry): entry for entry in old.entries}
    after = {_line(entry): entry for entry in new.entries}
    came = [
        f"key {e.fingerprint} of {e.principals}: new or changed since {since}"
        for n, e in after.items()
        if n not in before
    ]
    gone = [f"key {e.fingerprint} of {e.principals}: gone since {since}" for n, e in before.items() if n not in after]
    return came + gone


def _line(entry: Any) -> tuple[Any, ...]:
    return (entry.principals, entry.blob, entry.namespaces, entry.valid_after, entry.valid_before)
