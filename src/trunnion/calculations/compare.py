"""Old against new: every recorded result, verdict flips first, what came, went and changed."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations.baselines import RESULTS, issued_folder
from trunnion.calculations.reasons import value_text
from trunnion.calculations.results_file import read_results
from trunnion.errors import StoreError

NUMBERS = ("lo", "hi", "attained")
WORDS = ("unit", "basis")

Name = tuple[str, str, str | None]


@dataclass(frozen=True)
class ResultChange:
    """One recorded quantity, old and new; None on the side where it is not recorded."""

    quantity: str
    of: str
    over: str | None
    calculation: str
    old: Mapping[str, Any] | None
    new: Mapping[str, Any] | None

    @property
    def difference(self) -> dict[str, float]:
        """New minus old, by bound, where both are numbers in one unit."""
        if self.old is None or self.new is None or self.old["unit"] != self.new["unit"]:
            return {}
        pairs = {name: (self.old[name], self.new[name]) for name in NUMBERS}
        return {name: new - old for name, (old, new) in pairs.items() if old is not None and new is not None}

    @property
    def changed(self) -> bool:
        """Whether anything recorded differs."""
        if self.old is None or self.new is None:
            return True
        return any(self.old[name] != self.new[name] for name in (*NUMBERS, *WORDS))

    def plain(self) -> dict[str, Any]:
        """The change as JSON."""
        return {**self.__dict__, "difference": self.difference, "changed": self.changed}


@dataclass(frozen=True)
class VerdictChange:
    """A requirement's verdict for one candidate, old and new."""

    requirement: str
    candidate: str
    counts: bool
    old: str | None
    new: str | None
    old_limit: str
    new_limit: str

    @property
    def flips(self) -> bool:
        """Whether the verdict is another one."""
        return self.old != self.new


@dataclass(frozen=True)
class Pair:
    """Something with an old and a new value: an input's digest, a figure's, a decision's choice."""

    what: str
    old: str | None
    new: str | None


@dataclass(frozen=True)
class Comparison:
    """Two result sets, side by side."""

    old: str
    new: str
    verdicts: tuple[VerdictChange, ...]
    results: tuple[ResultChange, ...]
    calculations_new: tuple[str, ...]
    calculations_removed: tuple[str, ...]
    calculations_changed: tuple[str, ...]
    inputs: tuple[Pair, ...]
    figures: tuple[Pair, ...]
    decisions: tuple[Pair, ...]
    revisit: tuple[str, ...]

    @property
    def flips(self) -> list[VerdictChange]:
        """Verdicts that are other ones, those that count first."""
        return sorted((entry for entry in self.verdicts if entry.flips), key=lambda entry: not entry.counts)

    @property
    def changed_results(self) -> list[ResultChange]:
        """Results that differ, came or went."""
        return [entry for entry in self.results if entry.changed]

    @property
    def same(self) -> bool:
        """Whether nothing differs."""
        lists = (self.calculations_new, self.calculations_removed, self.inputs, self.figures, self.decisions)
        return not (self.flips or self.changed_results or any(lists))

    def plain(self) -> dict[str, Any]:
        """The comparison as JSON, verdict flips first."""
        return {
            "old": self.old,
            "new": self.new,
            "flips": [dict(entry.__dict__) for entry in self.flips],
            "verdicts": [dict(entry.__dict__) for entry in self.verdicts],
            "results": [entry.plain() for entry in self.results],
            "calculations": {
                "new": list(self.calculations_new),
                "removed": list(self.calculations_removed),
                "changed": list(self.calculations_changed),
            },
            "inputs": [dict(entry.__dict__) for entry in self.inputs],
            "figures": [dict(entry.__dict__) for entry in self.figures],
            "decisions": [dict(entry.__dict__) for entry in self.decisions],
            "decisions_to_revisit": list(self.revisit),
        }


