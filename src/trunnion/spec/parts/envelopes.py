"""Envelopes: the sets of attitudes something may take, each told by the key that makes it."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated, Any

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Part, Reference, key_named
from trunnion.spec.parts.rotations import AxisMap, FourComponents, NineEntries, ScalarPlace, ThreeTurns
from trunnion.spec.values import (
    Acceleration,
    Angle,
    AngleRange,
    Count,
    DataSize,
    Direction,
    Duration,
    Name,
    PositiveAngle,
    Rate,
    Real,
    RelativePath,
    Text,
    list_of,
    one_of,
)


class _Envelope(NamedPart):
    max_body_rate: Rate | None = None
    max_angular_acceleration: Acceleration | None = None
    dispersion: PositiveAngle | None = None
    source: Text | None = None
    text: Text | None = None


class FurtherCone(Part):
    """A further body axis held near a reference direction at the same time; the turn about it is left free."""

    axis: Direction
    around: Direction
    half_angle: Angle | None = None
    between: list_of(Angle, 2, "the nearest and the farthest angle") | None = None


class AxisLimits(Part):
    """A dispersion about some axes only: the largest turn, either way, about each."""

    axes_of: one_of("body", "reference")
    limits: dict[Name, PositiveAngle]


class Box(_Envelope):
    """All attitudes whose three angles lie in ranges, and that hold the axes of `also`."""

    convention: Reference
    box: dict[str, AngleRange]
    also: list[FurtherCone] | None = None
    dispersion_about: AxisLimits | None = None


class RollLimit(Part):
    """A limit on the turn about a cone's axis; at roll zero the axis `zero` points as near to `around` as it
    can."""

    zero: Direction
    range: AngleRange


def _which_roll(value: Any) -> str:
    return "\0limit" if isinstance(value, dict | RollLimit) else "\0any"


Roll = Annotated[
    Annotated[one_of("any"), Tag("\0any")] | Annotated[RollLimit, Tag("\0limit")], Discriminator(_which_roll)
]


class ConeShape(Part):
    """A body axis held within a cone, or between two angles, around a reference direction."""

    axis: Direction
    around: Direction
    half_angle: Angle | None = None
    between: list_of(Angle, 2, "the nearest and the farthest angle") | None = None
    roll: Roll


class Cone(_Envelope):
    """All attitudes that hold a body axis near a reference direction, and those of `also`."""

    cone: ConeShape
    also: list[FurtherCone] | None = None
    dispersion_about: AxisLimits | None = None
    body: Reference | None = None
    reference: Reference | None = None


_POSE_FORMS = {"angles": ThreeTurns, "matrix": NineEntries, "quaternion": FourComponents}


def _which_pose(value: Any) -> str | None:
    if isinstance(value, Part):
        return next((f"\0{form}" for form, kind in _POSE_FORMS.items() if isinstance(value, kind)), "\0axes")
    if not isinstance(value, dict):
        return None
    given = [form for form in _POSE_FORMS if form in value]
    return None if len(given) > 1 else f"\0{given[0]}" if given else "\0axes"


Pose = Annotated[
    Annotated[AxisMap, Tag("\0axes")]
    | Annotated[ThreeTurns, Tag("\0angles")]
    | Annotated[NineEntries, Tag("\0matrix")]
    | Annotated[FourComponents, Tag("\0quaternion")],
    Discriminator(_which_pose),
]


class Poses(_Envelope):
    """Listed attitudes, each with a ball of uncertainty."""

    poses: list[Pose]
    ball: PositiveAngle | None = None
    dispersion_about: AxisLimits | None = None
    body: Reference | None = None
    reference: Reference | None = None


class TimeColumn(Part):
    """The column of times and its unit."""

    column: Name
    unit: one_of("s", "ms", "us", "ns", "min", "h")


class Columns(Part):
    """Which columns of a table state the time and the attitude."""

    time: TimeColumn | None = None
    quaternion: list_of(Name, 4, "the four columns in the file's order") | None = None
    matrix: list_of(Name, 9, "the nine columns") | None = None
    angles: list_of(Name, 3, "the three columns, first turn first") | None = None
    unit: one_of("deg", "rad") | None = None


class _Statement(_Envelope):
    columns: Columns | None = None
    format: Name | None = None
    scalar: ScalarPlace | None = None
    order: one_of("rows", "columns") | None = None
    convention: Reference | None = None
    reference: Reference | None = None
    body: Reference | None = None
    maps: Text | None = None
    between_samples: one_of("slerp", "rate limited", "samples")
    attitude_error: PositiveAngle | None = None
    max_gap: Duration | None = None
    accept_damaged: Text | None = None
    topic: Name | None = None
    instance: Count | None = None
    segment: Count | None = None
    separator: Name | None = None
    norm_tolerance: Real | None = None
    sha256: Text | None = None
    reader_memory: DataSize | None = None
    reader_time: Duration | None = None
    answers: dict[str, Text] | None = None


class Table(_Statement):
    """A file of attitudes against time."""

    table: RelativePath


class Campaign(_Statement):
    """Many files of attitudes, one statement for all."""

    campaign: RelativePath
    #: the files the pattern matched; plain forms only
    files: list[RelativePath] | None = None


def _which_phases(value: Any) -> str:
    return "\0written" if isinstance(value, dict) else "\0names"


class Phases(_Envelope):
    """A union of envelopes, each a phase."""

    phases: Annotated[
        Annotated[list[Name], Tag("\0names")] | Annotated[dict[str, dict[str, Any]], Tag("\0written")],
        Discriminator(_which_phases),
    ]


class ProductOf(Part):
    """What a sensor bolted to a host goes through: the host's envelope and the mount."""

    host: Reference
    mount: Reference


class Product(_Envelope):
    """The attitudes of something mounted on a host."""

    product: ProductOf


ENVELOPE_FORMS: dict[str, type[_Envelope]] = {
    "box": Box,
    "cone": Cone,
    "poses": Poses,
    "table": Table,
    "phases": Phases,
    "product": Product,
    "campaign": Campaign,
}


Envelope = Annotated[
    Annotated[Box, Tag("\0box")]
    | Annotated[Cone, Tag("\0cone")]
    | Annotated[Poses, Tag("\0poses")]
    | Annotated[Table, Tag("\0table")]
    | Annotated[Phases, Tag("\0phases")]
    | Annotated[Product, Tag("\0product")]
    | Annotated[Campaign, Tag("\0campaign")],
    Discriminator(key_named(*ENVELOPE_FORMS)),
]
