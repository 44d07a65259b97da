"""Printed intervals: bounds rounded towards the unsafe side, so that print never promises more than was
proven.
"""

from __future__ import annotations

from trunnion.units import CEILING, FLOOR, LIMIT_SLACK_DEG, format_number

_SIGNS = {"deg": "°", "": ""}


def floor_text(value: float, digits: int = 2) -> str:
    """A lower bound with `digits` decimals: 21.3961 prints as 21.39."""
    return _print(format_number(value, digits=digits, toward=FLOOR, slack=LIMIT_SLACK_DEG))


def ceiling_text(value: float, digits: int = 2) -> str:
    """An upper bound with `digits` decimals: 21.3961 prints as 21.40."""
    return _print(format_number(value, digits=digits, toward=CEILING, slack=LIMIT_SLACK_DEG))


def interval_text(lo: float | None, hi: float | None, unit: str = "deg", digits: int = 2) -> str:
    """An interval [lo, hi] in print: lower end rounded down, upper end rounded up, missing ends left open."""
    low = floor_text(lo, digits) if lo is not None else None
    high = ceiling_text(hi, digits) if hi is not None else None
    if low is None and high is None:
        return "nothing shown"
    if low is None:
        return f"at most {with_unit(str(high), unit)}"
    if high is None:
        return f"at least {with_unit(low, unit)}"
    return with_unit(low, unit) if low == high else f"{low} … {with_unit(high, unit)}"


def with_unit(number: str, unit: str) -> str:
    """Number and unit as print has them: degrees as a sign, everything else after a space."""
    sign = _SIGNS.get(unit)
    return f"{number}{sign}" if sign is not None else f"{number} {unit}"


def _print(number: str) -> str:
    return number.replace("-", "−").replace("infinite", "∞")
