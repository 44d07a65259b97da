"""Frames: handedness, north, partners; directions in words."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude import frames as numeric
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context
from trunnion.spec.parts import Frame

LEVEL_WORDS = ("north", "south", "east", "west")

#: What people call the ends of a vehicle, and the axis words they stand for.
SYNONYMS: dict[str, tuple[str, ...]] = {
    "nose": ("forward",),
    "bow": ("forward",),
    "front": ("forward",),
    "ahead": ("forward",),
    "tail": ("aft",),
    "stern": ("aft",),
    "rear": ("aft",),
    "back": ("aft",),
    "right": ("starboard",),
    "starboard": ("right",),
    "left": ("port",),
    "port": ("left",),
    "top": ("up",),
    "bottom": ("down",),
}


def build_frame(ctx: Context, name: str, part: Frame) -> numeric.Frame | None:
    """The frame, or None when it cannot be one; what it leaves unsaid is noted and does not keep it from being one."""
    axes: tuple[str, str, str] = tuple(part.axes)
    left = part.handed == "left"
    _check_level(ctx, part, axes)
    if not _axes_stand(ctx, axes, left):
        return None
    if left and part.paired_with is None:
        ctx.note("no-partner", "handed")
        return None
    if not left and part.paired_with is not None:
        ctx.note("partner-without-left", "paired with")
        return None
    partner = ctx.part("frames", part.paired_with, "paired with") if left else None
    return numeric.Frame(name, axes, left, partner)


def _axes_stand(ctx: Context, axes: tuple[str, str, str], left: bool) -> bool:
    """True when the three axes are on three lines and as handed as declared."""
    for index, axis in enumerate(axes):
        for earlier in axes[:index]:
            if axis == earlier or axis == numeric.opposite(earlier) or _same_line(axis, earlier):
                ctx.note("repeated-axis", "axes", index, one=earlier, two=axis)
                return False
    hand = numeric.handedness(axes)
    if hand == -1 and not left:
        mended = f"{axes[0]}, {axes[1]}, {numeric.opposite(axes[2])}"
        ctx.note("left-handed", "axes", axes=", ".join(axes), mended=mended)
    elif hand == 1 and left:
        ctx.note("not-left-handed", "handed", axes=", ".join(axes))
    return hand is None or hand == (-1 if left else 1)


def _same_line(one: str, two: str) -> bool:
    """`right` and `starboard`, `left` and `starboard` …: two words for one line."""
    pairs = ({"right", "starboard"}, {"left", "port"})
    return any(pair == {one, two} or pair == {one, numeric.opposite(two)} for pair in pairs)


def _check_level(ctx: Context, part: Frame, axes: tuple[str, str, str]) -> None:
    """A level frame says which north it means and whether it travels."""
    level = next((index for index, axis in enumerate(axes) if axis in LEVEL_WORDS), None)
    if level is None:
        return
    if part.north is None:
        ctx.note("no-north", "axes", level, axis=axes[level])
    if part.carried is None:
        ctx.note("not-carried", "axes")


def check_partner(ctx: Context, part: Frame, partner: Frame | None) -> None:
    """A left-handed frame and its right-handed partner name the same lines."""
    if part.paired_with is None or partner is None or part.handed != "left":
        return
    why = None
    if partner.handed == "left":
        why = "it is left-handed itself"
    else:
        lines = {axis for word in partner.axes for axis in (word, numeric.opposite(word))}
        stray = next((axis for axis in part.axes if axis not in lines), None)
        why = f"it has no axis '{stray}' nor its opposite" if stray else None
    if why:
        ctx.note("bad-partner", "paired with", partner=part.paired_with, why=why)


def axis_vector(frame: numeric.Frame, word: str) -> NDArray[np.float64] | None:
    """Unit vector (3,) of an axis word in a frame, its opposite or a synonym; None for a word that is none of them."""
    for candidate in (word, *SYNONYMS.get(word, ())):
        bare = candidate.lstrip("-")
        known = {axis for name in frame.axes for axis in (name, numeric.opposite(name))} | {"x", "y", "z"}
        if candidate in known or bare in ("x", "y", "z"):
            return frame.direction(candidate)
    return None


def axis_words(frame: numeric.Frame) -> list[str]:
    """The axis words of a frame and their opposites."""
    return [*frame.axes, *(numeric.opposite(axis) for axis in frame.axes)]


def direction(ctx: Context, value: str | list[float], frame: numeric.Frame, *steps: str | int) -> Any:
    """Unit vector (3,) of a direction in a frame, or None when its word is no axis (noted)."""
    if isinstance(value, list):
        numbers = np.asarray(value, dtype=float)
        return numbers / np.linalg.norm(numbers)
    vector = axis_vector(frame, value)
    if vector is None:
        hint = suggestion(value, axis_words(frame), "its axes and their opposites are")
        ctx.note("unknown-axis", *steps, frame=frame.name, word=value, hint=hint)
    return vector
