"""Mounts: a fixed rotation from a sensor to its host, its tolerance, and how the sensor reports."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Annotated, Any

from pydantic import Discriminator, Tag

from trunnion.spec.parts.base import NamedPart, Part, Reference, key_named
from trunnion.spec.parts.conventions import Positive
from trunnion.spec.parts.rotations import FourNumbers, Matrix, ScalarPlace, ThreeAngles, Turning
from trunnion.spec.values import Count, Direction, Name, PositiveAngle, Real, Text, list_of, one_of

INSTRUMENTS = ("accelerometer", "gyro", "clinometer", "magnetometer", "star tracker", "camera")


class Tolerance(Part):
    """How well a mount is known: one whole turn, a turn about each sensor axis, or a covariance (rad^2)."""

    total_rotation: PositiveAngle | None = None
    per_axis: list_of(PositiveAngle, 3, "the bound about x, y and z") | None = None
    covariance: Matrix | None = None


class AnglesAs(Part):
    """The angles a sensor states of itself: a sequence about its own axes, which stand in for those of the
    vehicle."""

    sequence: Name
    about: Turning
    relative_to: Reference
    x_y_z_in_place_of: list_of(Name, 3, "the host axes that x, y and z stand in for") | None = None
    angles: list_of(Name, 3, "the names of the angles, first turn first") | None = None
    positive: Positive | None = None


class DirectionPair(Part):
    """One direction as seen by the sensor and as known in the host."""

    sensor: Direction
    host: Direction


def _which_angles_as(value: Any) -> str:
    own = isinstance(value, AnglesAs) or (isinstance(value, dict) and "maps" not in value)
    return "\0sequence" if own else "\0convention"


AnglesAsForm = Annotated[
    Annotated[Reference, Tag("\0convention")] | Annotated[AnglesAs, Tag("\0sequence")],
    Discriminator(_which_angles_as),
]


class _Mount(NamedPart):
    host: Reference
    frame: Reference | None = None
    sensor_axes: list_of(Name, 3, "the sensor's own axis names") | None = None
    boresight: Name | None = None
    tolerance: Tolerance | None = None
    instruments: list[one_of(*INSTRUMENTS)] | None = None
    accelerometer: one_of("specific force", "gravity") | None = None
    clinometer: one_of("sine", "tangent") | None = None
    tilt_axes: list_of(Name, 2, "the two sensor axes whose tilt is reported") | None = None
    angles_as: AnglesAsForm | None = None
    enter_as: Reference | None = None
    source: Text | None = None
    text: Text | None = None


class AxesMount(_Mount):
    """Where each sensor axis points in the host, in words."""

    axes: dict[str, Name]


class AnglesMount(_Mount):
    """Three angles that turn the host's axes into the sensor's."""

    angles: ThreeAngles
    sequence: Name | None = None
    about: Turning | None = None
    convention: Reference | None = None


class MatrixMount(_Mount):
    """Nine entries by rows, and which way they map."""

    matrix: Matrix
    maps: Text
    digits: Count | None = None


class QuaternionMount(_Mount):
    """A quaternion, where its scalar stands, and which way it maps."""

    quaternion: FourNumbers
    scalar: ScalarPlace
    maps: Text
    norm_tolerance: Real | None = None


class DirectionsMount(_Mount):
    """Two measured directions; the first pair is met exactly."""

    directions: list_of(DirectionPair, 2, "two pairs of directions")


MOUNT_FORMS = {
    "axes": AxesMount,
    "angles": AnglesMount,
    "matrix": MatrixMount,
    "quaternion": QuaternionMount,
    "directions": DirectionsMount,
}


Mount = Annotated[
    Annotated[AxesMount, Tag("\0axes")]
    | Annotated[AnglesMount, Tag("\0angles")]
    | Annotated[MatrixMount, Tag("\0matrix")]
    | Annotated[QuaternionMount, Tag("\0quaternion")]
    | Annotated[DirectionsMount, Tag("\0directions")],
    Discriminator(key_named(*MOUNT_FORMS)),
]
