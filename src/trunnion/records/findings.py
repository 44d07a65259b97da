"""Findings: what a person or a calculation holds against a calculation, requirement, input or cell.

Numbered when added, answered by a preparer, closed by the one who found it. One file a finding, under version control.
What calculations record themselves is open until somebody with the check or the approval closes it; if its text
changes, it is open again.
"""

from __future__ import annotations

import json
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.calculations.digest import sha256
from trunnion.errors import RecordError
from trunnion.records import layout, moments

SCHEMA = 1
OPEN, ANSWERED, CLOSED = "open", "answered", "closed"
RECORDED = "recorded by the calculation"
_NUMBERED = re.compile(r"F(\d+)")


@dataclass(frozen=True)
class Finding:
    """One finding and what became of it; `by` is the finder's id, or "" for what a calculation records."""

    id: str
    against: str
    text: str
    by: str = ""
    time: str = ""
    answer: str = ""
    answered_by: str = ""
    closed_by: str = ""
    closed_because: str = ""

    @property
    def state(self) -> str:
        """open, answered or closed; only closed ones do not bar approval."""
        return CLOSED if self.closed_by else ANSWERED if self.answered_by else OPEN

    def plain(self) -> dict[str, Any]:
        """The finding as it is kept."""
        return {"schema": SCHEMA, **self.__dict__}


def stored(workbook: Path) -> list[Finding]:
    """Findings kept with a workbook, in order of number."""
    folder = layout.findings_folder(workbook)
    files = sorted(folder.glob("*.json")) if folder.is_dir() else []
    return sorted((_read(path) for path in files), key=lambda finding: _order(finding.id))


def all_findings(workbook: Path, results: Mapping[str, Any], others: Sequence[Finding] = ()) -> list[Finding]:
    """Stored findings and those recorded by calculations (and `others` found in the spec), each once."""
    kept = {finding.id: finding for finding in stored(workbook)}
    found = [*recorded(results), *others]
    merged = [_merged(finding, kept.pop(finding.id, None)) for finding in found]
    gone = [finding for finding in kept.values() if finding.by]  # what is recorded no more needs no answer
    return [*gone, *merged]


def recorded(results: Mapping[str, Any]) -> list[Finding]:
    """Findings that calculations record, from `results.json`: `C02/find:box`."""
    return [
        Finding(
            f"{entry['id']}/{finding['id']}", str(finding.get("against", entry["id"])), str(finding.get("text", ""))
        )
        for entry in results["calculations"]
        for finding in entry["findings"]
    ]


def add(workbook: Any, *, against: str, text: str, by: str, time: str | None = None) -> Finding:
    """Add a finding of a person against something the workbook knows; returns it with its number."""
    _require_person(workbook, by)
    _require_subject(workbook, against)
    if not text.strip():
        raise RecordError("a finding says something", remedy="--text 'the limit is taken from an old edition'")
    numbers = [int(found[1]) for f in stored(workbook.root) if (found := _NUMBERED.fullmatch(f.id))]
    finding = Finding(f"F{max(numbers, default=0) + 1}", against, text.strip(), by, moments.stated(time))
    return _keep(workbook.root, finding)


def answer(workbook: Any, finding: Finding, *, text: str, by: str) -> Finding:
    """Answer a finding; only one who signs as prepared may, and not to one that is closed."""
    person = _require_person(workbook, by)
    if "prepared" not in (person.signs_as or ()):
        raise RecordError(f"{by} does not sign as prepared, and findings are answered by the preparer", remedy="--by")
    if finding.state == CLOSED:
        raise RecordError(f"{finding.id} is closed", remedy="add a new finding")
    return _keep(workbook.root, _with(finding, answer=text.strip(), answered_by=by))


def close(workbook: Any, finding: Finding, *, by: str, because: str = "") -> Finding:
    """Close an answered finding: by its finder, or by a checker or approver where a calculation recorded it."""
    person = _require_person(workbook, by)
    if finding.state == CLOSED:
        raise RecordError(f"{finding.id} is closed already", remedy="nothing is to be done")
    if finding.state == OPEN:
        raise RecordError(f"{finding.id} is not answered yet", remedy="trunnion finding answer")
    if finding.by and finding.by != by:
        raise RecordError(f"{finding.id} is {finding.by}'s, who alone closes it", remedy=f"--by {finding.by}")
    if not finding.by and not {"checked", "approved"} & set(person.signs_as or ()):
        raise RecordError(f"{by} neither checks nor approves", remedy="let a checker close what a calculation found")
    return _keep(workbook.root, _with(finding, closed_by=by, closed_because=because.strip()))


def named(findings: Sequence[Finding], name: str) -> Finding:
    """The finding of that id; RecordError names those there are."""
    found = next((finding for finding in findings if finding.id == name), None)
    if found is None:
        known = ", ".join(finding.id for finding in findings) or "none"
        raise RecordError(f"there is no finding {name}", remedy=f"known: {known}")
    return found


def _keep(root: Path, finding: Finding) -> Finding:
    folder = writes.make_folder(layout.findings_folder(root))
    name = finding.id if _NUMBERED.fullmatch(finding.id) else "R-" + sha256(finding.id.encode())[:12]
    writes.write_json(folder / f"{name}.json", finding.plain())
    return finding


def _with(finding: Finding, **fields: str) -> Finding:
    return Finding(**{**finding.__dict__, **fields})


def _merged(found: Finding, kept: Finding | None) -> Finding:
    return kept if kept is not None and kept.text == found.text and kept.against == found.against else found


def _read(path: Path) -> Finding:
    try:
        plain = json.loads(path.read_bytes())
        fields = {name: plain[name] for name in Finding.__dataclass_fields__}
        if plain["schema"] != SCHEMA or not all(isinstance(value, str) for value in fields.values()):
            raise ValueError("it is of another form")
    except (OSError, ValueError, KeyError, TypeError) as err:
        raise RecordError(f"the finding {path} can't be read ({err})", remedy="take it from version control") from err
    return Finding(**fields)


def _order(name: str) -> tuple[int, str]:
    found = _NUMBERED.fullmatch(name)
    return (int(found[1]) if found else 10**9, name)


def _require_person(workbook: Any, name: str) -> Any:
    person = next((person for person in workbook.people if person.id == name), None)
    if person is None:
        known = ", ".join(person.id for person in workbook.people) or "none"
        raise RecordError(f"there is no person {name} in the workbook", remedy=f"known: {known}")
    return person


def _require_subject(workbook: Any, against: str) -> None:
    """Calculations (`C02`, or a cell of one, `C02 cell 4`), requirements, decisions and other parts by id or path."""
    words = against.split()
    listed = ("calculations", "requirements", "decisions", "assumptions", "deviations", "sources")
    named_parts = ("conventions", "envelopes", "mounts", "frames")
    known = {name for section in (*listed, *named_parts) for name in workbook.names(section)}
    tables = {str(getattr(envelope, "table", "")) for envelope in workbook.envelopes.values()} - {"", "None"}
    cell = len(words) == 3 and words[1] == "cell" and words[2].isdigit() and words[0] in workbook.names("calculations")
    if not (cell or against in known | tables or against.rpartition(".")[2] in known):
        raise RecordError(
            f"the workbook has no '{against}' to hold a finding against",
            remedy="name a calculation, requirement, input or decision by its id, or a cell as in 'C02 cell 4'",
        )
