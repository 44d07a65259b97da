"""Conventions: from words to the numerical convention, and everything that keeps words from meaning one
thing.

Letters: `r` the reference frame, `b` the body frame; R_rb = left @ E @ right.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude import frames as numeric
from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.partners import axis_map, sequence_through_partner
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.attitude.words import axis_words as direction_words
from trunnion.attitude.words import default_ranges
from trunnion.errors import AttitudeError
from trunnion.spec import parts
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.frames import LEVEL_WORDS, axis_vector
from trunnion.spec.meaning.rotations import Ends, build_rotation, build_sequence, maps_p_to_q
from trunnion.spec.standards import STANDARDS, Standard
from trunnion.spec.values import Range, read_range

Array = NDArray[np.float64]

_NOTHING_TURNED = 1e-12  # rad
_TOO_LITTLE_MOTION = 0.1  # cosine: an axis that moves less than this towards a direction does not move there

_FILLERS = {"side", "wing", "axis", "end", "goes", "moves", "turns", "swings", "towards", "toward", "to", "the"}


@dataclass(frozen=True)
class Turns:
    """The three turns: sequence, sense and names."""

    sequence: Sequence
    sense: Sense
    names: tuple[str, str, str]


def build_convention(ctx: Context, name: str, part: parts.Convention) -> Convention | None:
    """The convention, or None when something about it is noted. All faults that can be told apart are
    noted."""
    frames = _frames(ctx, part)
    standard = _standard(ctx, part)
    turns = _turns(ctx, part, standard)
    if frames is None:
        return None
    reference, body = frames
    forward = maps_p_to_q(ctx, part.maps, _ends(body, reference), "maps")
    if standard is not None:
        _standard_axes(ctx, standard, reference, body)
    constants = None if turns is None else _constants(ctx, part, turns, reference, body)
    if turns is None or constants is None or forward is None:
        return None
    base = _base(name, reference, body, turns, constants, forward)
    signs = _signs(ctx, part, base, standard, body.left_handed)
    offsets = _offsets(ctx, part, turns.names)
    if signs is None or offsets is None:
        return None
    ranges = base.ranges and (base.ranges[0], (offsets[1], offsets[1] + math.pi), base.ranges[2])
    based = replace(base, signs=signs, offsets=offsets, ranges=ranges)
    return _with_ranges(ctx, part, based, standard)


def _base(
    name: str,
    reference: numeric.Frame,
    body: numeric.Frame,
    turns: Turns,
    constants: tuple[Array, Array],
    forward: bool,
) -> Convention:
    """The convention with each angle by the hand of its frames; of left-handed frames, carried to their partners."""
    left, right = constants
    sequence, signs, ranges = turns.sequence, (1, 1, 1), None
    if reference.partner is not None and body.partner is not None:
        outer, inner = axis_map(reference.partner, reference), axis_map(body.partner, body)
        sequence, signs = sequence_through_partner(sequence, outer)
        left, right = outer @ left @ outer.T, outer @ right @ inner.T
        reference, body = reference.partner, body.partner
        if sequence.repeated:  # the usual range of the frames the angles are stated in, whatever the sign of the turn
            ranges = ((-math.pi, math.pi), (0.0, math.pi), (-math.pi, math.pi))
    return Convention(
        name, reference, body, sequence, turns.sense, turns.names, signs,
        left=left, right=right, ranges=ranges, maps_body_to_reference=forward,
    )  # fmt: skip


def _ends(body: numeric.Frame, reference: numeric.Frame) -> Ends:
    return Ends(body, reference, ("body",), ("reference",))


def _frames(ctx: Context, part: parts.Convention) -> tuple[numeric.Frame, numeric.Frame] | None:
    reference = ctx.part("frames", part.reference, "reference")
    body = ctx.part("frames", part.body, "body")
    if reference is None or body is None:
        return None
    both = reference.partner is not None and body.partner is not None
    for key, frame in (("reference", reference), ("body", body)):
        if frame.left_handed and not both:
            ctx.note("left-handed-use", key, frame=frame.name)
            return None
    if reference.name == body.name:
        ctx.note("self-link", "body", what="the convention", frame=body.name)
        return None
    return reference, body


def _standard(ctx: Context, part: parts.Convention) -> Standard | None:
    if part.as_ is None:
        return None
    standard = STANDARDS.get(part.as_)
    if standard is None:
        hint = suggestion(part.as_, STANDARDS, "those known are")
        ctx.note("unknown-reference", "as", what="standard", name=part.as_, hint=hint)
    return standard


def _standard_axes(ctx: Context, standard: Standard, reference: numeric.Frame, body: numeric.Frame) -> None:
    fits = all(axis in words for axis, words in zip(body.axes, standard.axes, strict=True))
    if not fits:
        ctx.note(
            "standard-axes", "body",
            standard=standard.name, axes=standard.axes_text, frame=body.name, given=", ".join(body.axes),
        )  # fmt: skip
    elif reference.axes[2] in ("up", "down") and reference.axes[2] != standard.third_reference_axis:
        ctx.note(
            "standard-axes", "reference", standard=standard.name,
            axes=f"with z {standard.third_reference_axis}", frame=reference.name, given=", ".join(reference.axes),
        )  # fmt: skip


def _turns(ctx: Context, part: parts.Convention, standard: Standard | None) -> Turns | None:
    chosen: dict[str, Any] = {}
    examples = {
        "sequence": ("its sequence", "sequence: 3-2-1"),
        "about": ("whether its axes move or stay", "about: moving axes"),
        "angles": ("the names of its angles", "angles: [heading, elevation, bank]"),
    }
    for key, (what, example) in examples.items():
        given = getattr(part, key)
        fixed = getattr(standard, key) if standard is not None else None
        if given is None and fixed is None:
            if part.as_ is None:
                ctx.note("incomplete-convention", what=what, example=example, standards=", ".join(STANDARDS))
            return None
        chosen[key] = given if given is not None else fixed
    sequence = build_sequence(ctx, chosen["sequence"], "sequence")
    names = tuple(chosen["angles"])
    for index, name in enumerate(names):
        if name in names[:index]:
            ctx.note("repeated-angle", "angles", index, name=name)
            return None
    if sequence is None:
        return None
    if standard is not None and sequence.value != standard.sequence:
        _contradiction(ctx, standard, "sequence", standard.sequence, sequence.value)
    if standard is not None and chosen["about"] != standard.about:
        _contradiction(ctx, standard, "about", standard.about, chosen["about"])
    return Turns(sequence, Sense(chosen["about"]), names)


def _contradiction(ctx: Context, standard: Standard, key: str, fixed: str, given: str) -> None:
    ctx.note("standard-contradicted", key, standard=standard.name, what=key, fixed=fixed, given=given)


# --- constants on both sides
# ---------------------------------------------------------------------------------------


def _constants(
    ctx: Context, part: parts.Convention, turns: Turns, reference: numeric.Frame, body: numeric.Frame
) -> tuple[Array, Array] | None:
    """(left, right): the constants on the reference and on the body side."""
    sides: dict[str, Array] = {}
    keys: dict[str, str] = {}
    for key, side, frame in (("reference turned by", "reference", reference), ("body turned by", "body", body)):
        stated = part.reference_turned_by if side == "reference" else part.body_turned_by
        if stated is None:
            continue
        turned = build_rotation(ctx.at(key), stated, Ends(frame, frame, ("turned",), ("unturned",)))
        if turned is None:
            return None
        sides[side], keys[side] = turned, key
    if part.zero is not None:
        zero = build_rotation(ctx.at("zero"), part.zero, _ends(body, reference))
        if zero is None:
            return None
        if part.zero.side is None and rotation_angle(zero, np.eye(3)) > _NOTHING_TURNED:
            ctx.note("zero-side", "zero", readings=_both_readings(zero, turns, reference, body))
            return None
        side = part.zero.side or "reference"
        if side in sides and rotation_angle(zero, np.eye(3)) > _NOTHING_TURNED:
            ctx.note("side-twice", "zero", side=side, one=keys[side], other="zero")
            return None
        sides.setdefault(side, zero)
    return sides.get("reference", np.eye(3)), sides.get("body", np.eye(3))


def _both_readings(zero: Array, turns: Turns, reference: numeric.Frame, body: numeric.Frame) -> str:
    """Where one body axis points at one small set of angles, read either way; the pair that differs most is shown."""
    best, shown = 0.0, ("", "", "", "")
    for turn, name in enumerate(turns.names):
        angles = np.where(np.arange(3) == turn, math.radians(30.0), 0.0)
        E = chain_matrix(angles, sequence=turns.sequence, sense=turns.sense)
        for axis, word in enumerate(body.axes):
            one, other = (zero @ E)[:, axis], (E @ zero)[:, axis]
            apart = float(np.linalg.norm(one - other))
            if apart > best + 1e-9:
                best = apart
                shown = (name, word, direction_words(one, reference), direction_words(other, reference))
    name, word, one_way, other_way = shown
    return (
        f"At {name} 30 deg and the other angles zero, {word} is {one_way} if it is on the reference side "
        f"(R = zero E), and {other_way} if it is on the body side (R = E zero)"
    )


# --- senses, offsets, ranges
# ---------------------------------------------------------------------------------------


def _signs(
    ctx: Context, part: parts.Convention, base: Convention, standard: Standard | None, legacy: bool
) -> tuple[int, int, int] | None:
    """The sign of each angle; of left-handed frames (`legacy`), where two rules compete, it must be stated."""
    names = base.angle_names
    if part.positive is None:
        if standard is None and (legacy or _trade_differs(base)):
            example = f"{base.body.axes[0]} up"
            ctx.note("no-sense", angle=names[1], axes=", ".join(base.body.axes), example=example)
            return None
        return base.signs
    signs = senses(ctx, part.positive, base, open_ones=standard is not None)
    if standard is not None and signs is not None and signs != (1, 1, 1):
        wrong = names[signs.index(-1)]
        given = part.positive if isinstance(part.positive, str) else part.positive[wrong]
        ctx.note(
            "standard-contradicted", "positive", wrong, standard=standard.name, what=f"the sense of {wrong}",
            fixed="right-handed about its axis", given=given,
        )  # fmt: skip
        return None
    return signs


def senses(
    ctx: Context, positive: str | dict[str, str], base: Convention, *, open_ones: bool = False
) -> tuple[int, int, int] | None:
    """The sign of each angle from `positive`. open_ones: angles it leaves out are right-handed about their axes.

    `base` carries the sign of each turn by the hand of its own frames: +1, but for left-handed ones.
    """
    names = base.angle_names
    if isinstance(positive, str):
        if positive != "by axis":
            ctx.note("bad-sense", "positive", text=positive)
            return None
        return base.signs
    unknown = [name for name in positive if name not in names]
    for name in unknown:
        hint = suggestion(name, names, "its angles are")
        ctx.note("unknown-angle", "positive", name, key=True, convention=base.name, name=name, hint=hint)
    missing = [name for name in names if name not in positive]
    if missing and not unknown and not open_ones and _trade_differs(base):
        example = f"{base.body.axes[0]} up"
        ctx.note("no-sense", "positive", angle=missing[0], axes=", ".join(base.body.axes), example=example)
        return None
    signs = [_sign(ctx, positive.get(name, "by axis"), base, index) for index, name in enumerate(names)]
    if unknown or None in signs:
        return None
    return tuple(signs)  # type: ignore[return-value]


def _trade_differs(base: Convention) -> bool:
    """Whether a reader could expect another sense than the right-handed one about the axis.

    With body axes forward, starboard, down below a reference that is down or nameless the right-handed senses
    are those of everybody's heading, elevation and bank. With other vehicle axes, or north-east-up, they are
    not.
    """
    body, reference = base.body.axes, base.reference.axes
    if body in (("forward", "starboard", "down"), ("forward", "right", "down")):
        return any(axis in LEVEL_WORDS for axis in reference) and reference[2] != "down"
    words = {"forward", "aft", "starboard", "port", "right", "left", "up", "down"}
    return any(axis in words for axis in body)


def _sign(ctx: Context, text: str, base: Convention, index: int) -> int | None:
    """+1 when the stated sense is the right-handed one about the turn's axis, -1 when it is the other."""
    if text in ("by axis", "against axis"):
        return base.signs[index] if text == "by axis" else -base.signs[index]
    angle = base.angle_names[index]
    words = [word for word in re.split(r"\s+", text) if word not in _FILLERS]
    axis = axis_vector(base.body, words[0]) if len(words) == 2 else None
    zero = base.left @ base.right
    goal = _goal(words[1], base, zero) if axis is not None else None
    if axis is None or goal is None:
        ctx.note("bad-sense", "positive", angle, text=text)
        return None
    turn = np.eye(3)[base.sequence.axes[index]]
    motion = base.left @ np.cross(turn, base.right @ axis)
    towards = float(motion @ goal)
    if abs(towards) < _TOO_LITTLE_MOTION:
        length = float(np.linalg.norm(motion))
        moves = "nowhere" if length < _TOO_LITTLE_MOTION else "towards " + direction_words(motion, base.reference)
        ctx.note("sense-still", "positive", angle, angle=angle, axis=words[0], direction=words[1], moves=moves)
        return None
    return 1 if towards > 0.0 else -1


