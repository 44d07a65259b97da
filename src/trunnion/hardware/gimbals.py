"""Gimbal chains: two to four revolute axes in any directions, with travel, rate and acceleration limits.

Letters: `g` the base the outermost axis is fixed in, `p` the payload or platform. Axes n1, n2, … are unit vectors in
base components, given at zero joint angles, outermost first:

    R_gp = Rot(n1, t1) Rot(n2, t2) ... R_gp0         (v_g = R_gp v_p; R_gp0 the payload at zero angles)

All angles in rad. Joint angles are counted without wrapping: travel beyond a whole turn means what it says.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.rotations import about, require_rotation
from trunnion.errors import HardwareError
from trunnion.hardware.limits import PARALLEL
from trunnion.hardware.vectors import Array, angle_between, unit


@dataclass(frozen=True, eq=False)
class Joint:
    """One revolute axis.

    axis (3,) in base components at zero angles; travel (lower, upper) rad holding zero, infinite when it turns on;
    rate (rad/s) and acceleration (rad/s^2) limits or None; encoder_step (rad) or None.
    """

    name: str
    axis: Array
    travel: tuple[float, float] = (-np.inf, np.inf)
    rate: float | None = None
    acceleration: float | None = None
    encoder_step: float | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "axis", unit(self.axis, f"the axis of joint '{self.name}'"))
        lower, upper = self.travel
        if not lower < upper:
            raise HardwareError(
                f"joint '{self.name}' travels from {np.degrees(lower):g} to {np.degrees(upper):g} deg",
                remedy="lower limit first, and a range wider than zero",
            )
        if not lower <= 0.0 <= upper:
            raise HardwareError(
                f"the travel of joint '{self.name}' ({np.degrees(lower):g} to {np.degrees(upper):g} deg) excludes "
                "zero, "
                "where the axes are stated",
                remedy="state the axes at a position inside the travel, and count the angles from there",
            )
        for name in ("rate", "acceleration", "encoder_step"):
            value = getattr(self, name)
            if value is not None and not (np.isfinite(value) and value > 0.0):
                raise HardwareError(
                    f"the {name.replace('_', ' ')} of joint '{self.name}' is {value:g}",
                    remedy="give a number above zero, or leave it out when there is no limit",
                )


@dataclass(frozen=True, eq=False)
class GimbalChain:
    """Two to four joints, outermost first, and the payload's attitude R_gp0 at zero angles."""

    name: str
    joints: tuple[Joint, ...]
    R_gp0: Array = field(default_factory=lambda: np.eye(3))

    def __post_init__(self) -> None:
        if not 2 <= len(self.joints) <= 4:
            raise HardwareError(f"chain '{self.name}' has {len(self.joints)} axes", remedy="two, three or four")
        names = [joint.name for joint in self.joints]
        if len(set(names)) < len(names):
            raise HardwareError(f"chain '{self.name}' names a joint twice: {', '.join(names)}")
        object.__setattr__(self, "R_gp0", require_rotation(self.R_gp0, f"the zero attitude of chain '{self.name}'"))
        for one, other in zip(self.joints[:-1], self.joints[1:], strict=True):
            angle = float(angle_between(one.axis, other.axis))
            if min(angle, np.pi - angle) < PARALLEL:
                raise HardwareError(
                    f"axes '{one.name}' and '{other.name}' of chain '{self.name}' are "
                    f"{np.degrees(min(angle, np.pi - angle)):.3g} deg from parallel: they turn about one line",
                    remedy="neighbouring axes must cross at an angle, best a right one",
                )

    @property
    def axes(self) -> Array:
        """The axes (k, 3) in base components at zero angles, outermost first."""
        return np.array([joint.axis for joint in self.joints])

    @property
    def neighbour_angles(self) -> Array:
        """Angles (k-1,) rad between neighbouring axes."""
        axes = self.axes
        return angle_between(axes[:-1], axes[1:])

    @property
    def travel(self) -> Array:
        """Travel limits (k, 2) rad."""
        return np.array([joint.travel for joint in self.joints])

    def limits(self, kind: str) -> Array:
        """The `rate` or `acceleration` limits (k,), infinite where none is stated."""
        return np.array([getattr(j, kind) if getattr(j, kind) is not None else np.inf for j in self.joints])

    def attitude(self, angles: ArrayLike) -> Array:
        """R_gp (..., 3, 3) at joint angles (..., k) rad."""
        return self.product(angles) @ self.R_gp0

    def product(self, angles: ArrayLike) -> Array:
        """Rot(n1, t1) … Rot(nk, tk) (..., 3, 3) at joint angles (..., k) rad."""
        t = self._angles(angles)
        R = about(self.joints[0].axis, t[..., 0])
        for k, joint in enumerate(self.joints[1:], start=1):
            R = R @ about(joint.axis, t[..., k])
        return R

    def axes_at(self, angles: ArrayLike) -> Array:
        """Present directions (..., 3, k) of the axes in base components, as columns: the matrix of joint rates.

        The payload turns against the base at w_gp_g = axes_at(angles) @ joint rates.
        """
        t = self._angles(angles)
        R = np.broadcast_to(np.eye(3), (*t.shape[:-1], 3, 3))
        columns = []
        for k, joint in enumerate(self.joints):
            columns.append(R @ joint.axis)
            R = R @ about(joint.axis, t[..., k])
        return np.stack(columns, axis=-1)

    def _angles(self, angles: ArrayLike) -> Array:
        t = np.asarray(angles, dtype=float)
        if t.shape[-1:] != (len(self.joints),):
            raise HardwareError(
                f"chain '{self.name}' takes {len(self.joints)} joint angles, got shape {t.shape}",
                remedy="(..., number of axes) rad, outermost first",
            )
        return t


_FORWARD, _STARBOARD, _DOWN = np.eye(3)


def azimuth_elevation_chain(
    *,
    name: str = "azimuth-elevation",
    azimuth: tuple[float, float] = (-np.inf, np.inf),
    elevation: tuple[float, float] = (0.0, np.pi / 2),
    rates: tuple[float | None, float | None] = (None, None),
    accelerations: tuple[float | None, float | None] = (None, None),
    base: ArrayLike | None = None,
) -> GimbalChain:
    """Azimuth below elevation, boresight along x at zero, on a base with axes north (or forward), east, down.

    Azimuth grows from north through east, elevation upwards. base (3, 3): turns the whole mount (a tilted base).
    """
    R = np.eye(3) if base is None else require_rotation(base, "the base tilt")
    joints = (
        Joint("azimuth", R @ _DOWN, azimuth, rates[0], accelerations[0]),
        Joint("elevation", R @ _STARBOARD, elevation, rates[1], accelerations[1]),
    )
    return GimbalChain(name, joints, R)


def x_y_chain(
    *,
    name: str = "X-Y",
    travel: tuple[tuple[float, float], tuple[float, float]] = ((-np.pi / 2, np.pi / 2),) * 2,
    rates: tuple[float | None, float | None] = (None, None),
    accelerations: tuple[float | None, float | None] = (None, None),
) -> GimbalChain:
    """Lower axis level along north, upper axis across it; the boresight, payload x, points up at zero.

    Its keyholes lie on the horizon to the north and south, away from overhead passes.
    """
    joints = (
        Joint("X", _FORWARD, travel[0], rates[0], accelerations[0]),
        Joint("Y", _STARBOARD, travel[1], rates[1], accelerations[1]),
    )
    up = np.column_stack([-_DOWN, _STARBOARD, _FORWARD])
    return GimbalChain(name, joints, up)
