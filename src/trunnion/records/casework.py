"""A workbook's revision as the rules judge it: what was computed, the people, keys, statements and findings."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import store
from trunnion.calculations.baselines import RESULTS, issued_folder, issued_revisions, read_json
from trunnion.calculations.impact import without_source
from trunnion.calculations.issue import is_issued
from trunnion.errors import RecordError
from trunnion.records import layout
from trunnion.records import statements as st
from trunnion.records.findings import Finding, all_findings
from trunnion.records.keylist import read_keys
from trunnion.records.rules import Case
from trunnion.records.statements import Signed
from trunnion.records.verification import Keys

NO_SOURCE = "this input cites no source"


@dataclass(frozen=True)
class Trust:
    """Where keys come from: files given from outside, or the workbook's own list."""

    signers: Path | None = None
    revoked: Path | None = None


def stored_results(workbook: Any, output: Path | None = None) -> dict[str, Any]:
    """`results.json` of the revision in work; RecordError where nothing was computed."""
    revision = workbook.document.revision
    issued = issued_folder(workbook.root) / revision / RESULTS
    folder = store.revision_folder(workbook.root, revision, output).path
    path = issued if is_issued(workbook.root, revision) else folder / RESULTS
    if not path.is_file():
        raise RecordError(f"revision {revision} is not computed", remedy="trunnion compute WORKBOOK")
    return read_json(path)


def case_of(workbook: Any, results: Mapping[str, Any], trust: Trust | None = None, latest: str | None = None) -> Case:
    """The case of a loaded workbook and its results."""
    keys = keys_of(workbook.root, trust or Trust())
    files = signature_files(workbook.root, workbook.document.revision)
    signed, _ = st.read_signed(files, keys)
    return Case(
        results=results,
        roles={person.id: tuple(person.signs_as or ()) for person in workbook.people},
        keys=keys,
        signed=signed,
        former=former_statements(workbook.root, keys),
        approver_may_check=bool(workbook.document.approver_may_check),
        open_assumptions=[entry.id for entry in workbook.assumptions if entry.status == "open"],
        findings=findings_of(workbook, results),
        deviations=deviations_of(workbook),
        latest=latest,
    )


def keys_of(root: Path, trust: Trust) -> Keys:
    """The keys to judge by; an empty list where the workbook has none."""
    signers = trust.signers or layout.keys_file(root)
    revoked = trust.revoked or layout.revoked_file(root)
    listed = read_keys(signers).text if trust.signers or signers.is_file() else b""
    if trust.revoked is not None and not revoked.is_file():
        raise RecordError(f"there is no list of revoked keys {revoked}", remedy="public keys, one a line, or a KRL")
    return Keys(listed, revoked.read_bytes() if revoked.is_file() else None)


def deviations_of(workbook: Any) -> dict[str, dict[str, Any]]:
    """Deviations in the words that are signed."""
    return {
        entry.id: {
            "requirement": entry.requirement,
            "reason": entry.reason,
            "limits": entry.limits,
            "expires": entry.expires,
            "approved by": entry.approved_by,
        }
        for entry in workbook.deviations
    }


def findings_of(workbook: Any, results: Mapping[str, Any]) -> list[Finding]:
    """Findings of people, of calculations, and inputs without a source; as issued where the revision is issued."""
    path = issued_folder(workbook.root) / workbook.document.revision / layout.RECORD / "findings.json"
    if is_issued(workbook.root, workbook.document.revision) and path.is_file():
        return read_findings(path.read_bytes())
    unsourced = [Finding(f"source:{part}", part, NO_SOURCE) for part in without_source(workbook)]
    return all_findings(workbook.root, results, unsourced)


def read_findings(content: bytes) -> list[Finding]:
    """The findings of an issued revision; RecordError if they can't be read."""
    try:
        rows = json.loads(content)
        return [Finding(**{name: str(row[name]) for name in Finding.__dataclass_fields__}) for row in rows]
    except (ValueError, KeyError, TypeError, RecursionError) as err:
        raise RecordError(
            f"the issued findings can't be read ({err!r})", remedy="take them from version control"
        ) from err


def signature_files(root: Path, revision: str) -> dict[str, bytes]:
    """Statements and signatures of a revision: those in work, or those issued with it."""
    if is_issued(root, revision):
        return st.files_in(issued_folder(root) / revision / layout.RECORD / "signatures")
    return st.files_in(layout.signatures_folder(root, revision))


def former_files(root: Path) -> dict[str, bytes]:
    """Statements and signatures issued with earlier revisions."""
    found: dict[str, bytes] = {}
    for revision in issued_revisions(root):
        for name in ("signatures", "former"):
            found |= st.files_in(issued_folder(root) / revision / layout.RECORD / name)
    return found


def former_statements(root: Path, keys: Keys) -> dict[str, Signed]:
    """Signed statements of earlier revisions by digest, verified with the keys of today at their stated times."""
    signed, _ = st.read_signed(former_files(root), keys)
    return {entry.digest: entry for entry in signed}
