"""Frames linked end to end: earth, local level, vehicle, gimbal base, payload; every angle says relative to which.

A link from `p` (parent) to `c` (child) holds R_pc, v_p = R_pc v_c, constant or as a table over time. Tables are joined
between their samples by SLERP, never by interpolating angles. Times in s, angles in rad.

Clocks: a sample stamped t by a link's clock happened at t - offset on the chain's clock, so the link is looked up at
t + offset. What the offset may still be wrong by, and the jitter, cost relative rate x time error.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import (
    matrix_from_quaternion,
    quaternion_angle,
    require_rotation,
    require_unit_quaternion,
    rotation_angle,
    slerp,
)
from trunnion.errors import HardwareError
from trunnion.hardware.vectors import Array


@dataclass(frozen=True, eq=False)
class Link:
    """One link: parent and child frame names, and either a constant R_pc or times (N,) with quaternions (N, 4).

    time_offset, offset_error, jitter (s) are those of the link's clock against the chain's; attitude_error (rad) is
    the stated bound of the link itself. longest_gap (s): samples further apart are not joined.
    """

    parent: str
    child: str
    R_pc: Array | None = None
    times: Array | None = None
    quaternions: Array | None = None
    time_offset: float = 0.0
    offset_error: float = 0.0
    jitter: float = 0.0
    attitude_error: float = 0.0
    longest_gap: float = float("inf")
    source: str = ""

    def __post_init__(self) -> None:
        name = f"link {self.parent} to {self.child}"
        if (self.R_pc is None) == (self.times is None or self.quaternions is None):
            raise HardwareError(f"{name} must be a constant or a table", remedy="give one of the two")
        if self.R_pc is not None:
            object.__setattr__(self, "R_pc", require_rotation(self.R_pc, name))
            return
        t, q = np.asarray(self.times, dtype=float), require_unit_quaternion(np.asarray(self.quaternions), name)
        if t.ndim != 1 or len(t) != len(q) or len(t) < 2:
            raise HardwareError(f"{name} has {t.size} times and {len(q)} attitudes", remedy="at least two, one each")
        back = np.flatnonzero(np.diff(t) <= 0.0)
        if back.size:
            raise HardwareError(f"{name}: time does not advance after sample {back[0]} (t = {t[back[0]]:g} s)")
        object.__setattr__(self, "times", t)
        object.__setattr__(self, "quaternions", q)

    @property
    def constant(self) -> bool:
        """True when the link does not change with time."""
        return self.R_pc is not None

    def attitude(self, times: Array) -> Array:
        """R_pc (N, 3, 3) at chain times (N,); outside the table or across a gap is an error, never a guess."""
        if self.R_pc is not None:
            return np.broadcast_to(self.R_pc, (len(times), 3, 3))
        t, q, at, k = self._segment(times)
        fraction = (at - t[k]) / (t[k + 1] - t[k])
        return matrix_from_quaternion(slerp(q[k], q[k + 1], fraction))

    def largest_rate(self, first: float, last: float) -> float:
        """Largest rate (rad/s) at which the link turns between two chain times (s); 0 for a constant link."""
        if self.times is None or self.quaternions is None:
            return 0.0
        q, step = self.quaternions, np.diff(self.times)
        rates = quaternion_angle(q[:-1], q[1:]) / step
        touched = (self.times[1:] >= first + self.time_offset) & (self.times[:-1] <= last + self.time_offset)
        return float(np.max(rates[touched], initial=0.0))

    def _segment(self, times: Array) -> tuple[Array, Array, Array, NDArray[np.intp]]:
        assert self.times is not None
        assert self.quaternions is not None
        t, at = self.times, np.asarray(times, dtype=float) + self.time_offset
        outside = (at < t[0]) | (at > t[-1])
        if np.any(outside):
            raise HardwareError(
                f"link {self.parent} to {self.child} covers {t[0]:g} to {t[-1]:g} s of its clock; "
                f"{at[outside][0]:g} s is asked for",
                remedy="restrict the times to the common span (`FrameChain.common_span`)",
            )
        k = np.clip(np.searchsorted(t, at, side="right") - 1, 0, len(t) - 2)
        gap = t[k + 1] - t[k]
        if np.any(gap > self.longest_gap):
            raise HardwareError(
                f"link {self.parent} to {self.child} has a gap of {np.max(gap):g} s, {self.longest_gap:g} s allowed",
                remedy="leave those times out, or allow the gap with a reason",
            )
        return t, self.quaternions, at, k


@dataclass(frozen=True)
class TimingError:
    """What a link's clock costs: the largest relative rate (rad/s), the time error (s), and their product (rad)."""

    link: str
    rate: float
    time_error: float
    error: float


@dataclass(frozen=True, eq=False)
class ChainAttitude:
    """Attitude of a frame in another at given times: R (N, 3, 3), the path taken, and the error budget by link."""

    R: Array
    path: tuple[str, ...]
    timing: tuple[TimingError, ...]
    attitude_error: float

    @property
    def error(self) -> float:
        """Certified sum (rad) of the links' stated attitude errors and their timing errors."""
        return self.attitude_error + sum(t.error for t in self.timing)


