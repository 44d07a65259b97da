"""Travel: which solution, which whole turn, how much is left at the stops, and when the mount must unwind.

A record of joint solutions over time is first unwrapped, branch by branch; then whole turns and the flipped solution
are chosen so that the mount stays inside its travel as long as possible. Staying with the choice that lasts longest
gives the least number of unwindings. Angles in rad, times in s.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.basis import Basis
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import Solutions
from trunnion.hardware.limits import SINGULAR
from trunnion.hardware.vectors import Array, wrapped

_TURN = 2.0 * np.pi
_SLACK = 1e-9  # rad; a solution this far beyond a stop is still at the stop (rounding of the angles)


def shortest_move(start: ArrayLike, target: ArrayLike) -> Array:
    """The signed move (...) rad, at most half a turn, from one reading to another: 180 deg to -170 deg is +10 deg."""
    return wrapped(np.asarray(target, dtype=float) - np.asarray(start, dtype=float))


def move_time(distance: ArrayLike, rate: float, acceleration: float = np.inf) -> Array:
    """Least time (s) of a move (rad) from rest to rest under a rate and an acceleration limit."""
    way = np.abs(np.asarray(distance, dtype=float))
    if not np.isfinite(acceleration):
        return way / rate
    if not np.isfinite(rate):
        return 2.0 * np.sqrt(way / acceleration)
    ramp = rate**2 / acceleration  # distance used by a full start and stop
    return np.where(way >= ramp, way / rate + rate / acceleration, 2.0 * np.sqrt(way / acceleration))


def equivalents(chain: GimbalChain, angles: ArrayLike) -> Array:
    """All joint angles (M, k) inside the travel that differ from `angles` (k,) by whole turns, nearest to zero
    first.
    """
    options = []
    for value, (lower, upper) in zip(np.asarray(angles, dtype=float), chain.travel, strict=True):
        if not np.isfinite(upper - lower):
            options.append(np.array([wrapped(value)]))
            continue
        first = int(np.ceil((lower - _SLACK - value) / _TURN))
        last = int(np.floor((upper + _SLACK - value) / _TURN))
        options.append(value + _TURN * np.arange(first, last + 1))
    grid = np.array(np.meshgrid(*options, indexing="ij")).reshape(len(options), -1).T
    return grid[np.argsort(np.sum(np.abs(grid), axis=1), kind="stable")]


@dataclass(frozen=True, eq=False)
class Choice:
    """A solution within travel: which branch (0 or 1), the angles (k,), the time to get there (s) from where we are."""

    branch: int
    angles: Array
    time: float


def choices(chain: GimbalChain, solutions: Solutions, present: ArrayLike | None = None) -> list[Choice]:
    """Every way inside the travel to one attitude or direction, both branches and all whole turns, quickest first.

    `solutions` of a single target; present (k,) joint angles the move starts from (zero unless given). An empty list:
    the chain gives the target, its stops do not.
    """
    start = np.zeros(len(chain.joints)) if present is None else np.asarray(present, dtype=float)
    rates, accelerations = chain.limits("rate"), chain.limits("acceleration")
    found = []
    for branch in range(2):
        for angles in equivalents(chain, solutions.angles[branch]):
            way = np.where(np.isfinite(chain.travel).all(axis=1), angles - start, shortest_move(start, angles))
            angles = start + way
            time = max(float(move_time(w, r, a)) for w, r, a in zip(way, rates, accelerations, strict=True))
            found.append(Choice(branch, angles, time))
    return sorted(found, key=lambda choice: (choice.time, float(np.sum(np.abs(choice.angles - start)))))


@dataclass(frozen=True, eq=False)
class Segment:
    """A stretch of a record followed without unwinding: samples first..last, branch, joint angles (n, k)."""

    first: int
    last: int
    branch: int
    angles: Array


@dataclass(frozen=True, eq=False)
class Unwinding:
    """A break in following: after sample `after`, moving by `way` (k,) rad takes `time` s; why: stop or out of
    reach.
    """

    after: int
    at: float
    way: Array
    time: float
    why: str


@dataclass(frozen=True, eq=False)
class TravelPlan:
    """How a chain follows a record inside its travel.

    travel_left (k, 2) rad: least distance to the lower and the upper stop. rates, accelerations (k,): largest
    demanded along the segments, by differences of the samples (sampled).
    """

    segments: tuple[Segment, ...]
    unwindings: tuple[Unwinding, ...]
    travel_left: Array
    rates: Array
    accelerations: Array
    seconds_over_rate: Array

    @property
    def whole(self) -> bool:
        """True when the record is followed from end to end without a break."""
        return len(self.segments) == 1 and not self.unwindings


def plan_travel(chain: GimbalChain, times: ArrayLike, solutions: Solutions) -> TravelPlan:
    """Follow a record of solutions (N samples) with the fewest unwindings.

    Where no solution lies inside the travel, the sample is skipped and the break says so; nothing followable at all
    is an error.
    """
    t = np.asarray(times, dtype=float)
    if t.ndim != 1 or len(t) != len(solutions.angles) or len(t) < 2 or np.any(np.diff(t) <= 0.0):
        raise HardwareError("a record needs two or more samples at advancing times, one solution each")
    branches = [np.unwrap(solutions.angles[:, b], axis=0) for b in range(2)]
    reach = solutions.clearance >= -SINGULAR
    segments: list[Segment] = []
    start = 0
    while start < len(t):
        best = _longest(chain, branches, reach, start, segments[-1].angles[-1] if segments else None)
        if best is None:
            start += 1
            continue
        segments.append(best)
        start = best.last + 1
    if not segments:
        raise HardwareError(
            f"chain '{chain.name}' follows no sample of the record inside its travel",
            remedy="widen the travel, or tilt the base",
        )
    return _plan(chain, t, segments, reach)


def _longest(
    chain: GimbalChain, branches: Sequence[Array], reach: NDArray[np.bool_], start: int, present: Array | None
) -> Segment | None:
    """The branch and whole turns that keep inside the travel longest from `start`; ties to the shorter move there."""
    if not reach[start]:
        return None
    beyond = np.flatnonzero(~reach[start:])
    end = start + (int(beyond[0]) if beyond.size else len(reach) - start)
    best: Segment | None = None
    best_key = (-1, 0.0)
    for branch, angles in enumerate(branches):
        part = angles[start:end]
        low, high = np.minimum.accumulate(part, axis=0), np.maximum.accumulate(part, axis=0)
        lower, upper = chain.travel.T
        with np.errstate(invalid="ignore"):
            first = np.where(np.isfinite(lower), np.ceil((lower - _SLACK - low) / _TURN), -np.inf)
            last = np.where(np.isfinite(upper), np.floor((upper + _SLACK - high) / _TURN), np.inf)
        fits = np.all(first <= last, axis=1)
        length = int(np.argmin(fits)) if not fits.all() else len(fits)
        if length == 0:
            continue
        turns = _nearest_turns(first[length - 1], last[length - 1], part[0], present)
        chosen = part[:length] + _TURN * turns
        move = 0.0 if present is None else float(np.max(np.abs(chosen[0] - present)))
        if (length, -move) > best_key:
            best, best_key = Segment(start, start + length - 1, branch, chosen), (length, -move)
    return best


def _nearest_turns(first: Array, last: Array, begin: Array, present: Array | None) -> Array:
    wanted = np.round(((np.zeros_like(begin) if present is None else present) - begin) / _TURN)
    return np.clip(wanted, first, last)


def _plan(chain: GimbalChain, t: Array, segments: list[Segment], reach: NDArray[np.bool_]) -> TravelPlan:
    lower, upper = chain.travel.T
    rates_limit, accelerations_limit = chain.limits("rate"), chain.limits("acceleration")
    everything = np.concatenate([s.angles for s in segments])
    left = np.stack([np.min(everything - lower, axis=0), np.min(upper - everything, axis=0)], axis=1)
    rates, accelerations = np.zeros(len(lower)), np.zeros(len(lower))
    over = np.zeros(len(lower))
    for s in segments:
        step = np.diff(t[s.first : s.last + 1])[:, None]
        rate = np.diff(s.angles, axis=0) / step
        rates = np.maximum(rates, np.max(np.abs(rate), axis=0, initial=0.0))
        over += np.sum(np.where(np.abs(rate) > rates_limit, step, 0.0), axis=0)
        if len(rate) > 1:
            change = np.diff(rate, axis=0) / (0.5 * (step[1:] + step[:-1]))
            accelerations = np.maximum(accelerations, np.max(np.abs(change), axis=0))
    breaks = []
    for one, other in pairwise(segments):
        way = other.angles[0] - one.angles[-1]
        took = [float(move_time(w, r, a)) for w, r, a in zip(way, rates_limit, accelerations_limit, strict=True)]
        skipped = other.first - one.last - 1
        why = "out of reach" if skipped and not reach[one.last + 1 : other.first].all() else "travel stop"
        breaks.append(Unwinding(one.last, float(t[one.last]), way, max(took), why))
    return TravelPlan(tuple(segments), tuple(breaks), left, rates, accelerations, over)


def stopping_room(chain: GimbalChain, travel_left: ArrayLike) -> Array:
    """Travel (k, 2) rad still left after stopping from the full rate: rate^2 / (2 acceleration) taken off.

    Joints without both limits are left as they are; a negative entry would run into its stop.
    """
    rate, acceleration = chain.limits("rate"), chain.limits("acceleration")
    known = np.isfinite(rate) & np.isfinite(acceleration)
    need = np.where(known, np.where(known, rate, 0.0) ** 2 / (2.0 * np.where(known, acceleration, 1.0)), 0.0)
    return np.asarray(travel_left, dtype=float) - need[:, None]


@dataclass(frozen=True, eq=False)
class TravelOver:
    """Travel left over a set of attitudes or directions on one branch.

    left (k, 2) rad: least distance to the lower and upper stop, negative beyond it; worst (k, 2): the sample where;
    branch: the solution family judged (the better of the two); basis: sampled, or certified when the samples cover
    their region within a stated radius.
    """

    left: Array
    worst: NDArray[np.intp]
    branch: int
    basis: Basis


def travel_over(chain: GimbalChain, solutions: Solutions, *, covering_radius: float | None = None) -> TravelOver:
    """Travel left at the stops over N samples of a region of attitudes (three axes) or directions (two).

    covering_radius (rad): every attitude or direction of the region lies within this rotation of a sample. Then, for
    right-angled chains, the middle joint may move by r and the outer ones by asin(sin r / sin clearance) between
    samples: taken off, the result is certified. A sample that is out of reach is an error.
    """
    flat = solutions.angles.reshape(-1, *solutions.angles.shape[-2:])
    clearance = np.ravel(solutions.clearance)
    if np.any(clearance < -SINGULAR):
        raise HardwareError(
            f"{int(np.sum(clearance < -SINGULAR))} of {len(clearance)} samples are out of reach of '{chain.name}'",
            remedy="see `require_reachable` for how far and what would reach them",
        )
    growth = np.zeros((len(flat), len(chain.joints)))
    if covering_radius is not None:
        growth = _growth(chain, clearance, covering_radius)
    lower, upper = chain.travel.T
    stopped = np.isfinite(upper - lower)
    centre = np.where(stopped, np.where(stopped, lower, 0.0) + np.where(stopped, upper, 0.0), 0.0) / 2.0
    best: TravelOver | None = None
    for branch in range(2):
        angles = centre + wrapped(flat[:, branch] - centre)
        room = np.stack([angles - growth - lower, upper - angles - growth], axis=-1)
        basis = Basis.SAMPLED if covering_radius is None else Basis.CERTIFIED
        found = TravelOver(np.min(room, axis=0), np.argmin(room, axis=0), branch, basis)
        if best is None or np.min(found.left) > np.min(best.left):
            best = found
    assert best is not None
    return best


def _growth(chain: GimbalChain, clearance: Array, radius: float) -> Array:
    if not np.allclose(chain.neighbour_angles, np.pi / 2, rtol=0.0, atol=1e-12):
        raise HardwareError(
            f"chain '{chain.name}' is not right-angled, so the joints between samples are not bounded here",
            remedy="leave the covering radius out: the result is then sampled",
        )
    reaches = clearance <= radius
    sine = np.where(reaches, 1.0, np.sin(np.where(reaches, 1.0, clearance)))
    outer = np.where(reaches, np.inf, np.arcsin(np.clip(np.sin(radius) / sine, 0.0, 1.0)))
    return np.stack([outer, np.full_like(outer, radius), outer], axis=-1)[:, : len(chain.joints)]
