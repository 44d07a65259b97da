"""Attitude messages (AEM, APM) in key-value notation: structure, and every rule they break.

A rule whose breaking leaves the meaning open is hard and stops the reading; one of form only becomes a note.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from trunnion.errors import Fault, Place, TableError
from trunnion.tables import ccsds_rules as rules
from trunnion.tables.epochs import nanoseconds
from trunnion.tables.nearest import nearest_hint

MAX_BYTES = 256 << 20
#: Bytes that are not printable ASCII stand as ? in what is kept; the breach is noted where they are found.
_PRINTABLE = bytes(mark if 32 <= mark <= 126 else (32 if mark == 9 else 63) for mark in range(256))


@dataclass(frozen=True)
class Breach:
    """One broken rule: line number, words, and whether it leaves the meaning open."""

    line: int
    words: str
    hard: bool = True
    remedy: str = ""


@dataclass
class Block:
    """Keys of one part of a message, with the line of each; an AEM segment has rows, an APM part a kind."""

    kind: str
    line: int
    values: dict[str, str] = field(default_factory=dict)
    lines: dict[str, int] = field(default_factory=dict)
    order: list[tuple[str, int]] = field(default_factory=list)
    comments: list[str] = field(default_factory=list)
    rows: list[tuple[int, list[str]]] = field(default_factory=list)

    def get(self, key: str) -> str | None:
        """A value as written, or None."""
        return self.values.get(key)


@dataclass
class AttitudeMessage:
    """A parsed message: kind (AEM or APM), edition (1 or 2), header, blocks in order, and the rules it breaks."""

    kind: str
    edition: int
    header: Block
    blocks: list[Block] = field(default_factory=list)
    breaches: list[Breach] = field(default_factory=list)

    @property
    def segments(self) -> list[Block]:
        """The AEM's segments."""
        return [block for block in self.blocks if block.kind == "SEGMENT"]

    def require_readable(self, path: Path | str) -> None:
        """Raise TableError with every hard breach (the first twenty)."""
        hard = [breach for breach in self.breaches if breach.hard]
        if hard:
            raise TableError([Fault(breach.words, breach.remedy, Place(path, breach.line)) for breach in hard[:20]])


def parse_message(data: bytes, path: Path | str) -> AttitudeMessage:
    """Parse the bytes of a KVN message. Raises TableError only when it is no such message at all."""
    breaches: list[Breach] = []
    lines = list(_lines(data, breaches))
    first = next(((number, text) for number, text in lines if text), None)
    if first is None:
        raise TableError([Fault("the message is empty", place=Place(path))])
    message = _open(first, breaches, path)
    _Walk(message).run([line for line in lines if line[1] and line[0] > first[0]])
    return message


def _open(first: tuple[int, str], breaches: list[Breach], path: Path | str) -> AttitudeMessage:
    key, _, value = (part.strip() for part in first[1].partition("="))
    editions = {"1.0": 1, "2.0": 2}
    if key not in ("CCSDS_AEM_VERS", "CCSDS_APM_VERS"):
        cause = "this is no attitude message: the first line must be CCSDS_AEM_VERS or CCSDS_APM_VERS"
        raise TableError([Fault(cause, place=Place(path, first[0]))])
    if value not in editions:
        cause, remedy = f"edition '{value[:20]}' of the message is not known", "1.0 and 2.0 are read"
        raise TableError([Fault(cause, remedy, Place(path, first[0]))])
    return AttitudeMessage(key[6:9], editions[value], Block("HEADER", first[0]), breaches=breaches)


def _lines(data: bytes, breaches: list[Breach]) -> Iterator[tuple[int, str]]:
    """(number, stripped text) of each line; breaches of the line rules are noted."""
    text = data.replace(b"\r\n", b"\n").replace(b"\n\r", b"\n").replace(b"\r", b"\n")
    for number, raw in enumerate(text.split(b"\n"), 1):
        if len(raw) > rules.MAX_LINE:
            breaches.append(
                Breach(number, f"the line has {len(raw)} characters, at most {rules.MAX_LINE} are allowed", False)
            )
        if any(mark < 32 or mark > 126 for mark in raw):
            tab_only = all(mark == 9 or 32 <= mark <= 126 for mark in raw)
            what = "a TAB" if tab_only else "a character that is not printable ASCII"
            breaches.append(Breach(number, f"the line holds {what}", hard=False))
        yield number, raw.translate(_PRINTABLE).decode("ascii").strip()


