"""The gate before a revision is issued, and the record that is frozen with it."""

from __future__ import annotations

import importlib.metadata
import json
import platform
import sys
from collections.abc import Mapping
from typing import Any

from trunnion import __version__
from trunnion.errors import RecordError
from trunnion.records import layout, moments, rules
from trunnion.records.casework import Trust, case_of
from trunnion.records.rules import Case, Standing
from trunnion.records.signing import statements_used
from trunnion.records.statements import Signed

_SHOWN = 30


def require_ready(workbook: Any, results: Mapping[str, Any], day: str, trust: Trust | None = None) -> Case:
    """RecordError naming every rule that is not met; returns the case that is complete."""
    case = case_of(workbook, results, trust, latest=moments.end_of(day))
    standing = rules.judge(case)
    if not standing.complete:
        lacking = [*standing.bars, *standing.broken, *standing.missing]
        listed = "\n".join(f"    {text}" for text in lacking[:_SHOWN])
        more = f"\n    … and {len(lacking) - _SHOWN} more" if len(lacking) > _SHOWN else ""
        raise RecordError(
            f"revision {case.document['revision']} can't be issued:\n{listed}{more}",
            remedy="trunnion status WORKBOOK shows who has signed what and what is missing",
        )
    return case


def record_files(workbook: Any, case: Case, day: str) -> dict[str, bytes]:
    """What is frozen beside results and spec: statements, signatures, keys, findings, environment. By path."""
    standing = rules.judge(case)
    used = statements_used(standing, case)
    files = _signed_files("signatures", used)
    files |= _signed_files("former", _referred(case, used))
    files[layout.KEYS] = case.keys.signers
    if case.keys.revoked is not None:
        files[layout.REVOKED] = case.keys.revoked
    files["findings.json"] = _json([finding.plain() for finding in case.findings])
    files["environment.json"] = _json(environment())
    files["record.json"] = _json(_record(workbook, case, standing, day))
    return {f"{layout.RECORD}/{name}": content for name, content in sorted(files.items())}


def environment() -> dict[str, Any]:
    """The machine and every installed distribution with its version."""
    names = {dist.metadata["Name"]: dist.version for dist in importlib.metadata.distributions()}
    return {
        "trunnion": __version__,
        "python": sys.version.split()[0],
        "implementation": platform.python_implementation(),
        "system": platform.system(),
        "release": platform.release(),
        "machine": platform.machine(),
        "distributions": dict(sorted((str(name), version) for name, version in names.items())),
    }


def _record(workbook: Any, case: Case, standing: Standing, day: str) -> dict[str, Any]:
    return {
        "schema": 1,
        "document": {name: case.document[name] for name in ("number", "revision", "title", "supersedes")},
        "day": day,
        "people": [
            {"id": person.id, "name": person.name, "signs_as": list(person.signs_as or ())}
            for person in workbook.people
        ],
        "approver_may_check": case.approver_may_check,
        "open_assumptions": list(case.open_assumptions),
        "deviations": {name: dict(deviation) for name, deviation in case.deviations.items()},
        "approved_deviations": sorted(standing.approved_deviations),
    }


def _referred(case: Case, used: Any) -> list[Signed]:
    """Former statements that signatures by reference name, and those these name in turn."""
    found: dict[str, Signed] = {}
    left = list(used)
    while left:
        for entry in left.pop().entries.values():
            former = case.former.get(str((entry.get("by_reference") or {}).get("statement")))
            if former is not None and former.digest not in found:
                found[former.digest] = former
                left.append(former)
    return list(found.values())


def _signed_files(folder: str, signed: Any) -> dict[str, bytes]:
    files: dict[str, bytes] = {}
    for entry in signed:
        files[f"{folder}/{entry.name}.json"] = entry.content
        files[f"{folder}/{entry.name}.json.sig"] = entry.signature
    return files


def _json(value: Any) -> bytes:
    return (json.dumps(value, indent=1, sort_keys=True, ensure_ascii=False, allow_nan=False) + "\n").encode("utf-8")
