"""Passes over a pointing mount: where a target goes, what it demands of the axes, and what is lost near the keyhole.

Letters: `g` the mount's base with axes north, east, down unless the caller says otherwise. Angles in rad, times in s.
A pass is a record of directions; between its samples the target is taken to move on a great circle.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import require_rotation
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_rates import pointing_rates
from trunnion.hardware.joint_solutions import Solutions, pointing_solutions
from trunnion.hardware.travel import TravelPlan, plan_travel
from trunnion.hardware.vectors import Array, angle_between, unit


def directions(azimuth: ArrayLike, elevation: ArrayLike) -> Array:
    """Unit vectors (..., 3) in north, east, down from azimuth (north through east) and elevation (up)."""
    a, e = np.broadcast_arrays(np.asarray(azimuth, dtype=float), np.asarray(elevation, dtype=float))
    return np.stack([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), -np.sin(e)], axis=-1)


def azimuth_elevation(direction_g: ArrayLike) -> tuple[Array, Array]:
    """Azimuth in [0, 2 pi) and elevation of directions (..., 3) in north, east, down."""
    v = np.asarray(direction_g, dtype=float)
    return np.arctan2(v[..., 1], v[..., 0]) % (2.0 * np.pi), np.arctan2(-v[..., 2], np.hypot(v[..., 0], v[..., 1]))


@dataclass(frozen=True, eq=False)
class Pass:
    """One pass: times (N,) s advancing, directions (N, 3) in base components, and their rates of change (N, 3) 1/s."""

    name: str
    times: Array
    direction_g: Array
    change_g: Array

    def __post_init__(self) -> None:
        t = np.asarray(self.times, dtype=float)
        v = unit(self.direction_g, f"a direction of pass '{self.name}'")
        if t.ndim != 1 or len(t) != len(v) or len(t) < 3:
            raise HardwareError(
                f"pass '{self.name}' has {t.size} times and {len(v)} directions", remedy="three or more"
            )
        if np.any(np.diff(t) <= 0.0):
            where = int(np.flatnonzero(np.diff(t) <= 0.0)[0])
            raise HardwareError(f"pass '{self.name}': time does not advance after sample {where}")
        object.__setattr__(self, "times", t)
        object.__setattr__(self, "direction_g", v)

    @property
    def line_of_sight_rate(self) -> Array:
        """Angular rate (N,) rad/s of the target across the sky."""
        return np.linalg.norm(self.change_g, axis=1)

    @property
    def highest(self) -> float:
        """Highest elevation (rad) among the samples."""
        return float(np.max(azimuth_elevation(self.direction_g)[1]))


def _differentiated(t: Array, v: Array) -> Array:
    """Second-order differences of unit vectors, made square to them."""
    change = np.gradient(v, t, axis=0, edge_order=2)
    return change - np.sum(change * v, axis=1, keepdims=True) * v


def pass_from_table(name: str, times: ArrayLike, azimuth: ArrayLike, elevation: ArrayLike) -> Pass:
    """A pass from a table of time (s), azimuth and elevation (rad)."""
    return pass_from_directions(name, times, directions(azimuth, elevation))


def pass_from_directions(name: str, times: ArrayLike, direction_g: ArrayLike) -> Pass:
    """A pass from times (N,) s and directions (N, 3) in base components; rates by second-order differences."""
    t, v = np.asarray(times, dtype=float), unit(direction_g, f"a direction of pass '{name}'")
    if len(t) != len(v) or len(t) < 3 or np.any(np.diff(t) <= 0.0):
        return Pass(name, t, v, np.zeros_like(v))  # refused there with the reason
    return Pass(name, t, v, _differentiated(t, v))


def pass_on_host(track: Pass, R_rg: ArrayLike) -> Pass:
    """The same pass seen from a mount whose base turns with its host: R_rg (N, 3, 3) at the pass's times.

    `track` holds directions in the reference frame (north, east, down); the result holds them in base components, and
    its rates include the host's own turning.
    """
    R = require_rotation(np.asarray(R_rg, dtype=float), "the attitude of the base")
    if R.shape != (len(track.times), 3, 3):
        raise HardwareError(f"pass '{track.name}' has {len(track.times)} samples, the base attitude {R.shape}")
    return pass_from_directions(track.name, track.times, np.einsum("nji,nj->ni", R, track.direction_g))


def circular_pass(
    altitude: float,
    highest: float,
    *,
    planet_radius: float = 6378.137e3,
    gravity: float = 3.986004418e14,
    step: float = 1.0,
    lowest: float = 0.0,
    heading: float = 0.0,
    name: str | None = None,
) -> Pass:
    """A pass on a circular orbit over a sphere that does not turn: altitude (m), highest and lowest elevation (rad).

    The satellite moves towards `heading` (rad) and stays on its right-hand side; gravity in m^3/s^2. Directions and
    their rates are analytic. Good for sizing; use a table for a real pass.
    """
    if not 0.0 <= lowest < highest <= np.pi / 2 or altitude <= 0.0 or step <= 0.0:
        raise HardwareError("a pass needs 0 <= lowest < highest <= 90 deg, an altitude and a step above zero")
    r, R = planet_radius + altitude, planet_radius
    cross_track = ground_angle(altitude, highest, planet_radius=R)
    orbital = float(np.sqrt(gravity / r**3))
    half = float(
        np.arccos(np.clip(np.cos(ground_angle(altitude, lowest, planet_radius=R)) / np.cos(cross_track), -1, 1))
    )
    count = int(np.ceil(half / orbital / step))
    t: Array = step * np.arange(-count, count + 1, dtype=float)
    u = orbital * t
    right, up = np.array([-np.sin(heading), np.cos(heading), 0.0]), np.array([0.0, 0.0, -1.0])
    ahead = np.array([np.cos(heading), np.sin(heading), 0.0])
    plane = np.cos(cross_track) * up + np.sin(cross_track) * right
    place = r * (np.cos(u)[:, None] * plane + np.sin(u)[:, None] * ahead) - R * up
    speed = r * orbital * (-np.sin(u)[:, None] * plane + np.cos(u)[:, None] * ahead)
    distance = np.linalg.norm(place, axis=1, keepdims=True)
    v = place / distance
    change = (speed - np.sum(speed * v, axis=1, keepdims=True) * v) / distance
    return Pass(name or f"{np.degrees(highest):.4g} deg pass", t, v, change)


def ground_angle(altitude: float, elevation: float, *, planet_radius: float = 6378.137e3) -> float:
    """Angle (rad) at the planet's centre between a station and the point below a satellite seen at `elevation`."""
    return float(np.arccos(np.cos(elevation) * planet_radius / (planet_radius + altitude)) - elevation)


