"""MAVLink telemetry logs (.tlog): each packet with its 8-byte time stamp, walked by lengths and checksums.

Only the attitude messages are decoded, from the published message set `common`; no library is needed for them.
"""

from __future__ import annotations

import re
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

_STAMP = 8
_V1, _V2 = 0xFE, 0xFD
_MARK = re.compile(rb"[\xfd\xfe]")
_SIGNED = 1
_SIGNATURE = 13
#: Resynchronizing takes only stamps within this of the one before (us): ten years.
_NEAR_US = 10 * 365 * 86_400 * 10**6

#: number: (name, checksum seed, fields in wire order, size without extension fields); set `common`, as published.
MESSAGES: dict[int, tuple[str, int, list[tuple[str, str]], int]] = {
    30: (
        "ATTITUDE",
        39,
        [("time_boot_ms", "<u4"), *((name, "<f4") for name in ("roll", "pitch", "yaw"))]
        + [(name, "<f4") for name in ("rollspeed", "pitchspeed", "yawspeed")],
        28,
    ),
    31: (
        "ATTITUDE_QUATERNION",
        246,
        [("time_boot_ms", "<u4"), *((name, "<f4") for name in ("q1", "q2", "q3", "q4"))]
        + [(name, "<f4") for name in ("rollspeed", "pitchspeed", "yawspeed")]
        + [(f"repr_offset_q[{place}]", "<f4") for place in range(4)],
        32,
    ),
    265: (
        "MOUNT_ORIENTATION",
        26,
        [("time_boot_ms", "<u4"), *((name, "<f4") for name in ("roll", "pitch", "yaw", "yaw_absolute"))],
        16,
    ),
}


@dataclass
class TelemetryLog:
    """Attitude messages by (name, system, component): packed samples with their log time in us; and the damage."""

    samples: dict[tuple[str, int, int], list[tuple[int, bytes]]] = field(default_factory=dict)
    counts: dict[int, int] = field(default_factory=dict)
    damage: Damage = field(default_factory=Damage)


def read_mavlink_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """One attitude message of one vehicle. Broken packets and checksums stop it unless damage is accepted."""
    seal = Seal.of(path)
    log = walk_telemetry(read_whole(path), path)
    key = _choose(log, statement, path)
    samples = unpack(log, key)
    require_answers("mavlink", statement, _facts(samples), path)
    columns = columns_of_fields(samples, key[0], statement, path)
    columns.damage = log.damage.troubles()
    columns.notes = [f"{len(samples)} messages {key[0]} of system {key[1]}, component {key[2]}"]
    return assemble(columns, statement, path, seal.sha256)


def _choose(log: TelemetryLog, statement: TableStatement, path: Path) -> tuple[str, int, int]:
    held = sorted({name for name, _, _ in log.samples})
    if statement.topic is None:
        raise file_error(
            path, "not stated: which message holds the attitude?", f"state topic: one of {', '.join(held)}"
        )
    keys = sorted(key for key in log.samples if key[0] == statement.topic)
    if not keys:
        raise file_error(path, f"the log holds no message '{statement.topic}'", nearest_hint(statement.topic, held))
    stated = statement.answers.get("system")
    chosen = [key for key in keys if stated in (None, f"{key[1]}/{key[2]}")]
    if len(chosen) != 1:
        listed = ", ".join(f"'{system}/{component}'" for _, system, component in keys)
        raise file_error(path, "not stated: which system's attitude?", f"state answers: {{system: one of {listed}}}")
    return chosen[0]


def unpack(log: TelemetryLog, key: tuple[str, int, int]) -> np.ndarray:
    """Structured samples (N,) of one message, with `log_time` (us) as an extra field."""
    fields = next(fields for name, _, fields, _ in MESSAGES.values() if name == key[0])
    wire = np.dtype(fields)
    stamped = log.samples[key]
    packed = np.frombuffer(b"".join(payload.ljust(wire.itemsize, b"\0") for _, payload in stamped), dtype=wire)
    out = np.empty(len(packed), dtype=[*fields, ("log_time", "<u8")])
    for name in wire.names or ():
        out[name] = packed[name]
    out["log_time"] = [stamp for stamp, _ in stamped]
    return out