def _goal(word: str, base: Convention, zero: Array) -> Array | None:
    """The direction a sense names, in reference components: a reference axis, else a body axis as it lies at zero."""
    if word in base.reference.axes or numeric.opposite(word) in base.reference.axes:
        return base.reference.direction(word)
    on_body = axis_vector(base.body, word)
    return None if on_body is None else zero @ on_body


def _offsets(ctx: Context, part: parts.Convention, names: tuple[str, str, str]) -> tuple[float, float, float] | None:
    stated = part.offsets or {}
    unknown = [name for name in stated if name not in names]
    for name in unknown:
        hint = suggestion(name, names, "its angles are")
        ctx.note("unknown-angle", "offsets", name, key=True, convention=ctx.steps[-1], name=name, hint=hint)
    values = tuple(stated[name].value if name in stated else 0.0 for name in names)
    return None if unknown else values  # type: ignore[return-value]


def _with_ranges(
    ctx: Context, part: parts.Convention, base: Convention, standard: Standard | None
) -> Convention | None:
    stated: dict[str, Range] = dict(part.ranges or {})
    unknown = [name for name in stated if name not in base.angle_names]
    for name in unknown:
        hint = suggestion(name, base.angle_names, "its angles are")
        ctx.note("unknown-angle", "ranges", name, key=True, convention=base.name, name=name, hint=hint)
    if unknown:
        return None
    if standard is not None and not stated:
        fixed = zip(base.angle_names, standard.ranges, strict=True)
        stated = {name: read_range(list(ends)) for name, ends in fixed}
    if not stated:
        return base
    usual = dict(zip(base.angle_names, default_ranges(base), strict=True))
    ranges = []
    for name in base.angle_names:
        ends = _range_ends(ctx, name, stated[name]) if name in stated else usual[name]
        if ends is None:
            return None
        ranges.append(ends)
    try:
        return replace(base, ranges=tuple(ranges))  # type: ignore[arg-type]
    except AttitudeError as err:
        cause = err.fault.cause.partition(": ")[2] or err.fault.cause
        ctx.note("range-impossible", "ranges", why=cause, remedy=err.fault.remedy)
        return None


def _range_ends(ctx: Context, name: str, stated: Range) -> tuple[float, float] | None:
    if stated.lo is None or stated.hi is None:
        return -math.pi, math.pi
    lo, hi = stated.lo.value, stated.hi.value
    if lo > hi:
        ctx.note("reversed-range", "ranges", name, lo=stated.lo.text, hi=stated.hi.text, otherwise="")
        return None
    if lo == hi:
        ctx.note("empty-range", "ranges", name, angle=name, text=stated.lo.text)
        return None
    return lo, hi
