"""Checks between the parts of a workbook: names, circles, frames left over, files, promises."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from trunnion.errors import Fault
from trunnion.spec import parts
from trunnion.spec.kinds import fault, nearest, suggestion
from trunnion.spec.meaning.context import Steps
from trunnion.spec.meaning.frames import check_partner
from trunnion.spec.model import LISTED_SECTIONS, NAMED_SECTIONS, WorkbookFile
from trunnion.spec.paths import find
from trunnion.spec.resolve import Resolver
from trunnion.spec.shape import key_place, place_of, walk
from trunnion.spec.tree import Node

HARDWARE = ("passes", "sectors", "surveys", "budgets")

Spoiled = set[tuple[str | int, ...]]


def cross_check(model: WorkbookFile, tree: Node, file: str, root: Path | None, spoiled: Spoiled) -> list[Fault]:
    """Every fault between parts that are sound in themselves. root: where files must exist; None to not
    look."""
    check = _Check(model, tree, file, spoiled)
    check.everything()
    check.ids()
    check.frames_in_use()
    check.people_and_sources()
    check.requirements()
    check.decisions()
    check.calculations()
    check.document()
    if root is not None:
        check.files(root)
    return check.faults


class _Check:
    """One pass over a workbook."""

    def __init__(self, model: WorkbookFile, tree: Node, file: str, spoiled: Spoiled) -> None:
        self.model, self.tree, self.file = model, tree, file
        self.faults: list[Fault] = []
        bad_parts = {(str(s[0]), str(s[1])) for s in spoiled if len(s) == 2 and s[0] in NAMED_SECTIONS}
        bad_parts |= self._whole_sections(spoiled)
        self.spoiled_items = spoiled
        self.resolver = Resolver(model, self.note, bad_parts)

    def _whole_sections(self, spoiled: Spoiled) -> set[tuple[str, str]]:
        """All names of named sections that could not be read at all."""
        sections = {str(s[0]): str(s[0]) for s in spoiled if len(s) == 1}
        meant = {key: nearest(key, [*NAMED_SECTIONS]) for key in sections if key not in NAMED_SECTIONS}
        sections |= {key: name for key, name in meant.items() if name is not None}
        return {
            (name, key)
            for given, name in sections.items()
            if name in NAMED_SECTIONS
            for key in find(self.tree, [given]).keys
        }

    # --- places ---

    def note(self, kind: str, steps: Steps, *, key: bool = False, **words: object) -> None:
        """Note a fault at the steps of the model, which are those of the file but for left-out list items."""
        real = self._in_file(steps)
        node, taken, lost = walk(self.tree, tuple(real))
        if key and taken and not lost:
            owner = find(self.tree, taken[:-1])
            place = key_place(owner, str(taken[-1]), taken[:-1], self.tree, self.file)
        else:
            place = place_of(node, taken, self.tree, self.file)
        self.faults.append(fault(kind, place, **words))

    def _in_file(self, steps: Steps) -> list[str | int]:
        """List positions count the items of the file, spoiled ones included."""
        if len(steps) < 2 or not isinstance(steps[1], int):
            return list(steps)
        left_out = {s[1] for s in self.spoiled_items if len(s) == 2 and s[0] == steps[0]}
        kept = [number for number in range(steps[1] + len(left_out) + 1) if number not in left_out]
        return [steps[0], kept[steps[1]], *steps[2:]]

    # --- parts ---

    def everything(self) -> None:
        """Build everything that can be built; whatever keeps a part from meaning one thing is noted."""
        for section in ("frames", "conventions", "forms", "mounts", "envelopes", "links", "gimbals", *HARDWARE):
            for name in getattr(self.model, section):
                self.resolver.build(section, name)
        for name, frame in self.model.frames.items():
            self._partner(name, frame)
        self._circles()

    def _partner(self, name: str, frame: parts.Frame) -> None:
        if not isinstance(frame.paired_with, str) or frame.paired_with not in self.resolver.names("frames"):
            return
        steps = ("frames", name)
        if frame.paired_with == name:
            self.note("self-link", (*steps, "paired with"), what="the pairing", frame=name)
        else:
            check_partner(self.resolver.context(*steps), frame, self.model.frames.get(frame.paired_with))

    def _circles(self) -> None:
        """Envelopes made of envelopes must not contain themselves."""
        inner = {name: list(_inner_envelopes(part)) for name, part in self.model.envelopes.items()}
        told: set[str] = set()
        for start in inner:
            chain = _circle(start, inner)
            if chain and not told & set(chain):
                told |= set(chain)
                self.note("cycle", ("envelopes", start), key=True, name=start, chain=" → ".join(chain))

    # --- ids ---

    def ids(self) -> None:
        """Ids are used once, over all sections that list parts with ids."""
        seen: dict[str, int | None] = {}
        for section in LISTED_SECTIONS:
            for number, part in enumerate(getattr(self.model, section)):
                steps = (section, number, "id")
                node = walk(self.tree, tuple(self._in_file(steps)))[0]
                if part.id in seen:
                    self.note("duplicate-id", steps, id=part.id, line=seen[part.id])
                seen.setdefault(part.id, node.line)

    def _ids(self, section: str) -> list[str]:
        """Ids of a section, those of spoiled items included."""
        node = self.tree.child(section)
        items = node.value if node is not None and node.is_list else []
        given = [item.child("id") for item in items]
        return [str(found.value) for found in given if found is not None and isinstance(found.value, str | int)]

    def _known(self, steps: Steps, name: str, known: Iterable[str], what: str) -> bool:
        """Whether a name is known; if not, that is noted with the nearest one."""
        names = list(known)
        if name in names:
            return True
        hint = suggestion(name, names, "those known are")
        self.note("unknown-reference", steps, what=what, name=name, hint=hint)
        return False

    # --- frames ---

    def frames_in_use(self) -> None:
        """Every frame is joined to another one by something."""
        used = set(self._joined_frames())
        for name, frame in self.model.frames.items():
            if name not in used and frame.handed != "left":
                self.note("unlinked-frame", ("frames", name), key=True, frame=name)

    def _joined_frames(self) -> Iterator[str]:
        """Frames mentioned by anything; read from the file itself, so that faults elsewhere do not add
        noise."""
        for section in ("conventions", "forms", "mounts", "envelopes", "links", "gimbals", "surveys"):
            node = self.tree.child(section)
            if node is not None:
                yield from _words_in(node)
        for calculation in self.model.calculations:
            pair = [calculation.parameters.get(side) for side in ("reference", "body")]
            if all(isinstance(name, str) for name in pair):  # a calculation on two frames joins them
                yield from map(str, pair)
        for frame in self.model.frames.values():
            if isinstance(frame.paired_with, str):
                yield frame.paired_with
        yield from (name for name, frame in self.model.frames.items() if frame.paired_with is not None)

    # --- records ---

    def people_and_sources(self) -> None:
        """Owners, confirmers and approvers are people; texts of `source` begin with a source's id."""
        people = self._ids("people")
        for number, assumption in enumerate(self.model.assumptions):
            steps = ("assumptions", number)
            self._person((*steps, "owner"), assumption.owner, people)
            if assumption.confirmed_by is not None:
                self._person((*steps, "confirmed by"), assumption.confirmed_by, people)
            elif assumption.status == "confirmed":
                self.note("unconfirmed", (*steps, "status"))
        for number, deviation in enumerate(self.model.deviations):
            steps = ("deviations", number)
            self._known((*steps, "requirement"), deviation.requirement, self._ids("requirements"), "requirement")
            if self._person((*steps, "approved by"), deviation.approved_by, people):
                self._may_approve((*steps, "approved by"), deviation.approved_by)
        self._sources()

    def _person(self, steps: Steps, name: str, people: list[str]) -> bool:
        if name in people:
            return True
        self.note("unknown-person", steps, name=name, hint=suggestion(name, people, "those known are"))
        return False

    def _may_approve(self, steps: Steps, name: str) -> None:
        person = next((person for person in self.model.people if person.id == name), None)
        if person is not None and "approved" not in (person.signs_as or []):
            self.note("wrong-role", steps, name=name, role="approved")

    def _sources(self) -> None:
        ids = self._ids("sources")
        for steps, text in self._source_texts():
            if not any(text == source or text.startswith(source + " ") for source in ids):
                first = text.split()[0] if text.split() else ""
                near = nearest(first, ids)
                hint = f"write '{near}'" if near else f"begin with one of: {', '.join(ids) or '(none yet)'}"
                self.note("unknown-source", steps, name=first or text, hint=hint)

    def _source_texts(self) -> Iterator[tuple[Steps, str]]:
        for section in NAMED_SECTIONS:
            for name, part in getattr(self.model, section).items():
                if getattr(part, "source", None) is not None:
                    yield (section, name, "source"), part.source
        for name, budget in self.model.budgets.items():
            for number, term in enumerate(budget.terms):
                yield ("budgets", name, "terms", number, "source"), term.source
        for section in ("requirements", "assumptions"):
            for number, part in enumerate(getattr(self.model, section)):
                if part.source is not None:
                    yield (section, number, "source"), part.source

    def requirements(self) -> None:
        """A requirement has one limit, and speaks of parts that exist."""
        subjects = self._subjects()
        for number, requirement in enumerate(self.model.requirements):
            steps = ("requirements", number)
            limits = [key for key in ("at least", "at most") if getattr(requirement, key.replace(" ", "_")) is not None]
            if len(limits) != 1:
                place = (*steps, limits[1]) if limits else steps
                self.note("one-limit", place, count="none" if not limits else "two")
            if not _made_of(requirement.of, subjects):
                self._known((*steps, "of"), requirement.of, subjects, "part or decision")
            for index, name in enumerate(requirement.over or []):
                known = [*self.resolver.names("envelopes"), *self.resolver.names("passes")]
                self._known((*steps, "over", index), name, known, "envelope")

    def _subjects(self) -> list[str]:
        """What a result may be of: named parts, decisions, and what calculations name in their own parameters."""
        sections = [section for section in NAMED_SECTIONS if section != "frames"]
        own = [
            str(key)
            for calculation in self.model.calculations
            for value in calculation.parameters.values()
            if isinstance(value, dict)
            for key in value
        ]
        return [*self._ids("decisions"), *(name for section in sections for name in self.resolver.names(section)), *own]

    def decisions(self) -> None:
        """What is chosen is a candidate; candidates and calculations exist."""
        sections = ("conventions", "mounts", "envelopes", "gimbals")
        candidates = [name for section in sections for name in self.resolver.names(section)]
        for number, decision in enumerate(self.model.decisions):
            steps = ("decisions", number)
            for index, name in enumerate(decision.over):
                self._known((*steps, "over", index), name, candidates, "convention, mount, envelope or gimbal")
            if decision.chosen not in decision.over:
                hint = suggestion(decision.chosen, decision.over, "the candidates are")
                self.note("not-a-candidate", (*steps, "chosen"), name=decision.chosen, hint=hint)
            for index, name in enumerate(decision.rests_on):
                self._known((*steps, "rests on", index), name, self._ids("calculations"), "calculation")

    def calculations(self) -> None:
        """What a calculation promises to show are requirements."""
        requirements = self._ids("requirements")
        for number, calculation in enumerate(self.model.calculations):
            for index, name in enumerate(calculation.shows or []):
                if name not in requirements:
                    hint = suggestion(name, requirements, "the requirements are")
                    steps = ("calculations", number, "shows", index)
                    self.note("shows-nothing", steps, id=calculation.id, name=name, hint=hint)

    def document(self) -> None:
        """A revision supersedes another one."""
        document = self.model.document
        if document.supersedes is not None and document.supersedes == document.revision:
            if ("document",) in self.spoiled_items or any(s[0] == "document" for s in self.spoiled_items):
                return
            self.note("same-revision", ("document", "supersedes"), revision=document.revision)

    # --- files ---

    def files(self, root: Path) -> None:
        """Files named by the spec lie in the workbook, links followed."""
        for steps, path in self._paths():
            if steps[-1] == "campaign":
                self._glob(root, steps, path)
                continue
            target = root / path
            if not target.is_file() and not (target / "metadata.yaml").is_file():  # a bag is a folder
                self.note("path-missing", steps, path=path, hint=_like(root, path))
            elif not target.resolve().is_relative_to(root.resolve()):
                self.note("path-leaves", steps, path=path, why="a link leads out of it")

    def _glob(self, root: Path, steps: Steps, pattern: str) -> None:
        matches = [match for match in root.glob(pattern) if match.is_file()]
        if not matches:
            self.note("glob-empty", steps, path=pattern)
        elif not all(match.resolve().is_relative_to(root.resolve()) for match in matches):
            self.note("path-leaves", steps, path=pattern, why="a link leads out of it")

    def _paths(self) -> Iterator[tuple[Steps, str]]:
        if self.model.house is not None:
            yield ("house",), self.model.house
        for name, part in self.model.envelopes.items():
            if isinstance(part, parts.Table):
                yield ("envelopes", name, "table"), part.table
            elif isinstance(part, parts.Campaign):
                yield ("envelopes", name, "campaign"), part.campaign
        for name, each in self.model.passes.items():
            if isinstance(each, parts.TablePass):
                yield ("passes", name, "table"), each.table


