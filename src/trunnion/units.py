"""Quantities as people type them, and numbers as the package prints them.

A quantity is a number and a unit, `10 deg`, `120 deg/s`, `50 %`. There is no registry and no derived units: a
table of the units of the trade, each with its kind and its size. Angles are radians inside, everything else
SI.
"""

from __future__ import annotations

import decimal
import difflib
import enum
import math
import re
from collections.abc import Callable
from dataclasses import dataclass

from trunnion.errors import UnitError

#: Slack of a limit comparison and of a printed bound (degree): a margin this near a limit is at the limit,
#: and a bound this near a printable value prints as that value (20 deg comes back from radians as
#: 19.999999999999996).
LIMIT_SLACK_DEG = 1e-9

STANDARD_GRAVITY = 9.80665  # m/s^2, exact by definition (3rd CGPM, 1901)

_TURN_DEG = 360.0


@dataclass(frozen=True)
class Unit:
    """A unit: its symbol, its kind, and how a number in it becomes the inside unit of that kind."""

    symbol: str
    kind: str
    to_inside: Callable[[float], float]
    from_inside: Callable[[float], float]


def _scaled(symbol: str, kind: str, size: float) -> Unit:
    return Unit(symbol, kind, lambda x: x * size, lambda x: x / size)


def _of_degrees(symbol: str, kind: str, degrees: float) -> Unit:
    """An angular unit as a number of degrees; 180 deg becomes pi exactly, a factor pi/180 does not promise
    it."""
    return Unit(symbol, kind, lambda x: math.radians(x * degrees), lambda x: math.degrees(x) / degrees)


def _of_degree_parts(symbol: str, kind: str, parts: float) -> Unit:
    return Unit(symbol, kind, lambda x: math.radians(x / parts), lambda x: math.degrees(x) * parts)


_UNITS: tuple[Unit, ...] = (
    _of_degrees("deg", "angle", 1.0),
    _scaled("rad", "angle", 1.0),
    _scaled("mrad", "angle", 1e-3),
    _scaled("urad", "angle", 1e-6),
    _of_degree_parts("arcmin", "angle", 60.0),
    _of_degree_parts("arcsec", "angle", 3600.0),
    _of_degree_parts("mas", "angle", 3.6e6),
    _of_degrees("turn", "angle", _TURN_DEG),
    _of_degrees("deg/s", "angular rate", 1.0),
    _of_degree_parts("deg/min", "angular rate", 60.0),
    _of_degree_parts("deg/h", "angular rate", 3600.0),
    _scaled("rad/s", "angular rate", 1.0),
    _scaled("mrad/s", "angular rate", 1e-3),
    _of_degree_parts("arcmin/s", "angular rate", 60.0),
    _of_degree_parts("arcsec/s", "angular rate", 3600.0),
    _of_degrees("rpm", "angular rate", _TURN_DEG / 60.0),
    _of_degrees("deg/s^2", "angular acceleration", 1.0),
    _scaled("rad/s^2", "angular acceleration", 1.0),
    _scaled("s", "time", 1.0),
    _scaled("ms", "time", 1e-3),
    _scaled("us", "time", 1e-6),
    _scaled("ns", "time", 1e-9),
    _scaled("min", "time", 60.0),
    _scaled("h", "time", 3600.0),
    _scaled("Hz", "frequency", 1.0),
    _scaled("kHz", "frequency", 1e3),
    _scaled("m", "length", 1.0),
    _scaled("mm", "length", 1e-3),
    _scaled("um", "length", 1e-6),
    _scaled("cm", "length", 1e-2),
    _scaled("km", "length", 1e3),
    _scaled("m/s", "speed", 1.0),
    _scaled("m/s^2", "acceleration", 1.0),
    _scaled("g", "acceleration", STANDARD_GRAVITY),
    _scaled("mg", "acceleration", 1e-3 * STANDARD_GRAVITY),
    _scaled("%", "ratio", 1e-2),
    _scaled("percent", "ratio", 1e-2),
    _scaled("ppm", "ratio", 1e-6),
    _scaled("times", "ratio", 1.0),
    _scaled("B", "data size", 1.0),
    _scaled("kB", "data size", 1e3),
    _scaled("MB", "data size", 1e6),
    _scaled("GB", "data size", 1e9),
)
UNITS: dict[str, Unit] = {unit.symbol: unit for unit in _UNITS}

