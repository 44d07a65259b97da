"""What a mount is and how it differs from its drawing: boresight and clocking errors apart, everything in
words.

Letters: `b` host (body), `s` sensor as found, `n` the sensor's seat as drawn (nominal). R_bs and R_bn take
components to the host; the misalignment R_ns = R_bn' R_bs is stated in the drawn sensor axes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import quaternion_from_matrix, rotation_angle, rotation_vector
from trunnion.attitude.sequences import Sense
from trunnion.errors import HardwareError
from trunnion.hardware.mounts import Mount
from trunnion.hardware.properness import Properness, better_reading, properness
from trunnion.hardware.right_angles import NearestRightAngle, nearest_right_angle
from trunnion.hardware.vectors import Array, angle_between


@dataclass(frozen=True)
class PointingErrors:
    """A misalignment taken apart (rad).

    total: its whole rotation angle. boresight: how far the boresight moved. clocking: the turn about the
    boresight left when the boresight is carried straight back, right-handed, in (-pi, pi]; None when the
    boresight points backwards, where it has no meaning. total obeys cos(total/2) = cos(boresight/2)
    cos(clocking/2).
    """

    total: float
    boresight: float
    clocking: float | None


def pointing_errors(R_bs: ArrayLike, R_bn: ArrayLike, boresight: ArrayLike) -> PointingErrors:
    """Boresight and clocking error of R_bs against the drawing R_bn; `boresight` (3,) unit, sensor
    components.

    Source: the split of a rotation into a turn about a line and the shortest turn that tilts it (common
    practice, no source); the two half-angle formulas follow from the quaternion product.
    """
    R_ns = np.asarray(R_bn, dtype=float).T @ np.asarray(R_bs, dtype=float)
    q = quaternion_from_matrix(R_ns)
    along = float(q[1:] @ np.asarray(boresight, dtype=float))
    scalar = float(q[0])
    clocking = None if np.hypot(scalar, along) < 1e-9 else 2.0 * float(np.arctan2(along, scalar))
    if clocking is not None:
        clocking = float(np.pi - (np.pi - clocking) % (2.0 * np.pi))
    moved = float(angle_between(np.asarray(boresight, dtype=float), R_ns @ np.asarray(boresight, dtype=float)))
    return PointingErrors(float(np.linalg.norm(rotation_vector(R_ns))), moved, clocking)


def pointing_words(R_bs: ArrayLike, host: Frame, sensor_axes: tuple[str, str, str] = ("x", "y", "z")) -> list[str]:
    """Where each sensor axis points in the host, one sentence part an axis: `z points 2.0 deg from up,
    towards aft`.
    """
    R = np.asarray(R_bs, dtype=float)
    return [f"{axis} points {direction_words(R[:, k], host)}" for k, axis in enumerate(sensor_axes)]


def direction_words(direction: ArrayLike, host: Frame) -> str:
    """A direction (3,) as the nearest host axis, the angle from it, and where it leans."""
    v = np.asarray(direction, dtype=float)
    order = np.argsort(-np.abs(v), kind="stable")
    near = host.word(int(order[0]), int(np.sign(v[order[0]])))
    off = np.degrees(np.arctan2(np.hypot(v[order[1]], v[order[2]]), abs(v[order[0]])))
    if off < 1e-7:
        return near
    leans = [(host.word(int(j), int(np.sign(v[j]))), abs(float(v[j]))) for j in order[1:] if abs(v[j]) > 1e-9]
    if len(leans) == 1 or leans[1][1] < 0.02 * leans[0][1]:
        return f"{off:.4g} deg from {near}, towards {leans[0][0]}"
    return f"{off:.4g} deg from {near}, towards {leans[0][0]} and {leans[1][0]}"


@dataclass(frozen=True, eq=False)
class MountCheck:
    """Everything the check of one typed matrix found. `accepted` says whether it may be used as a mount.

    against_drawing and readings (how far the matrix as given, transposed and mirrored is from the drawing,
    Frobenius, nearest first) are there when a drawing was given; better names the reading that fits better
    than the given one.
    """

    properness: Properness
    right_angle: NearestRightAngle | None
    pointing: tuple[str, ...]
    against_drawing: PointingErrors | None
    readings: tuple[tuple[str, float], ...]
    better: str | None

    @property
    def accepted(self) -> bool:
        """A proper rotation, and no other reading of it fits the drawing better."""
        return self.properness.proper and self.better is None


def check_matrix(
    matrix: ArrayLike,
    host: Frame,
    *,
    sensor_axes: tuple[str, str, str] = ("x", "y", "z"),
    drawing: Mount | None = None,
) -> MountCheck:
    """Check a mounting matrix (3, 3), sensor to host, as typed or measured; nothing is refused or repaired
    here.

    With a drawing, its boresight (default the third axis) separates boresight from clocking error.
    """
    M = np.array(matrix, dtype=float)
    measure = properness(M, host, sensor_axes)
    usable = not measure.mirrored and measure.distance < 0.5
    errors = None
    if drawing is not None and usable:
        line = drawing.sensor_direction(drawing.boresight or drawing.sensor_axes[2])
        errors = pointing_errors(measure.nearest, drawing.R_bs, line)
    readings = tuple(better_reading(M, drawing.R_bs)) if drawing is not None else ()
    better = _better(readings)
    return MountCheck(
        measure,
        nearest_right_angle(measure.nearest, host, sensor_axes) if usable else None,
        tuple(pointing_words(measure.nearest, host, sensor_axes)) if usable else (),
        errors,
        readings,
        better,
    )


def _better(readings: tuple[tuple[str, float], ...]) -> str | None:
    if not readings:
        return None
    given = next(away for name, away in readings if name == "as given")
    name, away = readings[0]
    return name if name != "as given" and away < 0.5 * given else None


@dataclass(frozen=True, eq=False)
class NumbersToEnter:
    """What to type into a consuming system: the three angles (rad) of its convention, and how safe they are.

    margin (rad): distance of the mount from the convention's singular attitudes. inverse_separation (rad):
    the error made if the system takes the mount the other way round; fixed_moving_separation (rad): the
    error made if it takes the angles about the other kind of axes.
    """

    convention: Convention
    angles: Array
    margin: float
    singular: bool
    inverse_separation: float
    fixed_moving_separation: float


def numbers_to_enter(mount: Mount, convention: Convention) -> NumbersToEnter:
    """The mount in the consuming system's own convention, whose reference is the host and whose body is the
    sensor.

    `convention.maps_body_to_reference` says which way the system's matrix goes; angles are those of that
    matrix's convention, so they are the same triple either way.
    """
    if convention.reference.axes != mount.host.axes:
        raise HardwareError(
            f"convention '{convention.name}' is relative to '{convention.reference.name}', not to the host "
            f"'{mount.host.name}' of mount '{mount.name}'",
            remedy="the numbers to enter turn host axes into sensor axes",
        )
    found = convention.angles(mount.R_bs)
    angles = np.asarray(found.angles, dtype=float)
    other = _other_kind_of_axes(convention).matrix(angles)
    return NumbersToEnter(
        convention,
        angles,
        float(found.margin),
        bool(found.singular),
        float(rotation_angle(mount.R_bs, mount.R_bs.T)),
        float(rotation_angle(mount.R_bs, other)),
    )


def _other_kind_of_axes(convention: Convention) -> Convention:
    return replace(convention, sense=Sense.FIXED if convention.sense is Sense.MOVING else Sense.MOVING)
