"""Conventions: how three angles state an attitude."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated, Any

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Reference
from trunnion.spec.parts.rotations import Rotation, Turning
from trunnion.spec.values import Angle, AngleRange, Name, Text, list_of


def _which_sense(value: Any) -> str:
    return "\0each" if isinstance(value, dict) else "\0all"


Positive = Annotated[
    Annotated[Name, Tag("\0all")] | Annotated[dict[str, Name], Tag("\0each")], Discriminator(_which_sense)
]


class Convention(NamedPart):
    """Frames, sequence, senses, zero and mapping direction of three angles."""

    reference: Reference
    body: Reference
    as_: Name | None = None
    sequence: Name | None = None
    about: Turning | None = None
    angles: list_of(Name, 3, "the names of the angles, first turn first") | None = None
    positive: Positive | None = None
    offsets: dict[str, Angle] | None = None
    ranges: dict[str, AngleRange] | None = None
    zero: Rotation | None = None
    body_turned_by: Rotation | None = None
    reference_turned_by: Rotation | None = None
    maps: Text
    source: Text | None = None
    text: Text | None = None
