"""DataFlash logs (.bin): self-describing messages, walked by the lengths the log itself announces."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from trunnion.tables.assembly import assemble
from trunnion.tables.confine import Limits
from trunnion.tables.files import Seal, file_error, read_whole
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.packets import Damage, columns_of_fields
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable

_MARK = b"\xa3\x95"
_FORMAT = 128
_FORMAT_LENGTH = 89
_HEAD = 3
#: format letter: (numpy type, what one unit of the stored number is worth)
LETTERS: dict[str, tuple[str, float]] = {
    "b": ("i1", 1.0),
    "B": ("u1", 1.0),
    "M": ("u1", 1.0),
    "h": ("<i2", 1.0),
    "H": ("<u2", 1.0),
    "i": ("<i4", 1.0),
    "I": ("<u4", 1.0),
    "q": ("<i8", 1.0),
    "Q": ("<u8", 1.0),
    "g": ("<f2", 1.0),
    "f": ("<f4", 1.0),
    "d": ("<f8", 1.0),
    "c": ("<i2", 0.01),
    "C": ("<u2", 0.01),
    "e": ("<i4", 0.01),
    "E": ("<u4", 0.01),
    "L": ("<i4", 1e-7),
    "n": ("S4", 1.0),
    "N": ("S16", 1.0),
    "Z": ("S64", 1.0),
    "a": ("S64", 1.0),
}


@dataclass(frozen=True)
class MessageFormat:
    """One announced message: name, fields with format letters, packed type."""

    name: str
    letters: dict[str, str]
    dtype: np.dtype


@dataclass
class FlashLog:
    """Formats by message number, packed samples by name, and the damage."""

    formats: dict[int, MessageFormat] = field(default_factory=dict)
    samples: dict[str, bytearray] = field(default_factory=dict)
    damage: Damage = field(default_factory=Damage)

    def format_named(self, name: str) -> MessageFormat:
        """The format of a message that has samples."""
        return next(found for found in self.formats.values() if found.name == name)


def read_dataflash_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """One message of the log. Broken messages stop it unless damage is accepted."""
    seal = Seal.of(path)
    log = walk_flash(read_whole(path), path)
    held = sorted(log.samples)
    if statement.topic is not None and statement.topic not in log.samples:
        raise file_error(path, f"the log holds no message '{statement.topic}'", nearest_hint(statement.topic, held))
    require_answers("dataflash", statement, {}, path)
    assert statement.topic is not None
    shape = log.format_named(statement.topic)
    samples, notes = _one_instance(fields_of(log, statement.topic), shape, statement)
    columns = columns_of_fields(samples, statement.topic, statement, path)
    columns.damage = log.damage.troubles()
    columns.notes = [f"{len(samples)} messages {statement.topic}", *notes, *_scale_notes(shape, statement)]
    return assemble(columns, statement, path, seal.sha256)


def fields_of(log: FlashLog, name: str) -> np.ndarray:
    """Structured samples (N,) of one message with the format's own scale applied (hundredths become whole units)."""
    shape = log.format_named(name)
    packed = np.frombuffer(bytes(log.samples[name]), dtype=shape.dtype)
    scaled = [
        (key, "<f8" if LETTERS[letter][1] != 1.0 else LETTERS[letter][0]) for key, letter in shape.letters.items()
    ]
    out = np.empty(len(packed), dtype=scaled)
    for key, letter in shape.letters.items():
        scale = LETTERS[letter][1]
        out[key] = packed[key] if scale == 1.0 else packed[key] * scale
    return out


def _one_instance(samples: np.ndarray, shape: MessageFormat, statement: TableStatement) -> tuple[np.ndarray, list[str]]:
    """Messages logged by several estimators or sensors carry their number in a field C or I."""
    for key in ("C", "I"):
        if shape.letters.get(key) in ("B", "b", "M") and len(np.unique(samples[key])) > 1:
            kept = samples[samples[key] == statement.instance]
            return kept, [f"several sources, told apart by field {key}: instance {statement.instance} is read"]
    return samples, []


def _scale_notes(shape: MessageFormat, statement: TableStatement) -> list[str]:
    hundredths = [name for name in statement.columns if LETTERS[shape.letters[name]][1] == 0.01]
    return [f"stored in hundredths and scaled so: {', '.join(hundredths)}"] if hundredths else []


def walk_flash(data: bytes, path: Path | str) -> FlashLog:
    """Every message of a DataFlash log. Raises TableError for a file that does not begin as one."""
    if data[:3] != _MARK + bytes([_FORMAT]):
        raise file_error(path, "this is no DataFlash log: it does not begin with a format message")
    log, offset = FlashLog(), 0
    while offset < len(data):
        size = _message_size(data, offset, log)
        if size is None or offset + size > len(data):
            found = _resync(data, offset + 1, log)
            cut = size is not None or len(data) - offset < _HEAD
            reason = "the last message is incomplete" if cut and found == len(data) else "bytes that are no message"
            log.damage.add(reason, offset, found - offset)
            offset = found
            continue
        _take(data[offset : offset + size], offset, log)
        offset += size
    return log


def _message_size(data: bytes, offset: int, log: FlashLog) -> int | None:
    if data[offset : offset + 2] != _MARK or offset + _HEAD > len(data):
        return None
    number = data[offset + 2]
    if number == _FORMAT:
        return _FORMAT_LENGTH
    shape = log.formats.get(number)
    return _HEAD + shape.dtype.itemsize if shape else None


def _resync(data: bytes, start: int, log: FlashLog) -> int:
    """The next mark from which a known message is followed by another mark or the end."""
    while (start := data.find(_MARK, start)) >= 0:
        size = _message_size(data, start, log)
        after = start + size if size else len(data) + 1
        if after == len(data) or data[after : after + 2] == _MARK:
            return start
        start += 1
    return len(data)


def _take(message: bytes, offset: int, log: FlashLog) -> None:
    number, payload = message[2], message[_HEAD:]
    if number == _FORMAT:
        _learn(payload, offset, log)
    elif number in log.formats:
        log.samples.setdefault(log.formats[number].name, bytearray()).extend(payload)


def _learn(payload: bytes, offset: int, log: FlashLog) -> None:
    """Take in a format message: number, length, name, letters, field names."""
    number, length = payload[0], payload[1]
    try:
        name, letters, fields = (
            part.rstrip(b"\0").decode("ascii") for part in (payload[2:6], payload[6:22], payload[22:86])
        )
        keys = fields.split(",") if fields else []
        dtype = np.dtype([(key, LETTERS[letter][0]) for key, letter in zip(keys, letters, strict=True)])
    except (UnicodeDecodeError, KeyError, ValueError):
        log.damage.add("format messages that can't be read", offset)
        return
    if not name or length != _HEAD + dtype.itemsize:
        log.damage.add("format messages that contradict their own length", offset)
        return
    known = log.formats.get(number)
    if known is not None and known.dtype != dtype:
        log.damage.add("message numbers announced twice in different ways", offset)
        return
    if number != _FORMAT:
        log.formats[number] = MessageFormat(name, dict(zip(keys, letters, strict=True)), dtype)
