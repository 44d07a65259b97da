"""The kinds of value a key of the spec can hold: names, texts, quantities, ranges, directions, numbers,
paths.

Each is a pydantic type that refuses with a registered kind of fault (`kinds.py`) and publishes its JSON
Schema. Quantities are converted to radians or SI here, once; they keep the text they were written with.
"""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, PlainSerializer, PlainValidator, WithJsonSchema
from pydantic_core import PydanticCustomError

from trunnion.errors import UnitError
from trunnion.spec.scalars import Number, WholeNumber
from trunnion.units import EXAMPLES, UNITS, Quantity, nearest_unit, parse_quantity, shown, units_of

LONGEST_NAME = 60
LONGEST_TITLE = 120


def refuse(kind: str, **words: Any) -> PydanticCustomError:
    """An error of a registered kind, to be raised inside a validator."""
    return PydanticCustomError(kind, "{kind}", {"kind": kind, **words})


def what_it_is(value: Any) -> str:
    """`the number 4`, `a list`, `the text 'north'`: what stands in the file, for messages."""
    if isinstance(value, bool):
        return f"the word `{str(value).lower()}`"
    if isinstance(value, int | float):
        return f"the number {getattr(value, 'raw', value)}"
    if isinstance(value, str):
        return f"the text '{shown(value, 40)}'"
    return "a list" if isinstance(value, list) else "a mapping" if isinstance(value, dict) else "nothing"


def wrong_type(value: Any, expected: str, example: str) -> PydanticCustomError:
    """A value of the wrong type, saying what stands there and what belongs there."""
    return refuse("wrong-type", what=what_it_is(value), expected=expected, example=example)


# --- texts
# ---------------------------------------------------------------------------------------------------------


def _text(value: Any) -> str:
    if isinstance(value, WholeNumber | Number):
        return value.raw
    if not isinstance(value, str):
        raise wrong_type(value, "text", '"some words"')
    return value


def _name(value: Any) -> str:
    text = _text(value)
    if len(text) > LONGEST_NAME:
        raise refuse("name-too-long", count=len(text))
    if not text or text != text.strip() or "\n" in text:
        raise refuse("blank-name")
    return text


def _title(value: Any) -> str:
    text = _text(value)
    if len(text) > LONGEST_TITLE:
        raise refuse("title-too-long", count=len(text))
    if not text or text != text.strip() or "\n" in text:
        raise refuse("blank-name")
    return text


_ID = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]*")


def _id(value: Any) -> str:
    text = _name(value)
    if not _ID.fullmatch(text):
        bad = next((c for c in text if not re.fullmatch(r"[A-Za-z0-9._-]", c)), text[0])
        raise refuse("bad-id", value=text, character=bad)
    return text


def _schema(validate: Callable[[Any], Any], schema: dict[str, Any]) -> Any:
    return (PlainValidator(validate), WithJsonSchema(schema))


_TEXT_OR_NUMBER: dict[str, Any] = {"type": ["string", "number"]}

Text = Annotated[str, *_schema(_text, _TEXT_OR_NUMBER)]
Name = Annotated[str, *_schema(_name, _TEXT_OR_NUMBER | {"maxLength": LONGEST_NAME})]
Title = Annotated[str, *_schema(_title, _TEXT_OR_NUMBER | {"maxLength": LONGEST_TITLE})]
Id = Annotated[str, *_schema(_id, _TEXT_OR_NUMBER | {"maxLength": LONGEST_NAME, "pattern": f"^{_ID.pattern}$"})]


def _relative_path(value: Any) -> str:
    text = _text(value)
    why = None
    if not text.strip() or text != text.strip() or "\n" in text:
        raise refuse("blank-name")
    if "\\" in text:
        why = "it holds a backslash"
    elif text.startswith(("/", "~")) or re.match(r"[A-Za-z]:", text):
        why = "it begins at the root, a home or a drive"
    elif "://" in text:
        why = "it is an address"
    elif ".." in text.split("/"):
        why = "it goes up with `..`"
    if why:
        raise refuse("path-leaves", path=text, why=why)
    return text


