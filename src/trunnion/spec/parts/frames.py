"""Frames and the links between them."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated, Any

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Part, Reference, key_named
from trunnion.spec.values import Angle, Name, Text, list_of, one_of


class MagneticNorth(Part):
    """North by a compass: which field model, and of what date."""

    magnetic: Name
    date: Name


class GridNorth(Part):
    """North of a map grid, with its convergence (grid north east of true north counts positive)."""

    grid: Name
    convergence: Angle


class WanderNorth(Part):
    """A level frame whose azimuth is left to wander, and how it does."""

    wander: Text


def _which_north(value: Any) -> str | None:
    forms = ("magnetic", "grid", "wander")
    if isinstance(value, MagneticNorth | GridNorth | WanderNorth | dict):
        return key_named(*forms)(value)
    return "\0word"


North = Annotated[
    Annotated[one_of("true"), Tag("\0word")]
    | Annotated[MagneticNorth, Tag("\0magnetic")]
    | Annotated[GridNorth, Tag("\0grid")]
    | Annotated[WanderNorth, Tag("\0wander")],
    Discriminator(_which_north),
]


class Frame(NamedPart):
    """A named triad: three axes, and what a level or a left-handed frame must add."""

    axes: list_of(Name, 3, "x, y and z axis")
    north: North | None = None
    carried: one_of("along", "fixed at a point") | None = None
    origin: Text | None = None
    lever_arm: Text | None = None
    handed: one_of("right", "left") | None = None
    paired_with: Reference | None = None
    text: Text | None = None
