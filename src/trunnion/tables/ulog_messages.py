"""The messages of a ULog file, one after the other, to the last byte; and where that order breaks.

Written from the public description of the format: a 16-byte header, then messages of a 3-byte head (payload size,
type) and payload. Nothing is kept in memory but the message at hand, so a log of any size can be walked.
"""

from __future__ import annotations

import re
import struct
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import BinaryIO

import numpy as np

MAGIC = b"ULog\x01\x12\x35"
SYNC = b"\x2f\x73\x13\x20\x25\x0c\xbb\x12"
HEADER_SIZE = 16
_HEAD = struct.Struct("<HB")
_KNOWN = frozenset(b"BFIMPQARDLCSO")
_KNOWN_MARK = re.compile(rb"[BFIMPQARDLCSO]")
_MAX_TRIED = 2_000_000
_CHAIN = 5  # messages in a row that must fit before a walk takes up again after a break
_SCALARS = {
    "int8_t": "i1",
    "uint8_t": "u1",
    "int16_t": "<i2",
    "uint16_t": "<u2",
    "int32_t": "<i4",
    "uint32_t": "<u4",
    "int64_t": "<i8",
    "uint64_t": "<u8",
    "float": "<f4",
    "double": "<f8",
    "bool": "i1",
    "char": "i1",
}
_FIELD = re.compile(r"([A-Za-z_0-9]+)(?:\[(\d{1,5})\])? ([A-Za-z_0-9]+)")
_MAX_FIELDS = 20_000  # of one topic
_MAX_FIELDS_IN_ALL = 1_000_000  # of all formats that are subscribed to


@dataclass(frozen=True)
class Message:
    """One whole message: byte offset of its head, type letter, payload."""

    offset: int
    kind: str
    payload: bytes


@dataclass(frozen=True)
class Break:
    """A place where the order of messages is lost: offset, why, and how many bytes were passed over."""

    offset: int
    reason: str
    skipped: int


@dataclass(frozen=True)
class Topic:
    """A subscription: message id, topic name, instance, and the layout of its payload."""

    number: int
    name: str
    instance: int
    dtype: np.dtype
    padded_size: int


@dataclass
class Dictionary:
    """What the log has defined so far: formats, and topics by message id."""

    formats: dict[str, list[tuple[str, int, str]]] = field(default_factory=dict)
    topics: dict[int, Topic] = field(default_factory=dict)
    layouts: dict[str, tuple[np.dtype, int]] = field(default_factory=dict)
    fields_in_all: int = 0

    def learn(self, message: Message) -> str | None:
        """Take in a format or subscription message; returns what is wrong with it, if anything."""
        try:
            if message.kind == "F":
                self._learn_format(message.payload)
            elif message.kind == "A":
                self._learn_topic(message.payload)
        except (ValueError, UnicodeDecodeError, struct.error, KeyError, RecursionError) as err:
            return f"a definition that can't be read ({err})"
        return None

    def _learn_format(self, payload: bytes) -> None:
        name, _, body = payload.decode("ascii").partition(":")
        fields = []
        for part in filter(None, body.split(";")):
            match = _FIELD.fullmatch(part)
            if match is None:
                raise ValueError(f"field '{part[:40]!r}'")
            fields.append((match[1], int(match[2] or 0), match[3]))
        if not name or not fields:
            raise ValueError("a format without name or fields")
        if self.formats.get(name) != fields:
            self.formats[name] = fields
            self.layouts.clear()

    def _learn_topic(self, payload: bytes) -> None:
        instance, number = struct.unpack_from("<BH", payload)
        name = payload[3:].decode("ascii")
        if name not in self.formats:
            raise ValueError(f"topic '{name[:40]!r}' has no format")
        known = self.topics.get(number)
        if known is not None and known.name != name:
            raise ValueError(f"message id {number} is given to two topics")
        if name not in self.layouts:
            self.layouts[name] = self._layout(name)
        self.topics[number] = Topic(number, name, instance, *self.layouts[name])

    def _layout(self, name: str) -> tuple[np.dtype, int]:
        """The packed type of a topic without its trailing padding, and the size with it."""
        flat = self._flatten(name, "", 0)
        self.fields_in_all += len(flat)
        if self.fields_in_all > _MAX_FIELDS_IN_ALL:
            raise ValueError(f"the log's topics have more than {_MAX_FIELDS_IN_ALL} fields in all")
        padded = sum(np.dtype(code).itemsize for _, code in flat)
        while flat and flat[-1][0].startswith("_padding"):
            flat.pop()
        return np.dtype(flat), padded

    def _flatten(self, name: str, prefix: str, depth: int) -> list[tuple[str, str]]:
        if depth > 8:
            raise ValueError(f"format '{name}' nests without end")
        flat: list[tuple[str, str]] = []
        for kind, count, label in self.formats[name]:
            for place in range(max(count, 1)):
                full = f"{prefix}{label}[{place}]" if count else f"{prefix}{label}"
                if kind in _SCALARS:
                    flat.append((full, _SCALARS[kind]))
                else:
                    flat += self._flatten(kind, f"{full}.", depth + 1)
                if len(flat) > _MAX_FIELDS:
                    raise ValueError(f"format '{name}' has more than {_MAX_FIELDS} fields")
        return flat

    def size_fits(self, number: int, size: int) -> bool:
        """Does a data payload of `size` bytes (without the id) fit the topic of this id?"""
        topic = self.topics.get(number)
        return topic is not None and topic.dtype.itemsize <= size <= topic.padded_size


