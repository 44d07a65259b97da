"""Mounts: a fixed rotation from a sensor to its host, stated in whatever way the drawing states it.

Letters: `b` host (body), `s` sensor. `R_bs` takes sensor components to host components, v_b = R_bs v_s: its
columns say where each sensor axis points in the host. With the host's attitude R_rb the sensor's own is R_rs
= R_rb R_bs.
"""

from __future__ import annotations

import enum
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import about, matrix_from_quaternion, quaternion_from_matrix
from trunnion.attitude.sequences import Sense
from trunnion.errors import AttitudeError, HardwareError
from trunnion.hardware.limits import PARALLEL
from trunnion.hardware.properness import require_proper
from trunnion.hardware.vectors import Array, angle_between, unit


class Reports(enum.Enum):
    """What an accelerometer says at rest. Undeclared is an error wherever its readings are used."""

    SPECIFIC_FORCE = "specific force"
    GRAVITY = "gravity"

    @property
    def sign(self) -> float:
        """Reading (g) of an axis that points up, level and at rest: +1 for specific force, -1 for gravity."""
        return 1.0 if self is Reports.SPECIFIC_FORCE else -1.0


class TiltType(enum.Enum):
    """How a clinometer forms its two tilts from the two sensor axes it measures."""

    SINE = "sine"  # elevation of each axis above the horizontal, on its own
    TANGENT = "tangent"  # angle in the plane of that axis and the third axis


class Instrument(enum.Enum):
    """What is inside the box that is mounted; decides the columns of the bench table."""

    ACCELEROMETER = "accelerometer"
    GYRO = "gyro"
    CLINOMETER = "clinometer"
    MAGNETOMETER = "magnetometer"
    STAR_TRACKER = "star tracker"
    CAMERA = "camera"


@dataclass(frozen=True, eq=False)
class MountTolerance:
    """How well the mount is known. Any of three statements, or none.

    per_axis: bounds (rad, >= 0) of the turns about the sensor axes, read as the components of one rotation
    vector or as three turns made in any order. total: bound (rad) of the whole rotation. covariance: (3, 3)
    rad^2 of the small turn in sensor axes.
    """

    per_axis: tuple[float, float, float] | None = None
    total: float | None = None
    covariance: Array | None = None

    def __post_init__(self) -> None:
        bounds = [*(self.per_axis or ()), *([] if self.total is None else [self.total])]
        if any(not np.isfinite(b) or b < 0.0 for b in bounds):
            raise HardwareError("a mount tolerance is negative or not finite", remedy="bounds are angles >= 0")
        if self.covariance is not None:
            C = np.asarray(self.covariance, dtype=float)
            if C.shape != (3, 3) or np.max(np.abs(C - C.T)) > 1e-12 * np.max(np.abs(C)):
                raise HardwareError("the mount covariance is not a symmetric (3, 3) table", remedy="rad^2, sensor axes")
            if np.min(np.linalg.eigvalsh(C)) < -1e-12 * np.max(np.abs(C)):
                raise HardwareError(
                    "the mount covariance has a negative variance along some direction",
                    remedy="check signs and units of its off-diagonal entries",
                )

    @property
    def largest_turn(self) -> float | None:
        """Certified bound (rad) of the whole misalignment, or None when only a covariance or nothing is
        stated.

        Three turns a, b, c about square axes make, in any order, a turn t with cos(t/2) at least
        cos a/2 cos b/2 cos c/2 - sin a/2 sin b/2 sin c/2; components of one rotation vector make at most
        their root sum square. The larger of the two is promised.
        """
        known = [self.total] if self.total is not None else []
        if self.per_axis is not None:
            half = np.minimum(np.array(self.per_axis), np.pi) / 2.0
            product = float(np.clip(np.prod(np.cos(half)) - np.prod(np.sin(half)), -1.0, 1.0))
            known.append(min(np.pi, max(2.0 * np.arccos(product), float(np.linalg.norm(self.per_axis)))))
        return min(known) if known else None


