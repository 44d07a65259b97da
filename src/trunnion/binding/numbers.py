"""How numbers of checks and tables are printed; intervals are printed as the notebook prints them."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from trunnion.sheet.rounding import interval_text, with_unit

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def result_value(item: Mapping[str, Any]) -> str:
    """A result as printed: its interval, bounds rounded to the unsafe side, or the value reached."""
    lo, hi, unit = item.get("lo"), item.get("hi"), str(item.get("unit") or "")
    if lo is None and hi is None:
        return quantity_text(item.get("attained", ""), unit)
    if item.get("basis") == "exact" and unit in ("", "1") and lo is not None and lo == hi and float(lo).is_integer():
        return number_text(lo)  # a count
    return interval_text(lo, hi, unit)


def quantity_text(value: object, unit: str) -> str:
    """A number with its unit, or a text as it stands."""
    shown = number_text(value)
    number = isinstance(value, int | float) and not isinstance(value, bool)
    if not number or unit in ("", "1"):
        return shown
    return f"{shown}\u00a0{unit}" if "·10" in shown else with_unit(shown, unit).replace(" ", "\u00a0")


def number_text(value: object) -> str:
    """Up to six digits, very small and very large numbers in powers of ten, minus signs as signs."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return "" if value is None else str(value)
    if isinstance(value, float) and not math.isfinite(value):
        return "not a number" if math.isnan(value) else signed(str(value).replace("inf", "∞"))
    if value != 0 and (abs(value) < 1e-3 or abs(value) >= 1e7):
        mantissa, exponent = f"{value:.2e}".split("e")
        return signed(f"{mantissa}·10{str(int(exponent)).translate(_RAISED)}")
    return signed(f"{value + 0.0:.6g}")


def signed(text: str) -> str:
    """A hyphen before a number becomes a minus sign."""
    return "−" + text[1:] if text[:1] == "-" else text
