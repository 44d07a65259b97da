"""Recomputing what was recorded: the same calculations run again, here and now, and compared result by result.

For a workbook before it is signed, and for an archive years later. Installed templates of the same name run; where one
differs from the archived one, that is said, and the archived one runs instead after consent to its very content. A
template from elsewhere runs as the user, without isolation, with an environment reduced to `ENVIRONMENT`.
"""

from __future__ import annotations

import dataclasses
import math
import os
import platform
import tempfile
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from trunnion.calculations import store, templates
from trunnion.calculations.digest import content_digest
from trunnion.calculations.plan import Planned, plan
from trunnion.calculations.results import recorded
from trunnion.calculations.run import Job, Outcome, Progress, run
from trunnion.calculations.templates import Template
from trunnion.errors import RecordError, TrunnionError
from trunnion.records import scratch
from trunnion.records.archive import plain_json
from trunnion.records.bag import problems
from trunnion.spec import load_workbook

TOLERANCE = 1e-9  # of a number above 1 in its unit, in that unit below: what another library may change
REPRODUCED, WITHIN, DIFFERS = "reproduced", "reproduced within tolerance", "differs"
NOT_HELD, NOT_RUN = "input not held", "not run"
ENVIRONMENT = ("PATH", "HOME", "USERPROFILE", "LANG", "LC_ALL", "LC_CTYPE", "TMPDIR", "TEMP", "TMP", "SYSTEMROOT",
               "VIRTUAL_ENV", "LD_LIBRARY_PATH")  # fmt: skip
_NUMBERS = ("lo", "hi", "attained")

Consent = Callable[[Template], bool]
Tell = Callable[[Progress], None]


@dataclass(frozen=True)
class ResultRow:
    """One recorded result, then and now."""

    calculation: str
    result: str
    state: str
    then: Mapping[str, Any] | None = None
    now: Mapping[str, Any] | None = None
    why: str = ""

    def plain(self) -> dict[str, Any]:
        """The row as JSON."""
        return dict(self.__dict__)


@dataclass(frozen=True)
class Recomputed:
    """The comparison: rows, what differs of templates and versions, templates consented to, bodies recomputed."""

    document: Mapping[str, Any]
    rows: tuple[ResultRow, ...]
    templates: tuple[str, ...]
    versions: tuple[str, ...]
    consents: tuple[tuple[str, str], ...]
    of: Mapping[str, str] = field(default_factory=dict)
    same_bodies: tuple[str, ...] = ()

    @property
    def good(self) -> bool:
        """Whether every result was reproduced, within tolerance at least."""
        return bool(self.rows) and all(row.state in (REPRODUCED, WITHIN) for row in self.rows)

    @property
    def summary(self) -> str:
        """`12 reproduced, 1 differs`."""
        states = [row.state for row in self.rows]
        return ", ".join(f"{states.count(state)} {state}" for state in dict.fromkeys(states)) or "nothing recorded"

    def plain(self) -> dict[str, Any]:
        """The comparison as JSON."""
        return {
            "document": dict(self.document),
            "summary": self.summary,
            "tolerance": TOLERANCE,
            "results": [row.plain() for row in self.rows],
            "templates": list(self.templates),
            "versions": list(self.versions),
            "consents": [{"template": name, "sha256": digest} for name, digest in self.consents],
            "of": dict(self.of),
            "same_bodies": list(self.same_bodies),
            "platform": f"{platform.system()} {platform.machine()}, Python {platform.python_version()}",
        }


def recompute_workbook(
    workbook: Any, results: Mapping[str, Any], *, consent: Consent, tell: Tell | None = None
) -> Recomputed:
    """Run a workbook's calculations again in a scratch folder and compare with its results."""
    return _recompute(workbook, results, {}, {}, consent, tell)