class _Walk:
    """Goes through the lines once and sorts them into blocks."""

    def __init__(self, message: AttitudeMessage) -> None:
        self.message = message
        self.block = message.header
        self.in_data = False
        self.pending: list[tuple[int, str]] = []

    def breach(self, line: int, words: str, hard: bool = True, remedy: str = "") -> None:
        """Note a broken rule."""
        self.message.breaches.append(Breach(line, words, hard, remedy))

    def run(self, lines: list[tuple[int, str]]) -> None:
        """Take all lines after the first, then check what the blocks hold."""
        take = self._take_aem if self.message.kind == "AEM" else self._take_apm
        for number, text in lines:
            if text == "COMMENT" or text.startswith("COMMENT "):
                self._comment(number, text[7:].strip())
            else:
                take(number, text)
        self._settle(None)
        if self.in_data or self.block.kind not in ("HEADER", "METADATA", "SEGMENT", "DATA"):
            self.breach(lines[-1][0] if lines else 1, "the message ends inside a block")
        from trunnion.tables.ccsds_checks import check_blocks  # the checks need the types of this module

        check_blocks(self.message)

    def _comment(self, number: int, text: str) -> None:
        """A comment at the start of a block; one after keys may still be at the start of the next block."""
        if self.in_data and self.block.rows:
            self._late([number])
        elif self.block.values and not self.in_data:
            self.pending.append((number, text))
            return
        self.block.comments.append(text)

    def _late(self, numbers: list[int]) -> None:
        for number in numbers:
            self.breach(number, "a COMMENT stands at the start of a block only", hard=False)

    def _settle(self, next_block: Block | None) -> None:
        """Give held-back comments to the block that begins, or report them where none does."""
        if next_block is None:
            self._late([number for number, _ in self.pending])
        else:
            next_block.comments += [text for _, text in self.pending]
        self.pending = []

    def _take_aem(self, number: int, text: str) -> None:
        if text in ("META_START", "META_STOP", "DATA_START", "DATA_STOP"):
            self._settle(None)
        if text == "META_START":
            self.block = Block("SEGMENT", number)
            self.message.blocks.append(self.block)
        elif text == "DATA_START":
            self.in_data = True
        elif text in ("META_STOP", "DATA_STOP"):
            self.in_data = False
        elif self.in_data:
            self.block.rows.append((number, text.split()))
        else:
            self._pair(number, text)

    def _take_apm(self, number: int, text: str) -> None:
        name, _, end = text.rpartition("_")
        if end == "START" and name in rules.APM_BLOCKS:
            self.block = self._new(name, number)
            return
        if end == "STOP" and name in rules.APM_BLOCKS:
            if name != self.block.kind:
                self.breach(number, f"{text} closes no {name}_START")
            self._settle(None)
            self.block = Block("DATA", number)
            return
        key = text.partition("=")[0].strip()
        if self.block.kind == "HEADER" and key == "OBJECT_NAME":
            self.block = self._new("METADATA", number)
        elif self.block.kind == "METADATA" and key == "EPOCH":
            self.block = self._new("DATA", number)
        self._pair(number, text)

    def _new(self, kind: str, number: int) -> Block:
        block = Block(kind, number)
        self.message.blocks.append(block)
        self._settle(block)
        return block

    def _pair(self, number: int, text: str) -> None:
        key, equals, value = (part.strip() for part in text.partition("="))
        if not equals or rules.KEY.fullmatch(key) is None:
            self.breach(number, f"'{text[:60]}' is not of the form KEY = value")
            return
        if not value:
            self.breach(number, f"{key} has no value")
        self._settle(None)
        with_unit = rules.UNIT.fullmatch(value)
        if with_unit is not None:
            value = with_unit[1]
            self._unit(number, key, with_unit[2])
        repeatable = self.message.edition == 1 and key.endswith(("_ANGLE", "_RATE"))
        if key in self.block.values and not repeatable:
            self.breach(number, f"{key} is given twice in one block")
        self.block.order.append((key, number))
        if not (repeatable and key in self.block.values):
            self.block.values[key] = value
            self.block.lines[key] = number
        else:  # edition 1 writes the same key twice in sequences that repeat an axis
            self.block.values[f"{key}#2"] = value

    def _unit(self, number: int, key: str, unit: str) -> None:
        if self.message.kind == "AEM":
            self.breach(number, "units are not written in an AEM", hard=False)
        rate = "_DOT" in key or key.startswith("ANGVEL_") or key.endswith(("_VEL", "_RATE"))
        expected = {True: ("deg/s", "1/s"), False: ("deg", "s")}[rate]
        angular = key.startswith(("ANGLE_", "ANGVEL_", "SPIN_", "NUTATION")) or key.endswith(("_ANGLE", "_RATE"))
        if angular and unit not in expected:
            self.breach(number, f"{key} is given in [{unit}]", remedy=f"the standard has [{expected[0]}]")


def unknown_key(key: str, known: list[str]) -> str:
    """The words for a key the block does not have."""
    return f"{key} is not a key of this part; {nearest_hint(key, known)}"


def elapsed(block: Block, text: str) -> int:
    """Nanoseconds of a time stamp in the segment's time system."""
    return nanoseconds(text, block.get("TIME_SYSTEM") or "UTC")
