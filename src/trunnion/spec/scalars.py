"""What an unquoted word of the file is: text, whole number, number, true or false; or a form read differently
elsewhere.

The editions of YAML and their readers disagree about some forms (`010`, `on`, `12:30:00`, `1_000`, dates).
Those are refused with the form to write instead, so that the file means the same to everybody.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field

LONGEST_NUMBER = 40


class WholeNumber(int):
    """An int that remembers how it was written, so that `edition: 4` can be text."""

    raw: str

    def __new__(cls, raw: str) -> WholeNumber:
        made = super().__new__(cls, raw)
        made.raw = raw
        return made


class Number(float):
    """A float that remembers how it was written (`4.10` stays 4.10 where text is meant)."""

    raw: str

    def __new__(cls, raw: str) -> Number:
        made = super().__new__(cls, raw)
        made.raw = raw
        return made


@dataclass(frozen=True)
class Refused:
    """A form that is not read: the kind of fault and the words that fill it."""

    kind: str
    words: dict[str, str] = field(default_factory=dict)


_INT = re.compile(r"[-+]?(0|[1-9][0-9]*)")
_FLOAT = re.compile(r"[-+]?((0|[1-9][0-9]*)(\.[0-9]*)?|\.[0-9]+)([eE][-+]?[0-9]+)?")
_ZEROS = re.compile(r"([-+]?)0+([0-9]+)(\.[0-9]*)?([eE][-+]?[0-9]+)?")
_BASED = re.compile(r"([-+]?)0([oxb])([0-9a-fA-F_]+)")
_UNDERSCORED = re.compile(r"[-+]?[0-9][0-9_]*_[0-9_]*(\.[0-9_]*)?([eE][-+]?[0-9]+)?|[-+]?[0-9]+\.[0-9_]*_[0-9_]*")
_SEXAGESIMAL = re.compile(r"([-+]?)([0-9][0-9_]*(?::[0-5]?[0-9])+)(\.[0-9_]*)?")
_DATE = re.compile(r"\d{4}-\d{1,2}-\d{1,2}([Tt ].*)?")
_ENDLESS = re.compile(r"[-+]?\.(inf|Inf|INF)|\.(nan|NaN|NAN)")
_YES_NO = {"yes": "true", "on": "true", "no": "false", "off": "false"}
_SMALL = ("true", "false")


def resolve(raw: str) -> str | int | float | bool | Refused:
    """The value of an unquoted scalar, or why its form is refused."""
    if raw in _SMALL:
        return raw == "true"
    refused = _refused_word(raw)
    if refused is not None or not raw or raw[0] not in "+-.0123456789":
        return refused or raw
    return _number(raw)


def _refused_word(raw: str) -> Refused | None:
    folded, quoted = raw.lower(), f'"{raw}"'
    if raw in ("", "~", "null", "Null", "NULL"):
        return Refused("no-value", {"raw": f"`{raw}`" if raw else "nothing stands here"})
    if folded in _YES_NO and raw in (folded, folded.capitalize(), folded.upper()):
        return Refused("yes-no", {"raw": raw, "old": _YES_NO[folded], "quoted": quoted})
    if raw in ("True", "TRUE", "False", "FALSE"):
        return Refused("capital-word", {"raw": raw, "new": folded, "quoted": quoted})
    return Refused("value-sign") if raw == "=" else None


def _number(raw: str) -> str | int | float | Refused:
    quoted = f'"{raw}"'
    if _INT.fullmatch(raw):
        return WholeNumber(raw) if len(raw) <= LONGEST_NUMBER else Refused("number-too-long", {"raw": raw})
    if _FLOAT.fullmatch(raw):
        fits = len(raw) <= LONGEST_NUMBER and math.isfinite(float(raw)) and abs(float(raw)) < 1e300
        return Number(raw) if fits else Refused("number-too-long", {"raw": raw})
    if _ENDLESS.fullmatch(raw):
        return Refused("not-finite", {"raw": raw})
    if _DATE.fullmatch(raw):
        return Refused("date", {"raw": raw, "quoted": quoted})
    if match := _SEXAGESIMAL.fullmatch(raw):
        return Refused("sexagesimal", {"raw": raw, "old": _base_sixty(match), "quoted": quoted})
    return _number_in_another_form(raw, quoted)


def _number_in_another_form(raw: str, quoted: str) -> str | Refused:
    if match := _ZEROS.fullmatch(raw):
        new = (match[1].replace("+", "") + match[2].lstrip("0") or "0") + (match[3] or "") + (match[4] or "")
        if match[3] or match[4] or re.search("[89]", match[2]):
            return Refused("leading-zeros", {"raw": raw, "new": new, "quoted": quoted})
        words, old = {"raw": raw, "new": new, "quoted": quoted}, str(int(match[2][:LONGEST_NUMBER], 8))
        same = old == new.lstrip("-")
        return Refused("leading-zeros", words) if same else Refused("octal", words | {"old": match[1] + old})
    if match := _BASED.fullmatch(raw):
        try:
            value = int(match[3].replace("_", "")[:LONGEST_NUMBER], {"o": 8, "x": 16, "b": 2}[match[2]])
        except ValueError:
            return raw
        return Refused("base-prefix", {"raw": raw, "new": f"{match[1]}{value}", "quoted": quoted})
    if _UNDERSCORED.fullmatch(raw):
        return Refused("underscored", {"raw": raw, "new": raw.replace("_", ""), "quoted": quoted})
    return raw


def _base_sixty(match: re.Match[str]) -> str:
    total = 0
    for part in match[2].replace("_", "")[:LONGEST_NUMBER].split(":"):
        total = total * 60 + int(part or "0")
    return f"{match[1]}{total}{(match[3] or '').replace('_', '')}"
