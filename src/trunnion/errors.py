"""One tree of errors. Every message is for the engineer: where, what is wrong, what would be right."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any


@dataclass(frozen=True)
class Place:
    """A place in a file a person typed: path, 1-based line and column, and the key path in words."""

    file: Path | str | None = None
    line: int | None = None
    column: int | None = None
    key: str = ""

    def __str__(self) -> str:
        parts = [str(self.file)] if self.file is not None else []
        if self.line is not None:
            parts.append(str(self.line))
            if self.column is not None:
                parts.append(str(self.column))
        head = ":".join(parts)
        return f"{head}: {self.key}" if head and self.key else head or self.key


@dataclass(frozen=True)
class Fault:
    """One thing wrong: its place, its cause, and the remedy (the form that would be right)."""

    cause: str
    remedy: str = ""
    place: Place = Place()

    def __str__(self) -> str:
        head = f"{self.place}: " if str(self.place) else ""
        tail = f"\n    {self.remedy}" if self.remedy else ""
        return f"{head}{self.cause}{tail}"


class TrunnionError(Exception):
    """Base of all errors Trunnion raises on purpose; printed without a traceback, exit code 2."""

    def __init__(self, cause: str, *, remedy: str = "", place: Place | None = None) -> None:
        self.fault = Fault(cause, remedy, place or Place())
        super().__init__(str(self.fault))

    def __reduce__(self) -> tuple[Any, ...]:
        """Errors travel whole from one process to another."""
        return _remade, (type(self), self.args, self.__dict__)


def _remade(kind: type[TrunnionError], words: tuple[Any, ...], fields: dict[str, Any]) -> TrunnionError:
    error = kind.__new__(kind, *words)
    error.__dict__.update(fields)
    return error


class FaultsError(TrunnionError):
    """Several faults found in one pass (all spec faults are collected before anything is said)."""

    def __init__(self, faults: list[Fault]) -> None:
        self.faults = list(faults)
        Exception.__init__(self, "\n".join(str(fault) for fault in self.faults))
        self.fault = self.faults[0]


class SpecError(FaultsError):
    """The project spec cannot be used as it stands."""


class UnitError(TrunnionError):
    """A quantity without its unit, or with a unit of the wrong kind."""


class AttitudeError(TrunnionError):
    """A rotation, sequence, frame or convention that is not one."""


class RegionError(TrunnionError):
    """A region (envelope) that is empty, reversed or contradicts its own statement."""


class HardwareError(TrunnionError):
    """A mount, survey or gimbal chain that cannot be what it claims to be."""


class TableError(FaultsError):
    """An attitude table or flight log that cannot be read as stated."""


class TemplateError(TrunnionError):
    """A template that is missing, malformed, or given parameters it does not declare."""


class CalculationError(TrunnionError):
    """A calculation that failed while running."""


class BindingError(FaultsError):
    """Something that cannot be shown rightly in the package (names notebook, cell and item)."""


class StoreError(TrunnionError):
    """The output folder cannot be used: unwritable, locked, damaged or edited behind the tool's back."""


class RecordError(TrunnionError):
    """A finding, statement, signature, issue or archive that breaks a rule."""
