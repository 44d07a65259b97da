"""CCSDS attitude messages in: AEM and APM of both editions, key-value notation or XML.

The rotation of a message goes from REF_FRAME_A to REF_FRAME_B: the quaternion (scalar last) turns A's basis onto B's,
so as a map it takes B components to A components. Euler angles are three turns about moving axes, first letter first.
Source: CCSDS-504.0-B-2 annex F; edition 1 by annex J of the same.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import (
    matrix_from_quaternion,
    quaternion_angle,
    quaternion_conjugate,
    scalar_first,
)
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import Fault, Place, TableError
from trunnion.tables import ccsds_rules as rules
from trunnion.tables.assembly import assemble
from trunnion.tables.ccsds_checks import attitude_type
from trunnion.tables.ccsds_message import MAX_BYTES, AttitudeMessage, Block, elapsed, parse_message
from trunnion.tables.ccsds_xml import looks_like_xml, parse_xml_message
from trunnion.tables.columns import Columns
from trunnion.tables.confine import Limits
from trunnion.tables.files import Seal, file_error
from trunnion.tables.forms import quaternions_from_angles
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import Form, Scalar, TableStatement
from trunnion.tables.table import AttitudeTable

Array = NDArray[np.float64]

#: q . q' of a unit quaternion is zero; above this (1/s) the file's rate does not belong to its quaternion.
RATE_NOT_SQUARE = 1e-3


@dataclass(frozen=True)
class Part:
    """One attitude history of a message: frames, time system, times (ns), quaternions A to B, rates, and where."""

    label: str
    frame_a: str
    frame_b: str
    time_system: str
    times_ns: NDArray[np.int64]
    quaternions: Array
    rates_b: Array | None
    notes: tuple[str, ...] = ()


def read_ccsds_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """One segment of an AEM (or the attitude of an APM). `reference` and `body` name the file's own frames."""
    seal = Seal.of(path)
    message = load_message(path)
    message.require_readable(path)
    part = _choose(message_parts(message, path), statement, path)
    require_answers("ccsds", statement, {}, path)
    body_is_b = _orient(part, statement, path)
    q = part.quaternions if body_is_b else quaternion_conjugate(part.quaternions)
    own = replace(statement, form=Form.QUATERNION, scalar=Scalar.FIRST, body_to_reference=True, time_unit="ns")
    soft = [f"line {breach.line}: {breach.words}" for breach in message.breaches[:5] if not breach.hard]
    columns = Columns(part.times_ns, list(q.T))
    columns.notes = [f"CCSDS {message.kind} edition {message.edition}, {part.label}", *part.notes, *soft]
    table = assemble(columns, own, path, seal.sha256)
    rates = _body_rates(part, body_is_b)
    return replace(table, body_rates=None if rates is None else rates[table.rows - 1])


def load_message(path: Path) -> AttitudeMessage:
    """Parse a message file, key-value notation or XML."""
    if path.stat().st_size > MAX_BYTES:
        raise file_error(path, f"the message has more than {MAX_BYTES} bytes", "cut it into several")
    data = path.read_bytes()
    return parse_xml_message(data, path) if looks_like_xml(data) else parse_message(data, path)


def message_parts(message: AttitudeMessage, path: Path) -> list[Part]:
    """Every attitude history the message holds. Raises TableError for a type or block that can't be turned into one."""
    try:
        if message.kind == "AEM":
            return [_segment_part(message, place, block) for place, block in enumerate(message.segments, 1)]
        return _apm_parts(message)
    except (KeyError, ValueError) as err:
        raise file_error(path, f"the message can't be read: {err}") from err


def _segment_part(message: AttitudeMessage, place: int, segment: Block) -> Part:
    kind = attitude_type(segment)
    names = (rules.ROWS_B2 if message.edition == 2 else rules.ROWS_B1)[kind]
    numbers = np.array([[float(cell) for cell in cells[1:]] for _, cells in segment.rows]).reshape(-1, len(names))
    values = dict(zip(names, numbers.T, strict=True))
    frame_a, frame_b = segment.values["REF_FRAME_A"], segment.values["REF_FRAME_B"]
    q = _quaternions(values, segment.get("EULER_ROT_SEQ"), segment.get("QUATERNION_TYPE"))
    direction = _direction(message, segment, "ATTITUDE_DIR")
    return Part(
        label=f"segment {place} ({kind}, {segment.get('OBJECT_NAME')})",
        frame_a=frame_a,
        frame_b=frame_b,
        time_system=segment.values["TIME_SYSTEM"],
        times_ns=np.array([elapsed(segment, cells[0]) for _, cells in segment.rows], dtype=np.int64),
        quaternions=q if direction else quaternion_conjugate(q),
        rates_b=_rates_in_b(values, q, segment.get("ANGVEL_FRAME"), frame_a, frame_b),
        notes=tuple(_rate_notes(values, q)),
    )