def walk_messages(handle: BinaryIO, size: int, words: Dictionary, appended: list[int]) -> Iterator[Message | Break]:
    """Yield every message from the end of the header to the last byte, and a Break wherever that fails.

    `appended` are offsets at which the logger appended data later (from the flag message, filled while walking): the
    message before one may be cut short without damage after it.
    """
    offset = HEADER_SIZE
    handle.seek(offset)
    while offset < size:
        end = next((place for place in sorted(appended) if place > offset), size)
        head = handle.read(_HEAD.size)
        if len(head) < _HEAD.size or offset + _HEAD.size > end:
            yield Break(offset, "the last message is incomplete", end - offset)
            offset = end
            handle.seek(offset)
            continue
        length, kind = _HEAD.unpack(head)
        reason = _bad_head(length, kind)
        if reason is None and offset + _HEAD.size + length > end:
            reason = "the last message is incomplete" if end == size else "a message runs into appended data"
        if reason is None:
            payload = handle.read(length)
            yield Message(offset, chr(kind), payload)
            offset += _HEAD.size + length
            continue
        found = _find_chain(handle, offset + 1, end, words)
        yield Break(offset, reason, found - offset)
        offset = found
        handle.seek(offset)


def _bad_head(length: int, kind: int) -> str | None:
    if kind not in _KNOWN:
        return f"a message of no known type ({kind})" if kind else "a message head of zeros"
    return "a message without content" if length == 0 else None


def _find_chain(handle: BinaryIO, start: int, end: int, words: Dictionary) -> int:
    """The first offset from `start` at which several messages in a row make sense, or `end`.

    After too many places that looked like a message and were none the search is given up: the rest is called lost.
    """
    window, keep, tried = 1 << 16, 1 << 14, 0
    offset = start
    while offset < end:
        handle.seek(offset)
        block = handle.read(window)
        last = len(block) if offset + len(block) >= end else max(1, len(block) - keep)
        for mark in _KNOWN_MARK.finditer(block, 2, last + 2):
            tried += 1
            if _is_chain(block, mark.start() - 2, words):
                return offset + mark.start() - 2
        if tried > _MAX_TRIED:
            return end
        offset += last
    return end


def _is_chain(block: bytes, place: int, words: Dictionary) -> bool:
    for _ in range(_CHAIN):
        if place + 5 > len(block):
            return False
        length, kind = _HEAD.unpack_from(block, place)
        if _bad_head(length, kind) is not None:
            return False
        if kind == ord("D") and not words.size_fits(int.from_bytes(block[place + 3 : place + 5], "little"), length - 2):
            return False
        place += _HEAD.size + length
    return True