RelativePath = Annotated[str, *_schema(_relative_path, {"type": "string"})]

# --- quantities
# ----------------------------------------------------------------------------------------------------


def read_quantity(value: Any, kind: str | None) -> Quantity:
    """A quantity of a kind (None: any) from what stands in the file; refuses with the form to write."""
    example = EXAMPLES[kind] if kind else "10 deg"
    units = units_of(kind) if kind else "its unit"
    if isinstance(value, Quantity):
        return value
    if isinstance(value, int | float) and not isinstance(value, bool):
        raise refuse("no-unit", number=getattr(value, "raw", value), units=units, example=example)
    if not isinstance(value, str):
        raise wrong_type(value, "a quantity", example)
    try:
        return parse_quantity(value, kind=kind)
    except UnitError as err:
        raise _quantity_fault(value, kind, units, example) from err


def _quantity_fault(text: str, kind: str | None, units: str, example: str) -> PydanticCustomError:
    number, _, symbol = text.strip().partition(" ")
    try:
        found = parse_quantity(text)
    except UnitError:
        match = re.fullmatch(r"([-+0-9.eE]*[0-9.])\s*(\D.*)?", text.strip(), re.DOTALL)
        if match is None or math.isinf(_float(match[1])):
            return refuse("not-a-quantity", text=text, example=example)
        number, symbol = match[1], match[2]
        if not symbol:
            return refuse("no-unit", number=number, units=units, example=example)
        near = nearest_unit(symbol, kind)
        known = units if kind else ", ".join(UNITS)
        return refuse("unknown-unit", symbol=symbol, hint=f"write {number} {near}" if near else f"write {known}")
    return refuse("wrong-kind", text=found.text, found=_article(found.kind), wanted=_article(kind or ""), units=units)


def _float(text: str) -> float:
    try:
        return float(text)
    except ValueError:
        return math.inf


def _article(noun: str) -> str:
    return f"an {noun}" if noun[:1] in "aeiou" else f"a {noun}"


def _quantity_type(kind: str | None, *, least: float | None = None) -> Any:
    def validate(value: Any) -> Quantity:
        quantity = read_quantity(value, kind)
        if least is not None and quantity.value < least:
            raise refuse(
                "negative", text=quantity.text, what=_article(kind or "quantity"), example=EXAMPLES[kind or "angle"]
            )
        return quantity

    schema = {
        "type": "string",
        "pattern": r"^\s*[-+]?(\d+\.?\d*|\.\d+)([eE][-+]?\d+)?\s*\S+",
        "examples": [EXAMPLES[kind or "angle"]],
    }
    return Annotated[Quantity, PlainValidator(validate), PlainSerializer(str), WithJsonSchema(schema)]


Angle = _quantity_type("angle")
PositiveAngle = _quantity_type("angle", least=0.0)
Rate = _quantity_type("angular rate", least=0.0)
Acceleration = _quantity_type("angular acceleration", least=0.0)
Length = _quantity_type("length", least=0.0)
Time = _quantity_type("time")
Duration = _quantity_type("time", least=0.0)
DataSize = _quantity_type("data size", least=0.0)
AnyQuantity = _quantity_type(None)


@dataclass(frozen=True)
class Range:
    """Where an angle may lie: `any`, one value (lo is hi), or two ends as written; hi < lo runs through the
    half turn."""

    lo: Quantity | None
    hi: Quantity | None

    @property
    def any(self) -> bool:
        """True for `any`: a whole turn."""
        return self.lo is None

    def ends(self) -> tuple[float, float]:
        """(lo, hi) in rad with lo <= hi; a wrapped range gets a whole turn added to its upper end."""
        if self.lo is None or self.hi is None:
            return -math.pi, math.pi
        lo, hi = self.lo.value, self.hi.value
        return (lo, hi) if lo <= hi else (lo, hi + 2 * math.pi)

    def plain(self) -> str | list[str]:
        """As written: `any`, `0 deg` or the two ends."""
        if self.lo is None or self.hi is None:
            return "any"
        return self.lo.text if self.lo is self.hi else [self.lo.text, self.hi.text]

    def __str__(self) -> str:
        plain = self.plain()
        return plain if isinstance(plain, str) else f"[{plain[0]}, {plain[1]}]"


