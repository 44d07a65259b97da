"""Is a ULog file whole? Every message walked to the last byte, every content checked against the log's definitions.

A logger writes in rounds, topics in rising order of their numbers. Where nearly all rounds end with one topic, a last
round that does not is a doubt (a finding, not damage). What can't be seen from the file alone: a log cut exactly
between two rounds (the format has no closing record), and changed bytes inside numbers that stay plausible.
"""

from __future__ import annotations

import struct
from array import array
from collections import Counter
from dataclasses import dataclass, field
from pathlib import Path

from trunnion.tables.files import file_error
from trunnion.tables.table import SHOWN_ROWS, Trouble
from trunnion.tables.ulog_messages import HEADER_SIZE, MAGIC, SYNC, Break, Dictionary, Message, Topic, walk_messages
from trunnion.units import shown

_ZERO_RUN = bytes(32)  # this many zero bytes inside a text are no text
#: A last round raises a doubt only when there were this many rounds and this part of them ended alike.
_ROUNDS_NEEDED, _ROUNDS_ALIKE = 50, 0.9
_UNKNOWN_INCOMPATIBLE = 0xFE  # of the first flag byte; bit 0 (appended data) is known


@dataclass
class Series:
    """What the walk saw of one topic: samples, zero time stamps, and the stamps themselves where they are asked for."""

    topic: Topic
    count: int = 0
    zeros: int = 0
    stamps: array[int] | None = None

    @property
    def label(self) -> str:
        """Topic name, with the instance where it is not the first."""
        name = shown(self.topic.name)
        return f"{name}[{self.topic.instance}]" if self.topic.instance else name


@dataclass
class Health:
    """The report on one log: sizes, messages by type, series, and all that is wrong."""

    size: int = 0
    messages: Counter[str] = field(default_factory=Counter)
    series: dict[int, Series] = field(default_factory=dict)
    breaks: list[Break] = field(default_factory=list)
    contents: dict[str, list[int]] = field(default_factory=dict)
    dropouts: list[int] = field(default_factory=list)
    appended: list[int] = field(default_factory=list)
    keep: str | None = None
    round_ends: Counter[int] = field(default_factory=Counter)
    last_number: int = -1

    def count_round(self, number: int) -> None:
        """Take one sample's message number: one not above that ahead of it begins a new round."""
        if number <= self.last_number:
            self.round_ends[self.last_number] += 1
        self.last_number = number

    def note_content(self, reason: str, offset: int) -> None:
        """Remember a message whose content contradicts the log's own definitions."""
        self.contents.setdefault(reason, []).append(offset)

    def find(self, name: str, instance: int) -> Series | None:
        """The series of a topic, the longest if it was subscribed more than once."""
        found = [s for s in self.series.values() if s.topic.name == name and s.topic.instance == instance]
        return max(found, key=lambda series: series.count, default=None)

    def troubles(self) -> list[Trouble]:
        """Everything that speaks against the log, with counts and the first byte offsets."""
        return [
            *self._break_troubles(),
            *self._content_troubles(),
            *self._dropout_troubles(),
            *self._zero_stamp_troubles(),
        ]

    def _break_troubles(self) -> list[Trouble]:
        found = []
        for reason in dict.fromkeys(gap.reason for gap in self.breaks):
            places = [gap for gap in self.breaks if gap.reason == reason]
            lost = sum(gap.skipped for gap in places)
            text = (
                f"{reason} at {_bytes_listed([gap.offset for gap in places])}; {lost} bytes can't be read as messages"
            )
            found.append(Trouble("damaged log", text, len(places)))
        return found

    def _content_troubles(self) -> list[Trouble]:
        return [
            Trouble("damaged log", f"{reason}: {len(places)} times, at {_bytes_listed(places)}", len(places))
            for reason, places in self.contents.items()
        ]

    def _dropout_troubles(self) -> list[Trouble]:
        if not self.dropouts:
            return []
        total, longest = sum(self.dropouts), max(self.dropouts)
        text = f"the logger reports {len(self.dropouts)} dropouts, {total} ms in all, the longest {longest} ms"
        return [Trouble("dropouts", text, len(self.dropouts))]

    def _zero_stamp_troubles(self) -> list[Trouble]:
        """Zero time stamps among real ones; a topic that never fills its stamp is left alone."""
        found = []
        for series in self.series.values():
            if 0 < series.zeros < series.count:
                text = f"topic '{series.label}': {series.zeros} of {series.count} time stamps are zero"
                found.append(Trouble("damaged log", text, series.zeros))
        return found

    def doubts(self) -> list[Trouble]:
        """What may speak against the log but need not: a last round that ends otherwise than most others."""
        rounds = sum(self.round_ends.values())
        if rounds < _ROUNDS_NEEDED or self.appended:
            return []
        usual, count = self.round_ends.most_common(1)[0]
        if self.last_number == usual or count < _ROUNDS_ALIKE * rounds:
            return []
        usual_name, last_name = (self.series[number].label for number in (usual, self.last_number))
        text = f"the log may be cut between two messages: {count} of {rounds} rounds of its logger end with topic "
        return [Trouble("doubtful end", f"{text}'{usual_name}', the last one with '{last_name}'", 1)]


