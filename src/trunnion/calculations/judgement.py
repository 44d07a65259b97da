"""Requirements judged on recorded results: every candidate, every region; only the chosen candidate counts."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from trunnion.attitude.basis import Basis
from trunnion.calculations.results import Recorded, Result, select
from trunnion.calculations.verdicts import (
    Bounds,
    Comparison,
    Verdict,
    bound_text,
    governing,
    judge,
    together,
    why_text,
)
from trunnion.errors import Fault, Place, SpecError, UnitError
from trunnion.sheet.rounding import with_unit

LOCK_MARGIN = "lock margin"
NO_ANGLES = "quaternion or matrix inside, angles for display only"

PlaceOf = Callable[[str], Place]


def _nowhere(key: str) -> Place:
    return Place(key=key)


@dataclass(frozen=True)
class Asked:
    """What a requirement asks, apart from its words."""

    requirement: str
    quantity: str
    of: str
    over: tuple[str, ...]
    comparison: Comparison
    limit: Any  # units.Quantity
    basis: Basis

    @property
    def text(self) -> str:
        """`lock margin at least 20 deg over hover, cruise`."""
        where = f" over {', '.join(self.over)}" if self.over else ""
        return f"{self.quantity} {self.comparison.value} {self.limit.text}{where}"


@dataclass(frozen=True)
class Part:
    """The judgement on one region: the result it rests on, if there is one, and why it does not meet."""

    over: str | None
    verdict: Verdict
    result: Result | None = None
    why: str = ""


@dataclass(frozen=True)
class Judgement:
    """A requirement judged for one candidate."""

    asked: Asked
    candidate: str
    counts: bool
    verdict: Verdict
    parts: tuple[Part, ...]
    deviation: str = ""
    deviation_holds: bool = False
    no_lock: bool = False  # a candidate without angles has no singular attitude

    @property
    def satisfied(self) -> bool:
        """Whether it leaves nothing open: it meets, or an approved deviation accepts it."""
        return self.verdict is Verdict.MEETS or self.deviation_holds

    @property
    def governing_part(self) -> Part | None:
        """The part that decides: the first that does not meet, else the one nearest to the limit."""
        for part in self.parts:
            if part.verdict is self.verdict and self.verdict is not Verdict.MEETS:
                return part
        shown = [part for part in self.parts if part.result is not None]
        nearest = governing([part.result.bounds for part in shown if part.result], self.asked.comparison)
        return next((part for part in shown if part.result and part.result.bounds is nearest), None)

    @property
    def value_text(self) -> str:
        """The judged bound in print, rounded towards the unsafe side, and where it governs."""
        if self.no_lock:
            return "no singular attitude"
        part = self.governing_part
        if part is None or part.result is None:
            return "—"
        text = bound_text(part.result.bounds, self.asked.comparison, part.result.unit)
        return f"{text} ({part.over})" if part.over else text

    @property
    def basis_text(self) -> str:
        """The weakest basis among its results, or "" when there are none."""
        if self.no_lock:
            return Basis.EXACT.value
        order = [Basis.EXACT, Basis.CERTIFIED, Basis.SAMPLED, Basis.MEASURED]
        found = [order.index(part.result.bounds.basis) for part in self.parts if part.result is not None]
        return order[max(found)].value if found else ""

    @property
    def why(self) -> str:
        """Why it does not meet, in words; "" where it meets."""
        part = self.governing_part
        if self.verdict is Verdict.MEETS or part is None:
            return ""
        where = f"over {part.over}: " if part.over else ""
        return f"{where}{part.why}"


def asked_of(requirement: Any) -> Asked:
    """What a requirement of the spec asks."""
    least = requirement.at_least
    return Asked(
        requirement=requirement.id,
        quantity=requirement.result,
        of=requirement.of,
        over=tuple(requirement.over or ()),
        comparison=Comparison.AT_LEAST if least is not None else Comparison.AT_MOST,
        limit=least if least is not None else requirement.at_most,
        basis=Basis(requirement.basis),
    )


def judge_all(
    requirements: Sequence[Any],
    decisions: Sequence[Any],
    records: Mapping[str, Recorded],
    *,
    conventions: Collection[str] = (),
    deviations: Sequence[Any] = (),
    approved: Collection[str] = (),
    place: PlaceOf = _nowhere,
) -> list[Judgement]:
    """Judge every requirement for every candidate, in the order of the spec.

    A decision over `conventions` always has one candidate more, NO_ANGLES: it has no singular attitude, so a lock
    margin bounds it trivially. `approved` are the ids of deviations an approver has signed; `place` finds a key path
    in the spec. SpecError names two results for one requirement, or a unit that can't be compared.
    """
    chosen = {decision.id: decision for decision in decisions}
    faults: list[Fault] = []
    judgements = []
    for requirement in requirements:
        asked = asked_of(requirement)
        decision = chosen.get(asked.of)
        for candidate in _candidates(asked, decision, conventions):
            counts = decision is None or candidate == decision.chosen
            judgement = _judge_one(asked, candidate, counts, records, faults)
            judgements.append(_with_deviation(judgement, deviations, approved))
    if faults:
        raise SpecError([Fault(fault.cause, fault.remedy, place(fault.place.key)) for fault in faults])
    return judgements


def _candidates(asked: Asked, decision: Any | None, conventions: Collection[str]) -> list[str]:
    """The candidates a requirement is judged for: those of its decision, or the one it names."""
    if decision is None:
        return [asked.of]
    candidates = list(decision.over)
    if asked.quantity == LOCK_MARGIN and set(candidates) & set(conventions) and NO_ANGLES not in candidates:
        candidates.append(NO_ANGLES)
    return candidates


def broken_promises(
    calculations: Iterable[Any],
    requirements: Sequence[Any],
    judgements: Sequence[Judgement],
    finished: Collection[str],
    place: PlaceOf = _nowhere,
) -> list[Fault]:
    """Promises (`shows`) of finished calculations without a matching result: one fault each, naming both."""
    known = {requirement.id for requirement in requirements}
    faults = []
    for calculation in calculations:
        for promised in calculation.shows or ():
            if calculation.id not in finished or promised not in known:
                continue
            if not any(_rests_on(judgement, promised, calculation.id) for judgement in judgements):
                cause = f"{calculation.id} promises to show {promised}, and records no result that {promised} selects"
                remedy = f"take {promised} out of its `shows`, or compare result, of and over"
                faults.append(Fault(cause, remedy, place(f"calculations.{calculation.id}.shows")))
    return faults


def _rests_on(judgement: Judgement, requirement: str, calculation: str) -> bool:
    return judgement.asked.requirement == requirement and any(
        part.result is not None and part.result.calculation == calculation for part in judgement.parts
    )


def _judge_one(
    asked: Asked, candidate: str, counts: bool, records: Mapping[str, Recorded], faults: list[Fault]
) -> Judgement:
    if candidate == NO_ANGLES and asked.quantity == LOCK_MARGIN:
        return Judgement(asked, candidate, counts, Verdict.MEETS, (), no_lock=True)
    parts = tuple(_judge_part(asked, candidate, over, records, faults) for over in asked.over or (None,))
    return Judgement(asked, candidate, counts, together(part.verdict for part in parts), parts)


def _judge_part(
    asked: Asked, candidate: str, over: str | None, records: Mapping[str, Recorded], faults: list[Fault]
) -> Part:
    every = [result for record in records.values() for result in record.results]
    found = select(every, quantity=asked.quantity, of=candidate, over=over)
    if not found:
        where = f" over {over}" if over else ""
        return Part(over, Verdict.NOT_SHOWN, None, f"no calculation records {asked.quantity} of {candidate}{where}")
    if len(found) > 1:
        cause = f"two results answer {asked.requirement}: {found[0].place} and {found[1].place}"
        spot = Place(key=f"requirements.{asked.requirement}")
        faults.append(Fault(cause, "let one calculation record it, or name the place with `over`", spot))
    result = found[0]
    failed = records[result.calculation].failed_checks
    if failed:
        why = f"the independent check of {result.calculation} does not agree ({', '.join(failed)})"
        return Part(over, Verdict.NOT_SHOWN, result, why)
    return _judged(asked, over, result, faults)


def _judged(asked: Asked, over: str | None, result: Result, faults: list[Fault]) -> Part:
    try:
        limit = asked.limit.in_unit(result.unit)
    except UnitError as err:
        cause = f"{asked.requirement} asks {asked.limit.text}, and {result.place} is in {result.unit or 'no unit'}"
        faults.append(Fault(cause, err.fault.remedy, Place(key=f"requirements.{asked.requirement}")))
        return Part(over, Verdict.NOT_SHOWN, result, "its unit can't be compared")
    verdict = judge(result.bounds, asked.comparison, limit, asked.basis)
    why = why_text(result.bounds, asked.comparison, limit, asked.basis, result.unit)
    return Part(over, verdict, result, why)


def _with_deviation(judgement: Judgement, deviations: Sequence[Any], approved: Collection[str]) -> Judgement:
    if judgement.verdict is Verdict.MEETS or not judgement.counts:
        return judgement
    for deviation in deviations:
        if deviation.requirement == judgement.asked.requirement:
            return replace(judgement, deviation=deviation.id, deviation_holds=deviation.id in approved)
    return judgement


def plain_requirements(judgements: Sequence[Judgement]) -> list[dict[str, Any]]:
    """The requirements as `results.json` has them: the counting verdict, and every candidate side by side."""
    rows: dict[str, dict[str, Any]] = {}
    for judgement in judgements:
        asked = judgement.asked
        row = rows.setdefault(
            asked.requirement,
            {
                "id": asked.requirement,
                "asks": asked.text,
                "of": asked.of,
                "comparison": asked.comparison.value,
                "limit": asked.limit.text,
                "basis": asked.basis.value,
                "verdict": None,
                "deviation": "",
                "candidates": [],
            },
        )
        row["candidates"].append(_plain_candidate(judgement))
        if judgement.counts:
            row.update(verdict=judgement.verdict.value, counts=judgement.candidate, deviation=judgement.deviation)
    return list(rows.values())


def _plain_candidate(judgement: Judgement) -> dict[str, Any]:
    return {
        "name": judgement.candidate,
        "counts": judgement.counts,
        "verdict": judgement.verdict.value,
        "value": judgement.value_text,
        "why": judgement.why,
        "parts": [
            {
                "over": part.over,
                "verdict": part.verdict.value,
                "calculation": part.result.calculation if part.result else None,
                "result": part.result.id if part.result else None,
                "why": part.why,
            }
            for part in judgement.parts
        ],
    }


def bounds_of(plain: Mapping[str, Any]) -> Bounds:
    """The bounds of a result as `results.json` has it."""
    return Bounds(plain["lo"], plain["hi"], plain["attained"], Basis(plain["basis"]))


def limit_text(asked: Asked) -> str:
    """The limit in print, with its comparison."""
    number, _, unit = asked.limit.text.partition(" ")
    return f"{asked.comparison.value} {with_unit(number, unit)}"
