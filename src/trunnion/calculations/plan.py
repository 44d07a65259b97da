"""From the spec to calculations: templates found, parameters resolved to plain values, inputs read, keys made.

Nothing is run and nothing is written here. All faults of all calculations are collected before anything is said.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from trunnion.calculations import keys, templates
from trunnion.calculations.digest import sha256
from trunnion.calculations.store import held_name
from trunnion.calculations.templates import Template
from trunnion.errors import Fault, Place, SpecError, TemplateError, TrunnionError
from trunnion.spec.model import NAMED_SECTIONS

ALL = "all"


@dataclass(frozen=True)
class InputFile:
    """An input as read: its path in the workbook, the name notebooks read it by, content digest, size."""

    path: str
    held: str
    sha256: str
    size: int
    content: bytes | None  # None where it is above the copied size: listed by digest only
    origin: Path

    @property
    def copied(self) -> bool:
        """Whether the revision folder holds it."""
        return self.content is not None


@dataclass(frozen=True)
class Planned:
    """One calculation ready to run: what it takes, what it reads, and the content key that follows."""

    id: str
    template: Template
    parameters: Mapping[str, Any]
    inputs: Mapping[str, InputFile]
    parts: Mapping[str, Any]
    key: str
    title: str
    number: str
    shows: tuple[str, ...]


@dataclass
class _Reader:
    """Resolves names and files of one workbook, each once."""

    workbook: Any
    folder: Path
    copied_limit: float
    files: dict[str, InputFile] = field(default_factory=dict)

    def part(self, section: str, name: Any) -> dict[str, Any]:
        """A part of the workbook as plain JSON, everything it refers to written out."""
        from trunnion.spec.plain import plain_part

        known = self.workbook.names(section)
        if name not in known:
            guess = templates.nearest(str(name), dict.fromkeys(known))
            remedy = f"did you mean '{guess}'?" if guess else f"known: {', '.join(known) or 'none'}"
            raise TrunnionError(f"there is no '{name}' among the {section}", remedy=remedy)
        return plain_part(self.workbook, section, str(name))

    def file(self, path: str) -> InputFile:
        """Read an input file of the workbook."""
        if path not in self.files:
            place = self.folder / path
            if not place.resolve().is_relative_to(self.folder.resolve()):
                raise TrunnionError(f"'{path}' leaves the workbook", remedy="put the file into its folder")
            try:
                digest, content = _read(place, self.copied_limit)
                size = place.stat().st_size
            except OSError as err:
                cause = f"the file '{path}' can't be read ({err.strerror})"
                raise TrunnionError(cause, remedy="write its path from the workbook's folder") from err
            self.files[path] = InputFile(path, held_name(path, digest), digest, size, content, place.resolve())
        return self.files[path]


def _read(path: Path, limit: float) -> tuple[str, bytes | None]:
    """SHA-256 of a file and, up to `limit` bytes, its content; a larger one is never held in memory."""
    if path.stat().st_size <= limit:
        content = path.read_bytes()
        return sha256(content), content
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest(), None


def plan(workbook: Any, *, allow_local: bool = False, only: frozenset[str] = frozenset()) -> list[Planned]:
    """Plan every calculation of a workbook.

    `only` limits which local templates need consent; unplanned ids in it are an error. SpecError holds every fault;
    TemplateError asks for consent to local templates, naming each with its SHA-256.
    """
    reader = _Reader(workbook, workbook.root, float(workbook.max_copied_size))
    around = keys.surroundings()
    planned: list[Planned] = []
    faults: list[Fault] = []
    for calculation in workbook.calculations:
        try:
            planned.append(_planned(calculation, reader, around))
        except SpecError as err:
            faults += err.faults
        except TrunnionError as err:
            faults.append(_placed(err.fault, workbook, calculation.id))
    if faults:
        raise SpecError(faults)
    _require_consent([entry for entry in planned if not only or entry.id in only], allow_local)
    return planned


def _planned(calculation: Any, reader: _Reader, around: keys.Surroundings) -> Planned:
    template = templates.find(calculation.template, reader.folder)
    given = {key.replace(" ", "_"): value for key, value in calculation.parameters.items()}
    place = _place(reader.workbook, calculation.id)
    inputs: dict[str, InputFile] = {}
    resolved = {}
    for name, value in given.items():
        take = template.takes.get(name)
        if take is not None:
            resolved[name] = _resolved(take.kind, value, reader, inputs)
    faults = template.check({**given, **resolved}, place=place)
    if faults:
        raise SpecError(faults)
    digests = {entry.held: entry.sha256 for entry in inputs.values()}
    parts = keys.key_parts(calculation.id, template, resolved, digests, around)
    return Planned(
        id=calculation.id,
        template=template,
        parameters=resolved,
        inputs=inputs,
        parts=parts,
        key=keys.content_key(parts),
        title=calculation.title or template.title,
        number=calculation.number or f"{reader.workbook.document.number}-{calculation.id}",
        shows=tuple(calculation.shows or ()),
    )


def _require_consent(planned: list[Planned], allowed: bool) -> None:
    own = {entry.template.name: entry.template for entry in planned if entry.template.local}
    if not own or allowed:
        return
    listed = "\n".join(f"    {template.path}  sha256 {template.file_digest}" for template in own.values())
    raise TemplateError(
        f"this workbook brings templates of its own, which are programs that run as you:\n{listed}",
        remedy="read them, then run again with --allow-local-templates",
    )


def _as_written(reader: _Reader, value: Any) -> Any:
    from trunnion.spec.parts.base import to_plain

    return to_plain(value)


def _part(section: str) -> Callable[[_Reader, Any], Any]:
    """A resolver of one name to its part, written out with everything it refers to."""

    def resolve(reader: _Reader, name: Any) -> Any:
        return reader.part(section, name)

    return resolve


def _parts(section: str) -> Callable[[_Reader, Any], Any]:
    """A resolver of a list of names, or `all`, to parts by name."""

    def resolve(reader: _Reader, names: Any) -> Any:
        known = reader.workbook.names(section)
        wanted = known if names == ALL else [names] if isinstance(names, str) else names
        if not isinstance(wanted, list):
            raise TrunnionError(f"a list of {section} is needed, not {names!r}", remedy=f"write {ALL}, or their names")
        return {str(name): reader.part(section, name) for name in wanted}

    return resolve


_RESOLVERS: dict[str, Callable[[_Reader, Any], Any]] = {
    **{singular: _part(section) for section, singular in NAMED_SECTIONS.items()},
    **{section: _parts(section) for section in NAMED_SECTIONS},
}
_FILE_KEYS = ("table", "file")
_FILES_KEY = "files"


def _resolved(kind: str, value: Any, reader: _Reader, inputs: dict[str, InputFile]) -> Any:
    """The plain value of one parameter, with the names of copied inputs for its files."""
    if kind in _FILE_KEYS:
        return _with_inputs({kind: value}, reader, inputs)[kind]
    return _with_inputs(_RESOLVERS.get(kind, _as_written)(reader, value), reader, inputs)


def _held(path: str, reader: _Reader, inputs: dict[str, InputFile]) -> str:
    inputs[path] = reader.file(path)
    return inputs[path].held


def _with_inputs(value: Any, reader: _Reader, inputs: dict[str, InputFile]) -> Any:
    """The plain value with every file path replaced by the name the notebook reads it by."""
    if isinstance(value, dict):
        made: dict[str, Any] = {}
        for key, entry in value.items():
            if key in _FILE_KEYS and isinstance(entry, str):
                made[key] = _held(entry, reader, inputs)
            elif key == _FILES_KEY and isinstance(entry, list):
                made[key] = [_held(path, reader, inputs) for path in entry]
            else:
                made[key] = _with_inputs(entry, reader, inputs)
        return made
    if isinstance(value, list):
        return [_with_inputs(entry, reader, inputs) for entry in value]
    return value


def _place(workbook: Any, calculation: str) -> Place:
    return workbook.place(f"calculations.{calculation}")


def _placed(fault: Fault, workbook: Any, calculation: str) -> Fault:
    return fault if str(fault.place) else Fault(fault.cause, fault.remedy, _place(workbook, calculation))