@dataclass(frozen=True, eq=False)
class Mount:
    """A sensor bolted to a host.

    sensor_axes: the names the sensor's maker gives its axes. boresight: one of them, with a sign if need be.
    instruments: what is inside; accelerometer: what it reports at rest. clinometer: how its two tilts are
    formed; tilt_axes: which two sensor axes. angles_as: the convention in which the sensor states its own
    attitude. enter_as: the convention in which the consuming system takes the mount. stated_as: how the
    drawing states it, for display.
    """

    name: str
    host: Frame
    R_bs: Array
    sensor_axes: tuple[str, str, str] = ("x", "y", "z")
    boresight: str | None = None
    tolerance: MountTolerance = field(default_factory=MountTolerance)
    accelerometer: Reports | None = None
    instruments: tuple[Instrument, ...] = (Instrument.ACCELEROMETER, Instrument.GYRO)
    clinometer: TiltType | None = None
    tilt_axes: tuple[str, str] | None = None
    angles_as: Convention | None = None
    enter_as: Convention | None = None
    stated_as: str = "matrix"
    typed: Array | None = None
    stated_angles: tuple[Array, Convention] | None = None

    def __post_init__(self) -> None:
        if len(set(self.sensor_axes)) != 3:
            raise HardwareError(f"mount '{self.name}' names a sensor axis twice: {', '.join(self.sensor_axes)}")
        R, _ = require_proper(self.R_bs, self.host, self.sensor_axes, what=f"the matrix of mount '{self.name}'")
        object.__setattr__(self, "R_bs", R)
        if self.boresight is not None:
            self.sensor_direction(self.boresight)

    def sensor_direction(self, word: str) -> Array:
        """Unit vector (3,) in sensor components of a named sensor axis, `-` in front for its opposite."""
        name, sign = (word[1:], -1.0) if word.startswith("-") else (word.lstrip("+"), 1.0)
        if name not in self.sensor_axes:
            raise HardwareError(
                f"mount '{self.name}' has no sensor axis '{word}'",
                remedy=f"its axes are {', '.join(self.sensor_axes)}, each with an optional minus sign",
            )
        return sign * np.eye(3)[self.sensor_axes.index(name)]

    @property
    def boresight_in_host(self) -> Array | None:
        """Boresight as a unit vector (3,) in host components, or None."""
        return None if self.boresight is None else self.R_bs @ self.sensor_direction(self.boresight)

    def reports(self) -> Reports:
        """What the accelerometer reports; HardwareError when the mount does not say."""
        if self.accelerometer is None:
            raise HardwareError(
                f"mount '{self.name}' does not say what its accelerometer reports at rest",
                remedy="declare `specific force` (an axis that points up reads +1 g) or `gravity` (it reads -1 g)",
            )
        return self.accelerometer


def sensor_attitude(mount: Mount, R_rb: ArrayLike) -> Array:
    """The sensor's own attitude R_rs (..., 3, 3) from the host's R_rb (..., 3, 3)."""
    return np.asarray(R_rb, dtype=float) @ mount.R_bs


def mount_from_axes(axes: Mapping[str, str], host: Frame, *, name: str = "mount", **details: Any) -> Mount:
    """A mount as axis words: `{x: up, y: starboard, z: forward}`, each sensor axis and where it points in
    the host.

    Two axes are enough (the third is completed right-handed); a mirrored set is refused with the single
    changes that would cure it. Details go to `Mount`.
    """
    names = details.pop("sensor_axes", None) or _sensor_axes(tuple(axes))
    unknown = [key for key in axes if key not in names]
    if unknown:
        raise HardwareError(
            f"mount '{name}' has no sensor axis '{unknown[0]}'", remedy=f"its axes are {', '.join(names)}"
        )
    if len(axes) < 2:
        raise HardwareError(
            f"mount '{name}' says where only {len(axes)} of its axes points",
            remedy="name two or three axes: one leaves the turn about it open",
        )
    try:
        columns = {names.index(key): host.direction(word) for key, word in axes.items()}
    except AttitudeError as err:
        raise HardwareError(f"mount '{name}': {err.fault.cause}", remedy=err.fault.remedy) from err
    _require_different_lines(columns, axes, names, name)
    if len(columns) == 2:
        missing = ({0, 1, 2} - set(columns)).pop()
        columns[missing] = np.cross(columns[(missing + 1) % 3], columns[(missing + 2) % 3])
    M = np.column_stack([columns[k] for k in range(3)])
    require_proper(M, host, names, what=f"mount '{name}' ({_said(axes)})")
    return Mount(name, host, M, names, stated_as=f"axes {_said(axes)}", typed=M, **details)


