"""What a frame or a named standard adds to a convention, in sentences: north, origin, lever arm, what was fixed."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
from pydantic import TypeAdapter

from trunnion.attitude import frames as numeric
from trunnion.attitude.words import listed, plain_names, range_sentence
from trunnion.spec.parts import Frame
from trunnion.spec.parts.frames import GridNorth, MagneticNorth, WanderNorth
from trunnion.spec.standards import STANDARDS

_FRAME: TypeAdapter[Frame] = TypeAdapter(Frame)


def north_words(north: Any) -> str:
    """Which north a level frame means, as a sentence; "" for a frame without one."""
    if isinstance(north, MagneticNorth):
        return f"North is magnetic, by {north.magnetic} for {north.date}."
    if isinstance(north, GridNorth):
        return f"North is that of grid {north.grid}; grid north lies {north.convergence.text} east of true north."
    if isinstance(north, WanderNorth):
        return f"Its azimuth wanders: {north.wander}."
    return "North is true north." if north else ""


def carried_words(carried: str | None) -> str:
    """Whether a level frame travels, as a sentence; "" where it is not said."""
    if carried is None:
        return ""
    return "It travels along." if carried == "along" else "It is fixed at a point."


def text_words(frame: Frame) -> Iterator[str]:
    """Origin and lever arm, carried as text."""
    for what, text in (("origin", frame.origin), ("lever arm", frame.lever_arm)):
        if text:
            yield f"Its {what} is {text} (carried as text: only attitude is computed)."


def frame_notes(convention: Mapping[str, Any]) -> dict[str, str]:
    """Per frame of a plain convention: which north, whether it travels, origin and lever arm; left out where empty."""
    notes = {}
    for key in ("reference", "body"):
        part = _FRAME.validate_python(dict(convention[key]))
        words = [north_words(part.north), carried_words(part.carried), *text_words(part)]
        if part.handed == "left" and isinstance(part.paired_with, dict):
            partner = _FRAME.validate_python(part.paired_with)
            words.insert(0, partner_words(part, partner))
            part = partner
        said = " ".join(word for word in words if word)
        if said:
            notes[str(part.name)] = said
    return notes


def partner_words(frame: Frame, partner: Frame) -> str:
    """How a left-handed frame is carried over to its right-handed partner."""
    here = numeric.Frame(str(partner.name), tuple(partner.axes))
    signed = [
        "xyz"[int(np.argmax(np.abs(v)))] if v.sum() > 0 else f"−{'xyz'[int(np.argmax(np.abs(v)))]}"
        for v in (here.direction(axis) for axis in frame.axes)
    ]
    return (
        f"Stated in the left-handed frame {frame.name} (x {frame.axes[0]}, y {frame.axes[1]}, z {frame.axes[2]}) and "
        f"carried over to this right-handed partner: x, y, z there are {', '.join(signed)} here, the angles keep their "
        "values, and ‘by axis’ there means the left-hand rule."
    )


def taken_from_standard(plain: Mapping[str, Any], convention: Any) -> tuple[str, ...]:
    """One sentence for each thing that the standard a plain convention names fixed; empty without a standard."""
    standard = STANDARDS.get(str(plain.get("as", "")))
    if standard is None:
        return ()
    convention = plain_names(convention)
    found = [f"The body axes x, y, z: {standard.axes_text}; the third reference axis: {standard.third_reference_axis}."]
    if "sequence" not in plain or "about" not in plain:
        found.append(f"The order of the turns: {convention.sequence.value} about {convention.sense.value}.")
    if "angles" not in plain:
        found.append(f"The names of the angles: {listed(list(convention.angle_names))}.")
    if "positive" not in plain:
        found.append("The sense of each angle: by the right-hand rule about its axis.")
    if not plain.get("ranges"):
        found.append(f"The ranges: {range_sentence(convention).partition(': ')[2]}")
    return (*found, f"How much of it was read: {standard.seen}.")
