"""Three numbers that are no sequence of turns: tilt pairs, direction and roll, rotation vectors.

Each form says how its numbers give an attitude and back, where it is singular, and how far an attitude is from there.
R (..., 3, 3) takes body to reference components; angles in rad; directions are unit vectors given in their frame.

A tilt pair looks like pitch and roll and is not: each angle is taken to the horizontal on its own.
sine type       angle of the body axis itself to the horizontal (accelerometer strapped to the body)
tangent type    angle seen in the plane of that axis and the body's upright axis (pendulum in that plane)
sine + tangent  what a gimballed sensor reads: the same two angles as pitch and roll of a sequence
Sources: OCE-1203 (tilt formulas of current profilers); direction forms checked against SOFA-2023, NAIF-ROTATION.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass, field
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import from_rotation_vector, require_rotation, rotation_vector, unit
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_REFERENCE = Frame("reference", ("x", "y", "z"))
_BODY = Frame("body", ("x", "y", "z"))
_ROUNDING = 1e-15  # a sine or length this small is rounding alone
_RIGHT_ANGLE = 1e-9  # two stated directions may miss 90 deg by this much (rad)


class FormNumbers(NamedTuple):
    """The numbers (..., n) of a form; margin (...) rad to its singular set; singular (...): some number is arbitrary;
    inverted (...): the up/down flag of a tilt pair, False elsewhere."""

    values: Array
    margin: Array
    singular: NDArray[np.bool_]
    inverted: NDArray[np.bool_]


class Form(Protocol):
    """What every form offers."""

    @property
    def names(self) -> tuple[str, ...]:
        """The names of its numbers."""

    @property
    def singular_set(self) -> str:
        """In words: the attitudes at which numbers are lost, and which."""

    def rotation(self, values: ArrayLike) -> Array:
        """R (..., 3, 3) of numbers (..., n)."""

    def numbers(self, R: ArrayLike) -> FormNumbers:
        """Numbers of attitudes (..., 3, 3)."""

    def margin(self, R: ArrayLike) -> Array:
        """Rotation angle (...) rad to the nearest singular attitude of the form."""


class TiltType(enum.Enum):
    """How one tilt angle is taken to the horizontal."""

    SINE = "sine type"
    TANGENT = "tangent type"


@dataclass(frozen=True, eq=False)
class Level:
    """The level reference: `up`, `north` (3,) in reference components; `clockwise`: how headings grow, from above."""

    up: ArrayLike
    north: ArrayLike
    clockwise: bool = True

    def __post_init__(self) -> None:
        object.__setattr__(self, "up", unit(self.up, "up"))
        object.__setattr__(self, "north", unit(self.north, "north"))
        _require_right_angle(self.axes[2], self.axes[0], "up and north")

    @property
    def axes(self) -> Array:
        """Rows: north, the direction of a heading of +90 deg, up."""
        up, north = np.asarray(self.up), np.asarray(self.north)
        side = np.cross(north, up) if self.clockwise else np.cross(up, north)
        return np.stack([north, side, up])


@dataclass(frozen=True, eq=False)
class TiltPair:
    """Heading of one body axis and the tilts of two, each to the horizontal on its own.

    `first` and `second` are the tilted body axes (3,), positive with their end up; `upright` is the body axis that
    points up when both are zero. Heading is that of the first axis (types TANGENT, SINE: of the horizontal direction at
    right angles to the second axis, which the levelled outer gimbal keeps). `types` gives the type of each tilt:
    (SINE, SINE) and (TANGENT, TANGENT) are sensors fixed to the body; their tilts lie within +-90 deg and leave open
    whether the body is upside down, which is the flag `inverted`. Mixed types are a gimballed sensor: the sine one is
    inside, the tangent one turns a full circle, no flag is needed, and the three numbers are a sequence
    (see `as_convention`).
    """

    level: Level
    first: ArrayLike
    second: ArrayLike
    upright: ArrayLike
    types: tuple[TiltType, TiltType]
    names: tuple[str, str, str] = ("heading", "pitch", "roll")

    def __post_init__(self) -> None:
        for name in ("first", "second", "upright"):
            object.__setattr__(self, name, unit(getattr(self, name), f"the {name} axis"))
        for one, two in (("first", "second"), ("second", "upright"), ("upright", "first")):
            _require_right_angle(getattr(self, one), getattr(self, two), f"the {one} and the {two} axis")

    @property
    def gimballed(self) -> bool:
        """True for mixed types, where the pair is that of a sequence."""
        return self.types[0] is not self.types[1]

    @property
    def singular_set(self) -> str:
        """In words: where numbers are lost, and which."""
        if self.gimballed:
            inner = "first" if self.types[0] is TiltType.SINE else "second"
            return f"the {inner} axis vertical: only the sum or the difference of heading and the other tilt is known"
        if self.types[0] is TiltType.SINE:
            return "the upright axis horizontal: the way up is not known there"
        return "the upright axis horizontal: both tilts are 90 deg whatever the turn about it"

    def rotation(self, values: ArrayLike, inverted: ArrayLike = False) -> Array:
        """R (..., 3, 3) of (heading, first tilt, second tilt) (..., 3) rad and the up/down flag (...).

        Raises AttitudeError for tilts no attitude has (two sine tilts adding up to over 90 deg) and for a vertical
        first axis, whose heading means nothing.
        """
        heading, a, b = np.moveaxis(np.asarray(values, dtype=float), -1, 0)
        if self.gimballed:
            return self.as_convention().matrix(np.stack(self._turn_order(heading, a, b), axis=-1))
        c = self._up_in_body(a, b, np.where(np.asarray(inverted, dtype=bool), -1.0, 1.0))
        body = np.stack([np.asarray(self.first), np.asarray(self.second), np.asarray(self.upright)])
        up_b = c @ body
        ahead_b = self.first - c[..., :1] * up_b
        length = np.linalg.norm(ahead_b, axis=-1, keepdims=True)
        if np.any(length <= _ROUNDING):
            raise AttitudeError("the first axis is vertical: a heading means nothing there", remedy="give a rotation")
        north, side, up = self.level.axes
        ahead_r = np.cos(heading)[..., None] * north + np.sin(heading)[..., None] * side
        up_r = np.broadcast_to(up, ahead_r.shape)
        return _triad(ahead_r, up_r) @ np.swapaxes(_triad(ahead_b / length, up_b), -1, -2)

    def numbers(self, R: ArrayLike) -> FormNumbers:
        """(heading, first tilt, second tilt) (..., 3) rad of attitudes (..., 3, 3); heading in (-pi, pi]."""
        M = require_rotation(R, "attitude")
        if self.gimballed:
            found = self.as_convention().angles(M)
            order = (0, 1, 2) if self.types[0] is TiltType.SINE else (0, 2, 1)
            never = np.zeros(found.margin.shape, dtype=bool)
            return FormNumbers(found.angles[..., order], found.margin, found.singular, never)
        c = self._up_components(M)
        across = np.abs(c[..., 2])
        if self.types[0] is TiltType.SINE:
            a = np.arctan2(c[..., 0], np.hypot(c[..., 1], c[..., 2]))
            b = np.arctan2(c[..., 1], np.hypot(c[..., 0], c[..., 2]))
        else:
            a, b = np.arctan2(c[..., 0], across), np.arctan2(c[..., 1], across)
        ahead = M @ np.asarray(self.first)
        north, side, _ = self.level.axes
        heading = np.arctan2(ahead @ side, ahead @ north)
        return FormNumbers(np.stack([heading, a, b], axis=-1), self.margin(M), across == 0.0, c[..., 2] < 0.0)

    def margin(self, R: ArrayLike) -> Array:
        """Rotation angle (...) rad to the nearest singular attitude.

        Sensors fixed to the body: the elevation of the upright axis (a whole circle of directions is singular, not two
        points). Gimballed: that of the sequence.
        """
        if self.gimballed:
            return self.as_convention().lock_margin(R)
        c = self._up_components(np.asarray(R, dtype=float))
        return np.arctan2(np.abs(c[..., 2]), np.hypot(c[..., 0], c[..., 1]))

    def total_tilt(self, R: ArrayLike) -> Array:
        """Angle (...) rad in [0, pi] between the upright axis and up."""
        c = self._up_components(np.asarray(R, dtype=float))
        return np.arctan2(np.hypot(c[..., 0], c[..., 1]), c[..., 2])

    def as_convention(self) -> Convention:
        """The sequence a gimballed pair is: heading, then the sine tilt, then the tangent tilt, about moving axes.

        Raises AttitudeError for sensors fixed to the body, which are no sequence.
        """
        if not self.gimballed:
            raise AttitudeError(
                f"two tilts of {self.types[0].value} are no sequence of turns", remedy="convert through the rotation"
            )
        north, _, up = self.level.axes
        first, second, upright = (np.asarray(axis) for axis in (self.first, self.second, self.upright))
        side = np.cross(upright, first)
        clockwise = -1 if self.level.clockwise else 1
        lateral = (
            1 if side @ second > 0.0 else -1
        )  # first end up is a turn against y, second end up one with or against x
        heading, one, two = self.names
        if self.types[0] is TiltType.SINE:
            sequence, names, signs = Sequence.ZYX, (heading, one, two), (clockwise, -1, lateral)
        else:
            sequence, names, signs = Sequence.ZXY, (heading, two, one), (clockwise, lateral, -1)
        left, right = np.column_stack([north, np.cross(up, north), up]), np.stack([first, side, upright])
        return Convention(
            "gimballed tilt pair", _REFERENCE, _BODY, sequence, Sense.MOVING, names, signs, left=left, right=right
        )

    def _turn_order(self, heading: Array, a: Array, b: Array) -> tuple[Array, Array, Array]:
        return (heading, a, b) if self.types[0] is TiltType.SINE else (heading, b, a)

    def _up_components(self, R: Array) -> Array:
        """Components (..., 3) of up along the first, second and upright body axis."""
        up_b = np.swapaxes(R, -1, -2) @ self.level.axes[2]
        return up_b @ np.stack([np.asarray(self.first), np.asarray(self.second), np.asarray(self.upright)]).T

    def _up_in_body(self, a: Array, b: Array, side: Array) -> Array:
        """The same from two tilts of one type; side +1 upright, -1 inverted."""
        if self.types[0] is TiltType.SINE:
            square = np.cos(a + b) * np.cos(a - b)  # 1 - sin^2 a - sin^2 b, without cancellation
            if np.any(square < -_ROUNDING) or np.any(np.maximum(np.abs(a), np.abs(b)) > np.pi / 2):
                worst = np.degrees(np.max(np.abs(a) + np.abs(b)))
                raise AttitudeError(
                    f"two tilts to the horizontal add up to {worst:.6g} deg; no attitude has more than 90 deg",
                    remedy="are they tangent type, or angles of a sequence?",
                )
            return np.stack([np.sin(a), np.sin(b), side * np.sqrt(np.maximum(square, 0.0))], axis=-1)
        c = np.stack([np.sin(a) * np.cos(b), np.cos(a) * np.sin(b), side * np.cos(a) * np.cos(b)], axis=-1)
        if np.any(np.minimum(np.cos(a), np.cos(b)) <= _ROUNDING):
            raise AttitudeError(
                "a tangent tilt of 90 deg or more leaves the attitude open",
                remedy="the upright axis is horizontal there; give a rotation",
            )
        return c / np.linalg.norm(c, axis=-1, keepdims=True)


@dataclass(frozen=True, eq=False)
class DirectionRoll:
    """Direction of a boresight by two angles, and the turn about it: azimuth, elevation, roll (or polarization).

    `pole` and `zero_azimuth` (3,) in reference components; `boresight` and `mark` (3,) in body components. Elevation is
    counted from the plane across the pole towards it; at zero roll the mark points towards the pole side, and roll
    turns it about the boresight by the right-hand rule (against it with `roll_right_handed` False). Azimuth grows
    clockwise seen from the pole with `clockwise`. Without `with_roll` there are two numbers: they fix a direction, and
    the attitude only up to a turn about it.
    """

    pole: ArrayLike
    zero_azimuth: ArrayLike
    boresight: ArrayLike
    mark: ArrayLike
    clockwise: bool = True
    roll_right_handed: bool = True
    with_roll: bool = True
    azimuth_from_zero: bool = True
    names: tuple[str, ...] = ("azimuth", "elevation", "roll")
    _chain: Convention = field(init=False, repr=False)

    def __post_init__(self) -> None:
        p, n = unit(self.pole, "pole"), unit(self.zero_azimuth, "zero azimuth")
        d, m = unit(self.boresight, "boresight"), unit(self.mark, "mark")
        _require_right_angle(p, n, "pole and zero azimuth")
        _require_right_angle(d, m, "boresight and mark")
        turn = (0.0, 2.0 * np.pi) if self.azimuth_from_zero else (-np.pi, np.pi)
        chain = Convention(
            "direction and roll",
            _REFERENCE,
            _BODY,
            Sequence.ZYX,
            Sense.MOVING,
            (self.names[0], self.names[1], self.names[2] if len(self.names) > 2 else "roll"),
            (-1 if self.clockwise else 1, -1, 1 if self.roll_right_handed else -1),
            left=np.column_stack([n, np.cross(p, n), p]),
            right=np.stack([d, np.cross(m, d), m]),
            ranges=(turn, (-np.pi / 2.0, np.pi / 2.0), (-np.pi, np.pi)),
        )
        object.__setattr__(self, "_chain", chain)

    @property
    def singular_set(self) -> str:
        """In words: where numbers are lost, and which."""
        if self.with_roll:
            return "the boresight along the pole: only the sum or difference of azimuth and roll is known"
        return "the boresight along the pole: the azimuth is arbitrary"

    def as_convention(self) -> Convention:
        """The three numbers as turns about moving axes with constants on both sides: margins, rates, ranges and all."""
        return self._chain

    def direction(self, azimuth: ArrayLike, elevation: ArrayLike) -> Array:
        """Unit vector (..., 3) in reference components."""
        a, e = np.broadcast_arrays(np.asarray(azimuth, dtype=float), np.asarray(elevation, dtype=float))
        return self._chain.matrix(np.stack([a, e, np.zeros_like(a)], axis=-1)) @ unit(self.boresight)

    def azimuth_elevation(self, direction: ArrayLike) -> Array:
        """(azimuth, elevation) (..., 2) rad of directions (..., 3) in reference components, any length."""
        v = unit(direction) @ self._chain.left
        azimuth = np.arctan2(v[..., 1], v[..., 0]) * self._chain.signs[0]
        if self.azimuth_from_zero:
            azimuth = np.where(azimuth < 0.0, azimuth + 2.0 * np.pi, azimuth)
        return np.stack([azimuth, np.arctan2(v[..., 2], np.hypot(v[..., 0], v[..., 1]))], axis=-1)

    def rotation(self, values: ArrayLike, roll: ArrayLike | None = None) -> Array:
        """R (..., 3, 3) of (azimuth, elevation, roll) (..., 3) rad, or of (azimuth, elevation) and a stated roll.

        Two numbers without a roll raise AttitudeError: they leave the turn about the boresight free.
        """
        numbers = np.asarray(values, dtype=float)
        if not self.with_roll:
            if roll is None:
                raise AttitudeError(
                    "azimuth and elevation leave the turn about the boresight free", remedy="state the roll"
                )
            third = np.broadcast_to(np.asarray(roll, dtype=float), numbers.shape[:-1])
            numbers = np.concatenate([numbers, third[..., None]], axis=-1)
        return self._chain.matrix(numbers)

    def numbers(self, R: ArrayLike, policy: Policy = Policy.LAST_ZERO) -> FormNumbers:
        """(azimuth, elevation, roll) (..., 3) rad, or (..., 2) without roll, of attitudes (..., 3, 3)."""
        found = self._chain.angles(R, policy)
        values = found.angles if self.with_roll else found.angles[..., :2]
        return FormNumbers(values, found.margin, found.singular, np.zeros(found.margin.shape, dtype=bool))

    def margin(self, R: ArrayLike) -> Array:
        """Angle (...) rad between the boresight and the line of the pole."""
        return self._chain.lock_margin(R)


@dataclass(frozen=True)
class RotationVector:
    """Axis of the single turn from the reference to the body, times its angle: (x, y, z) rad, length in [0, pi].

    The same components in both frames, since the turn leaves its axis alone. With `reverse` the numbers are those of
    the inverse map (reference to body components): the opposite vector.
    """

    names: tuple[str, str, str] = ("x", "y", "z")
    reverse: bool = False

    @property
    def singular_set(self) -> str:
        """In words: where numbers are lost, and which."""
        return "half a turn away from the reference: the vector and its opposite are one attitude, and the value jumps"

    def rotation(self, values: ArrayLike) -> Array:
        """R (..., 3, 3) of vectors (..., 3) rad of any length."""
        return from_rotation_vector(-np.asarray(values, dtype=float) if self.reverse else values)

    def numbers(self, R: ArrayLike) -> FormNumbers:
        """Vectors (..., 3) rad of length at most pi; at half a turn the first non-zero component is positive."""
        vector = rotation_vector(np.swapaxes(np.asarray(R, dtype=float), -1, -2) if self.reverse else R)
        margin = self.margin(R)
        return FormNumbers(vector, margin, margin == 0.0, np.zeros(margin.shape, dtype=bool))

    def margin(self, R: ArrayLike) -> Array:
        """Rotation angle (...) rad to the nearest half turn: pi minus the angle of R."""
        from trunnion.attitude.rotations import quaternion_from_matrix

        q = quaternion_from_matrix(R)
        return 2.0 * np.arctan2(np.abs(q[..., 0]), np.linalg.norm(q[..., 1:], axis=-1))

    def gain(self, R: ArrayLike) -> Array:
        """Largest change (...) of the vector per radian of attitude change: (t/2)/sin(t/2), from 1 to pi/2.

        Across the axis; along it the ratio is 1. The jump at half a turn is not a matter of gain.
        """
        half = np.linalg.norm(rotation_vector(R), axis=-1) / 2.0
        return 1.0 / np.sinc(half / np.pi)


def _triad(ahead: Array, up: Array) -> Array:
    """Matrix (..., 3, 3) with columns ahead, up x ahead, up."""
    return np.stack([ahead, np.cross(up, ahead), up], axis=-1)


def _require_right_angle(one: ArrayLike, two: ArrayLike, what: str) -> None:
    cosine = float(np.dot(np.asarray(one), np.asarray(two)))
    if abs(cosine) > _RIGHT_ANGLE:
        raise AttitudeError(
            f"{what} are not at right angles: {np.degrees(np.arccos(np.clip(cosine, -1, 1))):.6g} deg",
            remedy="give perpendicular directions",
        )