KINDS: tuple[str, ...] = tuple(dict.fromkeys(unit.kind for unit in _UNITS))

#: One quantity of each kind, to show the form.
EXAMPLES: dict[str, str] = {
    "angle": "10 deg",
    "angular rate": "120 deg/s",
    "angular acceleration": "40 deg/s^2",
    "time": "20 ms",
    "frequency": "50 Hz",
    "length": "25 mm",
    "speed": "12 m/s",
    "acceleration": "0.02 g",
    "ratio": "5 %",
    "data size": "50 MB",
}

# what people write for a unit of the table, and the form to write
_OTHER_FORMS: dict[str, str] = {
    form: symbol
    for symbol, forms in {
        "deg": ["°", "degree", "degrees", "degs"],
        "rad": ["radian", "radians", "rads"],
        "arcmin": ["'", "′", "amin"],
        "arcsec": ['"', "″", "asec"],
        "deg/s": ["dps", "°/s", "deg/sec", "degrees/s"],
        "deg/s^2": ["deg/s/s", "deg/s2", "deg/s²", "°/s²"],
        "rad/s^2": ["rad/s2", "rad/s²"],
        "rpm": ["RPM"],
        "s": ["sec", "secs", "second", "seconds"],
        "ms": ["msec"],
        "us": ["usec", "µs", "μs"],
        "min": ["minute", "minutes"],
        "h": ["hour", "hours"],
        "Hz": ["hz", "HZ"],
        "m": ["metre", "metres", "meter", "meters"],
        "m/s^2": ["m/s2", "m/s²"],
        "g": ["G"],
        "percent": ["per cent"],
        "B": ["bytes"],
        "kB": ["KB", "kb"],
        "MB": ["mb", "Mb"],
        "GB": ["gb"],
    }.items()
    for form in forms
}

_NUMBER = r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d{1,4})?"
_QUANTITY = re.compile(rf"({_NUMBER})\s*(.*)", re.DOTALL)


@dataclass(frozen=True)
class Quantity:
    """A typed quantity: `value` in radians or SI (as its kind says), `text` as it was written, tidied."""

    value: float
    unit: str
    kind: str
    text: str

    @property
    def number(self) -> float:
        """The number in the unit it was written in."""
        return float(self.text.split()[0])

    def in_unit(self, symbol: str) -> float:
        """The number in another unit of the same kind; UnitError for a unit of another kind."""
        return convert(self.value, self.kind, symbol)

    def __str__(self) -> str:
        return self.text


def convert(value: float, kind: str, symbol: str) -> float:
    """A value in the inside unit of `kind` (rad, SI) as a number in `symbol`."""
    unit = UNITS.get(symbol)
    if unit is None or unit.kind != kind:
        raise UnitError(f"'{symbol}' is not a unit of {kind}", remedy=f"write {units_of(kind)}")
    return unit.from_inside(value)


def units_of(kind: str) -> str:
    """The units of one kind as words: `deg, rad, mrad … or turn`."""
    symbols = [unit.symbol for unit in _UNITS if unit.kind == kind]
    return symbols[0] if len(symbols) == 1 else ", ".join(symbols[:-1]) + " or " + symbols[-1]


def nearest_unit(text: str, kind: str | None = None) -> str | None:
    """The unit someone probably means by `text`, of the given kind if there is one."""
    if text in _OTHER_FORMS:
        return _OTHER_FORMS[text]
    candidates = [unit.symbol for unit in _UNITS if kind is None or unit.kind == kind]
    folded = {symbol.lower(): symbol for symbol in candidates}
    near = difflib.get_close_matches(text.lower(), list(folded), n=1, cutoff=0.6)
    return folded[near[0]] if near else None


