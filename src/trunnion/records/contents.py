"""What a signature covers of a calculation: its body and results by digest, and the verdicts that rest on it.

Everything is taken from `results.json`, so that an archive can be judged without its spec. Titles, pages, limits that
no verdict of the calculation rests on, and the time of binding take no part.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from trunnion.calculations.digest import sha256_json
from trunnion.errors import RecordError

MEETS = "meets"


@dataclass(frozen=True)
class Content:
    """The signed content of one calculation."""

    id: str
    body: str
    results: str
    verdicts: tuple[Mapping[str, Any], ...]

    def plain(self) -> dict[str, Any]:
        """The content as a statement has it."""
        return {"id": self.id, "body": self.body, "results": self.results, "verdicts": [dict(v) for v in self.verdicts]}


def contents(results: Mapping[str, Any]) -> dict[str, Content]:
    """The content of every calculation that was computed, by id; RecordError if the results can't be read."""
    try:
        return {
            entry["id"]: Content(
                id=str(entry["id"]),
                body=str(entry["digest"]),
                results=results_digest(entry),
                verdicts=tuple(_verdicts(results, entry["id"])),
            )
            for entry in results["calculations"]
            if entry["state"] == "computed"
        }
    except (KeyError, TypeError, ValueError) as err:
        raise RecordError(f"the results can't be read ({err!r})", remedy="compute the workbook again") from err


def results_digest(entry: Mapping[str, Any]) -> str:
    """Digest of what one calculation of `results.json` records, and of the inputs it read."""
    inputs = {file["path"]: file["sha256"] for file in entry["inputs"]}
    return sha256_json({**{name: entry[name] for name in ("results", "checks", "findings")}, "inputs": inputs})


def requirements_digest(results: Mapping[str, Any]) -> str:
    """Digest of all verdicts and decisions: what an approver answers for beyond single calculations."""
    rows = [_row(row, candidate) for row in results["requirements"] for candidate in row["candidates"]]
    return sha256_json({"requirements": rows, "decisions": results["decisions"]})


def open_verdicts(results: Mapping[str, Any], approved: frozenset[str]) -> list[str]:
    """Counting verdicts that bar approval: neither met nor accepted by an approved deviation."""
    return [
        f"{row['id']}: {row['verdict'] or 'not shown'}"
        + (f" ({row['deviation']} is not approved)" if row["deviation"] else "")
        for row in results["requirements"]
        if row["verdict"] != MEETS and row["deviation"] not in approved
    ]


def incomplete(results: Mapping[str, Any]) -> list[str]:
    """Calculations that failed or were not run, and independent checks that do not agree."""
    found = [f"{entry['id']} is {entry['state']}" for entry in results["calculations"] if entry["state"] != "computed"]
    for entry in results["calculations"]:
        found += [
            f"{entry['id']}: check {c['id']} does not agree" for c in entry["checks"] if c.get("agrees") is not True
        ]
    return found


def _verdicts(results: Mapping[str, Any], calculation: str) -> list[dict[str, Any]]:
    return [
        _row(row, candidate)
        for row in results["requirements"]
        for candidate in row["candidates"]
        if any(part["calculation"] == calculation for part in candidate["parts"])
    ]


def _row(row: Mapping[str, Any], candidate: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "requirement": row["id"],
        "asks": row["asks"],
        "basis": row["basis"],
        "candidate": candidate["name"],
        "counts": candidate["counts"],
        "verdict": candidate["verdict"],
    }