def recompute_archive(
    root: Path, *, consent: Consent, own_templates: bool = False, tell: Tell | None = None
) -> Recomputed:
    """Run the calculations of an opened archive again; RecordError where the archive is not whole.

    `own_templates` prefers the archive's template where the installed one differs; each asks for consent.
    """
    wrong = problems(root)
    if wrong:
        raise RecordError(f"the archive is not whole: {wrong[0]}", remedy="trunnion audit ARCHIVE says what is wrong")
    try:
        results = plain_json((root / "data/issued/results.json").read_bytes())
        parts = plain_json((root / "data/issued/digests.json").read_bytes())["calculations"]
        archived = {path.stem: path for path in sorted((root / "data/templates").glob("*.ipynb"))}
        with scratch.copied(root, results) as folder:
            _stand_in(folder, archived)
            preferred = archived if own_templates else {}
            return _recompute(load_workbook(folder), results, parts, preferred, consent, tell)
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as err:
        raise RecordError(f"the archive can't be read ({err!r})", remedy="trunnion audit ARCHIVE") from err


def _stand_in(folder: Path, archived: Mapping[str, Path]) -> None:
    """Archived templates that are not installed any more count as the workbook's own, and ask for consent."""
    installed = templates.shipped()
    for name, path in archived.items():
        if name not in installed:
            (folder / "templates").mkdir(exist_ok=True)
            (folder / "templates" / path.name).write_bytes(path.read_bytes())


def _recompute(
    workbook: Any, results: Mapping[str, Any], parts: Mapping[str, Any], preferred: Mapping[str, Path],
    consent: Consent, tell: Tell | None,
) -> Recomputed:  # fmt: skip
    planned = {entry.id: entry for entry in plan(workbook, allow_local=True)}
    before = {entry["id"]: entry for entry in results["calculations"] if entry["state"] == "computed"}
    told: list[str] = []
    consents: dict[tuple[str, str], bool] = {}
    jobs: list[Planned] = []
    skipped: dict[str, tuple[str, str]] = {}
    for name, entry in before.items():
        if name not in planned:
            skipped[name] = (NOT_RUN, "the spec has no such calculation")
        elif parts and any(file["held"] is None for file in entry["inputs"]):
            skipped[name] = (NOT_HELD, ", ".join(f["path"] for f in entry["inputs"] if f["held"] is None))
        else:
            chosen = _template(planned[name], parts.get(name, {}), preferred, told)
            if chosen.template.local and not _consented(chosen.template, consent, consents):
                skipped[name] = (
                    NOT_RUN,
                    f"no consent to template {chosen.template.name} ({chosen.template.file_digest})",
                )
            else:
                jobs.append(chosen)
    with tempfile.TemporaryDirectory(prefix="trunnion-recompute-") as place:
        outcomes, bodies = _run(Path(place), jobs, tell)
    rows = [row for name, entry in before.items() for row in _rows(entry, skipped.get(name), outcomes, bodies)]
    return Recomputed(
        document=results["document"],
        rows=tuple(rows),
        templates=tuple(dict.fromkeys(told)),
        versions=tuple(_versions(before.values(), planned)),
        consents=tuple(key for key, given in consents.items() if given),
        of={name: str(entry["digest"]) for name, entry in before.items()},
        same_bodies=tuple(n for n in before if n in bodies and content_digest(bodies[n]) == before[n]["digest"]),
    )


def _template(entry: Planned, parts: Mapping[str, Any], preferred: Mapping[str, Path], told: list[str]) -> Planned:
    """The calculation with the template that is to run."""
    archived = parts.get("parts", {}).get("template", {}).get("cells")
    if archived is None or archived == entry.template.cells_digest:
        return entry
    told.append(f"template differs: {entry.template.name} ({entry.id})")
    if entry.template.local or entry.template.name not in preferred:
        return entry
    own = templates.load(entry.template.name, preferred[entry.template.name], is_local=True)
    return dataclasses.replace(entry, template=own)


