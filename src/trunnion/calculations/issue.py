"""Freezing a revision: what is issued is never changed, only superseded or withdrawn.

`<workbook>/issued/<revision>/` holds what change and comparison need, small and fit for version control: results, the
spec as read, digests. `digests.json` lists the SHA-256 of the two others, of every file of the output folder, and the
seal (its own SHA-256) of the issue it supersedes, so that an issue altered together with its digests shows as soon as
another one follows it. Whose issue it is, signatures tell, not this module.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import keys, writes
from trunnion.calculations.baselines import (
    DIGESTS,
    RESULTS,
    SPEC,
    issued_folder,
    issued_revisions,
    read_json,
)
from trunnion.calculations.compute import COMPUTED, Computed
from trunnion.calculations.digest import sha256
from trunnion.calculations.notebooks import canonical_bytes
from trunnion.errors import RecordError, StoreError

SCHEMA = 1
_NOT_FROZEN = ("lock.json", "state.json")


@dataclass(frozen=True)
class Alteration:
    """A file of an issued revision that is not what was issued."""

    revision: str
    path: Path
    what: str  # "changed", "missing", "not issued"

    @property
    def text(self) -> str:
        """The alteration in one line."""
        return f"issued revision {self.revision}: {self.path} is {self.what}"


def freeze(computed: Computed, *, date: str, record: Mapping[str, bytes] | None = None) -> Path:
    """Freeze a computed workbook as its revision; returns the folder under `issued/`.

    `date` is the day of issue (ISO); `record` holds further files to freeze with it (signatures, findings), by
    relative path. RecordError if the revision is issued already, if a calculation failed or was
    not run, or if the revision it supersedes was altered.
    """
    workbook, folder = computed.workbook, computed.folder.path
    revision = workbook.document.revision
    require_issuable(workbook, date=date)
    _require_complete(computed)
    target = writes.make_folder(issued_folder(workbook.root) / revision)
    results = canonical_bytes(computed.results)
    spec = workbook.text.encode("utf-8")
    files = {RESULTS: results, SPEC: spec, **(record or {})}
    digests = {
        "schema": SCHEMA,
        "document": {**computed.results["document"], "issued": date},
        "files": {name: sha256(content) for name, content in files.items()},
        "outputs": output_digests(folder),
        "calculations": {entry.planned.id: _calculation(entry) for entry in computed.done},
        "code": dict(keys.surroundings().code),
        "supersedes": _superseded(workbook),
    }
    for name, content in files.items():
        writes.make_folder((target / name).parent)
        writes.write_bytes(target / name, content)
    writes.write_json(target / DIGESTS, digests)  # last: an issue without it is none
    return target


def alterations(workbook: Path, outputs: Path | None = None) -> list[Alteration]:
    """Every file of every issued revision that was edited behind the tool's back.

    `outputs` is the folder that holds the revision folders of this workbook; what is not there is not missed, since
    outputs can be rebuilt.
    """
    found: list[Alteration] = []
    names = issued_revisions(workbook)
    for name in names:
        folder = issued_folder(workbook) / name
        digests = read_json(folder / DIGESTS)
        found += _altered(name, folder, {**digests["files"], DIGESTS: _seal_known(workbook, names, name)})
        if outputs is not None and (outputs / name).is_dir():
            found += _altered(name, outputs / name, digests["outputs"])
    return found


def require_unaltered(workbook: Path, outputs: Path | None = None) -> None:
    """RecordError naming every altered file of an issued revision."""
    found = alterations(workbook, outputs)
    if found:
        raise StoreError(
            "\n".join(entry.text for entry in found),
            remedy="take the issued files from version control; a change needs a new revision: trunnion revise",
        )


def is_issued(workbook: Path, revision: str) -> bool:
    """Whether a revision is issued."""
    return (issued_folder(workbook) / revision / DIGESTS).is_file()


def issue_date(workbook: Path, revision: str) -> str | None:
    """The day a revision was issued; None if it is not."""
    path = issued_folder(workbook) / revision / DIGESTS
    return str(read_json(path)["document"]["issued"]) if path.is_file() else None


def output_digests(folder: Path) -> dict[str, str]:
    """SHA-256 of every file of a revision's output folder, by relative path."""
    files = [path for path in folder.rglob("*") if path.is_file() and not path.name.startswith(".")]
    return {
        path.relative_to(folder).as_posix(): sha256(path.read_bytes())
        for path in sorted(files)
        if path.name not in _NOT_FROZEN
    }


def _calculation(entry: Any) -> dict[str, Any]:
    return {
        "key": entry.planned.key,
        "parts": dict(entry.planned.parts),
        "digest": entry.digest,
        "sha256": sha256(entry.body),
        "inputs": {path: file.sha256 for path, file in entry.planned.inputs.items()},
    }


def _superseded(workbook: Any) -> dict[str, str] | None:
    former = workbook.document.supersedes
    path = issued_folder(workbook.root) / former / DIGESTS if former else None
    if path is None or not path.is_file():
        return None
    return {"revision": former, "seal": sha256(path.read_bytes())}


def _require_date(date: str) -> None:
    try:
        datetime.date.fromisoformat(date)
    except ValueError as err:
        raise RecordError(f"'{date}' is no day", remedy="write it as 2031-05-28") from err


def require_issuable(workbook: Any, *, date: str) -> None:
    """RecordError if a workbook's revision can't be issued, whatever was computed."""
    _require_date(date)
    revision = workbook.document.revision
    if is_issued(workbook.root, revision):
        raise RecordError(
            f"revision {revision} is issued and never changed", remedy="open the next one: trunnion revise --reason …"
        )
    if workbook.overrides:
        raise RecordError("a trial is never issued", remedy="put the values into the spec")


def _require_complete(computed: Computed) -> None:
    workbook = computed.workbook
    revision = workbook.document.revision
    lacking = [
        f"{entry.planned.id} ({entry.error or entry.state})" for entry in computed.done if entry.state != COMPUTED
    ]
    if lacking:
        raise RecordError(
            f"revision {revision} is not complete: {', '.join(lacking)}", remedy="run trunnion compute until it is"
        )
    require_unaltered(workbook.root, computed.folder.path.parent)


def _seal_known(workbook: Path, names: list[str], name: str) -> str | None:
    """The seal of an issue as the issue that supersedes it recorded it; None where none does."""
    for other in names:
        superseded = read_json(issued_folder(workbook) / other / DIGESTS).get("supersedes")
        if superseded and superseded["revision"] == name:
            return str(superseded["seal"])
    return None


def _altered(revision: str, folder: Path, expected: Mapping[str, str | None]) -> list[Alteration]:
    found = []
    for name, digest in expected.items():
        path = folder / name
        if digest is None:
            continue
        if not path.is_file():
            found.append(Alteration(revision, path, "missing"))
        elif sha256(path.read_bytes()) != digest:
            found.append(Alteration(revision, path, "changed"))
    return found
