"""One convention to another over a whole table, with the target's lock margin at every row."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_from_matrix, quaternion_product
from trunnion.errors import AttitudeError, Fault, TableError
from trunnion.tables.table import SHOWN_ROWS, AttitudeTable

Array = NDArray[np.float64]

#: Rows nearer to the target's lock than this are flagged unless another limit is asked for.
NEAR_LOCK = float(np.radians(5.0))
_BLOCK = 1 << 15


@dataclass(frozen=True, eq=False)
class ConvertedTable:
    """A table in the target convention.

    `table` holds the same attitudes between the target's frames; angles (N, 3) rad as the target states them; margins
    (N,) rad to the target's lock; near (N,) flags rows below `near_lock` rad, singular (N,) rows where the angles are
    one choice of many.
    """

    table: AttitudeTable
    convention: Convention
    angles: Array
    margins: Array
    near: NDArray[np.bool_]
    singular: NDArray[np.bool_]
    near_lock: float

    @property
    def least_margin(self) -> tuple[float, int]:
        """(rad, row number of the file) of the row nearest to lock."""
        place = int(np.argmin(self.margins))
        return float(self.margins[place]), int(self.table.rows[place])

    def warnings(self) -> list[str]:
        """What must be said beside the angles: the rows near lock and what they cost."""
        count = int(np.count_nonzero(self.near))
        if count == 0:
            return []
        rows = ", ".join(map(str, self.table.rows[self.near][:SHOWN_ROWS])) + (", …" if count > SHOWN_ROWS else "")
        margin, row = self.least_margin
        limit = np.degrees(self.near_lock)
        words = f"{count} of {len(self.margins)} rows are within {limit:g} deg of the lock of '{self.convention.name}' "
        words += f"(rows {rows}; least margin {np.degrees(margin):.6g} deg in row {row})"
        tail = "there small attitude errors become large in the outer angles, so compare attitudes, never triples"
        found = [f"{words}: {tail}"]
        locked = int(np.count_nonzero(self.singular))
        if locked:
            found.append(
                f"{locked} rows are at the lock itself: only one combination of the outer angles is determined"
            )
        return found


def convert_table(
    table: AttitudeTable, source: Convention, target: Convention, near_lock: float = NEAR_LOCK
) -> ConvertedTable:
    """State every attitude of `table` in `target`; `source` names the frames the table stands on.

    Frames with other axes are related by their axis words (north/south, forward/aft …). Raises TableError when the
    words do not relate them. Nothing is interpolated; the angles of each row stand for themselves.
    """
    C_reference = frame_change(source.reference, target.reference)
    C_body = frame_change(source.body, target.body)
    q = _carried(table.quaternions, C_reference, C_body)
    count = len(q)
    angles, margins, singular = np.empty((count, 3)), np.empty(count), np.empty(count, dtype=bool)
    for block in _blocks(count):
        found = target.angles(matrix_from_quaternion(q[block]))
        angles[block], margins[block], singular[block] = found.angles, found.margin, found.singular
    rates = None if table.body_rates is None else table.body_rates @ C_body.T
    carried = replace(table, quaternions=q, body_rates=rates)
    return ConvertedTable(carried, target, angles, margins, margins < near_lock, singular, near_lock)


def frame_change(source: Frame, target: Frame) -> Array:
    """C (3, 3) that takes components in `source` to components in `target`, from the axis words of both.

    Frames of the same axes need no words in common with others; letters x, y, z relate frames of one name only.
    """
    letters = {"x", "y", "z"}
    if source.axes == target.axes and (source.name == target.name or not letters & set(source.axes)):
        return np.eye(3)
    try:
        if letters & {*source.axes, *target.axes}:
            raise AttitudeError("letters name no direction", remedy="name the axes by directions in both frames")
        return np.stack([source.direction(axis) for axis in target.axes])
    except AttitudeError as err:
        cause = (
            f"frames '{source.name}' ({', '.join(source.axes)}) and '{target.name}' ({', '.join(target.axes)}) "
            "can't be related by the names of their axes"
        )
        raise TableError([Fault(cause, err.fault.remedy)]) from err


def _carried(q: Array, C_reference: Array, C_body: Array) -> Array:
    """Quaternions of C_reference R_rb C_body^T."""
    if not np.array_equal(C_reference, np.eye(3)):
        q = quaternion_product(quaternion_from_matrix(C_reference), q)
    if not np.array_equal(C_body, np.eye(3)):
        q = quaternion_product(q, quaternion_from_matrix(C_body.T))
    return q


def _blocks(count: int) -> Iterator[slice]:
    return (slice(start, min(start + _BLOCK, count)) for start in range(0, count, _BLOCK))