def elevation_at(altitude: float, angle: float, *, planet_radius: float = 6378.137e3) -> float:
    """Elevation (rad) of a satellite whose ground point is `angle` (rad) away: the inverse of `ground_angle`."""
    return float(np.arctan2(np.cos(angle) - planet_radius / (planet_radius + altitude), np.sin(angle)))


def highest_pass_followed(
    altitude: float, azimuth_rate: float, *, planet_radius: float = 6378.137e3, gravity: float = 3.986004418e14
) -> float:
    """Highest pass (elevation, rad) an azimuth axis of this rate (rad/s) follows all the way.

    At its top the satellite passes the vertical axis at the ground angle L with azimuth rate n / sin L, n the orbital
    rate (circular orbit, planet not turning).
    """
    n = float(np.sqrt(gravity / (planet_radius + altitude) ** 3))
    if azimuth_rate <= n:
        raise HardwareError(
            f"an azimuth rate of {np.degrees(azimuth_rate):.3g} deg/s is below the orbital rate",
            remedy="no pass is followed all the way",
        )
    return elevation_at(altitude, float(np.arcsin(n / azimuth_rate)), planet_radius=planet_radius)


@dataclass(frozen=True)
class LostTime:
    """Time off target (s) around one demand beyond the outer axis's limits, the axis doing all it can in between.

    flipped: the mount comes back on its other solution (elevation past the top), which is quicker near the zenith.
    """

    start: float
    end: float
    flipped: bool

    @property
    def seconds(self) -> float:
        """Duration off target."""
        return self.end - self.start


@dataclass(frozen=True, eq=False)
class PassAnalysis:
    """What a pass demands of a two-axis mount.

    rates, accelerations (k,): largest demanded. seconds_over_rate, seconds_over_acceleration (k,). lost: intervals off
    target on one branch, the outer axis catching up within its rate and acceleration limits; lost_with_flip: the same
    where the travel lets the mount come back flipped. clearance (rad): least angle to the keyhole's centre line, with
    what may hide between samples taken off. plan: whole turns, stops, unwinding.
    """

    name: str
    highest: float
    rates: Array
    accelerations: Array
    seconds_over_rate: Array
    seconds_over_acceleration: Array
    lost: tuple[LostTime, ...]
    lost_with_flip: tuple[LostTime, ...]
    clearance: float
    plan: TravelPlan

    @property
    def seconds_lost(self) -> float:
        """Time off target (s) with the better of the two ways."""
        one = sum(gap.seconds for gap in self.lost)
        return min(one, sum(gap.seconds for gap in self.lost_with_flip)) if self.lost_with_flip else one


