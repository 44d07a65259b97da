"""Keyholes of two-axis mounts: what the axes reach but cannot follow, apart from what they do not reach at all.

The outer axis of a mount must turn at w / (sin l12 sin V) for a line that moves at w across it; with right angles that
is w / sin m, m the angle between the line and the outer axis. Inside asin(w / limit) it cannot follow.
Sources: the formula is that of the trade; BORKOWSKI-1987 for stars near the zenith. Angles in rad.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import about
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_rates import clearance_needed
from trunnion.hardware.joint_solutions import pointing_solutions, reachable_set
from trunnion.hardware.passes import Pass, directions
from trunnion.hardware.vectors import Array, about_all, unit


@dataclass(frozen=True)
class Keyhole:
    """The two keyholes of a mount, about its outer axis and about the opposite (half angles, rad).

    unreachable_ahead, unreachable_behind: cones no joint angles give. by_rate, by_acceleration: clearance from the
    edge of those cones inside which the outer axis would exceed its limit; pi/2 when the limit never suffices.
    """

    unreachable_ahead: float
    unreachable_behind: float
    by_rate: float
    by_acceleration: float

    @property
    def half_angle(self) -> float:
        """Half angle of the larger keyhole counted from the outer axis, unreachable part included."""
        return max(self.unreachable_ahead, self.unreachable_behind) + max(self.by_rate, self.by_acceleration)


def keyhole(chain: GimbalChain, rate: float, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)) -> Keyhole:
    """Keyholes for a line of sight that moves at up to `rate` (rad/s) across the sky.

    The acceleration limit is judged on great circles past the outer axis at constant rate, for right-angled mounts.
    """
    if not np.isfinite(rate) or rate <= 0.0:
        raise HardwareError(f"a line of sight rate of {rate:g} rad/s", remedy="give a rate above zero")
    reach = reachable_set(chain, boresight_p=boresight_p)
    by_rate = clearance_needed(chain, rate, boresight_p=boresight_p)
    limit = float(chain.limits("acceleration")[0])
    by_acceleration = _by_acceleration(rate, limit) if np.isfinite(limit) else 0.0
    return Keyhole(reach.cone_ahead, reach.cone_behind, by_rate, by_acceleration)


def peak_outer_acceleration(rate: float, miss: float) -> float:
    """Largest acceleration (rad/s^2) of the outer axis while a line passes it at the angle `miss` (rad) at `rate`.

    With k = 1/sin(miss) and x the way along the great circle, the outer angle is atan(k tan x); its second derivative
    k (k^2 - 1) sin 2x / (A - B cos 2x)^2 with A = (1 + k^2)/2, B = (k^2 - 1)/2 is largest at
    cos 2x = (sqrt(A^2 + 8 B^2) - A) / (2 B).
    """
    k = 1.0 / np.sin(miss)
    A, B = (1.0 + k * k) / 2.0, (k * k - 1.0) / 2.0
    if B <= 0.0:
        return 0.0
    c = (np.sqrt(A * A + 8.0 * B * B) - A) / (2.0 * B)
    return float(rate**2 * 2.0 * k * B * np.sqrt(1.0 - c * c) / (A - B * c) ** 2)


def _by_acceleration(rate: float, limit: float) -> float:
    """The miss angle at which the peak acceleration equals the limit; it falls steadily as the miss grows."""
    from scipy.optimize import brentq

    smallest = 1e-9
    if peak_outer_acceleration(rate, smallest) <= limit:
        return 0.0
    return float(brentq(lambda m: peak_outer_acceleration(rate, m) - limit, smallest, np.pi / 2, xtol=1e-14))


def rate_left_on_sky(limit: float, clearance: ArrayLike, tracking: float) -> Array:
    """Scan rate (...) left on the sky when the outer axis also follows the sky at `tracking`: limit sin(m) - tracking.

    m (rad) is the clearance, for azimuth-elevation mounts a quarter turn less the elevation. Negative: cannot follow.
    """
    return limit * np.sin(np.asarray(clearance, dtype=float)) - tracking


@dataclass(frozen=True)
class BlindSpot:
    """Declinations (rad) of stars an azimuth axis loses near the zenith, and the least span in hour angle (rad)."""

    lowest: float
    highest: float
    hour_angle: float


def zenith_blind_spot(latitude: float, speed_ratio: float) -> BlindSpot:
    """Blind spot of an azimuth-elevation mount at `latitude` whose azimuth limit is speed_ratio times the sky's rate.

    Span arctan(2 V cos(lat) / (V^2 - 1)) in declination and at least pi / V in hour angle; edges
    tan(dec) = (V sin(lat) -+ 1) / (V cos(lat)). Source: BORKOWSKI-1987 (edges derived here from its span).
    """
    if speed_ratio <= 1.0:
        raise HardwareError("the azimuth axis is no faster than the sky", remedy="speed ratio above one")
    V = speed_ratio
    edges = [np.arctan2(V * np.sin(latitude) + sign, V * np.cos(latitude)) for sign in (-1.0, 1.0)]
    return BlindSpot(float(edges[0]), float(edges[1]), float(np.pi / V))


@dataclass(frozen=True, eq=False)
class KeyholeMap:
    """A sky map on a grid of azimuth (A,) and elevation (E,): clearance (E, A) rad, largest outer rate over its limit
    (E, A) for the stated line of sight rate, and whether the travel limits reach it (E, A).
    """

    azimuth: Array
    elevation: Array
    clearance: Array
    rate_ratio: Array
    in_travel: NDArray[np.bool_]


def keyhole_map(
    chain: GimbalChain,
    rate: float,
    *,
    azimuths: int = 181,
    elevations: int = 91,
    boresight_p: ArrayLike = (1.0, 0.0, 0.0),
) -> KeyholeMap:
    """Map the sky of a two-axis mount: base axes north, east, down; line of sight rate in rad/s."""
    azimuth, elevation = np.linspace(0.0, 2.0 * np.pi, azimuths), np.linspace(0.0, np.pi / 2, elevations)
    line = directions(azimuth[None, :], elevation[:, None])
    solutions = pointing_solutions(chain, line, boresight_p=boresight_p)
    A = chain.axes_at(solutions.angles[..., 0, :])
    determinant = np.abs(np.einsum("...i,...i->...", A[..., 0], np.cross(A[..., 1], line)))
    across = np.linalg.norm(np.cross(A[..., 1], line), axis=-1)
    with np.errstate(divide="ignore"):
        ratio = rate * across / determinant / chain.limits("rate")[0]
    reachable = solutions.clearance >= -1e-12
    inside = np.zeros(reachable.shape, dtype=bool)
    for branch in range(2):
        inside |= _inside(chain, solutions.angles[..., branch, :])
    return KeyholeMap(azimuth, elevation, solutions.clearance, np.where(reachable, ratio, np.inf), inside & reachable)


def _inside(chain: GimbalChain, angles: Array) -> NDArray[np.bool_]:
    """Whether some whole-turn equivalent of joint angles (..., k) lies inside the travel."""
    ok = np.ones(angles.shape[:-1], dtype=bool)
    for k, (lower, upper) in enumerate(chain.travel):
        if not np.isfinite(upper - lower):
            continue
        turns = np.ceil((lower - 1e-9 - angles[..., k]) / (2.0 * np.pi))
        ok &= angles[..., k] + 2.0 * np.pi * turns <= upper + 1e-9
    return ok


@dataclass(frozen=True, eq=False)
class BaseTilt:
    """A tilt of the base that keeps passes away from the outer axis.

    axis_g (3,): where the outer axis then points; tilt (rad) and towards (rad, azimuth in the base). seconds_over: time
    (s) beyond the outer rate limit over all passes, before and after; clearance: least angle (rad), before and after.
    """

    axis_g: Array
    tilt: float
    towards: float
    seconds_over: tuple[float, float]
    clearance: tuple[float, float]


def best_base_tilt(chain: GimbalChain, tracks: Sequence[Pass], *, largest: float, rings: int = 16) -> BaseTilt:
    """The tilt of up to `largest` (rad) with the least time beyond the outer rate limit, then the largest clearance.

    For right-angled mounts. Tilts are searched on `rings` rings of directions about the outer axis and refined once
    around the best: a sampled search, so the tilt is good, not proven best.
    """
    if not 0.0 < largest <= np.pi / 2:
        raise HardwareError("the largest base tilt must lie above 0 and at most 90 deg")
    b = np.concatenate([track.direction_g for track in tracks])
    moment = np.concatenate([np.cross(track.direction_g, track.change_g) for track in tracks])
    weight = np.concatenate([np.gradient(track.times) for track in tracks])
    limit = float(chain.limits("rate")[0])
    axis = chain.joints[0].axis
    near = _within_reach(axis, b, moment, limit, largest)
    fits = (b[near], moment[near], weight[near], limit)
    candidates = _cap(axis, axis, largest, rings)
    best = candidates[_best(_score(candidates, *fits))]
    fine = _cap(axis, best, largest / rings, 8)
    fine = np.concatenate([best[None], fine[fine @ axis >= np.cos(largest) - 1e-12]])
    chosen = fine[_best(_score(fine, *fits))]
    seconds, clearance = _score(np.array([axis, chosen]), b, moment, weight, limit)
    tilt = float(np.arctan2(np.linalg.norm(np.cross(axis, chosen)), axis @ chosen))
    up = -chosen if axis[2] > 0 else chosen
    return BaseTilt(
        chosen,
        tilt,
        float(np.arctan2(up[1], up[0]) % (2.0 * np.pi)),
        (float(seconds[0]), float(seconds[1])),
        (float(clearance[0]), float(clearance[1])),
    )


def _within_reach(axis: Array, b: Array, moment: Array, limit: float, largest: float) -> NDArray[np.bool_]:
    """The samples that can enter the keyhole of some allowed tilt; when there are none, the nearest one alone.

    The outer rate is at most the line's own rate over the sine of its angle to the axis.
    """
    away = np.arcsin(np.clip(np.linalg.norm(np.cross(b, axis), axis=1), 0.0, 1.0))
    needed = np.arcsin(np.clip(np.linalg.norm(moment, axis=1) / limit, 0.0, 1.0))
    near = away <= largest + needed
    return near if near.any() else away == np.min(away)


def _cap(axis: Array, centre: Array, radius: float, rings: int) -> Array:
    """Directions (M, 3) on rings about `centre` out to `radius`, the centre first."""
    found = [centre[None]]
    for k in range(1, rings + 1):
        r = radius * k / rings
        count = max(6, int(np.ceil(2.0 * np.pi * np.sin(r) / (radius / rings))))
        found.append(about_all(centre, r, count))
    return np.concatenate(found)


def _score(axes: Array, b: Array, moment: Array, weight: Array, limit: float) -> tuple[Array, Array]:
    """Seconds beyond the limit and least clearance (rad) for each candidate outer axis (M, 3)."""
    seconds, clearance = np.empty(len(axes)), np.empty(len(axes))
    for start in range(0, len(axes), 64):
        part = axes[start : start + 64]
        along = part @ b.T
        across = np.maximum(1.0 - along**2, 1e-300)
        rate = np.abs(part @ moment.T) / across
        seconds[start : start + 64] = (rate > limit) @ weight
        clearance[start : start + 64] = np.arcsin(np.sqrt(np.min(across, axis=1)))
    return seconds, clearance


def _best(score: tuple[Array, Array]) -> int:
    seconds, clearance = score
    return int(np.lexsort((-clearance, seconds))[0])


def tilted(chain: GimbalChain, tilt: BaseTilt) -> GimbalChain:
    """The same mount on the tilted base: every axis and the zero attitude turned by the shortest tilt."""
    axis = chain.joints[0].axis
    cross = np.cross(axis, tilt.axis_g)
    R = np.eye(3) if np.linalg.norm(cross) < 1e-15 else about(unit(cross), tilt.tilt)
    joints = tuple(replace(joint, axis=R @ joint.axis) for joint in chain.joints)
    return replace(chain, joints=joints, R_gp0=R @ chain.R_gp0)