def _bytes_listed(offsets: list[int]) -> str:
    listed = ", ".join(str(offset) for offset in offsets[:SHOWN_ROWS])
    return f"byte {listed}" + (", …" if len(offsets) > SHOWN_ROWS else "")


def examine(path: Path, keep: str | None = None) -> Health:
    """Walk a log from first to last byte, keeping the time stamps of the topic `keep` only.

    Raises TableError for a file that is no ULog at all.
    """
    health = Health(size=path.stat().st_size, keep=keep)
    words = Dictionary()
    with path.open("rb", buffering=1 << 20) as handle:
        require_header(handle.read(HEADER_SIZE), path)
        for step in walk_messages(handle, health.size, words, health.appended):
            if isinstance(step, Break):
                health.breaks.append(step)
            else:
                health.messages[step.kind] += 1
                _take_in(step, words, health)
    return health


def require_header(header: bytes, path: Path) -> None:
    """Raise TableError unless these 16 bytes open a ULog file."""
    if header[:7] != MAGIC:
        raise file_error(
            path, "this is no ULog file: its first bytes are wrong", "the file is damaged or another format"
        )
    if len(header) < HEADER_SIZE:
        raise file_error(path, "the log ends inside its header", "the file is cut")


def _take_in(message: Message, words: Dictionary, health: Health) -> None:
    """Check one message's content and keep what the report needs."""
    kind, payload = message.kind, message.payload
    if kind == "D":
        _take_data(message, words, health)
        return
    reason = words.learn(message)
    if kind == "A" and reason is None:
        number = int.from_bytes(payload[1:3], "little")
        topic = words.topics[number]
        stamps = array("Q") if topic.name == health.keep else None
        health.series.setdefault(number, Series(topic, stamps=stamps))
    elif kind == "B":
        reason = _flags(payload, health)
    elif kind == "O":
        reason = None if len(payload) == 2 else "a dropout message of the wrong size"
        health.dropouts.append(int.from_bytes(payload[:2], "little"))
    elif kind == "S":
        reason = None if payload == SYNC else "a synchronization message with other bytes"
    elif kind in "IMPQ":
        reason = _key_value({"I": payload, "P": payload}.get(kind, payload[1:]))
    elif kind in "LC":
        reason = _logged_text(payload, 9 if kind == "L" else 11)
    if reason:
        health.note_content(reason, message.offset)


def _take_data(message: Message, words: Dictionary, health: Health) -> None:
    number = int.from_bytes(message.payload[:2], "little")
    topic = words.topics.get(number)
    if topic is None:
        health.note_content("samples of a topic that was never announced", message.offset)
        return
    if not topic.dtype.itemsize <= len(message.payload) - 2 <= topic.padded_size:
        health.note_content("samples of the wrong size for their topic", message.offset)
        return
    series = health.series[number]
    series.count += 1
    health.count_round(number)
    fields = topic.dtype.fields
    if fields and "timestamp" in fields:
        kind, start = fields["timestamp"][:2]
        stamp = int.from_bytes(message.payload[2 + start : 2 + start + kind.itemsize], "little")
        series.zeros += stamp == 0
        if series.stamps is not None:
            series.stamps.append(stamp & 0xFFFFFFFFFFFFFFFF)


def _flags(payload: bytes, health: Health) -> str | None:
    if len(payload) < 40:
        return "a flag message of the wrong size"
    if payload[8] & _UNKNOWN_INCOMPATIBLE or any(payload[9:16]):
        return "the log says it needs a newer reader (unknown incompatible flags)"
    if payload[8] & 1:
        offsets = struct.unpack_from("<3Q", payload, 16)
        health.appended += [offset for offset in offsets if HEADER_SIZE < offset < health.size]
    return None


def _key_value(payload: bytes) -> str | None:
    """What is wrong with a key-value message (key length, `type name`, value)."""
    if not payload or len(payload) < 1 + payload[0]:
        return "a key that runs past its message"
    key, value = payload[1 : 1 + payload[0]], payload[1 + payload[0] :]
    kind, blank, name = key.partition(b" ")
    if not blank or not name or not key.isascii() or b"\0" in key:
        return "a key that is no text"
    if kind.startswith(b"char[") and _ZERO_RUN in value:
        return "a text full of zeros"
    return None


def _logged_text(payload: bytes, start: int) -> str | None:
    if len(payload) < start or not 48 <= payload[0] <= 55:
        return "a logged text without its level"
    return "a text full of zeros" if _ZERO_RUN in payload[start:] else None
