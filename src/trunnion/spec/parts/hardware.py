"""What turns and what is measured: gimbals, passes, forbidden sectors, alignment surveys, pointing budgets."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Part, Reference, key_named
from trunnion.spec.parts.envelopes import TimeColumn
from trunnion.spec.parts.rotations import Rotation
from trunnion.spec.values import (
    Acceleration,
    Angle,
    AngleRange,
    Direction,
    Duration,
    Length,
    Name,
    PositiveAngle,
    Rate,
    RelativePath,
    Text,
    list_of,
    one_of,
)


class Joint(Part):
    """One revolute axis: its direction in the base at zero angles, and its limits."""

    name: Name
    axis: Direction
    travel: AngleRange
    max_rate: Rate | None = None
    max_acceleration: Acceleration | None = None
    encoder_step: PositiveAngle | None = None


class Gimbal(NamedPart):
    """Two to four joints on a base, outermost first, and the payload they carry."""

    base: Reference
    payload: Reference | None = None
    joints: list[Joint]
    zero: Rotation | None = None
    boresight: Direction | None = None
    source: Text | None = None
    text: Text | None = None


class SkyColumns(Part):
    """The columns of a pass: time, azimuth (north through east) and elevation, and the unit of the two angles."""

    time: TimeColumn
    azimuth: Name
    elevation: Name
    unit: one_of("deg", "rad")


class TablePass(NamedPart):
    """A pass from a table of azimuth and elevation against time."""

    table: RelativePath
    columns: SkyColumns
    source: Text | None = None
    text: Text | None = None


class CircularOrbit(Part):
    """A circular orbit over a sphere that does not turn; for sizing."""

    altitude: Length
    highest: PositiveAngle
    lowest: PositiveAngle | None = None
    heading: Angle | None = None
    step: Duration | None = None


class CircularPass(NamedPart):
    """A pass of a satellite on a circular orbit."""

    circular: CircularOrbit
    source: Text | None = None
    text: Text | None = None


PASS_FORMS = {"table": TablePass, "circular": CircularPass}

Pass = Annotated[
    Annotated[TablePass, Tag("\0table")] | Annotated[CircularPass, Tag("\0circular")],
    Discriminator(key_named(*PASS_FORMS)),
]


class Sector(NamedPart):
    """A forbidden part of the sky: a polygon of azimuth and elevation, in the modes it holds in (none: all)."""

    corners: list[list_of(Angle, 2, "azimuth and elevation")]
    modes: list[Name] | None = None
    source: Text | None = None
    text: Text | None = None


class Sighting(Part):
    """One direction as seen by the sensor and as known in the host; its accuracy when it differs from the others'."""

    sensor: Direction
    host: Direction
    accuracy: PositiveAngle | None = None


class Survey(NamedPart):
    """An alignment survey: directions seen in both frames, and their accuracy (one standard deviation)."""

    host: Reference
    mount: Reference | None = None
    sightings: list[Sighting]
    accuracy: PositiveAngle
    source: Text | None = None
    text: Text | None = None


class Timing(Part):
    """A time error at a relative rate about each axis."""

    relative_rate: list[Rate]
    time_error: Duration


class _Term(Part):
    name: Name
    kind: Name
    source: Text
    correlated: Name | None = None
    counts_in: list[Name] | None = None


class GaussianTerm(_Term):
    """Normally distributed: the standard deviation on each axis, and the mean if it is not zero."""

    gaussian: list[PositiveAngle]
    mean: list[Angle] | None = None


class UniformTerm(_Term):
    """Equally likely between two ends on each axis."""

    uniform: list[list_of(Angle, 2, "the lower and the upper end")]


class SinusoidTerm(_Term):
    """A sine of unknown phase: its amplitude on each axis."""

    sinusoid: list[PositiveAngle]


class BoundedTerm(_Term):
    """Known only to lie within plus or minus a bound on each axis."""

    bounded: list[PositiveAngle]


class MountTerm(_Term):
    """The tolerance of a mount."""

    mount: Reference


class TimingTerm(_Term):
    """The cost of a time error."""

    timing: Timing


TERM_FORMS = {
    "gaussian": GaussianTerm,
    "uniform": UniformTerm,
    "sinusoid": SinusoidTerm,
    "bounded": BoundedTerm,
    "mount": MountTerm,
    "timing": TimingTerm,
}

Term = Annotated[
    Annotated[GaussianTerm, Tag("\0gaussian")]
    | Annotated[UniformTerm, Tag("\0uniform")]
    | Annotated[SinusoidTerm, Tag("\0sinusoid")]
    | Annotated[BoundedTerm, Tag("\0bounded")]
    | Annotated[MountTerm, Tag("\0mount")]
    | Annotated[TimingTerm, Tag("\0timing")],
    Discriminator(key_named(*TERM_FORMS)),
]


class Budget(NamedPart):
    """A pointing budget: named axes, and terms with one value each."""

    axes: list[Name]
    terms: list[Term]
    source: Text | None = None
    text: Text | None = None
