"""What each instrument reads for a given attitude or turn of its host.

Letters: `l` the bench (local level) frame with axes north, east, down; `b` host; `s` sensor. R_lb is the
host's attitude on the bench, R_ls = R_lb R_bs the sensor's. Accelerometer readings in g, gyro in rad/s,
angles in rad.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.frames import Frame
from trunnion.errors import HardwareError
from trunnion.hardware.mounts import Mount, TiltType
from trunnion.hardware.vectors import Array

BENCH: Final = Frame("bench", ("north", "east", "down"))
UP: Final = np.array([0.0, 0.0, -1.0])


def _to_sensor(mount: Mount, R_lb: ArrayLike, v_l: Array) -> Array:
    R_ls = np.asarray(R_lb, dtype=float) @ mount.R_bs
    return np.einsum("...ij,...i->...j", R_ls, np.broadcast_to(v_l, R_ls.shape[:-1]))


def accelerometer(mount: Mount, R_lb: ArrayLike) -> Array:
    """Static reading (..., 3) g of the three sensor axes; the mount must declare what it reports."""
    return mount.reports().sign * _to_sensor(mount, R_lb, UP)


def gyro(mount: Mount, rate_b: ArrayLike) -> Array:
    """Reading (..., 3) rad/s for a turn of the host at `rate_b` (..., 3) rad/s, host components."""
    return np.asarray(rate_b, dtype=float) @ mount.R_bs


def magnetometer(mount: Mount, R_lb: ArrayLike, field_l: ArrayLike) -> Array:
    """Reading (..., 3), unit of `field_l` (3,), the field at the bench in north, east, down."""
    return _to_sensor(mount, R_lb, np.asarray(field_l, dtype=float))


def local_field(*, strength: float, dip: float, declination: float = 0.0) -> Array:
    """Field (3,) in north, east, down from its strength, dip (rad, positive down) and declination (rad,
    east).
    """
    level = strength * np.cos(dip)
    return np.array([level * np.cos(declination), level * np.sin(declination), strength * np.sin(dip)])


def clinometer(mount: Mount, R_lb: ArrayLike) -> Array:
    """The two tilts (..., 2) rad of the mount's tilt axes, positive when the axis rises; nan where undefined.

    Sine type: elevation of each axis on its own. Tangent type: atan2(rise of the axis, rise of the third
    axis), the third taken on the side it points when the host stands at the bench attitude R_lb = identity;
    undefined when both are level.
    """
    if mount.clinometer is None or mount.tilt_axes is None:
        raise HardwareError(
            f"mount '{mount.name}' does not say how its clinometer forms its tilts",
            remedy="declare sine (each axis to the horizontal) or tangent (in the plane with the third "
            "axis), "
            "and the two axes it measures",
        )
    up_s = _to_sensor(mount, R_lb, UP)
    axes = np.array([mount.sensor_direction(word) for word in mount.tilt_axes])
    rise = up_s @ axes.T
    if mount.clinometer is TiltType.SINE:
        return np.arcsin(np.clip(rise, -1.0, 1.0))
    third = np.cross(axes[0], axes[1])
    at_zero = float(_to_sensor(mount, np.eye(3), UP) @ third)
    normal = up_s @ third * (1.0 if at_zero >= 0.0 else -1.0)
    level = np.hypot(rise, normal[..., None]) < 1e-12
    return np.where(level, np.nan, np.arctan2(rise, normal[..., None]))


def boresight_azimuth_elevation(mount: Mount, R_lb: ArrayLike) -> Array:
    """Azimuth (from north through east) and elevation (..., 2) rad of the boresight; azimuth nan at the
    zenith.
    """
    if mount.boresight is None:
        raise HardwareError(
            f"mount '{mount.name}' has no boresight", remedy="name the sensor axis the instrument looks along"
        )
    line = np.asarray(R_lb, dtype=float) @ mount.R_bs @ mount.sensor_direction(mount.boresight)
    level = np.hypot(line[..., 0], line[..., 1])
    azimuth = np.where(level < 1e-9, np.nan, np.arctan2(line[..., 1], line[..., 0]) % (2.0 * np.pi))
    return np.stack([azimuth, np.arctan2(-line[..., 2], level)], axis=-1)


def direction_from_azimuth_elevation(azimuth_elevation: ArrayLike) -> Array:
    """Direction (..., 3) in north, east, down from azimuth (from north through east) and elevation (..., 2) rad."""
    a, e = np.moveaxis(np.asarray(azimuth_elevation, dtype=float), -1, 0)
    return np.stack([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), -np.sin(e)], axis=-1)


def star_tracker(mount: Mount, R_lb: ArrayLike) -> Array:
    """The tracker's own attitude R_ls (..., 3, 3): its axes in the bench frame."""
    return np.asarray(R_lb, dtype=float) @ mount.R_bs