def _sensor_axes(keys: tuple[str, ...]) -> tuple[str, str, str]:
    if len(keys) == 3 and not set(keys) <= {"x", "y", "z"}:
        return keys[0], keys[1], keys[2]
    return "x", "y", "z"


def _said(axes: Mapping[str, str]) -> str:
    return ", ".join(f"{key}: {word}" for key, word in axes.items())


def _require_different_lines(
    columns: dict[int, Array], axes: Mapping[str, str], names: tuple[str, str, str], mount: str
) -> None:
    taken: dict[int, str] = {}
    for k, column in columns.items():
        line = int(np.argmax(np.abs(column)))
        if line in taken:
            raise HardwareError(
                f"mount '{mount}' puts sensor axes {taken[line]} and {names[k]} along one line of the host "
                f"({axes[taken[line]]} and {axes[names[k]]})",
                remedy="two axes of a sensor are square to each other: give each its own line",
            )
        taken[line] = names[k]


def mount_from_matrix(
    matrix: ArrayLike,
    host: Frame,
    *,
    name: str = "mount",
    maps_sensor_to_host: bool = True,
    digits: int | None = None,
    **details: Any,
) -> Mount:
    """A mount from nine entries (3, 3), rows of the table as printed.

    maps_sensor_to_host: v_host = M v_sensor (columns are sensor axes in the host); False when the source's
    matrix goes the other way. digits: decimals printed, for a source that rounds. Refuses mirrors and
    non-rotations.
    """
    axes = details.get("sensor_axes", ("x", "y", "z"))
    M = np.array(matrix, dtype=float)
    toward = M if maps_sensor_to_host else M.T
    R, _ = require_proper(toward, host, axes, digits=digits, what=f"the matrix of mount '{name}'")
    way = "sensor to host" if maps_sensor_to_host else "host to sensor"
    return Mount(name, host, R, stated_as=f"matrix, {way}", typed=M, **details)


def mount_from_quaternion(
    quaternion_bs: ArrayLike,
    host: Frame,
    *,
    scalar_first: bool,
    name: str = "mount",
    maps_sensor_to_host: bool = True,
    norm_tolerance: float = 1e-6,
    **details: Any,
) -> Mount:
    """A mount from a quaternion (4,). Where the scalar stands and which way it maps must be said by the
    caller.

    A norm further from 1 than `norm_tolerance` is an error that states the norm.
    """
    q = np.asarray(quaternion_bs, dtype=float)
    if q.shape != (4,) or not np.all(np.isfinite(q)):
        raise HardwareError(f"the quaternion of mount '{name}' is not four finite numbers")
    norm = float(np.linalg.norm(q))
    if abs(norm - 1.0) > norm_tolerance:
        raise HardwareError(
            f"the quaternion of mount '{name}' has norm {norm:.9g}, {abs(norm - 1):.3g} from 1",
            remedy="check for a lost sign or a mistyped digit, or state how many digits the source prints",
        )
    R = matrix_from_quaternion((q if scalar_first else np.roll(q, 1)) / norm)
    order = "scalar first" if scalar_first else "scalar last"
    way = "sensor to host" if maps_sensor_to_host else "host to sensor"
    toward = R if maps_sensor_to_host else R.T
    return Mount(name, host, toward, stated_as=f"quaternion, {order}, {way}", typed=q, **details)