def _direction(message: AttitudeMessage, block: Block, key: str) -> bool:
    """True for A to B. Edition 2 knows nothing else; edition 1 must say it."""
    if message.edition == 2:
        return True
    word = rules.plain_value(block.values[key])
    if word not in ("A2B", "B2A"):
        raise ValueError(f"{key} = '{word[:20]}' is neither A2B nor B2A")
    return word == "A2B"


def _quaternions(values: dict[str, Array], sequence: str | None, place_of_scalar: str | None) -> Array:
    """Quaternions (N, 4), scalar first, from A to B, of any attitude type."""
    if "QC" in values:
        q = np.stack([values[name] for name in rules.QUATERNION], axis=-1)
        # Edition 1 may write the scalar first and then the vector, under QUATERNION_TYPE = FIRST.
        return q if (place_of_scalar or "").upper() == "FIRST" else scalar_first(q)
    if "ANGLE_1" in values:
        degrees = np.stack([values[name] for name in rules.ANGLES], axis=-1)
        return quaternions_from_angles(np.radians(degrees), _moving(Sequence.from_text(sequence or "")))
    spin = np.stack([values["SPIN_ALPHA"] + 90.0, 90.0 - values["SPIN_DELTA"], values["SPIN_ANGLE"]], axis=-1)
    return quaternions_from_angles(np.radians(spin), _moving(Sequence.ZXZ))


def _moving(sequence: Sequence) -> Convention:
    a, b = Frame("A", ("x", "y", "z")), Frame("B", ("x", "y", "z"))
    return Convention("message", a, b, sequence, Sense.MOVING, ("angle 1", "angle 2", "angle 3"))


def _rates_in_b(values: dict[str, Array], q: Array, frame: str | None, frame_a: str, frame_b: str) -> Array | None:
    """Angular velocity (N, 3) rad/s of B relative to A in B components, where the row holds it."""
    if "ANGVEL_X" not in values:
        return None
    w = np.radians(np.stack([values[name] for name in rules.ANGVEL], axis=-1))
    named = rules.plain_value(frame or "")
    if named in (rules.plain_value(frame_b), "REF FRAME B"):
        return w
    if named in (rules.plain_value(frame_a), "REF FRAME A"):
        return np.einsum("nji,nj->ni", matrix_from_quaternion(q / np.linalg.norm(q, axis=-1, keepdims=True)), w)
    raise ValueError(f"ANGVEL_FRAME = '{frame}' is neither {frame_a} nor {frame_b}")


def _rate_notes(values: dict[str, Array], q: Array) -> list[str]:
    if "Q1_DOT" not in values:
        return []
    rate = np.stack([values[name] for name in ("Q1_DOT", "Q2_DOT", "Q3_DOT", "QC_DOT")], axis=-1)
    along = float(np.max(np.abs(np.sum(scalar_first(rate) * q, axis=-1)), initial=0.0))
    if along <= RATE_NOT_SQUARE:
        return []
    return [
        f"the quaternion's rate is not square to the quaternion (up to {along:.3g} 1/s instead of 0): check the order"
    ]


def _apm_parts(message: AttitudeMessage) -> list[Part]:
    metadata = next(block for block in message.blocks if block.kind == "METADATA")
    data = next(block for block in message.blocks if block.kind == "DATA")
    if message.edition == 1:
        return _apm_parts_of_edition_1(message, metadata, data)
    rate = next((block for block in message.blocks if block.kind == "ANGVEL"), None)
    attitudes = [block for block in message.blocks if block.kind in ("QUAT", "EULER")]
    return [_apm_part(block, place, metadata, data, rate) for place, block in enumerate(attitudes, 1)]


def _apm_part(block: Block, place: int, metadata: Block, data: Block, rate: Block | None) -> Part:
    values = _numbers(block)
    q = _quaternions(values, block.get("EULER_ROT_SEQ"), None)
    frame_a, frame_b = block.values["REF_FRAME_A"], block.values["REF_FRAME_B"]
    same = rate is not None and (rate.get("REF_FRAME_A"), rate.get("REF_FRAME_B")) == (frame_a, frame_b)
    rates = _rates_in_b(_numbers(rate), q, rate.get("ANGVEL_FRAME"), frame_a, frame_b) if rate and same else None
    system = metadata.values["TIME_SYSTEM"]
    times = np.array([elapsed(metadata, data.values["EPOCH"])], dtype=np.int64)
    label = f"block {place} ({block.kind}, {metadata.get('OBJECT_NAME')})"
    return Part(label, frame_a, frame_b, system, times, q, rates, tuple(_rate_notes(values, q)))


