"""Why a calculation is out of date: data first, text second."""

from __future__ import annotations

import enum
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from trunnion.calculations.digest import sha256_json

_ABSENT = object()


class ReasonKind(enum.Enum):
    """What kind of thing changed."""

    NEW = "new calculation"
    PARAMETER = "parameter"
    INPUT = "input file"
    TEMPLATE = "template"
    CODE = "program source"
    PYTHON = "Python"
    LIBRARY = "library"
    BODY = "stored notebook"


@dataclass(frozen=True)
class Reason:
    """One changed thing: its kind, which one, its old and new value as plain JSON (None where there was none)."""

    kind: ReasonKind
    what: str
    old: Any = None
    new: Any = None

    def plain(self) -> dict[str, Any]:
        """The reason as JSON."""
        return {"kind": self.kind.value, "what": self.what, "old": self.old, "new": self.new}

    @property
    def text(self) -> str:
        """The reason in one line: `parameter envelopes.cruise.box.bank: [-45 deg, 45 deg] → [-50 deg, 50 deg]`."""
        if self.kind in (ReasonKind.NEW, ReasonKind.BODY):
            return self.what
        return f"{self.kind.value} {self.what}: {value_text(self.old)} → {value_text(self.new)}"


def reasons(
    old: Mapping[str, Any] | None,
    new: Mapping[str, Any],
    *,
    old_code: Mapping[str, str] | None = None,
    new_code: Mapping[str, str] | None = None,
) -> list[Reason]:
    """What differs between the key parts of then and now; empty when the key is the same.

    `old` None: the calculation was never computed. `old_code` and `new_code` are the digests of the source files, so
    that the files themselves can be named; they are used only where they belong to the recorded code digest.
    """
    if old is None:
        return [Reason(ReasonKind.NEW, "never computed")]
    found = [*_template(old, new), *_inputs(old, new), *_parameters(old, new)]
    if old["code"] != new["code"]:
        found += _code(old, new, old_code, new_code)
    if old["python"] != new["python"]:
        found.append(Reason(ReasonKind.PYTHON, "version", old["python"], new["python"]))
    for name, before, after in differences(old["libraries"], new["libraries"]):
        found.append(Reason(ReasonKind.LIBRARY, name, before, after))
    return found


def differences(old: Any, new: Any, path: str = "") -> Iterator[tuple[str, Any, Any]]:
    """The places where two plain values differ: (key path, old, new), None for what is not there."""
    if isinstance(old, Mapping) and isinstance(new, Mapping):
        for key in dict.fromkeys((*old, *new)):
            inner = f"{path}.{key}" if path else str(key)
            yield from differences(old.get(key, _ABSENT), new.get(key, _ABSENT), inner)
    elif old is _ABSENT or new is _ABSENT or old != new or type(old) is not type(new):
        yield path, None if old is _ABSENT else old, None if new is _ABSENT else new


def value_text(value: Any) -> str:
    """A plain value in few words."""
    if value is None:
        return "none"
    if isinstance(value, Mapping):
        return "{" + ", ".join(f"{key}: {value_text(entry)}" for key, entry in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(value_text(entry) for entry in value) + "]"
    text = f"{value:.10g}" if isinstance(value, float) else str(value)
    return text[:12] if len(text) == 64 and set(text) <= set("0123456789abcdef") else text


def _template(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Reason]:
    before, after = old["template"], new["template"]
    if before["name"] != after["name"]:
        return [Reason(ReasonKind.TEMPLATE, "name", before["name"], after["name"])]
    if before["local"] != after["local"]:
        return [Reason(ReasonKind.TEMPLATE, f"{after['name']} of the workbook's own", before["local"], after["local"])]
    if before["cells"] != after["cells"]:
        return [Reason(ReasonKind.TEMPLATE, after["name"], before["cells"], after["cells"])]
    return []


def _inputs(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Reason]:
    """Inputs by file name; a held name is the content's first twelve digits, a dash, and the file's name."""
    before = {held[13:]: digest for held, digest in old["inputs"].items()}
    after = {held[13:]: digest for held, digest in new["inputs"].items()}
    return [Reason(ReasonKind.INPUT, name, was, now) for name, was, now in differences(before, after)]


def _parameters(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Reason]:
    """Parameters that differ, apart from the names of copied inputs, which change with their content."""
    held = {*old["inputs"], *new["inputs"]}
    return [
        Reason(ReasonKind.PARAMETER, path, before, after)
        for path, before, after in differences(old["parameters"], new["parameters"])
        if not (isinstance(before, str) and isinstance(after, str) and {before, after} <= held)
    ]


def _code(
    old: Mapping[str, Any],
    new: Mapping[str, Any],
    old_code: Mapping[str, str] | None,
    new_code: Mapping[str, str] | None,
) -> list[Reason]:
    known = (
        old_code is not None
        and new_code is not None
        and sha256_json(dict(old_code)) == old["code"]
        and sha256_json(dict(new_code)) == new["code"]
    )
    if not known:
        return [Reason(ReasonKind.CODE, "of the numerical rooms", old["code"], new["code"])]
    return [Reason(ReasonKind.CODE, name, was, now) for name, was, now in differences(old_code, new_code)]