def mount_from_angles(
    angles: ArrayLike, convention: Convention, host: Frame, *, name: str = "mount", **details: Any
) -> Mount:
    """A mount from three stated angles (rad) in a convention whose reference is the host and whose body is
    the sensor.
    """
    if convention.reference.axes != host.axes:
        raise HardwareError(
            f"mount '{name}' takes its angles in convention '{convention.name}', whose reference is "
            f"'{convention.reference.name}', not the host '{host.name}'",
            remedy="mount angles turn the host's axes into the sensor's: state them relative to the host",
        )
    a = np.asarray(angles, dtype=float)
    if a.shape != (3,) or not np.all(np.isfinite(a)):
        raise HardwareError(f"the angles of mount '{name}' are not three finite numbers")
    R = convention.matrix(a)
    said = ", ".join(f"{n} {np.degrees(v):g} deg" for n, v in zip(convention.angle_names, a, strict=True))
    way = f"angles {convention.sequence.value} about {convention.sense.value}: {said}"
    return Mount(name, host, R, stated_as=way, typed=a, stated_angles=(a, convention), **details)


def mount_from_turns(
    turns: Sequence[tuple[str, float]], sense: Sense, host: Frame, *, name: str = "mount", **details: Any
) -> Mount:
    """A mount from turns said one after the other: `[("starboard", pi), ("down", pi / 2)]`, axis word and angle (rad).

    The sensor starts aligned with the host. Sense.FIXED: every turn is about the host's own axis; Sense.MOVING: about
    the axis of that name as the sensor carries it by then. The two differ, and nothing in the words says which.
    """
    R = np.eye(3)
    for axis, angle in turns:
        step = about(host.direction(axis), angle)
        R = step @ R if sense is Sense.FIXED else R @ step
    said = " then ".join(f"{axis} {np.degrees(angle):g} deg" for axis, angle in turns)
    return Mount(name, host, R, stated_as=f"turns about {sense.value}: {said}", **details)


@dataclass(frozen=True)
class TwoDirections:
    """How well two measured direction pairs fit each other (rad): their angles in both frames and the
    difference.
    """

    angle_in_sensor: float
    angle_in_host: float

    @property
    def disagreement(self) -> float:
        """Difference of the two angles; a rotation cannot change an angle, so this is measurement error."""
        return self.angle_in_sensor - self.angle_in_host


def mount_from_directions(
    in_sensor: ArrayLike, in_host: ArrayLike, host: Frame, *, name: str = "mount", **details: Any
) -> tuple[Mount, TwoDirections]:
    """A mount from two directions seen in both frames, (2, 3) each; the first pair is met exactly.

    Refuses pairs nearer to parallel than `limits.PARALLEL`. Source: TRIAD (SHUSTER-OH-1981).
    """
    s = unit(np.asarray(in_sensor, dtype=float), f"a measured direction of mount '{name}'")
    b = unit(np.asarray(in_host, dtype=float), f"a measured direction of mount '{name}'")
    if s.shape != (2, 3) or b.shape != (2, 3):
        raise HardwareError(
            f"mount '{name}' needs two directions in both frames, got {s.shape[0]} and {b.shape[0]}",
            remedy="use an alignment survey for more than two",
        )
    pair = TwoDirections(float(angle_between(s[0], s[1])), float(angle_between(b[0], b[1])))
    for where, angle in (("sensor", pair.angle_in_sensor), ("host", pair.angle_in_host)):
        if min(angle, np.pi - angle) < PARALLEL:
            raise HardwareError(
                f"the two directions of mount '{name}' are {np.degrees(min(angle, np.pi - angle)):.3g} deg "
                "from "
                f"parallel in the {where}: the turn about their common line is open",
                remedy="measure a second direction well away from the first, best square to it",
            )
    R = _triad(b) @ _triad(s).T
    return Mount(name, host, R, stated_as="two measured directions", **details), pair


def _triad(pair: Array) -> Array:
    normal = unit(np.cross(pair[0], pair[1]))
    return np.column_stack([pair[0], normal, np.cross(pair[0], normal)])


def mount_quaternion(mount: Mount) -> Array:
    """The mount as a quaternion (4,), scalar first, sensor components to host components, scalar >= 0."""
    return quaternion_from_matrix(mount.R_bs)
