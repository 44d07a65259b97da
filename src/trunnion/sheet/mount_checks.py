"""Checks of a mount and of its bench readings by scipy's rotations, from the plain words of the parameters."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from trunnion.hardware.bench import BenchTable
from trunnion.hardware.mounts import Mount
from trunnion.sheet import display, independent

MATRIX_TOLERANCE_DEG = 1e-6
READING_TOLERANCE = 1e-9


def check_mount(mount: Mount, plain: Mapping[str, Any]) -> None:
    """The mount rebuilt by scipy from its words, against the matrix in use (rotation angle between both)."""
    from scipy.spatial.transform import Rotation

    theirs = _rebuilt(mount, plain)
    if theirs is None:
        return
    apart = (Rotation.from_matrix(mount.R_bs).inv() * theirs).magnitude()
    display.check(
        f"check:{mount.name}:matrix",
        f"mount of {mount.name} rebuilt from its statement",
        ours=0.0,
        theirs=float(np.degrees(apart)),
        tolerance=MATRIX_TOLERANCE_DEG,
        unit="deg",
        library=independent.LIBRARY,
    )


def _rebuilt(mount: Mount, plain: Mapping[str, Any]) -> Any:
    """The mount by scipy: from axis words by aligning named directions, from a quaternion or a matrix directly."""
    from scipy.spatial.transform import Rotation

    if "axes" in plain:
        names = list(plain["axes"])
        seen = np.array([np.eye(3)[mount.sensor_axes.index(name)] for name in names])
        known = np.array([mount.host.direction(plain["axes"][name]) for name in names])
        return Rotation.align_vectors(known, seen)[0]
    if "matrix" in plain:
        found = Rotation.from_matrix(np.array(plain["matrix"], dtype=float))
        return found.inv() if _to_sensor(mount, plain) else found
    if "quaternion" in plain:
        numbers = [float(number) for number in plain["quaternion"]]
        last = numbers if plain.get("scalar") == "last" else [*numbers[1:], numbers[0]]
        found = Rotation.from_quat(last)
        return found.inv() if _to_sensor(mount, plain) else found
    return None


def _to_sensor(mount: Mount, plain: Mapping[str, Any]) -> bool:
    """True when the stated map takes host components to the sensor's."""
    return str(plain.get("maps", "")).startswith(f"{mount.host.name} to ")


def check_readings(table: BenchTable) -> None:
    """Expected accelerometer and gyro readings against scipy: the bench's up, or the turn, seen by the sensor."""
    from scipy.spatial.transform import Rotation

    mount = table.mount
    sensor = Rotation.from_matrix(mount.R_bs)
    up = np.array([0.0, 0.0, -1.0])  # the bench frame is north, east, down
    if table.expected.accelerometer is not None:
        poses = Rotation.from_matrix(np.array([pose.R_lb for pose in table.poses])) * sensor
        reported = mount.reports().sign * poses.inv().apply(up)
        _check_array(
            f"check:{mount.name}:accelerometer", "accelerometer readings", table.expected.accelerometer, reported, "g"
        )
    if table.expected.gyro is not None:
        turned = sensor.inv().apply(np.array([turn.rate_b for turn in table.turns]))
        _check_array(f"check:{mount.name}:gyro", "gyro readings", table.expected.gyro, turned, "rad/s")


def _check_array(identity: str, what: str, ours: Any, theirs: Any, unit: str) -> None:
    """One check of a whole table of readings: its largest entries and the largest difference of any entry."""
    display.check(
        identity,
        f"{what}, all rows",
        ours=float(np.max(np.abs(ours))),
        theirs=float(np.max(np.abs(theirs))),
        difference=float(np.max(np.abs(np.asarray(ours) - np.asarray(theirs)))),
        tolerance=READING_TOLERANCE,
        unit=unit,
        library=independent.LIBRARY,
    )
