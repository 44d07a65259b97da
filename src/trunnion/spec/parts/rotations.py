"""A fixed rotation in whatever way a drawing states it: axis words, one turn, three angles, a matrix, a
quaternion."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated, Any

from pydantic import ConfigDict, Discriminator, Tag

from trunnion.spec.parts.base import Part, Reference
from trunnion.spec.values import Angle, Direction, Name, Real, Text, list_of, one_of

SIDES = ("reference", "body")

Side = one_of(*SIDES)
ScalarPlace = one_of("first", "last")
Turning = one_of("moving axes", "fixed axes")
Matrix = list_of(list_of(Real, 3, "the entries of one row"), 3, "the three rows")
FourNumbers = list_of(Real, 4, "the components of the quaternion")
ThreeAngles = list_of(Angle, 3, "the angles, first turn first")


def _no_other_form(schema: dict[str, Any]) -> None:
    """For editors: words for axes, not one of the forms that have keys of their own."""
    schema["not"] = {"anyOf": [{"required": [key]} for key in ("angle", "angles", "matrix", "quaternion")]}


class AxisMap(Part):
    """Axis words: each key is an axis, its value the direction it lies along."""

    model_config = ConfigDict(extra="allow", json_schema_extra=_no_other_form)
    __pydantic_extra__: dict[str, Name]

    side: Side | None = None

    @property
    def axes(self) -> dict[str, str]:
        """Axis to direction, as written."""
        return dict(self.__pydantic_extra__)


class SingleTurn(Part):
    """One turn by an angle about a direction (right-handed)."""

    about: Direction
    angle: Angle
    side: Side | None = None


class ThreeTurns(Part):
    """Three angles with their sequence, or in a convention of the workbook."""

    angles: ThreeAngles
    sequence: Name | None = None
    about: Turning | None = None
    convention: Reference | None = None
    side: Side | None = None


class NineEntries(Part):
    """A matrix by rows, and which way it maps."""

    matrix: Matrix
    maps: Text
    side: Side | None = None


class FourComponents(Part):
    """A quaternion, where its scalar stands, and which way it maps."""

    quaternion: FourNumbers
    scalar: ScalarPlace
    maps: Text
    side: Side | None = None


_FORMS = {"matrix": NineEntries, "quaternion": FourComponents, "angles": ThreeTurns, "angle": SingleTurn}


def _which_rotation(value: Any) -> str | None:
    if isinstance(value, Part):
        return next((f"\0{form}" for form, kind in _FORMS.items() if isinstance(value, kind)), "\0axes")
    if not isinstance(value, dict):
        return None
    given = [form for form in _FORMS if form in value]
    if len(given) > 1:
        return None
    return f"\0{given[0]}" if given else "\0axes"


Rotation = Annotated[
    Annotated[AxisMap, Tag("\0axes")]
    | Annotated[SingleTurn, Tag("\0angle")]
    | Annotated[ThreeTurns, Tag("\0angles")]
    | Annotated[NineEntries, Tag("\0matrix")]
    | Annotated[FourComponents, Tag("\0quaternion")],
    Discriminator(_which_rotation),
]