def find_results(what: str | Path, workbook: Path | None = None) -> Path:
    """The `results.json` of a revision of a workbook (issued, else its output), of a folder, or the file itself."""
    path = Path(what)
    if workbook is not None:
        candidates = [issued_folder(workbook) / str(what) / RESULTS]
        from trunnion.calculations.store import outputs_of

        candidates.append(outputs_of(workbook.resolve(), None) / workbook.resolve().name / str(what) / RESULTS)
    else:
        candidates = [path] if path.is_file() else [path / RESULTS]
    for candidate in candidates:
        if candidate.is_file():
            return candidate
    looked = " nor ".join(str(candidate) for candidate in candidates)
    raise StoreError(f"there are no results for '{what}': neither {looked}", remedy="give a folder with results.json")


def compare(old: Path, new: Path) -> Comparison:
    """Compare two `results.json` files."""
    return compare_results(read_results(old), read_results(new), str(old.parent), str(new.parent))


def compare_results(old: Mapping[str, Any], new: Mapping[str, Any], old_name: str, new_name: str) -> Comparison:
    """Compare two result sets as plain JSON."""
    before, after = _calculations(old), _calculations(new)
    verdicts = _verdicts(old, new)
    changed = [name for name in after if name in before and before[name]["digest"] != after[name]["digest"]]
    decisions = _pairs(_chosen(old), _chosen(new))
    removed = tuple(name for name in before if name not in after)
    return Comparison(
        old=_name_of(old, old_name),
        new=_name_of(new, new_name),
        verdicts=tuple(verdicts),
        results=tuple(_results(old, new)),
        calculations_new=tuple(name for name in after if name not in before),
        calculations_removed=removed,
        calculations_changed=tuple(changed),
        inputs=tuple(_pairs(_inputs(old), _inputs(new))),
        figures=tuple(_pairs(_figures(old), _figures(new))),
        decisions=tuple(decisions),
        revisit=tuple(_revisit(new, verdicts, {*changed, *removed}, decisions)),
    )


def change_rows(comparison: Comparison) -> list[tuple[str, str, str, str]]:
    """The change report in rows (what, before, after, effect), verdict flips first; for the package and the screen."""
    rows = []
    for flip in comparison.flips:
        counts = "" if flip.counts else " (does not count)"
        limits = "" if flip.old_limit == flip.new_limit else f"limit {flip.old_limit or '—'} → {flip.new_limit or '—'}"
        rows.append((f"{flip.requirement}, {flip.candidate}{counts}", flip.old or "—", flip.new or "—", limits))
    for result in comparison.changed_results:
        where = f" over {result.over}" if result.over else ""
        what = f"{result.quantity} of {result.of}{where}"
        rows.append((what, interval(result.old), interval(result.new), difference_text(result)))
    rows += [(f"calculation {name}", "—", "new", "") for name in comparison.calculations_new]
    rows += [(f"calculation {name}", "removed", "—", "") for name in comparison.calculations_removed]
    for title, pairs in (
        ("input", comparison.inputs),
        ("figure", comparison.figures),
        ("decision", comparison.decisions),
    ):
        rows += [(f"{title} {p.what}", value_text(p.old), value_text(p.new), "") for p in pairs]
    rows += [(f"decision {name}", "", "", "to be revisited") for name in comparison.revisit]
    return rows


def interval(plain: Mapping[str, Any] | None) -> str:
    """A recorded interval with enough digits to tell two apart."""
    if plain is None:
        return "—"
    ends = ["—" if plain[name] is None else f"{plain[name]:.10g}" for name in ("lo", "hi")]
    if ends[0] == ends[1]:
        text = ends[0]
    elif ends[1] == "—":
        text = f"at least {ends[0]}"
    elif ends[0] == "—":
        text = f"at most {ends[1]}"
    else:
        text = f"{ends[0]} … {ends[1]}"
    return f"{text} {plain['unit']} ({plain['basis']})".replace("  ", " ")


