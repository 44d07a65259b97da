"""From columns of numbers to unit quaternions body to reference, and which rows are no attitude.

Nothing is interpolated here and no angle is ever averaged: each row becomes one rotation, so a column that wraps from
359 to 0 is as good as one that does not.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import determinant, quaternion_from_matrix, quaternion_product
from trunnion.attitude.sequences import Sense
from trunnion.tables.statements import Form, Order, Scalar, TableStatement
from trunnion.tables.table import Trouble, trouble_at

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

_BLOCK_ROWS = 1 << 14
#: Quaternions further off unit length than this are worth a note (32-bit floats stay below it).
NORM_NOTE = 1e-6


@dataclass(frozen=True)
class Converted:
    """Unit quaternions (N, 4) scalar first, body to reference; rows that are none; what was noticed."""

    quaternions: Array
    bad: Mask
    troubles: list[Trouble]
    notes: list[str]


def to_quaternions(columns: list[Array], statement: TableStatement) -> Converted:
    """Convert the stated columns (each (N,)) of any form. The statement must be complete (`questions.py`)."""
    if statement.form is Form.QUATERNION:
        return _from_quaternion_columns(columns, statement)
    if statement.form is Form.MATRIX:
        return _from_matrix_columns(columns, statement)
    return _from_angle_columns(columns, statement)


def _from_quaternion_columns(columns: list[Array], statement: TableStatement) -> Converted:
    order = (0, 1, 2, 3) if statement.scalar is Scalar.FIRST else (3, 0, 1, 2)
    ordered = [columns[source] for source in order]
    q, length = np.empty((len(ordered[0]), 4)), np.empty(len(ordered[0]))
    vector_sign = 1.0 if statement.body_to_reference else -1.0
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        for block in _blocks(len(q)):
            _normalise(ordered, block, vector_sign, q, length)
        finite = np.isfinite(length)
        tolerance = statement.norm_tolerance
        miss = np.abs(length - 1.0)
        off = finite & ~(miss <= tolerance)
    text = f"the quaternion's length is off 1 by more than {tolerance:g}"
    if np.any(off):
        worst = int(np.flatnonzero(off)[np.argmax(miss[off])])
        text += f" (worst {length[worst]:.6g} in row {worst + 1})"
    troubles = [
        trouble_at("no number", "a quaternion cell is empty or not a finite number", ~finite),
        trouble_at("not unit", text, off, "check columns and order, or state a wider norm tolerance"),
    ]
    largest = float(np.max(miss, initial=0.0, where=finite & ~off))
    notes = [f"made unit: lengths were off 1 by up to {largest:.2g}"] if largest > NORM_NOTE else []
    return Converted(q, ~finite | off, [trouble for trouble in troubles if trouble], notes)


def _blocks(count: int) -> Iterator[slice]:
    """Slices that keep the temporaries in the processor's cache."""
    return (slice(start, min(start + _BLOCK_ROWS, count)) for start in range(0, count, _BLOCK_ROWS))


def _normalise(ordered: list[Array], block: slice, vector_sign: float, q: Array, length: Array) -> None:
    """Fill one block of q (N, 4) with unit quaternions and of length (N,) with what their length was."""
    parts = [column[block] for column in ordered]
    squared = parts[0] * parts[0]
    for part in parts[1:]:
        squared += part * part
    np.sqrt(squared, out=length[block])
    inverse = 1.0 / length[block]
    np.multiply(parts[0], inverse, out=q[block, 0])
    inverse *= vector_sign
    for place in (1, 2, 3):
        np.multiply(parts[place], inverse, out=q[block, place])


def _from_matrix_columns(columns: list[Array], statement: TableStatement) -> Converted:
    M = np.stack(columns, axis=-1).reshape(-1, 3, 3)
    if statement.order is Order.COLUMNS:
        M = np.swapaxes(M, -1, -2)
    finite = np.all(np.isfinite(M), axis=(-2, -1))
    safe = np.where(finite[:, None, None], M, np.eye(3))
    mirrored = finite & (determinant(safe) < 0.0)
    miss = np.max(np.abs(np.swapaxes(safe, -1, -2) @ safe - np.eye(3)), axis=(-2, -1))
    off = finite & ~mirrored & ~(miss <= 2.0 * statement.norm_tolerance)
    bad = ~finite | mirrored | off
    text = f"not a rotation: columns miss unit length or right angles by up to {np.max(miss, initial=0.0):.3g}"
    troubles = [
        trouble_at("no number", "a matrix cell is empty or not a finite number", ~finite),
        trouble_at("mirrored", "the matrix is a reflection (determinant negative), not a rotation", mirrored),
        trouble_at("not a rotation", text, off, "check columns and order, or state a wider norm tolerance"),
    ]
    U, _, Vt = np.linalg.svd(np.where(bad[:, None, None], np.eye(3), safe))
    q = quaternion_from_matrix(U @ Vt)
    if not statement.body_to_reference:
        q[:, 1:] *= -1.0
    return Converted(q, bad, [trouble for trouble in troubles if trouble], [])