def _numbers(block: Block) -> dict[str, Array]:
    prefixes = ("Q", "ANGLE_", "ANGVEL_X", "ANGVEL_Y", "ANGVEL_Z")
    return {key: np.array([float(value)]) for key, value in block.values.items() if key.startswith(prefixes)}


def _apm_parts_of_edition_1(message: AttitudeMessage, metadata: Block, data: Block) -> list[Part]:
    """Edition 1 has no delimiters: Q_FRAME_A … QC, then EULER_FRAME_A … Z_ANGLE, in one run of keys."""
    values = data.values
    times = np.array([elapsed(metadata, values["EPOCH"])], dtype=np.int64)
    system, parts = metadata.values["TIME_SYSTEM"], []
    if "QC" in values:
        q = scalar_first(np.array([[float(values[name]) for name in rules.QUATERNION]]))
        q = q if _direction(message, data, "Q_DIR") else quaternion_conjugate(q)
        parts.append(Part("quaternion", values["Q_FRAME_A"], values["Q_FRAME_B"], system, times, q, None))
    if "EULER_ROT_SEQ" in values:
        sequence = Sequence.from_text(values["EULER_ROT_SEQ"])
        degrees = np.array([[float(value) for value in _angles_of_edition_1(values, sequence)]])
        q = quaternions_from_angles(np.radians(degrees), _moving(sequence))
        q = q if _direction(message, data, "EULER_DIR") else quaternion_conjugate(q)
        parts.append(Part("angles", values["EULER_FRAME_A"], values["EULER_FRAME_B"], system, times, q, None))
    return parts


def _angles_of_edition_1(values: dict[str, str], sequence: Sequence) -> list[str]:
    """X_ANGLE, Y_ANGLE, Z_ANGLE in the order of the sequence; a repeated axis has its key twice."""
    seen: dict[str, int] = {}
    found = []
    for axis in sequence.axes:
        key = f"{'XYZ'[axis]}_ANGLE"
        seen[key] = seen.get(key, 0) + 1
        found.append(values[key] if seen[key] == 1 else values[f"{key}#2"])
    return found


def _choose(parts: list[Part], statement: TableStatement, path: Path) -> Part:
    """The stated segment; the only one; or the first of several that say the same in other words."""
    if statement.segment is not None:
        if not 1 <= statement.segment <= len(parts):
            raise file_error(path, f"there is no segment {statement.segment}", f"there are {_listed(parts)}")
        return parts[statement.segment - 1]
    if len(parts) == 1:
        return parts[0]
    if not parts:
        raise file_error(path, "the message holds no attitude")
    if len(parts[0].times_ns) == 1 and all(_agree(parts[0], other) for other in parts[1:]):
        return parts[0]
    raise file_error(path, "not stated: which of the message's parts?", f"state segment: a number of {_listed(parts)}")


def _agree(one: Part, other: Part) -> bool:
    """The same frames, time and attitude, as near as printed digits allow (1e-4 rad)."""
    frames = (one.frame_a, one.frame_b) == (other.frame_a, other.frame_b)
    same_times = np.array_equal(one.times_ns, other.times_ns)
    return frames and same_times and float(np.max(quaternion_angle(one.quaternions, other.quaternions))) < 1e-4


def _listed(parts: list[Part]) -> str:
    return "; ".join(f"{place} = {part.label}, {part.frame_a} to {part.frame_b}" for place, part in enumerate(parts, 1))


def _orient(part: Part, statement: TableStatement, path: Path) -> bool:
    """True when frame B is the body. The stated names must be the file's two frames."""
    stated = (rules.plain_value(statement.reference or ""), rules.plain_value(statement.body or ""))
    held = (rules.plain_value(part.frame_a), rules.plain_value(part.frame_b))
    if stated == held:
        return True
    if stated == held[::-1]:
        return False
    cause = f"the message's frames are {part.frame_a} and {part.frame_b}"
    remedy = f"stated are reference: {statement.reference} and body: {statement.body}"
    raise TableError([Fault(cause, remedy, Place(path))])


def _body_rates(part: Part, body_is_b: bool) -> Array | None:
    """Angular velocity of the body relative to the reference in body components."""
    if part.rates_b is None or body_is_b:
        return part.rates_b
    q = part.quaternions / np.linalg.norm(part.quaternions, axis=-1, keepdims=True)
    return -np.einsum("nij,nj->ni", matrix_from_quaternion(q), part.rates_b)
