"""The statement of a table: all that must be said about a file of attitudes before one number of it is used.

A statement says where the file is, which columns hold what in which unit and order, which way the rotation maps, and
what may be assumed between samples. Nothing of it is guessed: what is missing is asked for (`questions.py`).
"""

from __future__ import annotations

import enum
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from trunnion.attitude.conventions import Convention
from trunnion.errors import Fault, Place, TableError, UnitError
from trunnion.tables.nearest import nearest_hint
from trunnion.units import UNITS, parse_quantity


class Form(enum.Enum):
    """How one row states an attitude; the value is the key in the spec and the number of columns follows."""

    QUATERNION = "quaternion"
    MATRIX = "matrix"
    ANGLES = "angles"

    @property
    def width(self) -> int:
        """How many columns one attitude takes."""
        return {"quaternion": 4, "matrix": 9, "angles": 3}[self.value]


class Scalar(enum.Enum):
    """Which of the four quaternion columns is the scalar part."""

    FIRST = "first"
    LAST = "last"


class Order(enum.Enum):
    """In which order nine matrix columns fill the matrix."""

    ROWS = "rows"
    COLUMNS = "columns"


class Between(enum.Enum):
    """What may be assumed of the attitude between two samples."""

    SLERP = "slerp"
    RATE_LIMITED = "rate limited"
    SAMPLES = "samples"


ANGLE_UNITS = ("deg", "rad")
TIME_UNITS = tuple(symbol for symbol, unit in UNITS.items() if unit.kind == "time")


@dataclass(frozen=True)
class TableStatement:
    """What is stated of one attitude table. Angles in rad, times in s, except where a unit field says otherwise.

    `body_to_reference` tells which way a quaternion or matrix maps (None: not stated); angles carry their meaning in
    `convention`. `topic` and `instance` choose one series in a log, `segment` (1, 2, …) one in a CCSDS message.
    `sha256`, where stated, is the
    digest the file must have; `reader_memory` (bytes) and `reader_time` (s) raise the limits of the process that
    reads a binary format. `answers` holds the answers to the questions a format asks that no other field answers.
    """

    path: str
    form: Form | None = None
    columns: tuple[str, ...] = ()
    time_column: str | None = None
    time_unit: str | None = None
    format: str | None = None
    scalar: Scalar | None = None
    order: Order | None = None
    convention: Convention | None = None
    angle_unit: str | None = None
    reference: str | None = None
    body: str | None = None
    body_to_reference: bool | None = None
    between: Between | None = None
    max_rate: float | None = None
    attitude_error: float | None = None
    max_gap: float | None = None
    accept_damaged: str | None = None
    topic: str | None = None
    instance: int = 0
    segment: int | None = None
    separator: str = ","
    norm_tolerance: float = 1e-3
    sha256: str | None = None
    reader_memory: float | None = None
    reader_time: float | None = None
    answers: Mapping[str, str] = field(default_factory=dict)


_KEYS = (
    "table",
    "columns",
    "format",
    "scalar",
    "order",
    "convention",
    "reference",
    "body",
    "maps",
    "between samples",
    "max rate",
    "max body rate",
    "attitude error",
    "max gap",
    "accept damaged",
    "topic",
    "instance",
    "segment",
    "separator",
    "norm tolerance",
    "sha256",
    "reader memory",
    "reader time",
    "answers",
    "source",
)
_COLUMN_KEYS = ("time", "quaternion", "matrix", "angles", "unit")


def statement_from_plain(plain: Mapping[str, Any], convention: Convention | None = None) -> TableStatement:
    """A TableStatement from plain data with the keys of the spec (`table`, `columns`, `scalar`, `maps`, …).

    `convention` is the built object that the plain key `convention` names; it is needed for angles. Every fault of
    the statement is collected; raises TableError with all of them.
    """
    reader = _Reader(plain, convention)
    statement = reader.read()
    if reader.faults:
        raise TableError(reader.faults)
    return statement