def _consented(template: Template, consent: Consent, given: dict[tuple[str, str], bool]) -> bool:
    key = (template.name, template.file_digest)
    if key not in given:
        given[key] = consent(template)
    return given[key]


def _run(folder: Path, jobs: Sequence[Planned], tell: Tell | None) -> tuple[dict[str, Outcome], dict[str, Any]]:
    place = store.RevisionFolder(folder)
    place.prepare()
    made = []
    for entry in jobs:
        for file in entry.inputs.values():
            if file.content is not None:
                place.keep_input(file.path, file.content)
        elsewhere = {file.held: file.origin for file in entry.inputs.values() if not file.copied}
        body, failed = place.body(entry.id), place.failed(entry.id, entry.template.name)
        made.append(Job(entry.id, entry.template.path, entry.parameters, folder, body, failed, elsewhere))
    with reduced_environment():
        outcomes = run(made, tell=tell) if made else {}
    done = [name for name, outcome in outcomes.items() if outcome.done]
    return outcomes, {name: store.read_body(place.body(name).read_bytes()) for name in done}


@contextmanager
def reduced_environment() -> Iterator[None]:
    """Only the named variables, for what is run meanwhile."""
    before = dict(os.environ)
    os.environ.clear()
    os.environ.update({name: value for name, value in before.items() if name in ENVIRONMENT})
    try:
        yield
    finally:
        os.environ.clear()
        os.environ.update(before)


def _rows(
    entry: Mapping[str, Any],
    skipped: tuple[str, str] | None,
    outcomes: Mapping[str, Outcome],
    bodies: Mapping[str, Any],
) -> Iterator[ResultRow]:
    name = str(entry["id"])
    then = {result["id"]: result for result in entry["results"]}
    if skipped is None and not outcomes[name].done:
        skipped = (DIFFERS, f"it fails now: {outcomes[name].error}")
    if skipped is not None:
        yield from (ResultRow(name, result, skipped[0], then[result], None, skipped[1]) for result in then)
        return
    try:
        now = {result.id: result.plain() for result in recorded(name, bodies[name]).results}
    except TrunnionError as err:
        yield from (ResultRow(name, result, DIFFERS, then[result], None, err.fault.cause) for result in then)
        return
    for result in dict.fromkeys((*then, *now)):
        yield compare_result(name, result, then.get(result), now.get(result))


def compare_result(
    calculation: str, result: str, then: Mapping[str, Any] | None, now: Mapping[str, Any] | None
) -> ResultRow:
    """One result, then and now."""
    if then is None or now is None:
        why = "not recorded now" if now is None else "not recorded then"
        return ResultRow(calculation, result, DIFFERS, then, now, why)
    words = [name for name in ("quantity", "of", "over", "unit", "basis") if then[name] != now[name]]
    if words:
        return ResultRow(calculation, result, DIFFERS, then, now, f"another {', '.join(words)}")
    if all(then[name] == now[name] for name in _NUMBERS):
        return ResultRow(calculation, result, REPRODUCED, then, now)
    gaps = [_gap(then[name], now[name]) for name in _NUMBERS]
    state = WITHIN if max(gaps) <= TOLERANCE else DIFFERS
    return ResultRow(calculation, result, state, then, now, f"by {max(gaps):.2g} (tolerance {TOLERANCE:g})")


def _gap(then: float | None, now: float | None) -> float:
    if then is None or now is None:
        return 0.0 if then is now else math.inf
    return 0.0 if then == now else abs(now - then) / max(1.0, abs(then))


def _versions(before: Any, planned: Mapping[str, Planned]) -> Iterator[str]:
    found: dict[str, tuple[str, str]] = {}
    for entry in before:
        if entry["id"] in planned:
            parts = planned[entry["id"]].parts
            now = {**parts["libraries"], "python": parts["python"]}
            found |= {name: (str(entry["libraries"].get(name)), str(version)) for name, version in now.items()}
    yield from (f"{name} {then} → {now}" for name, (then, now) in found.items() if then != now)
