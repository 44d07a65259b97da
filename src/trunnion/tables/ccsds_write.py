"""Attitude messages out: AEM and APM of CCSDS 504.0-B-2 in key-value notation, checked by our own rules before return.

Source: CCSDS-504.0-B-2 (orders, number forms, direction A to B, angles in degrees about moving axes).
"""

from __future__ import annotations

from collections.abc import Sequence as Many
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.attitude.sequences import Sense
from trunnion.errors import Fault, TableError
from trunnion.tables.ccsds_message import parse_message
from trunnion.tables.epochs import epoch_text, nanoseconds
from trunnion.tables.table import AttitudeTable

Array = NDArray[np.float64]


@dataclass(frozen=True)
class MessageHead:
    """What a message must say besides its attitudes. Times in the message's own form; `epoch` is the table's time zero.

    `reference_frame` becomes REF_FRAME_A and `body_frame` REF_FRAME_B: names agreed with the receiver or from the
    registry the standard names.
    """

    originator: str
    creation_date: str
    object_name: str
    object_id: str
    reference_frame: str
    body_frame: str
    time_system: str
    epoch: str
    center_name: str | None = None
    message_id: str | None = None
    comments: tuple[str, ...] = ()


def aem_text(table: AttitudeTable, head: MessageHead, convention: Convention | None = None) -> str:
    """An AEM with one segment of all rows: quaternions, or Euler angles when a `convention` is given.

    The convention must be three turns about moving axes without constants (the standard knows no other); rows at its
    lock are refused, for the standard has no rule for them. Raises TableError for what the standard can't carry.
    """
    start = nanoseconds(head.epoch, head.time_system)
    stamps = [epoch_text(start + round(second * 1e9), head.time_system) for second in table.times.tolist()]
    kind, rows = _rows(table, convention)
    lines = [
        *_header("AEM", head),
        "",
        "META_START",
        *_comments((*head.comments, *_direction_words(head))),
        *_object(head),
        f"REF_FRAME_A = {head.reference_frame}",
        f"REF_FRAME_B = {head.body_frame}",
        f"TIME_SYSTEM = {head.time_system}",
        f"START_TIME = {stamps[0]}",
        f"STOP_TIME = {stamps[-1]}",
        f"ATTITUDE_TYPE = {kind}",
        *([f"EULER_ROT_SEQ = {convention.sequence.name}"] if convention else []),
        "META_STOP",
        "",
        "DATA_START",
        *(f"{stamp} {row}" for stamp, row in zip(stamps, rows, strict=True)),
        "DATA_STOP",
    ]
    return _checked(lines)


def apm_text(q: Array, head: MessageHead, convention: Convention | None = None) -> str:
    """An APM of one attitude (4,), scalar first, body to reference, at the head's epoch; with angles when asked."""
    q1, q2, q3, qc = (_number(part, 15) for part in np.roll(np.asarray(q, dtype=float), -1))
    frames = [f"REF_FRAME_A = {head.reference_frame}", f"REF_FRAME_B = {head.body_frame}"]
    lines = [
        *_header("APM", head),
        "",
        *_comments((*head.comments, *_direction_words(head))),
        *_object(head),
        f"TIME_SYSTEM = {head.time_system}",
        "",
        f"EPOCH = {head.epoch}",
        "",
        "QUAT_START",
        *frames,
        *(f"{key} = {value}" for key, value in zip(("Q1", "Q2", "Q3", "QC"), (q1, q2, q3, qc), strict=True)),
        "QUAT_STOP",
    ]
    if convention is not None:
        (angles,) = _angles(np.asarray(q, dtype=float)[None], convention)
        values = [f"ANGLE_{place} = {_number(angle, 12)} [deg]" for place, angle in enumerate(angles, 1)]
        lines += ["", "EULER_START", *frames, f"EULER_ROT_SEQ = {convention.sequence.name}", *values, "EULER_STOP"]
    return _checked(lines)


def _header(kind: str, head: MessageHead) -> list[str]:
    lines = [f"CCSDS_{kind}_VERS = 2.0", f"CREATION_DATE = {head.creation_date}", f"ORIGINATOR = {head.originator}"]
    return lines + ([f"MESSAGE_ID = {head.message_id}"] if head.message_id else [])


def _object(head: MessageHead) -> list[str]:
    lines = [f"OBJECT_NAME = {head.object_name}", f"OBJECT_ID = {head.object_id}"]
    return lines + ([f"CENTER_NAME = {head.center_name}"] if head.center_name else [])


def _comments(texts: Many[str]) -> list[str]:
    return [f"COMMENT {text}" for text in texts]


def _direction_words(head: MessageHead) -> tuple[str, ...]:
    """The convention said in words, so that a reader need not know annex F."""
    a, b = head.reference_frame, head.body_frame
    return (
        f"Rotation from {a} (A) to {b} (B): it turns the axes of A onto those of B, and as a map",
        f"takes components in {b} to components in {a}. Quaternion scalar last. Angles: moving axes.",
    )


def _rows(table: AttitudeTable, convention: Convention | None) -> tuple[str, list[str]]:
    if convention is None:
        last = np.roll(table.quaternions, -1, axis=-1)
        return "QUATERNION", [" ".join(_number(part, 15) for part in row) for row in last.tolist()]
    angles = _angles(table.quaternions, convention)
    return "EULER_ANGLE", [" ".join(_number(part, 12) for part in row) for row in angles]


def _angles(q: Array, convention: Convention) -> list[list[float]]:
    """Angles (N, 3) deg of a convention the standard can carry."""
    plain = (
        convention.sense is Sense.MOVING
        and convention.signs == (1, 1, 1)
        and convention.offsets == (0.0, 0.0, 0.0)
        and np.array_equal(convention.zero, np.eye(3))
        and np.array_equal(convention.left, np.eye(3))
    )
    if not plain:
        cause = f"convention '{convention.name}' can't be written: the standard has turns about moving axes only"
        raise TableError([Fault(cause, "write quaternions, or a convention without signs, offsets and zero attitude")])
    found = convention.angles(matrix_from_quaternion(q))
    if np.any(found.singular):
        row = int(np.flatnonzero(found.singular)[0]) + 1
        cause = f"row {row} is at the lock of '{convention.name}', where its angles are not unique"
        raise TableError([Fault(cause, "write quaternions")])
    degrees: list[list[float]] = np.degrees(found.angles).tolist()
    return degrees


def _number(value: float, decimals: int) -> str:
    """Fixed point with at most 16 digits and no negative zero."""
    whole = len(str(int(abs(value))))
    text = f"{value:.{min(decimals, 16 - whole)}f}"
    return text.removeprefix("-") if float(text) == 0.0 else text


def _checked(lines: list[str]) -> str:
    """The text, after our own reader found no broken rule in it."""
    text = "\n".join(lines) + "\n"
    breaches = parse_message(text.encode("utf-8"), "message").breaches
    if breaches:
        raise TableError([Fault(f"line {b.line}: {b.words}", "change what goes into the message") for b in breaches])
    return text