class _Reader:
    """Reads one plain mapping and collects what is wrong with it."""

    def __init__(self, plain: Mapping[str, Any], convention: Convention | None) -> None:
        self.plain = plain
        self.convention = convention
        self.faults: list[Fault] = []

    def read(self) -> TableStatement:
        self._refuse_unknown(self.plain, _KEYS, "")
        columns = self.plain.get("columns") or {}
        if not isinstance(columns, Mapping):
            self._fault("columns", "is not a mapping", "write columns: {time: …, quaternion: […]}")
            columns = {}
        self._refuse_unknown(columns, _COLUMN_KEYS, "columns.")
        form, names = self._form(columns)
        time_column, time_unit = self._time(columns.get("time"))
        reference, body = self._frames()
        return TableStatement(
            path=self._text("table") or "",
            form=form,
            columns=names,
            time_column=time_column,
            time_unit=time_unit,
            format=self._text("format"),
            scalar=self._word("scalar", Scalar),
            order=self._word("order", Order),
            convention=self.convention,
            angle_unit=self._angle_unit(columns, form),
            reference=reference,
            body=body,
            body_to_reference=self._maps(reference, body),
            between=self._word("between samples", Between),
            max_rate=self._quantity("max rate", "angular rate") or self._quantity("max body rate", "angular rate"),
            attitude_error=self._quantity("attitude error", "angle"),
            max_gap=self._quantity("max gap", "time"),
            accept_damaged=self._reason(),
            topic=self._text("topic"),
            instance=self._count("instance", 0),
            segment=self._count("segment", None),
            separator=self._separator(),
            norm_tolerance=self._tolerance(),
            sha256=self._digest(),
            reader_memory=self._quantity("reader memory", "data size"),
            reader_time=self._quantity("reader time", "time"),
            answers=self._answers(),
        )

    def _fault(self, key: str, cause: str, remedy: str = "") -> None:
        table = self.plain.get("table")
        place = Place(table if isinstance(table, str) else None)
        self.faults.append(Fault(f"'{key}' {cause}", remedy, place))

    def _refuse_unknown(self, found: Mapping[str, Any], known: tuple[str, ...], prefix: str) -> None:
        for key in found:
            if key not in known:
                self._fault(f"{prefix}{key}", "is not a key of a table", nearest_hint(str(key), known))

    def _text(self, key: str) -> str | None:
        value = self.plain.get(key)
        if value is None:
            if key == "table":
                self._fault(key, "is missing", "name the file, relative to the workbook")
            return None
        if not isinstance(value, str) or not value.strip():
            self._fault(key, f"is {value!r}, not a text")
            return None
        return value

    def _word(self, key: str, words: type[enum.Enum]) -> Any:
        value = self.plain.get(key)
        if value is None:
            return None
        known = [word.value for word in words]
        if value not in known:
            self._fault(key, f"is {value!r}", f"say one of: {', '.join(known)}")
            return None
        return words(value)

    def _count(self, key: str, default: int | None) -> Any:
        value = self.plain.get(key, default)
        if value is not None and (isinstance(value, bool) or not isinstance(value, int) or value < 0):
            self._fault(key, f"is {value!r}", "give a whole number")
            return default
        return value

    def _quantity(self, key: str, kind: str) -> float | None:
        value = self.plain.get(key)
        if value is None:
            return None
        try:
            number = parse_quantity(value if isinstance(value, str) else str(value), kind=kind).value
        except UnitError as err:
            self._fault(key, err.fault.cause, err.fault.remedy)
            return None
        if not number > 0.0:
            self._fault(key, f"is {value!r}", "give a quantity above zero")
        return number

    def _separator(self) -> str:
        value = self.plain.get("separator", ",")
        if not isinstance(value, str) or len(value) != 1 or value in '"\r\n#.+-' or value.isalnum():
            self._fault("separator", f"is {value!r}", "give the one character between two cells")
            return ","
        return value

    def _tolerance(self) -> float:
        value = self.plain.get("norm tolerance", 1e-3)
        if isinstance(value, bool) or not isinstance(value, (int, float)) or not 0.0 < value < 0.5:
            self._fault("norm tolerance", f"is {value!r}", "give a number between 0 and 0.5, without unit")
            return 1e-3
        return float(value)

    def _reason(self) -> str | None:
        value = self.plain.get("accept damaged")
        if value is None:
            return None
        if not isinstance(value, str) or len(value.strip()) < 5:
            self._fault("accept damaged", f"is {value!r}", "give the reason in words; it is printed in the package")
            return None
        return value.strip()

    def _digest(self) -> str | None:
        value = self._text("sha256")
        if value is not None and re.fullmatch(r"[0-9a-fA-F]{64}", value) is None:
            self._fault("sha256", f"is {value!r}", "give the 64 hexadecimal digits of the file's SHA-256")
            return None
        return value.lower() if value else None

    def _answers(self) -> Mapping[str, str]:
        value = self.plain.get("answers") or {}
        if not isinstance(value, Mapping) or not all(isinstance(word, str) for word in value.values()):
            self._fault("answers", "is not a mapping of questions to texts")
            return {}
        return dict(value)

    def _form(self, columns: Mapping[str, Any]) -> tuple[Form | None, tuple[str, ...]]:
        forms = [form for form in Form if form.value in columns]
        if len(forms) > 1:
            listed = " and ".join(form.value for form in forms)
            self._fault("columns", f"states {listed}", "state one of them; the other is a table of its own")
        if not forms:
            return None, ()
        form, names = forms[0], columns[forms[0].value]
        is_list = isinstance(names, (list, tuple)) and all(isinstance(name, (str, int)) for name in names)
        if not is_list or len(names) != form.width:
            self._fault(f"columns.{form.value}", f"does not name {form.width} columns")
            return form, ()
        texts = tuple(str(name) for name in names)
        if len(set(texts)) != len(texts):
            self._fault(f"columns.{form.value}", "names one column twice")
        return form, texts

    def _time(self, time: Any) -> tuple[str | None, str | None]:
        if time is None:
            return None, None
        if not isinstance(time, Mapping) or not isinstance(time.get("column"), str):
            self._fault("columns.time", "does not name column and unit", "write time: {column: t, unit: s}")
            return None, None
        unit = time.get("unit")
        if unit is not None and unit not in TIME_UNITS:
            self._fault("columns.time.unit", f"is {unit!r}", f"say one of: {', '.join(TIME_UNITS)}")
            unit = None
        return time["column"], unit

    def _angle_unit(self, columns: Mapping[str, Any], form: Form | None) -> str | None:
        unit = columns.get("unit")
        if unit is not None and unit not in ANGLE_UNITS:
            self._fault("columns.unit", f"is {unit!r}", "say deg or rad")
            return None
        return unit if form is Form.ANGLES else None

    def _frames(self) -> tuple[str | None, str | None]:
        if self.convention is not None:
            return self.convention.reference.name, self.convention.body.name
        return self._text("reference"), self._text("body")

    def _maps(self, reference: str | None, body: str | None) -> bool | None:
        value = self.plain.get("maps")
        if value is None:
            return None
        ends = [end.strip() for end in value.split(" to ")] if isinstance(value, str) else []
        known_bodies = {"body", body} - {None}
        if len(ends) == 2 and ends[0] != ends[1]:
            other = {"reference", reference} - {None}
            if ends[0] in known_bodies and (reference is None or ends[1] in other):
                return True
            if ends[1] in known_bodies and (reference is None or ends[0] in other):
                return False
        names = f"{body or 'body'} to {reference or 'reference'}"
        back = f"{reference or 'reference'} to {body or 'body'}"
        self._fault("maps", f"is {value!r}", f"say which components the rotation takes to which: '{names}' or '{back}'")
        return None
