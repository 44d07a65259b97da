"""Where other parts are found, and what becomes of a fault."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any, Protocol

from trunnion.errors import Place, TrunnionError
from trunnion.spec.kinds import fault

Steps = tuple[str | int, ...]


class Note(Protocol):
    """Takes a fault: its kind, the steps to its place, whether the key itself is at fault, and the words."""

    def __call__(self, kind: str, steps: Steps, *, key: bool = False, **words: object) -> None: ...


#: Finds a part: section, what refers to it (a name, or the part written out), the steps to the reference.
Find = Callable[[str, Any, Steps], Any]


@dataclass(frozen=True)
class Context:
    """One part being read: where it stands, where others are found, where faults go."""

    find: Find
    take: Note
    steps: Steps = ()

    def at(self, *steps: str | int) -> Context:
        """The same, one or more steps further in."""
        return replace(self, steps=(*self.steps, *steps))

    def note(self, kind: str, *steps: str | int, key: bool = False, **words: object) -> None:
        """Note a fault at a place below this one."""
        self.take(kind, (*self.steps, *steps), key=key, **words)

    def part(self, section: str, reference: Any, *steps: str | int) -> Any:
        """The numerical object a reference stands for, or None when it cannot be had (that is noted
        elsewhere)."""
        return self.find(section, reference, (*self.steps, *steps))


def raise_fault(kind: str, steps: Steps, *, key: bool = False, **words: object) -> None:
    """A note that raises: for plain forms, which have no file and are read one at a time."""
    del key
    made = fault(kind, Place(key=".".join(str(step) for step in steps)), **words)
    raise TrunnionError(made.cause, remedy=made.remedy, place=made.place)