def difference_text(change: ResultChange) -> str:
    """The difference of the bounds, with sign and unit."""
    if change.old is None or change.new is None:
        return "new" if change.old is None else "removed"
    found = {name: value for name, value in change.difference.items() if value != 0}
    parts = [f"{name} {value:+.6g} {change.new['unit']}".strip() for name, value in found.items()]
    words = [
        f"{name} {change.old[name]} → {change.new[name]}" for name in WORDS if change.old[name] != change.new[name]
    ]
    return ", ".join(parts + words)


def _calculations(results: Mapping[str, Any]) -> dict[str, Mapping[str, Any]]:
    return {entry["id"]: entry for entry in results.get("calculations", [])}


def _recorded(results: Mapping[str, Any]) -> dict[Name, tuple[str, Mapping[str, Any]]]:
    return {
        (result["quantity"], result["of"], result["over"]): (entry["id"], result)
        for entry in results.get("calculations", [])
        for result in entry["results"]
    }


def _results(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[ResultChange]:
    before, after = _recorded(old), _recorded(new)
    for name in dict.fromkeys((*after, *before)):
        calculation = (after.get(name) or before[name])[0]
        was, now = before.get(name), after.get(name)
        yield ResultChange(*name, calculation, was[1] if was else None, now[1] if now else None)


def _verdicts(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[VerdictChange]:
    before, after = _candidates(old), _candidates(new)
    changes = []
    for name in dict.fromkeys((*after, *before)):
        was, now = before.get(name), after.get(name)
        changes.append(
            VerdictChange(
                *name,
                counts=bool((now or was or {}).get("counts")),
                old=was["verdict"] if was else None,
                new=now["verdict"] if now else None,
                old_limit=was["limit"] if was else "",
                new_limit=now["limit"] if now else "",
            )
        )
    return changes


def _candidates(results: Mapping[str, Any]) -> dict[tuple[str, str], dict[str, Any]]:
    return {
        (row["id"], candidate["name"]): {**candidate, "limit": f"{row['comparison']} {row['limit']}"}
        for row in results.get("requirements", [])
        for candidate in row["candidates"]
    }


def _inputs(results: Mapping[str, Any]) -> dict[str, str]:
    return {file["path"]: file["sha256"] for entry in results.get("calculations", []) for file in entry["inputs"]}


def _figures(results: Mapping[str, Any]) -> dict[str, str]:
    return {
        f"{entry['id']} {figure['id']}": figure["sha256"]
        for entry in results.get("calculations", [])
        for figure in entry.get("figures", [])
    }


def _chosen(results: Mapping[str, Any]) -> dict[str, str]:
    return {entry["id"]: entry["chosen"] for entry in results.get("decisions", [])}


def _pairs(old: Mapping[str, str], new: Mapping[str, str]) -> list[Pair]:
    names = dict.fromkeys((*new, *old))
    return [Pair(name, old.get(name), new.get(name)) for name in names if old.get(name) != new.get(name)]


def _revisit(
    new: Mapping[str, Any], verdicts: Sequence[VerdictChange], changed: set[str], decisions: Sequence[Pair]
) -> list[str]:
    """Decisions that rest on a changed calculation, whose requirements flipped, or whose choice is another."""
    flipped = {entry.requirement for entry in verdicts if entry.flips}
    own = {row["id"]: row["of"] for row in new.get("requirements", [])}
    moved = {entry.what for entry in decisions}
    return [
        entry["id"]
        for entry in new.get("decisions", [])
        if changed & set(entry["rests_on"])
        or entry["id"] in moved
        or any(own[requirement] == entry["id"] for requirement in flipped if requirement in own)
    ]


def _name_of(results: Mapping[str, Any], fallback: str) -> str:
    document = results.get("document", {})
    number, revision = document.get("number"), document.get("revision")
    return f"{number} revision {revision}" if number and revision else fallback
