"""The verdict rule, and nothing typed by hand.

*At least L*: a lower bound ≥ L − slack on a sufficient basis meets; an attained value < L − slack, on any basis, does
not meet; everything else is not shown. *At most L* is the mirror. The slack is `units.LIMIT_SLACK_DEG`, 10⁻⁹ of the
unit compared, printed in every package. Bases: exact > certified bound > sampled; measured data satisfy only a
requirement that asks for measured, and nothing else satisfies that one.
"""

from __future__ import annotations

import enum
from collections.abc import Iterable
from dataclasses import dataclass

from trunnion.attitude.basis import Basis
from trunnion.sheet.rounding import ceiling_text, floor_text, with_unit
from trunnion.units import LIMIT_SLACK_DEG

SLACK = LIMIT_SLACK_DEG

_STRENGTH = {Basis.EXACT: 3, Basis.CERTIFIED: 2, Basis.SAMPLED: 1}


class Verdict(enum.Enum):
    """What the evidence says of a requirement; the values are the words printed."""

    MEETS = "meets"
    DOES_NOT_MEET = "does not meet"
    NOT_SHOWN = "not shown"


class Comparison(enum.Enum):
    """Which side of its limit a quantity must stay on."""

    AT_LEAST = "at least"
    AT_MOST = "at most"


@dataclass(frozen=True)
class Bounds:
    """What a result says, in one unit: the interval that holds it, its basis, a value really reached."""

    lo: float | None
    hi: float | None
    attained: float | None
    basis: Basis


def sufficient(have: Basis, asked: Basis) -> bool:
    """Whether evidence on basis `have` serves a requirement that asks for `asked`."""
    if Basis.MEASURED in (have, asked):
        return have is asked
    return _STRENGTH[have] >= _STRENGTH[asked]


def judge(bounds: Bounds, comparison: Comparison, limit: float, asked: Basis) -> Verdict:
    """The verdict on one result; `limit` in the unit of the bounds."""
    if comparison is Comparison.AT_MOST:
        return judge(_mirrored(bounds), Comparison.AT_LEAST, -limit, asked)
    if bounds.attained is not None and bounds.attained < limit - SLACK:
        return Verdict.DOES_NOT_MEET
    if bounds.lo is not None and bounds.lo >= limit - SLACK and sufficient(bounds.basis, asked):
        return Verdict.MEETS
    return Verdict.NOT_SHOWN


def together(verdicts: Iterable[Verdict]) -> Verdict:
    """The verdict over several regions: one failure fails all, one gap leaves all not shown, none shows nothing."""
    found = set(verdicts)
    for verdict in (Verdict.DOES_NOT_MEET, Verdict.NOT_SHOWN, Verdict.MEETS):
        if verdict in found:
            return verdict
    return Verdict.NOT_SHOWN


def governing(bounds: Iterable[Bounds], comparison: Comparison) -> Bounds | None:
    """The result nearest to the limit's wrong side: least lower bound for at least, largest upper for at most."""
    return min(bounds, key=lambda entry: _proven(entry, comparison), default=None)


def bound_text(bounds: Bounds, comparison: Comparison, unit: str, digits: int = 2) -> str:
    """The bound that was judged, rounded towards the unsafe side: a floor of 21.3961 prints as 21.39."""
    if comparison is Comparison.AT_LEAST:
        text = None if bounds.lo is None else floor_text(bounds.lo, digits)
    else:
        text = None if bounds.hi is None else ceiling_text(bounds.hi, digits)
    return "no bound" if text is None else with_unit(text, unit)


def why_text(bounds: Bounds, comparison: Comparison, limit: float, asked: Basis, unit: str) -> str:
    """Why a result does not meet or does not show its requirement, in words; "" where it meets."""
    verdict = judge(bounds, comparison, limit, asked)
    if verdict is Verdict.MEETS:
        return ""
    if verdict is Verdict.DOES_NOT_MEET:
        return f"{with_unit(f'{bounds.attained:.4f}', unit)} is reached"
    if not sufficient(bounds.basis, asked):
        return f"the basis is '{bounds.basis.value}', asked for is '{asked.value}'"
    return f"the proven bound is {bound_text(bounds, comparison, unit)}, and no attitude beyond the limit is known"


def _proven(bounds: Bounds, comparison: Comparison) -> float:
    side = bounds.lo if comparison is Comparison.AT_LEAST else bounds.hi
    if side is None:
        return float("-inf")
    return side if comparison is Comparison.AT_LEAST else -side


def _mirrored(bounds: Bounds) -> Bounds:
    def turned(value: float | None) -> float | None:
        return None if value is None else -value

    return Bounds(turned(bounds.hi), turned(bounds.lo), turned(bounds.attained), bounds.basis)
