"""What a workbook is compared with: the last issued revision, and the last computed state.

An issued revision keeps its baseline in `<workbook>/issued/<revision>/`, a computed one in its output folder. Both
hold the spec as read, `results.json`, and for every calculation the parts of its content key.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations.results import Recorded, result_from_plain
from trunnion.errors import StoreError

SPEC, RESULTS, DIGESTS, STATE = "workbook.yaml", "results.json", "digests.json", "state.json"


@dataclass(frozen=True)
class Baseline:
    """One earlier state: what it is called, its results, and what each calculation depended on."""

    name: str
    revision: str
    folder: Path
    results: Mapping[str, Any]
    calculations: Mapping[str, Mapping[str, Any]]  # id -> {key, parts, inputs, digest, sha256}
    code: Mapping[str, str]

    @property
    def spec(self) -> Path:
        """The spec as it was read then."""
        return self.folder / SPEC

    def key(self, calculation: str) -> str | None:
        """The content key a calculation had."""
        return self.calculations.get(calculation, {}).get("key")

    def recorded(self, calculation: str) -> Recorded | None:
        """What a calculation recorded, from `results.json`."""
        for entry in self.results.get("calculations", []):
            if entry["id"] == calculation and entry["state"] == "computed":
                results = tuple(result_from_plain(calculation, plain) for plain in entry["results"])
                return Recorded(calculation, results, tuple(entry["checks"]), tuple(entry["findings"]))
        return None


def issued_folder(workbook: Path) -> Path:
    """Where issued revisions are kept, under version control."""
    return workbook / "issued"


def issued_revisions(workbook: Path) -> list[str]:
    """Issued revisions in the order in which they supersede each other, the last one last."""
    folder = issued_folder(workbook)
    found: dict[str, str | None] = {}
    for entry in sorted(folder.iterdir()) if folder.is_dir() else []:
        if (entry / DIGESTS).is_file():
            document = read_json(entry / DIGESTS).get("document", {})
            found[entry.name] = document.get("supersedes")
    ordered: list[str] = []
    while len(ordered) < len(found):
        ready = [name for name in found if name not in ordered and found[name] not in set(found) - set(ordered)]
        ordered.extend(ready or [name for name in found if name not in ordered])
    return ordered


def issued_baseline(workbook: Path, revision: str | None = None) -> Baseline | None:
    """The baseline of an issued revision, the last one by default; None if there is none."""
    names = issued_revisions(workbook)
    if revision is None:
        revision = names[-1] if names else None
    if revision is None or revision not in names:
        return None
    folder = issued_folder(workbook) / revision
    digests = read_json(folder / DIGESTS)
    return Baseline(
        name=f"issued revision {revision}",
        revision=revision,
        folder=folder,
        results=read_json(folder / RESULTS),
        calculations=digests["calculations"],
        code=digests.get("code", {}),
    )


def computed_baseline(folder: Path) -> Baseline | None:
    """The baseline of the last computed state in an output folder; None if nothing was computed there."""
    if not (folder / RESULTS).is_file() or not (folder / STATE).is_file():
        return None
    state, results = read_json(folder / STATE), read_json(folder / RESULTS)
    return Baseline(
        name="last computed state",
        revision=str(results.get("document", {}).get("revision", "")),
        folder=folder,
        results=results,
        calculations=state.get("calculations", {}),
        code=state.get("code", {}),
    )


def read_json(path: Path) -> dict[str, Any]:
    """A JSON object from a file of the store; StoreError when it is none."""
    try:
        value = json.loads(path.read_bytes())
    except OSError as err:
        raise StoreError(
            f"{path} can't be read ({err.strerror})", remedy="compute or issue the workbook again"
        ) from err
    except (ValueError, RecursionError) as err:
        raise StoreError(f"{path} is damaged: {err}", remedy="take it from version control, or compute again") from err
    if not isinstance(value, dict):
        raise StoreError(f"{path} is no JSON object", remedy="take it from version control, or compute again")
    return value
