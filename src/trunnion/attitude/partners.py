"""Left-handed frames through their right-handed partner: components, matrices and sequences carried over.

A left-handed frame and its partner name the same three lines. P, with entries 0 and +-1 and determinant -1, takes
components in the left-handed frame to components in the partner. A matrix between two left-handed frames becomes
P_r M P_b^T, which is a rotation exactly when M was a proper one; a turn by an angle about an axis n, positive by the
left-hand rule, becomes P Rot(n) P^T = Rot(-P n), so a sequence becomes a sequence with senses.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.frames import Frame, opposite
from trunnion.attitude.rotations import determinant, require_rotation
from trunnion.attitude.sequences import Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


def axis_map(target: Frame, source: Frame) -> Array:
    """P (3, 3) with v_target = P v_source, for two frames whose axis words name the same lines.

    Determinant -1 when one of them is left-handed. Raises AttitudeError naming the axis word that has no counterpart.
    """
    P = np.zeros((3, 3))
    for column, word in enumerate(source.axes):
        for row, axis in enumerate(target.axes):
            if word in (axis, opposite(axis)):
                P[row, column] = 1.0 if word == axis else -1.0
    lost = [word for column, word in enumerate(source.axes) if not P[:, column].any()]
    if lost:
        raise AttitudeError(
            f"axis '{lost[0]}' of frame '{source.name}' is no axis of frame '{target.name}', nor an opposite of one",
            remedy=f"the axes of '{target.name}' are {', '.join(target.axes)}",
        )
    return P


def matrix_through_partners(M: ArrayLike, reference_map: ArrayLike, body_map: ArrayLike) -> Array:
    """R (..., 3, 3) between the right-handed partners, of M (..., 3, 3) between the left-handed frames.

    M takes body to reference components in the left-handed frames; the maps take components of a frame to its
    partner's. Raises AttitudeError when the result is no rotation, as for a matrix between a left- and a right-handed
    frame.
    """
    R = np.asarray(reference_map) @ np.asarray(M, dtype=float) @ np.asarray(body_map).T
    return require_rotation(R, "matrix carried over to the right-handed partners")


def sequence_through_partner(sequence: Sequence, frame_map: ArrayLike) -> tuple[Sequence, tuple[int, int, int]]:
    """The sequence in the partner's axes, and the sense of each angle there, of a sequence in a left-handed frame.

    The angles of the left-handed frame are positive by the left-hand rule, so that the elementary matrices look as in a
    right-handed one. Also right for a map of determinant +1 (relabelled axes).
    """
    P = np.asarray(frame_map, dtype=float)
    hand = round(float(determinant(P)))
    if not np.array_equal(np.abs(P) @ np.ones(3), np.ones(3)) or hand not in (1, -1):
        raise AttitudeError("a map between frames has one +1 or -1 in each row", remedy="use axis_map")
    letters, senses = [], []
    for axis in sequence.axes:
        row = int(np.argmax(np.abs(P[:, axis])))
        letters.append("XYZ"[row])
        senses.append(hand * int(P[row, axis]))
    return Sequence["".join(letters)], (senses[0], senses[1], senses[2])