@dataclass(frozen=True)
class FrameChain:
    """Links that join frames into a tree; any frame can be asked for in any other."""

    links: tuple[Link, ...] = field(default=())

    def __post_init__(self) -> None:
        joined: dict[str, set[str]] = {}
        for link in self.links:
            one = joined.get(link.parent, {link.parent})
            other = joined.get(link.child, {link.child})
            if one is other or link.parent == link.child:
                raise HardwareError(
                    f"link {link.parent} to {link.child} closes a ring: there would be two ways between them",
                    remedy="leave one link out, or compare the two ways in a survey",
                )
            both = one | other
            for name in both:
                joined[name] = both

    def attitude(self, of: str, relative_to: str, times: ArrayLike) -> ChainAttitude:
        """R takes `of` components to `relative_to` components, at chain times (N,) s."""
        at = np.atleast_1d(np.asarray(times, dtype=float))
        steps = self._path(relative_to, of)
        R = np.broadcast_to(np.eye(3), (len(at), 3, 3))
        timing = []
        for link, forward in steps:
            step = link.attitude(at)
            R = R @ (step if forward else np.swapaxes(step, -1, -2))
            wrong = link.offset_error + link.jitter
            if not link.constant and wrong > 0.0:
                rate = link.largest_rate(float(at.min()) - wrong, float(at.max()) + wrong)
                timing.append(TimingError(f"{link.parent} to {link.child}", rate, wrong, rate * wrong))
        names = [relative_to]
        for link, forward in steps:
            names.append(link.child if forward else link.parent)
        return ChainAttitude(R, tuple(names), tuple(timing), sum(link.attitude_error for link, _ in steps))

    def common_span(self, of: str, relative_to: str) -> tuple[float, float]:
        """First and last chain time (s) that every table on the way covers; infinite without tables."""
        first, last = -np.inf, np.inf
        for link, _ in self._path(relative_to, of):
            if link.times is not None:
                first = max(first, float(link.times[0]) - link.time_offset)
                last = min(last, float(link.times[-1]) - link.time_offset)
        if last < first:
            raise HardwareError(
                f"the tables between {relative_to} and {of} share no time", remedy="check clocks and offsets"
            )
        return first, last

    def _path(self, start: str, end: str) -> list[tuple[Link, bool]]:
        known = {name for link in self.links for name in (link.parent, link.child)}
        for name in (start, end):
            if name not in known:
                raise HardwareError(f"no link names frame '{name}'", remedy=f"frames: {', '.join(sorted(known))}")
        ways: dict[str, list[tuple[Link, bool]]] = {start: []}
        front = [start]
        while front:
            here = front.pop(0)
            for link in self.links:
                for near, far, forward in ((link.parent, link.child, True), (link.child, link.parent, False)):
                    if near == here and far not in ways:
                        ways[far] = [*ways[here], (link, forward)]
                        front.append(far)
        if end not in ways:
            raise HardwareError(f"no links join '{start}' to '{end}'", remedy="add the missing link")
        return ways[end]


@dataclass(frozen=True, eq=False)
class ReadingComparison:
    """The same angles taken relative to the right frame and to a wrong one: triples (N, 3) rad, difference (N,) rad."""

    right: Array
    wrong: Array
    right_margin: Array
    wrong_margin: Array
    separation: Array


def wrong_link_reading(
    chain: FrameChain, of: str, right: str, wrong: str, convention: Convention, times: ArrayLike
) -> ReadingComparison:
    """What the angles of `of` are relative to `right`, and what they would be taken to `wrong` instead."""
    one = chain.attitude(of, right, times).R
    other = chain.attitude(of, wrong, times).R
    a, b = convention.angles(one), convention.angles(other)
    return ReadingComparison(a.angles, b.angles, a.margin, b.margin, rotation_angle(one, other))


def residual_delay(
    times: ArrayLike, rate_one: ArrayLike, rate_other: ArrayLike, *, largest: float
) -> tuple[float, float]:
    """The shift (s) that best lines up two turning-rate records on one clock, and their correlation there.

    times (N,) s evenly spaced; searched over plus or minus `largest` s. Positive: the second record lags.
    """
    t, a, b = (np.asarray(v, dtype=float) for v in (times, rate_one, rate_other))
    step = float(np.mean(np.diff(t)))
    if np.max(np.abs(np.diff(t) - step)) > 1e-6 * step:
        raise HardwareError("the times of the two records are not evenly spaced", remedy="resample both first")
    a, b = a - a.mean(), b - b.mean()
    shifts = np.arange(-int(largest / step), int(largest / step) + 1)
    scores = np.array([_overlap(a, b, int(k)) for k in shifts])
    best = int(np.argmax(scores))
    return float(shifts[best] * step), float(scores[best])


def _overlap(a: Array, b: Array, shift: int) -> float:
    one, other = (a[: len(a) - shift], b[shift:]) if shift >= 0 else (a[-shift:], b[: len(b) + shift])
    size = np.sqrt(np.sum(one**2) * np.sum(other**2))
    return float(np.sum(one * other) / size) if size > 0 else 0.0
