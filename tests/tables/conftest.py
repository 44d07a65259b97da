"""Fixtures for table tests: conventions, statements, and a writer of small flight logs."""

from __future__ import annotations

import struct
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.tables import TableStatement, statement_from_plain

LOCAL = Frame("local", ("north", "east", "down"))
BODY = Frame("body", ("forward", "starboard", "down"))

MAGIC = b"ULog\x01\x12\x35\x01"
SYNC = b"\x2f\x73\x13\x20\x25\x0c\xbb\x12"


def message(kind: str, payload: bytes) -> bytes:
    """One message: payload size, type letter, payload."""
    return struct.pack("<HB", len(payload), ord(kind)) + payload


def key_value(text: str, value: bytes) -> bytes:
    """Payload of an information or parameter message."""
    return bytes([len(text)]) + text.encode() + value


def write_log(
    quaternions: np.ndarray, *, step_us: int = 10_000, start_us: int = 5_000_000, extra: bytes = b""
) -> bytes:
    """A whole flight log with attitudes (N, 4) scalar first and three other topics between them."""
    out = [MAGIC + struct.pack("<Q", start_us), message("B", bytes(40))]
    out.append(message("I", key_value("char[5] sys_name", b"BENCH")))
    for text in (
        "vehicle_attitude:uint64_t timestamp;float[4] q;float rollspeed;",
        "body_rates:uint64_t timestamp;float[3] rate;uint8_t flag;uint8_t[7] _padding0;",
        "point:float x;float y;",
        "path_points:uint64_t timestamp;point[3] corner;int16_t kind;",
        "noise:uint64_t timestamp;uint16_t[20] words;",
    ):
        out.append(message("F", text.encode()))
    out.append(message("P", key_value("float GAIN_P", struct.pack("<f", 6.5))))
    names = ("vehicle_attitude", "body_rates", "path_points", "noise")
    out += [message("A", struct.pack("<BH", 0, number) + name.encode()) for number, name in enumerate(names)]
    out.append(extra)
    rng = np.random.default_rng(3)
    for row, q in enumerate(quaternions):
        now = struct.pack("<Q", start_us + row * step_us)
        out.append(message("D", struct.pack("<H", 0) + now + struct.pack("<5f", *q, 0.1)))
        out.append(message("D", struct.pack("<H", 1) + now + struct.pack("<3fB", *rng.normal(size=3), 1)))
        if row % 3 == 0:
            out.append(message("D", struct.pack("<H", 2) + now + struct.pack("<6fh", *rng.normal(size=6), 7)))
        if row % 4 == 0:
            words = rng.integers(1, 60000, 20, dtype=np.uint16).tobytes()
            out.append(message("D", struct.pack("<H", 3) + now + words))
        if row % 50 == 0:
            out.append(message("S", SYNC))
            out.append(message("L", b"6" + now + b"all well"))
    return b"".join(out)


@pytest.fixture(scope="session")
def log_writer() -> Callable[..., bytes]:
    """The writer of small flight logs."""
    return write_log


@pytest.fixture(scope="session")
def log_message() -> Callable[[str, bytes], bytes]:
    """The writer of one log message."""
    return message


@pytest.fixture(scope="session")
def turns() -> np.ndarray:
    """400 attitudes (N, 4), scalar first: a slow tumble that passes half a turn."""
    from scipy.spatial.transform import Rotation

    steps = np.linspace(0.0, 1.0, 400)[:, None]
    turned = Rotation.from_euler("ZYX", np.array([0.3, -0.4, 0.2]) + steps * np.array([7.0, 1.5, -2.0]))
    return np.roll(turned.as_quat(canonical=True), 1, axis=1)


@pytest.fixture(scope="session")
def ordinary() -> Convention:
    """Heading, elevation, bank about moving axes 3-2-1."""
    return Convention("ordinary", LOCAL, BODY, Sequence.ZYX, Sense.MOVING, ("heading", "elevation", "bank"))


@pytest.fixture(scope="session")
def log_statement() -> Callable[..., TableStatement]:
    """A complete statement for the written logs; keyword arguments replace keys of the plain form."""

    def make(**changes: Any) -> TableStatement:
        plain: dict[str, Any] = {
            "table": "flight.ulg",
            "topic": "vehicle_attitude",
            "columns": {
                "time": {"column": "timestamp", "unit": "us"},
                "quaternion": ["q[0]", "q[1]", "q[2]", "q[3]"],
            },
            "scalar": "first",
            "maps": "body to reference",
            "between samples": "slerp",
        }
        plain.update({key.replace("_", " "): value for key, value in changes.items()})
        return statement_from_plain(plain)

    return make


@pytest.fixture(scope="session")
def csv_statement() -> Callable[..., TableStatement]:
    """A complete statement for t, w, x, y, z tables; keyword arguments replace keys of the plain form."""

    def make(convention: Convention | None = None, **changes: Any) -> TableStatement:
        plain: dict[str, Any] = {
            "table": "table.csv",
            "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": ["w", "x", "y", "z"]},
            "scalar": "first",
            "maps": "body to reference",
            "between samples": "slerp",
        }
        plain.update({key.replace("_", " "): value for key, value in changes.items()})
        return statement_from_plain({key: value for key, value in plain.items() if value is not None}, convention)

    return make


@pytest.fixture
def write_rows(tmp_path: Path) -> Callable[..., Path]:
    """Write a CSV from a header and rows of numbers or texts."""

    def write(header: str, rows: Any, name: str = "table.csv", separator: str = ",") -> Path:
        lines = [header, *(separator.join(str(cell) for cell in row) for row in rows)]
        (tmp_path / name).write_text("\n".join(lines) + "\n", encoding="utf-8")
        return tmp_path

    return write