def parse_quantity(text: str, *, kind: str | None = None) -> Quantity:
    """Read `10 deg`, `-0.5 mrad`, `1e-3 rad/s`, `50 %`.

    kind: one of KINDS, or None for any. Returns the quantity with its value in radians or SI. Raises
    UnitError, with the form to write, for a missing, unknown or wrong unit and for a number that is not
    finite.
    """
    example = EXAMPLES[kind] if kind else "10 deg"
    match = _QUANTITY.fullmatch(text.strip())
    if match is None or len(text) > 80:
        raise UnitError(f"'{shown(text)}' is not a number with a unit", remedy=f"write it as in {example}")
    number, symbol = match[1], " ".join(match[2].split())
    if not symbol:
        wanted = units_of(kind) if kind else "deg, s, m …"
        raise UnitError(f"{number} has no unit", remedy=f"add the unit ({wanted}), as in {example}")
    unit = UNITS.get(symbol)
    if unit is None:
        near = nearest_unit(symbol, kind)
        hint = f"write {number} {near}" if near else f"write {units_of(kind) if kind else ', '.join(UNITS)}"
        raise UnitError(f"'{shown(symbol)}' is not a known unit", remedy=hint)
    if kind is not None and unit.kind != kind:
        raise UnitError(
            f"'{number} {symbol}' is {_article(unit.kind)}, and {_article(kind)} is meant here",
            remedy=f"give it in {units_of(kind)}",
        )
    value = unit.to_inside(float(number))
    if not math.isfinite(value):
        raise UnitError(f"{number} {symbol} is too large to compute with", remedy="write a finite number")
    return Quantity(value, symbol, unit.kind, f"{number} {symbol}")


def shown(text: str, limit: int = 60) -> str:
    """Text fit for a one-line message: control characters escaped, long text cut."""
    safe = "".join(c if c.isprintable() else f"[U+{ord(c):04X}]" for c in text[: limit + 1])
    return safe if len(text) <= limit else safe[:limit] + "…"


def _article(noun: str) -> str:
    return f"an {noun}" if noun[0] in "aeiou" else f"a {noun}"


class Toward(enum.Enum):
    """Which way a printed number is rounded."""

    NEAREST = decimal.ROUND_HALF_EVEN
    LOWER = decimal.ROUND_FLOOR
    UPPER = decimal.ROUND_CEILING


#: A lower bound is printed low and an upper bound high: what is printed is never better than what was found.
FLOOR, CEILING = Toward.LOWER, Toward.UPPER


def format_number(value: float, *, digits: int, toward: Toward = Toward.NEAREST, slack: float = 0.0) -> str:
    """A number with a fixed count of decimals, rounded as said; no negative zero.

    slack (same unit as value): a value this near a printable one prints as that one.
    """
    if not math.isfinite(value):
        return "not a number" if math.isnan(value) else ("infinite" if value > 0 else "-infinite")
    step = decimal.Decimal(1).scaleb(-digits)
    exact = decimal.Decimal(value)
    with decimal.localcontext() as context:
        context.prec = 400
        nearest = exact.quantize(step, rounding=decimal.ROUND_HALF_EVEN)
        near = abs(exact - nearest) <= decimal.Decimal(slack)
        rounded = nearest if near else exact.quantize(step, rounding=toward.value)
    return f"{abs(rounded) if rounded == 0 else rounded:f}"


def format_angle(value: float, *, digits: int = 2, toward: Toward = Toward.NEAREST, unit: str = "deg") -> str:
    """An angle (rad) as `21.39 deg`.

    A floor of 21.3961 deg prints as 21.39 and a ceiling as 21.40; within LIMIT_SLACK_DEG of a printable value
    it prints as that one.
    """
    slack = abs(convert(math.radians(LIMIT_SLACK_DEG), "angle", unit))
    number = convert(value, "angle", unit)
    return f"{format_number(number, digits=digits, toward=toward, slack=slack)} {unit}"


def format_quantity(value: float, kind: str, unit: str, *, digits: int = 3, toward: Toward = Toward.NEAREST) -> str:
    """A value in the inside unit of `kind` printed in `unit`, rounded as said."""
    if kind == "angle":
        return format_angle(value, digits=digits, toward=toward, unit=unit)
    return f"{format_number(convert(value, kind, unit), digits=digits, toward=toward)} {unit}"