def analyse_pass(chain: GimbalChain, track: Pass, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)) -> PassAnalysis:
    """Rates, accelerations, keyhole loss, stops and unwinding of one pass on a two-axis mount."""
    solutions = pointing_solutions(chain, track.direction_g, boresight_p=boresight_p)
    plan = plan_travel(chain, track.times, solutions)
    branch = plan.segments[0].branch
    angles = np.unwrap(solutions.angles[:, branch], axis=0)
    demanded = pointing_rates(chain, angles, track.direction_g, track.change_g)
    turning = np.gradient(demanded, track.times, axis=0)
    limits, accelerations = chain.limits("rate"), chain.limits("acceleration")
    lost = _lost(track.times, angles[:, 0], demanded[:, 0], turning[:, 0], limits[0], accelerations[0])
    step = angle_between(track.direction_g[1:], track.direction_g[:-1])
    return PassAnalysis(
        track.name,
        track.highest,
        np.max(np.abs(demanded), axis=0),
        np.max(np.abs(turning), axis=0),
        np.array([_seconds_above(track.times, np.abs(demanded[:, k]), limits[k]) for k in range(2)]),
        np.array([_seconds_above(track.times, np.abs(turning[:, k]), accelerations[k]) for k in range(2)]),
        lost,
        _lost_flipping(chain, track, solutions, branch, lost, limits),
        float(np.min(np.minimum(solutions.clearance[1:], solutions.clearance[:-1]) - step / 2.0)),
        plan,
    )


def _seconds_above(t: Array, value: Array, limit: float) -> float:
    """Time (s) during which `value` exceeds `limit`, joined linearly between samples."""
    if not np.isfinite(limit):
        return 0.0
    over = value - limit
    a, b = over[:-1], over[1:]
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where((a > 0) & (b > 0), 1.0, np.where((a <= 0) & (b <= 0), 0.0, np.maximum(a, b) / np.abs(a - b)))
    return float(np.sum(share * np.diff(t)))


def _intervals(mask: NDArray[np.bool_]) -> list[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate([[False], mask, [False]]).astype(int)))
    return [(int(a), int(b) - 1) for a, b in edges.reshape(-1, 2)]


def _lost(
    t: Array, azimuth: Array, demanded: Array, turning: Array, limit: float, acceleration: float
) -> tuple[LostTime, ...]:
    """Shortest intervals around each excess of rate or acceleration over which the axis gets from one end to the other.

    Running up from the demanded rate r to the limit W costs (W - r)^2 / (2 a) of way against running at W all along,
    and so does coming back to it; whoever leaves at a and returns at b therefore needs
    ahead(b) + cost(b) <= ahead(a) - cost(a), with ahead(t) = azimuth - W t in the sense of the turn.
    """
    if not np.isfinite(limit):
        return ()
    found: list[LostTime] = []
    for first, last in _intervals((np.abs(demanded) > limit) | (np.abs(turning) > acceleration)):
        if found and t[first] <= found[-1].end:
            continue
        peak = first + int(np.argmax(np.abs(demanded[first : last + 1])))
        sense = np.sign(demanded[peak])
        ahead = sense * azimuth - limit * t
        cost = np.maximum(limit - sense * demanded, 0.0) ** 2 / (2.0 * acceleration)
        found.append(_shortest(t, ahead - cost, ahead + cost, first, last))
    return tuple(found)


def _shortest(t: Array, before: Array, after: Array, first: int, last: int) -> LostTime:
    """Shortest [a, b] with a <= first, b >= last, after(b) <= before(a); both fall outside the excess."""
    best = (np.inf, t[0], t[-1])
    b = last
    for a in range(first, -1, -1):
        while b > last and after[b - 1] <= before[a]:
            b -= 1
        while b < len(t) - 1 and after[b] > before[a]:
            b += 1
        if after[b] > before[a]:
            continue
        best = min(best, (float(t[b] - t[a]), float(t[a]), float(t[b])))
        if t[last] - t[a] > best[0]:
            break
    return LostTime(best[1], best[2], False)


def _lost_flipping(
    chain: GimbalChain, track: Pass, solutions: Solutions, branch: int, lost: tuple[LostTime, ...], limits: Array
) -> tuple[LostTime, ...]:
    """The same intervals when the mount comes back on its other solution, where the inner axis's travel allows it.

    Searched symmetrically about the nearest approach and judged on rates alone: a flip is worth a closer look with the
    mount's own acceleration once it wins here.
    """
    if not lost or not np.isfinite(limits[0]):
        return ()
    t = track.times
    here, there = solutions.angles[:, branch], solutions.angles[:, 1 - branch]
    lower, upper = chain.travel[1]
    found = []
    for gap in lost:
        first, last = int(np.searchsorted(t, gap.start)), int(np.searchsorted(t, gap.end))
        middle = first + int(np.argmin(solutions.clearance[first : last + 1]))
        best = gap
        for half in range(last - first + 1):
            a, b = max(middle - half // 2, 0), min(middle + half - half // 2, len(t) - 1)
            way = there[b] - here[a]
            way[0] = (way[0] + np.pi) % (2.0 * np.pi) - np.pi
            inside = lower - 1e-9 <= there[b, 1] <= upper + 1e-9
            if inside and np.all(np.abs(way) <= limits * max(t[b] - t[a], 0.0) + 1e-12):
                best = LostTime(float(t[a]), float(t[b]), True)
                break
        found.append(best)
    return tuple(found)


def analyse_day(chain: GimbalChain, tracks: Sequence[Pass], **details: ArrayLike) -> list[PassAnalysis]:
    """Every pass of a day, in order."""
    return [analyse_pass(chain, track, **details) for track in tracks]
