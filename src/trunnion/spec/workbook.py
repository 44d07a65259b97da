"""The workbook as loaded: typed parts, and the place of everything in its file."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from trunnion.errors import Place
from trunnion.spec.model import LISTED_SECTIONS, NAMED_SECTIONS, WorkbookFile
from trunnion.spec.parts import (
    Assumption,
    Budget,
    Calculation,
    Convention,
    Decision,
    Deviation,
    Document,
    Envelope,
    Form,
    Frame,
    Gimbal,
    Link,
    Mount,
    Part,
    Pass,
    Person,
    Requirement,
    Revision,
    Sector,
    Source,
    Survey,
)
from trunnion.spec.paths import find, locate
from trunnion.spec.shape import place_of
from trunnion.spec.tree import Node
from trunnion.units import Quantity

DEFAULT_COPIED_SIZE = 50_000_000.0  # bytes


@dataclass(frozen=True, eq=False)
class Workbook:
    """A workbook that has been read and found free of faults.

    root: its folder. path: its `workbook.yaml`. text: the file as read. overrides: trial values in force.
    """

    root: Path
    path: Path
    text: str
    file: WorkbookFile
    tree: Node = field(repr=False)
    overrides: tuple[tuple[str, str], ...] = ()

    @property
    def document(self) -> Document:
        """The title block."""
        return self.file.document

    @property
    def frames(self) -> Mapping[str, Frame]:
        """Frames by name."""
        return self.file.frames

    @property
    def links(self) -> Mapping[str, Link]:
        """Links between frames by name."""
        return self.file.links

    @property
    def conventions(self) -> Mapping[str, Convention]:
        """Conventions by name."""
        return self.file.conventions

    @property
    def envelopes(self) -> Mapping[str, Envelope]:
        """Envelopes by name."""
        return self.file.envelopes

    @property
    def mounts(self) -> Mapping[str, Mount]:
        """Mounts by name."""
        return self.file.mounts

    @property
    def forms(self) -> Mapping[str, Form]:
        """Forms that are no sequence, by name."""
        return self.file.forms

    @property
    def gimbals(self) -> Mapping[str, Gimbal]:
        """Gimbals by name."""
        return self.file.gimbals

    @property
    def passes(self) -> Mapping[str, Pass]:
        """Passes by name."""
        return self.file.passes

    @property
    def sectors(self) -> Mapping[str, Sector]:
        """Forbidden sectors by name."""
        return self.file.sectors

    @property
    def surveys(self) -> Mapping[str, Survey]:
        """Alignment surveys by name."""
        return self.file.surveys

    @property
    def budgets(self) -> Mapping[str, Budget]:
        """Pointing budgets by name."""
        return self.file.budgets

    @property
    def people(self) -> list[Person]:
        """People, in the file's order."""
        return self.file.people

    @property
    def sources(self) -> list[Source]:
        """Sources, in the file's order."""
        return self.file.sources

    @property
    def revisions(self) -> list[Revision]:
        """The revision table, in the file's order."""
        return self.file.revisions

    @property
    def requirements(self) -> list[Requirement]:
        """Requirements, in the file's order."""
        return self.file.requirements

    @property
    def deviations(self) -> list[Deviation]:
        """Deviations, in the file's order."""
        return self.file.deviations

    @property
    def assumptions(self) -> list[Assumption]:
        """Assumptions, in the file's order."""
        return self.file.assumptions

    @property
    def decisions(self) -> list[Decision]:
        """Decisions, in the file's order."""
        return self.file.decisions

    @property
    def calculations(self) -> list[Calculation]:
        """Calculations, in the file's order."""
        return self.file.calculations

    @property
    def house(self) -> Path | None:
        """The organization's `house.yaml`, or None."""
        return None if self.file.house is None else self.root / self.file.house

    @property
    def max_copied_size(self) -> float:
        """Input files above this many bytes are listed by digest only."""
        size: Quantity | None = self.file.max_copied_size
        return DEFAULT_COPIED_SIZE if size is None else size.value

    def names(self, section: str) -> list[str]:
        """Names of the parts of a named section, or ids of a listed one, in the file's order."""
        parts = getattr(self.file, section)
        return list(parts) if section in NAMED_SECTIONS else [part.id for part in parts]

    def part(self, section: str, name: str) -> Any:
        """A part by section and name or id. KeyError when there is none."""
        parts = getattr(self.file, section)
        if section in NAMED_SECTIONS:
            return parts[name]
        found: Part | None = next((part for part in parts if getattr(part, "id", None) == name), None)
        if found is None or section not in LISTED_SECTIONS:
            raise KeyError(name)
        return found

    def place(self, path: str) -> Place:
        """Where a key path such as `requirements.ATT-04.at least` stands; the nearest place above if it is
        not there."""
        steps = locate(self.tree, path)
        return place_of(find(self.tree, steps), steps, self.tree, str(self.path))