def read_range(value: Any) -> Range:
    """A range of an angle from what stands in the file."""
    if value == "any":
        return Range(None, None)
    if isinstance(value, Range):
        return value
    if isinstance(value, list):
        if len(value) != 2:
            raise refuse(
                "wrong-count", count=len(value), expected="two ends", meaning="the lowest, then the highest value"
            )
        lo, hi = (read_quantity(end, "angle") for end in value)
        return Range(lo, hi)
    if isinstance(value, dict) or (isinstance(value, str) and not re.match(r"\s*[-+.\d]", value)):
        raise refuse("not-a-range", text=value if isinstance(value, str) else "a mapping")
    one = read_quantity(value, "angle")
    return Range(one, one)


_RANGE_SCHEMA: dict[str, Any] = {
    "anyOf": [{"type": "string"}, {"type": "array", "items": {"type": "string"}, "minItems": 2, "maxItems": 2}],
    "examples": ["any", "0 deg", ["-20 deg", "25 deg"]],
}
AngleRange = Annotated[Range, PlainValidator(read_range), WithJsonSchema(_RANGE_SCHEMA)]

# --- numbers and directions
# ----------------------------------------------------------------------------------------


def _number(value: Any) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise wrong_type(value, "a number", "0.5")
    return float(value)


def _count(value: Any) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or value < 0:
        raise wrong_type(value, "a whole number", "0")
    return int(value)


def _truth(value: Any) -> bool:
    if not isinstance(value, bool):
        raise wrong_type(value, "true or false", "true")
    return value


Real = Annotated[float, *_schema(_number, {"type": "number"})]
Count = Annotated[int, *_schema(_count, {"type": "integer", "minimum": 0})]
Truth = Annotated[bool, *_schema(_truth, {"type": "boolean"})]


def counted(values: Any, count: int, meaning: str) -> list[Any]:
    """A list of exactly `count` values, or a refusal that says what they mean."""
    numerals = {2: "two", 3: "three", 4: "four", 9: "nine"}
    if not isinstance(values, list):
        dots = ", ".join("…" for _ in range(count))
        raise refuse("not-a-list", what=what_it_is(values), expected=numerals[count], dots=dots, meaning=meaning)
    if len(values) != count:
        raise refuse("wrong-count", count=len(values), expected=numerals[count], meaning=meaning)
    return values


def list_of(item: Any, count: int, meaning: str) -> Any:
    """The type of a list with exactly `count` items."""
    schema: Any = {"minItems": count, "maxItems": count}
    return Annotated[list[item], BeforeValidator(lambda v: counted(v, count, meaning)), Field(json_schema_extra=schema)]


def _direction(value: Any) -> str | list[float]:
    if isinstance(value, str):
        return _name(value)
    if not isinstance(value, list):
        raise wrong_type(value, "a direction", "forward")
    numbers = [_number(entry) for entry in counted(value, 3, "x, y and z component")]
    if not any(numbers):
        raise refuse("zero-vector")
    return numbers


#: An axis name of the frame meant (or its opposite), or three components in that frame.
Direction = Annotated[
    str | list[float],
    *_schema(
        _direction,
        {"anyOf": [{"type": "string"}, {"type": "array", "items": {"type": "number"}, "minItems": 3, "maxItems": 3}]},
    ),
]


def one_of(*words: str) -> Any:
    """The type of a key that takes one of a few words."""

    def validate(value: Any) -> str:
        if isinstance(value, bool) and str(value).lower() in words:
            return str(value).lower()
        if not isinstance(value, str):
            raise wrong_type(value, "a word", words[0])
        if value not in words:
            raise refuse("not-one-of", value=value, words=list(words))
        return value

    return Annotated[str, *_schema(validate, {"enum": [*words, True] if "true" in words else [*words]})]