def _from_angle_columns(columns: list[Array], statement: TableStatement) -> Converted:
    convention = statement.convention
    assert convention is not None  # asked for by questions.require_answers
    scale = np.pi / 180.0 if statement.angle_unit == "deg" else 1.0
    q = _quaternions_of(columns, scale, convention)
    finite = np.isfinite(q[:, 0])
    notes = _range_notes(columns, convention.angle_names, statement.angle_unit, scale)
    troubles = [trouble_at("no number", "an angle cell is empty or not a finite number", ~finite)]
    return Converted(q, ~finite, [trouble for trouble in troubles if trouble], notes)


def quaternions_from_angles(angles: Array, convention: Convention) -> Array:
    """Quaternions (N, 4) of R_rb for stated angles (N, 3) rad: half-angle products, no matrices on the way."""
    return _quaternions_of(list(angles.T), 1.0, convention)


def _quaternions_of(columns: list[Array], scale: float, convention: Convention) -> Array:
    """Quaternions (N, 4) of three columns of stated angles in units of `scale` rad; NaN where an angle is none."""
    q = np.empty((len(columns[0]), 4))
    with np.errstate(invalid="ignore"):
        for block in _blocks(len(q)):
            halves = [
                (0.5 * sign) * (column[block] * scale - offset)
                for column, sign, offset in zip(columns, convention.signs, convention.offsets, strict=True)
            ]
            _chain_block(halves, convention, q[block])
    if not np.array_equal(convention.left, np.eye(3)):
        q = quaternion_product(quaternion_from_matrix(convention.left), q)
    if not np.array_equal(convention.right, np.eye(3)):
        q = quaternion_product(q, quaternion_from_matrix(convention.right))
    return q


def _chain_block(halves: list[Array], convention: Convention, q: Array) -> None:
    """Fill q (N, 4) with the product of three half-angle quaternions in the order of the convention's sense."""
    turns = [(axis, np.cos(half), np.sin(half)) for axis, half in zip(convention.sequence.axes, halves, strict=True)]
    if convention.sense is Sense.FIXED:
        turns.reverse()
    (first, c1, s1), (second, c2, s2), (axis, c, s) = turns
    parts = [np.zeros(0)] * 4
    third = 3 - first - second
    handed = 1.0 if (second - first) % 3 == 1 else -1.0
    parts[0], parts[1 + first], parts[1 + second] = c1 * c2, s1 * c2, c1 * s2
    parts[1 + third] = handed * (s1 * s2)
    w, k, i, j = 0, 1 + axis, 1 + (axis + 1) % 3, 1 + (axis + 2) % 3
    q[:, w], q[:, k] = parts[w] * c - parts[k] * s, parts[k] * c + parts[w] * s
    q[:, i], q[:, j] = parts[i] * c + parts[j] * s, parts[j] * c - parts[i] * s


def _range_notes(columns: list[Array], names: tuple[str, str, str], unit: str | None, scale: float) -> list[str]:
    """Notes on wraps, and a doubt where the unit looks wrong; nothing is changed because of either."""
    notes, largest = [], 0.0
    for column, name in zip(columns, names, strict=True):
        low, high = (float(np.nanmin(column, initial=np.inf)), float(np.nanmax(column, initial=-np.inf)))
        largest = max(largest, abs(low * scale), abs(high * scale)) if low <= high else largest
        if high * scale - low * scale <= np.pi:
            continue
        wraps = int(np.count_nonzero(np.abs(np.diff(column)) * scale > np.pi))
        if wraps:
            notes.append(f"'{name}' wraps {wraps} times; rotations are used, so nothing is lost")
    if unit == "deg" and len(columns[0]) > 10 and largest < np.radians(2.0 * np.pi):
        notes.append("no angle exceeds 6.2832 deg: are these radians?")
    if unit == "rad" and largest > 4.0 * np.pi:
        notes.append(f"an angle of {largest:.6g} rad is more than two turns: are these degrees?")
    return notes


def continuous_signs(q: Array, before: Array | None = None) -> tuple[Array, int]:
    """Quaternions (N, 4) with signs so that neighbours are less than half a turn of the hypersphere apart.

    `before` (4,) is the last one of a previous chunk. Returns the quaternions and how many flips were undone.
    """
    if len(q) == 0:
        return q, 0
    flips = np.zeros(len(q), dtype=bool)
    flips[0] = before is not None and float(q[0] @ before) < 0.0
    for block in _blocks(len(q) - 1):
        here, after = q[block], q[block.start + 1 : block.stop + 1]
        dots = after[:, 0] * here[:, 0]
        for place in (1, 2, 3):
            dots += after[:, place] * here[:, place]
        np.less(dots, 0.0, out=flips[block.start + 1 : block.stop + 1])
    count = int(np.count_nonzero(flips))
    if count == 0:
        return q, 0
    odd = (np.cumsum(flips) & 1).astype(bool)
    turned = q.copy()
    np.negative(turned, out=turned, where=odd[:, None])
    return turned, count
