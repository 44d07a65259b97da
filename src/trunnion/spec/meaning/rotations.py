"""Fixed rotations in words and numbers, as matrices.

Letters: `p` the frame the rotation comes from (body, sensor, turned), `q` the one it goes to (reference,
host, unturned). `R_qp` takes p-components to q-components.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import about, determinant, matrix_from_quaternion, nearest_rotation
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.frames import axis_words, direction
from trunnion.spec.parts.rotations import AxisMap, FourComponents, NineEntries, SingleTurn, ThreeTurns
from trunnion.units import format_number

Array = NDArray[np.float64]

#: A stated matrix or quaternion may miss a rotation by this much (pure number): eight printed decimals pass.
LOOSEST = 2e-8


@dataclass(frozen=True)
class Ends:
    """The two frames of a rotation, and by which words `maps` may name them."""

    p: Frame
    q: Frame
    p_words: tuple[str, ...]
    q_words: tuple[str, ...]


def build_rotation(ctx: Context, part: Any, ends: Ends) -> Array | None:
    """R_qp (3, 3) of a stated rotation, or None when something about it is noted."""
    if isinstance(part, AxisMap):
        return from_axes(ctx, part.axes, ends)
    if isinstance(part, SingleTurn):
        return _single_turn(ctx, part, ends)
    if isinstance(part, ThreeTurns):
        return three_turns(ctx, part, ends)
    if isinstance(part, NineEntries):
        return from_matrix(ctx, part.matrix, part.maps, ends)
    assert isinstance(part, FourComponents)
    return from_quaternion(ctx, part.quaternion, part.scalar, part.maps, ends)


def from_axes(ctx: Context, axes: dict[str, str], ends: Ends) -> Array | None:
    """R_qp from words: each axis of p, and the direction of q it lies along. Two fix the third,
    right-handed."""
    columns: list[tuple[Array, Array]] = []
    for axis, word in axes.items():
        from_p = _named_axis(ctx, axis, ends.p)
        to_q = direction(ctx, word, ends.q, axis)
        if from_p is None or to_q is None:
            return None
        for (p, q), other in zip(columns, axes, strict=False):
            if abs(from_p @ p) > 0.5 or abs(to_q @ q) > 0.5:
                ctx.note("axis-map-parallel", axis, one=f"{other}: {axes[other]}", two=f"{axis}: {word}")
                return None
        columns.append((from_p, to_q))
    if len(columns) < 2:
        ctx.note("axis-map-incomplete")
        return None
    (p1, q1), (p2, q2) = columns[:2]
    R_qp = np.column_stack([q1, q2, np.cross(q1, q2)]) @ np.column_stack([p1, p2, np.cross(p1, p2)]).T
    if len(columns) > 2 and columns[2][1] @ R_qp @ columns[2][0] < 0.5:
        third = list(axes)[2]
        lies = ends.q.nearest_word(R_qp @ columns[2][0])[0]
        ctx.note(
            "mirror",
            third,
            what="the axis map",
            det="-1",
            hint=f"write `{third}: {lies}`, which follows from the first two",
        )
        return None
    return R_qp


def _named_axis(ctx: Context, word: str, frame: Frame) -> Array | None:
    known = axis_words(frame)
    if word in known or word in ("x", "y", "z"):
        return frame.direction(word)
    hint = suggestion(word, known, "its axes and their opposites are")
    ctx.note("unknown-axis", word, key=True, frame=frame.name, word=word, hint=hint)
    return None


def _single_turn(ctx: Context, part: SingleTurn, ends: Ends) -> Array | None:
    """A turn about an axis has the same components on both sides; a word may be one of either frame."""
    word = part.about
    if isinstance(word, str) and word in axis_words(ends.q):
        axis = ends.q.direction(word)
        if word in axis_words(ends.p) and not np.array_equal(axis, ends.p.direction(word)):
            ctx.note("axis-ambiguous", "about", word=word, one=ends.p.name, other=ends.q.name)
            return None
    else:
        axis = direction(ctx, word, ends.p, "about")
    return None if axis is None else about(axis, part.angle.value)


def three_turns(ctx: Context, part: Any, ends: Ends) -> Array | None:
    """R_qp of three angles: about a stated sequence of axes, or in a convention between these two frames."""
    angles = np.array([angle.value for angle in part.angles])
    if part.convention is not None:
        return _in_convention(ctx, part, angles, ends)
    if part.sequence is None or part.about is None:
        missing = "sequence" if part.sequence is None else "about"
        example = "sequence: 3-2-1" if part.sequence is None else "about: moving axes"
        ctx.note("missing-key", name=missing, example=example)
        return None
    sequence = build_sequence(ctx, part.sequence, "sequence")
    if sequence is None:
        return None
    return chain_matrix(angles, sequence=sequence, sense=Sense(part.about))


def _in_convention(ctx: Context, part: Any, angles: Array, ends: Ends) -> Array | None:
    for key in ("sequence", "about"):
        if getattr(part, key) is not None:
            ctx.note("table-excess", key, key=True, name=key, because="the convention says it already")
            return None
    convention = ctx.part("conventions", part.convention, "convention")
    if convention is None:
        return None
    if (convention.reference.axes, convention.body.axes) != (ends.q.axes, ends.p.axes):
        ctx.note(
            "other-frames", "convention",
            convention=convention.name, has=f"'{convention.reference.name}' to '{convention.body.name}'",
            wanted=f"'{ends.q.name}' to '{ends.p.name}'",
        )  # fmt: skip
        return None
    R_qp: Array = convention.matrix(angles)
    return R_qp


def build_sequence(ctx: Context, text: str, *steps: str | int) -> Sequence | None:
    """The sequence a text names, or None when it is none (noted)."""
    marks = [mark for mark in text.upper() if mark not in "- ,"]
    axes = ["XYZ"[int(mark) - 1] if mark in "123" else mark for mark in marks]
    if len(axes) != 3 or any(axis not in "XYZ" for axis in axes):
        ctx.note("not-a-sequence", *steps, text=text)
        return None
    if axes[0] == axes[1] or axes[1] == axes[2]:
        ctx.note("equal-neighbours", *steps, text=text)
        return None
    return Sequence["".join(axes)]


def maps_p_to_q(ctx: Context, text: str, ends: Ends, *steps: str | int) -> bool | None:
    """True when `maps` says p to q, False when q to p, None (noted) when it says neither."""
    one, found, other = (word.strip() for word in text.partition(" to "))
    p_words, q_words = {ends.p.name, *ends.p_words}, {ends.q.name, *ends.q_words}
    if found and one in p_words and other in q_words and one != other:
        return True
    if found and one in q_words and other in p_words and one != other:
        return False
    p, q = ends.p_words[0], ends.q_words[0]
    ctx.note("bad-maps", *steps, text=text, one=f"maps: {p} to {q}", other=f"maps: {q} to {p}")
    return None


def from_matrix(ctx: Context, rows: list[list[float]], maps: str, ends: Ends) -> Array | None:
    """R_qp from nine entries by rows; refuses mirrors and what is no rotation."""
    forward = maps_p_to_q(ctx, maps, ends, "maps")
    M = np.array(rows, dtype=float)
    if not _is_rotation(ctx, M) or forward is None:
        return None
    R, _ = nearest_rotation(M)
    return R if forward else R.T


def _is_rotation(ctx: Context, M: Array) -> bool:
    det = float(determinant(M))
    miss = float(np.max(np.abs(M.T @ M - np.eye(3))))
    if det < 0.0:
        shown = format_number(det, digits=4)
        hint = "change the sign of one row, or exchange two, as the drawing has them"
        ctx.note("mirror", "matrix", what="the matrix", det=shown, hint=hint)
    elif miss > LOOSEST:
        why = f"its columns miss unit length or right angles by {miss:.2g}"
        ctx.note("not-a-rotation", "matrix", what="the matrix", why=why)
    return det > 0.0 and miss <= LOOSEST


def from_quaternion(ctx: Context, q: list[float], scalar: str, maps: str, ends: Ends) -> Array | None:
    """R_qp from four components; the length must be one."""
    forward = maps_p_to_q(ctx, maps, ends, "maps")
    values = np.array(q, dtype=float)
    length = float(np.linalg.norm(values))
    if abs(length - 1.0) > LOOSEST:
        ctx.note("not-a-rotation", "quaternion", what="the quaternion", why=f"its length is {length:.9g}, not 1")
        return None
    if forward is None:
        return None
    ordered = values / length if scalar == "first" else np.roll(values, 1) / length
    R = matrix_from_quaternion(ordered)
    return R if forward else R.T