def _inner_envelopes(part: Any) -> Iterator[str]:
    if isinstance(part, parts.Phases) and isinstance(part.phases, list):
        yield from part.phases
    elif isinstance(part, parts.Product) and isinstance(part.product.host, str):
        yield part.product.host


def _circle(start: str, inner: dict[str, list[str]]) -> list[str] | None:
    """A chain of names from `start` back to it, or None."""
    stack: list[list[str]] = [[start]]
    seen: set[str] = set()
    while stack:
        chain = stack.pop()
        for name in inner.get(chain[-1], []):
            if name == start:
                return [*chain, start]
            if name not in seen:
                seen.add(name)
                stack.append([*chain, name])
    return None


def _words_in(node: Node) -> Iterator[str]:
    """All texts under a node, and the words of `X to Y`."""
    if node.is_mapping:
        for child in node.value.values():
            yield from _words_in(child)
    elif node.is_list:
        for child in node.value:
            yield from _words_in(child)
    elif isinstance(node.value, str):
        yield node.value
        yield from (word.strip() for word in node.value.split(" to "))


def _like(root: Path, path: str) -> str:
    """The file someone probably meant."""
    folder = (root / path).parent
    names = sorted(p.name for p in folder.iterdir() if p.is_file()) if folder.is_dir() else []
    near = nearest(Path(path).name, names[:1000])
    return f"did you mean '{(Path(path).parent / near).as_posix()}'?" if near else "check the path and its case"


def _made_of(name: str, subjects: list[str]) -> bool:
    """True for `one with another` and `one to another` of known names, as results of several parts are called."""
    for word in (" with ", " to "):
        parts = name.split(word)
        if len(parts) > 1 and all(part in subjects for part in parts):
            return True
    return False