def _facts(samples: np.ndarray) -> dict[str, str]:
    """The display offset is answered by the file where the field is missing, zero, or no turn."""
    names = [f"repr_offset_q[{place}]" for place in range(4)]
    if names[0] not in (samples.dtype.names or ()):
        return {"display offset": "the message has no such field"}
    offsets = np.stack([samples[name] for name in names], axis=-1)
    unused = np.all(np.all(offsets == 0.0, axis=-1) | np.all(offsets == [1.0, 0.0, 0.0, 0.0], axis=-1))
    return {"display offset": "zero or no turn in every message"} if unused else {}


def walk_telemetry(data: bytes, path: Path | str) -> TelemetryLog:
    """Every packet of a telemetry log. Raises TableError for a file that does not begin as one."""
    log, offset = TelemetryLog(), 0
    if len(data) > _STAMP and data[_STAMP] not in (_V1, _V2):
        raise file_error(path, "this is no MAVLink telemetry log: no packet follows the first time stamp")
    last = int.from_bytes(data[:_STAMP], "big")
    while offset < len(data):
        end = _packet_end(data, offset)
        stamp = int.from_bytes(data[offset : offset + _STAMP], "big")
        if end is None or abs(stamp - last) > _NEAR_US:
            found = _resync(data, offset + 1, last)
            incomplete = (
                end is None and found == len(data) and data[offset + _STAMP : offset + 9] in (b"\xfe", b"\xfd", b"")
            )
            reason = "the last packet is incomplete" if incomplete else "bytes that are no packet"
            log.damage.add(reason, offset, found - offset)
            offset = found
            continue
        _take(data, offset, end, stamp, log)
        offset, last = end, stamp
    return log


def _packet_end(data: bytes, offset: int) -> int | None:
    """The offset after the packet at `offset`, or None where there is none or it runs past the end."""
    start = offset + _STAMP
    head = data[start : start + 3]
    if len(head) < 3 or head[0] not in (_V1, _V2):
        return None
    size = 8 + head[1] if head[0] == _V1 else 12 + head[1] + (_SIGNATURE if head[2] & _SIGNED else 0)
    return start + size if start + size <= len(data) else None


def _resync(data: bytes, start: int, last: int) -> int:
    """The next offset from which two packets follow each other, or the end."""
    for mark in _MARK.finditer(data, start + _STAMP):
        offset = mark.start() - _STAMP
        stamp = int.from_bytes(data[offset : offset + _STAMP], "big")
        end = _packet_end(data, offset) if abs(stamp - last) <= _NEAR_US else None
        if end is not None and (end == len(data) or _packet_end(data, end) is not None):
            return offset
    return len(data)


def _take(data: bytes, offset: int, end: int, stamp: int, log: TelemetryLog) -> None:
    start = offset + _STAMP
    second = data[start] == _V2
    length = data[start + 1]
    head = 10 if second else 6
    system, component = data[start + 5 : start + 7] if second else data[start + 3 : start + 5]
    number = int.from_bytes(data[start + 7 : start + 10], "little") if second else data[start + 5]
    log.counts[number] = log.counts.get(number, 0) + 1
    if number not in MESSAGES:
        return
    name, seed, _, _ = MESSAGES[number]
    body = data[start + 1 : start + head + length]
    stated = int.from_bytes(data[start + head + length : start + head + length + 2], "little")
    if checksum(body + bytes([seed])) != stated:
        log.damage.add("packets with a wrong checksum", offset)
        return
    log.samples.setdefault((name, system, component), []).append((stamp, body[head - 1 :]))


def _checksum_table() -> list[int]:
    table = []
    for value in range(256):
        for _ in range(8):
            value = value >> 1 ^ 0x8408 if value & 1 else value >> 1
        table.append(value)
    return table


_TABLE = _checksum_table()


def checksum(data: bytes) -> int:
    """CRC-16 of the message set (reflected 0x1021, start 0xFFFF)."""
    value = 0xFFFF
    for byte in data:
        value = value >> 8 ^ _TABLE[(value ^ byte) & 0xFF]
    return value
