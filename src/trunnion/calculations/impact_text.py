"""An impact in lines of text."""

from __future__ import annotations

from collections.abc import Iterator

from trunnion.calculations.impact import Impact, VerdictImpact
from trunnion.calculations.reasons import Reason, ReasonKind

MOST_SOURCES = 4


def impact_lines(found: Impact) -> Iterator[str]:
    """The impact for the screen, verdicts that are certain to change first."""
    yield f"Against {found.baseline}:"
    if found.nothing:
        yield "  nothing differs"
        return
    yield from _group("verdicts that change, certain without a run", map(_verdict, filter(_flips, found.verdicts)))
    yield from _group("verdicts that may change", (_name(v) for v in found.verdicts if not v.certain))
    stay = [_name(v) for v in found.verdicts if v.certain and not v.flips]
    yield from _group("verdicts certain to stay", [", ".join(stay)] if stay else [])
    for entry in found.calculations:
        if entry.out_of_date:
            yield from _group(f"{entry.id} is out of date", _reason_lines(entry.reasons))
    current = [entry.id for entry in found.calculations if not entry.out_of_date]
    yield from _group("up to date", [", ".join(current)] if current else [])
    yield from _group("no longer in the spec", found.removed)
    yield from _group("decisions to revisit", found.decisions)
    yield from _group("findings touched", found.findings)
    for source in found.sources:
        title = f"{source.id} went from {source.old or 'no edition'} to {source.new}: to be confirmed"
        yield from _group(title, source.to_be_confirmed)
    yield from _group("changed in the spec", (change.text for change in found.spec))


def _reason_lines(found: tuple[Reason, ...]) -> Iterator[str]:
    """Each reason on its line; many changed source files in one."""
    sources = [reason.what for reason in found if reason.kind is ReasonKind.CODE]
    few = len(sources) <= MOST_SOURCES
    yield from (reason.text for reason in found if few or reason.kind is not ReasonKind.CODE)
    if not few:
        rest = len(sources) - MOST_SOURCES
        yield f"program sources {', '.join(sources[:MOST_SOURCES])} and {rest} more"


def _group(title: str, lines: object) -> Iterator[str]:
    listed = list(lines)  # type: ignore[call-overload]
    if listed:
        yield f"  {title}:"
        yield from (f"    {line}" for line in listed)


def _flips(verdict: VerdictImpact) -> bool:
    return verdict.flips


def _name(verdict: VerdictImpact) -> str:
    counts = "" if verdict.counts else " (does not count)"
    return f"{verdict.requirement} {verdict.candidate}{counts}"


def _verdict(verdict: VerdictImpact) -> str:
    return f"{_name(verdict)}: {verdict.old} → {verdict.new} ({verdict.value})"
