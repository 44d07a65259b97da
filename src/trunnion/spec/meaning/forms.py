"""Forms that are no sequence: from words to the numerical form between two frames."""

from __future__ import annotations

from typing import Any

from trunnion.attitude import frames as numeric
from trunnion.attitude.forms import DirectionRoll, Level, RotationVector, TiltPair, TiltType
from trunnion.attitude.stated_forms import StatedForm
from trunnion.errors import AttitudeError
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.frames import direction
from trunnion.spec.meaning.rotations import Ends, maps_p_to_q
from trunnion.spec.parts import forms as parts


def build_form(ctx: Context, name: str, part: Any) -> StatedForm | None:
    """The form with its frames, or None when something about it is noted."""
    reference = ctx.part("frames", part.reference, "reference")
    body = ctx.part("frames", part.body, "body")
    if reference is None or body is None:
        return None
    if reference.name == body.name:
        ctx.note("self-link", "body", what="the form", frame=body.name)
        return None
    try:
        form = _numeric(ctx, part, reference, body)
    except AttitudeError as err:
        ctx.note("refused", why=err.fault.cause, remedy=err.fault.remedy or "correct it")
        return None
    return None if form is None else StatedForm(name, reference, body, form)


def _numeric(ctx: Context, part: Any, reference: numeric.Frame, body: numeric.Frame) -> Any:
    if isinstance(part, parts.TiltForm):
        return _tilts(ctx, part, reference, body)
    if isinstance(part, parts.PointingForm):
        return _pointing(ctx, part, reference, body)
    return _vector(ctx, part, reference, body)


def _directions(ctx: Context, part: Any, frames: dict[str, numeric.Frame]) -> dict[str, Any] | None:
    """Unit vectors of the named keys of a part, each in its frame; None when a word is no axis (noted)."""
    found = {key: direction(ctx, getattr(part, key), frame, key.replace("_", " ")) for key, frame in frames.items()}
    return None if any(vector is None for vector in found.values()) else found


def _named_twice(ctx: Context, names: list[str], key: str) -> bool:
    for index, name in enumerate(names):
        if name in names[:index]:
            ctx.note("repeated-angle", key, index, name=name)
            return True
    return False


def _tilts(ctx: Context, part: parts.TiltForm, reference: numeric.Frame, body: numeric.Frame) -> TiltPair | None:
    found = _directions(ctx, part, {"up": reference, "heading_from": reference, "upright": body})
    tilted = [direction(ctx, axis, body, "tilts", index) for index, axis in enumerate(part.tilts)]
    if found is None or any(axis is None for axis in tilted) or _named_twice(ctx, part.angles, "angles"):
        return None
    level = Level(found["up"], found["heading_from"], part.headings_grow == "clockwise")
    first, second = (TiltType(f"{kind} type") for kind in part.types)
    names = (part.angles[0], part.angles[1], part.angles[2])
    return TiltPair(level, tilted[0], tilted[1], found["upright"], (first, second), names)


def _pointing(
    ctx: Context, part: parts.PointingForm, reference: numeric.Frame, body: numeric.Frame
) -> DirectionRoll | None:
    frames = {"pole": reference, "azimuth_from": reference, "boresight": body, "mark": body}
    found = _directions(ctx, part, frames)
    if found is None or _named_twice(ctx, part.angles, "angles"):
        return None
    return DirectionRoll(
        found["pole"],
        found["azimuth_from"],
        found["boresight"],
        found["mark"],
        clockwise=part.azimuths_grow == "clockwise",
        roll_right_handed=part.roll != "left-handed",
        with_roll=part.roll != "free",
        names=(part.angles[0], part.angles[1], part.angles[2]),
    )


def _vector(
    ctx: Context, part: parts.VectorForm, reference: numeric.Frame, body: numeric.Frame
) -> RotationVector | None:
    forward = maps_p_to_q(ctx, part.maps, Ends(body, reference, ("body",), ("reference",)), "maps")
    if forward is None or _named_twice(ctx, part.rotation_vector, "rotation vector"):
        return None
    first, second, third = part.rotation_vector
    return RotationVector((first, second, third), reverse=not forward)
