"""Forms: numbers that state an attitude and are no sequence of turns."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Reference, key_named
from trunnion.spec.values import Direction, Name, Text, list_of, one_of

Growing = one_of("clockwise", "counterclockwise")


class _Form(NamedPart):
    reference: Reference
    body: Reference
    source: Text | None = None
    text: Text | None = None


class TiltForm(_Form):
    """A heading and two tilts, each to the horizontal on its own; tilts are positive with their axis' end up."""

    tilts: list_of(Direction, 2, "the two tilted body axes, in the order of their angles")
    types: list_of(one_of("sine", "tangent"), 2, "the type of each tilt, `sine` or `tangent`")
    upright: Direction
    up: Direction
    heading_from: Direction
    headings_grow: Growing
    angles: list_of(Name, 3, "the names of the heading and of the two tilts")


class PointingForm(_Form):
    """Azimuth and elevation of a boresight, and the turn about it (or that it is left free)."""

    boresight: Direction
    mark: Direction
    pole: Direction
    azimuth_from: Direction
    azimuths_grow: Growing
    roll: one_of("right-handed", "left-handed", "free")
    angles: list_of(Name, 3, "the names of azimuth, elevation and roll (named even where it is free)")


class VectorForm(_Form):
    """The axis of the single turn between the frames, times its angle in radians."""

    rotation_vector: list_of(Name, 3, "the names of its components")
    maps: Text


FORMS = {"tilts": TiltForm, "boresight": PointingForm, "rotation vector": VectorForm}

Form = Annotated[
    Annotated[TiltForm, Tag("\0tilts")]
    | Annotated[PointingForm, Tag("\0boresight")]
    | Annotated[VectorForm, Tag("\0rotation vector")],
    Discriminator(key_named(*FORMS)),
]
