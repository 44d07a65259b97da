"""From the bytes of a spec to a tree of values that know where they stand.

The event stream of PyYAML is walked; nothing is built that the file could use against us. Anchors, aliases,
tags, merge keys, deep nesting, long files and forms that YAML editions read differently are refused, each
with line and column.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

import yaml

from trunnion.errors import Fault, Place
from trunnion.spec.kinds import fault
from trunnion.spec.scalars import Refused, resolve

LARGEST_FILE = 5_000_000  # bytes
DEEPEST = 32  # levels
MOST_VALUES = 100_000  # nodes

# characters that hide or reorder what a reader sees
_HIDING = frozenset(
    map(chr, (*range(0x202A, 0x202F), *range(0x2066, 0x206A), 0x200E, 0x200F, 0x061C, 0x2028, 0x2029, 0xFEFF))
)


@dataclass(eq=False)
class Node:
    """A value of the file. `line` and `column` count from 1; `keys` holds where each key of a mapping
    stands."""

    value: Any  # str, int, float, bool | list[Node] | dict[str, Node] | None when faulty
    line: int
    column: int
    keys: dict[str, tuple[int, int]] = field(default_factory=dict)
    faulty: bool = False
    file: str | None = None

    @property
    def is_mapping(self) -> bool:
        return isinstance(self.value, dict)

    @property
    def is_list(self) -> bool:
        return isinstance(self.value, list)

    def child(self, step: str | int) -> Node | None:
        """The value under a key, or an item of a list by its number; None when there is none."""
        if isinstance(self.value, dict):
            return self.value.get(step) if isinstance(step, str) else None
        if isinstance(self.value, list) and isinstance(step, int) and 0 <= step < len(self.value):
            return self.value[step]
        return None

    def holds_faulty(self) -> bool:
        """Whether this value, or one inside it, could not be read (that is noted already)."""
        inner = self.value.values() if isinstance(self.value, dict) else self.value if self.is_list else ()
        return self.faulty or any(node.holds_faulty() for node in inner)

    def plain(self) -> Any:
        """The bare values, without places. A faulty value becomes None."""
        if isinstance(self.value, dict):
            return {key: node.plain() for key, node in self.value.items()}
        if isinstance(self.value, list):
            return [node.plain() for node in self.value]
        return self.value


class _Stop(Exception):
    """Reading cannot go on; the fault is already noted."""


def read_tree(data: bytes, file: str) -> tuple[Node | None, str, list[Fault]]:
    """The tree of a spec file, its text, and everything wrong with it so far.

    The tree is None when the file cannot be read to its end. Time and memory are bounded by the size limit.
    """
    faults: list[Fault] = []
    try:
        text = _decode(data, file, faults)
    except _Stop:
        return None, "", faults
    return read_text(text, file, faults), text, faults


def read_text(text: str, file: str, faults: list[Fault]) -> Node | None:
    """The tree of a text; faults are added to the list given."""
    builder = _Builder(file, faults)
    try:
        return builder.document(_events(text, file, faults))
    except _Stop:
        return None


def _decode(data: bytes, file: str, faults: list[Fault]) -> str:
    if len(data) > LARGEST_FILE:
        faults.append(fault("file-too-large", Place(file), limit=f"{LARGEST_FILE:,}"))
        raise _Stop
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as err:
        line = data.count(b"\n", 0, err.start) + 1
        column = err.start - (data.rfind(b"\n", 0, err.start) + 1) + 1
        place = Place(file, line, column)
        faults.append(fault("not-utf8", place, offset=err.start, byte=f"{data[err.start]:02x}"))
        raise _Stop from err
    for number, content in enumerate(text.split("\n"), start=1):
        if content.isprintable():
            continue
        for position, character in enumerate(content, start=1):
            if _unprintable(character):
                faults.append(fault("not-printable", Place(file, number, position), code=ord(character)))
    if faults:
        raise _Stop
    return text


def _unprintable(character: str) -> bool:
    if character in "\t\r\u0085\u00a0":
        return character == "\u0085"
    return character in _HIDING or unicodedata.category(character) in ("Cc", "Cs", "Cn")


def _events(text: str, file: str, faults: list[Fault]) -> Iterator[Any]:
    """Events of PyYAML's own reader. The faster one it may have beside it accepts other files and words its messages
    otherwise, and a spec must mean the same on every machine."""
    try:
        yield from yaml.parse(text, Loader=yaml.SafeLoader)
    except (yaml.YAMLError, RecursionError) as err:
        faults.append(_syntax_fault(err, file))
        raise _Stop from err


def _syntax_fault(err: Exception, file: str) -> Fault:
    mark = getattr(err, "problem_mark", None) or getattr(err, "context_mark", None)
    place = Place(file, mark.line + 1, mark.column + 1) if mark else Place(file)
    said = [getattr(err, "context", None), getattr(err, "problem", None)]
    return fault("not-yaml", place, problem=", ".join(part for part in said if part) or "it is nested too deeply")


class _Builder:
    """Builds nodes from events and notes faults. Depth is bounded, so plain recursion is safe."""

    def __init__(self, file: str, faults: list[Fault]) -> None:
        self.file, self.faults, self.count = file, faults, 0

    def document(self, events: Iterator[yaml.Event]) -> Node:
        root: Node | None = None
        for event in events:
            if isinstance(event, yaml.DocumentStartEvent) and root is not None:
                self.note("second-document", event)
                raise _Stop
            if isinstance(event, yaml.NodeEvent):
                root = self.node(event, events, 1)
        if root is None:
            self.faults.append(fault("empty-file", Place(self.file, 1, 1)))
            raise _Stop
        return root

    def note(self, kind: str, event: Any, **words: object) -> None:
        mark = event.start_mark
        self.faults.append(fault(kind, Place(self.file, mark.line + 1, mark.column + 1), **words))

    def node(self, event: Any, events: Iterator[yaml.Event], depth: int) -> Node:
        self.count += 1
        if depth > DEEPEST:
            self.note("too-deep", event, limit=DEEPEST)
            raise _Stop
        if self.count > MOST_VALUES:
            self.note("too-many-values", event, limit=f"{MOST_VALUES:,}")
            raise _Stop
        made = Node(None, event.start_mark.line + 1, event.start_mark.column + 1, file=self.file)
        if isinstance(event, yaml.AliasEvent):
            self.note("alias", event, name=event.anchor)
            made.faulty = True
            return made
        self.refuse_properties(event)
        if isinstance(event, yaml.ScalarEvent):
            self.scalar(event, made)
        elif isinstance(event, yaml.SequenceStartEvent):
            made.value = [self.node(item, events, depth + 1) for item in _until(events, yaml.SequenceEndEvent)]
        else:
            self.mapping(made, events, depth)
        return made

    def refuse_properties(self, event: Any) -> None:
        if event.anchor is not None:
            self.note("anchor", event, name=event.anchor)
        if event.tag is not None:
            self.note("tag", event, tag=event.tag.replace("tag:yaml.org,2002:", "!!"))

    def scalar(self, event: yaml.ScalarEvent, made: Node) -> None:
        made.value = event.value
        plain = not event.style and event.tag is None
        if plain:
            resolved = resolve(event.value)
            if isinstance(resolved, Refused):
                self.note(resolved.kind, event, **resolved.words)
                made.value, made.faulty = None, True
                return
            made.value = resolved
        self.refuse_control_characters(event, made)

    def refuse_control_characters(self, event: yaml.ScalarEvent, made: Node) -> None:
        for character in event.value:
            control = unicodedata.category(character) in ("Cc", "Cs") and character not in "\n\t"
            if control or character in _HIDING:
                self.note("control-character", event, code=ord(character))
                made.value, made.faulty = None, True
                return

    def mapping(self, made: Node, events: Iterator[yaml.Event], depth: int) -> None:
        made.value = {}
        event: Any
        for event in _until(events, yaml.MappingEndEvent):
            key = self.key(event, events, depth)
            value = self.node(next(events), events, depth + 1)
            if key is None:
                continue
            if key in made.keys:
                self.note("duplicate-key", event, key=key, line=made.keys[key][0])
                continue
            made.keys[key] = (event.start_mark.line + 1, event.start_mark.column + 1)
            made.value[key] = value

    def key(self, event: Any, events: Iterator[yaml.Event], depth: int) -> str | None:
        """The text of a key, or None when it is none (the fault is noted)."""
        node = self.node(event, events, depth + 1)
        if not isinstance(event, yaml.ScalarEvent):
            if not isinstance(event, yaml.AliasEvent):
                self.note("key-not-text", event, what="list" if node.is_list else "mapping")
            return None
        if event.value == "<<" and not event.style:
            self.note("merge-key", event)
            return None
        return None if node.faulty else event.value


def _until(events: Iterator[yaml.Event], end: type[yaml.Event]) -> Iterator[yaml.Event]:
    for event in events:
        if isinstance(event, end):
            return
        yield event
