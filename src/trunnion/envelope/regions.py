"""Regions: the sets of attitudes something may take.

Every region is a set of rotations R_rb (body components to reference components). Angles rad, times in one unit
throughout (s by custom), rates rad per that unit. A region is checked when it is made; what is wrong with it is a
RegionError that says what would be right.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import require_rotation, unit
from trunnion.errors import RegionError

Array = NDArray[np.float64]

TURN = 2.0 * np.pi
LARGEST_BALL = np.pi / 2
"""A ball of this radius makes every lock margin zero; a larger one is surely a mistake of unit."""


class Region:
    """Base of all regions; carries no data."""


@dataclass(frozen=True, eq=False)
class Box(Region):
    """All attitudes whose angles in `convention` lie in `ranges`, in the convention's own angle order.

    A range wider than a turn is a full turn. A range whose first value is larger passes through half a turn
    (170 deg … -170 deg is 20 deg wide); if that way is wider than half a turn the range is taken for a slip.
    """

    convention: Convention
    ranges: tuple[tuple[float, float], tuple[float, float], tuple[float, float]]

    def __post_init__(self) -> None:
        names = self.convention.angle_names
        if len(self.ranges) != 3:
            raise RegionError(f"a box needs three ranges, got {len(self.ranges)}", remedy=f"one each for {names}")
        spans = tuple(_span(name, *ends) for name, ends in zip(names, self.ranges, strict=True))
        object.__setattr__(self, "ranges", spans)

    def chain_ranges(self) -> tuple[Array, Array]:
        """Least and largest chain angles (3,), (3,) rad: signs and offsets of the convention applied."""
        stated = np.array(self.ranges, dtype=float)
        signs = np.array(self.convention.signs, dtype=float)
        chain = signs[:, None] * (stated - np.array(self.convention.offsets)[:, None])
        return chain.min(axis=1), chain.max(axis=1)


def _span(name: str, low: float, high: float) -> tuple[float, float]:
    """One range with low <= high and at most a turn wide."""
    if not (np.isfinite(low) and np.isfinite(high)):
        raise RegionError(f"the range of {name} holds a value that is no number", remedy="two finite angles")
    if low > high:
        wrapped = high + TURN * np.ceil((low - high) / TURN)
        if not wrapped - low <= np.pi:
            raise RegionError(
                f"the range of {name} is reversed: {np.degrees(low):g} deg to {np.degrees(high):g} deg",
                remedy=f"write [{np.degrees(high):g} deg, {np.degrees(low):g} deg]; a range through half a turn "
                f"wider than half a turn as [{np.degrees(low):g} deg, {np.degrees(wrapped):g} deg]",
            )
        high = float(wrapped)
    return float(low), float(min(high, low + TURN))


@dataclass(frozen=True, eq=False)
class Roll:
    """A limit on the turn about a cone's body axis.

    Roll is the right-handed turn about the body axis that brings the half plane holding the cone's reference
    direction onto the half plane of `body_zero` (3,): at roll zero, `body_zero` points as nearly towards the reference
    direction as it can. Where the body axis lies along the reference direction every roll is allowed.
    """

    low: float
    high: float
    body_zero: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "body_zero", unit(self.body_zero, "roll zero"))
        low, high = _span("roll", self.low, self.high)
        object.__setattr__(self, "low", low)
        object.__setattr__(self, "high", high)


@dataclass(frozen=True, eq=False)
class Cone(Region):
    """All attitudes that hold `body_axis` (3,) between `nearest` and `farthest` rad from `reference_axis` (3,).

    With `roll` None the body may have any roll about its axis. nearest = 0 is a cone, nearest = farthest = 0 a spin.
    """

    body_axis: Array
    reference_axis: Array
    nearest: float
    farthest: float
    roll: Roll | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "body_axis", unit(self.body_axis, "body axis of the cone"))
        object.__setattr__(self, "reference_axis", unit(self.reference_axis, "reference direction of the cone"))
        near, far = float(self.nearest), float(self.farthest)
        if not 0.0 <= near <= far <= np.pi:
            raise RegionError(
                f"a cone from {np.degrees(near):g} deg to {np.degrees(far):g} deg is empty or reversed",
                remedy="0 deg <= nearest <= farthest <= 180 deg",
            )
        if self.roll is not None and abs(self.roll.body_zero @ self.body_axis) > 1.0 - 1e-12:
            raise RegionError("the roll's zero direction lies along the cone's own body axis", remedy="name another")


@dataclass(frozen=True, eq=False)
class Poses(Region):
    """Listed attitudes `matrices` (N, 3, 3), each with a ball of `radius` rad of rotation around it."""

    matrices: Array
    radius: float = 0.0

    def __post_init__(self) -> None:
        matrices = np.asarray(self.matrices, dtype=float)
        matrices = matrices[None] if matrices.ndim == 2 else matrices
        if matrices.ndim != 3 or not len(matrices):
            raise RegionError("an empty list of poses", remedy="list at least one attitude")
        object.__setattr__(self, "matrices", require_rotation(matrices, what="pose"))
        require_ball(self.radius, "ball of the poses")


def require_ball(radius: float, what: str) -> None:
    """Refuse a negative, non-finite or absurdly large radius."""
    if not 0.0 <= radius <= LARGEST_BALL:
        raise RegionError(
            f"the {what} is {np.degrees(radius):g} deg, outside 0 deg to 90 deg",
            remedy="a ball of 90 deg leaves no margin in any convention; check the unit",
        )


class Between(enum.Enum):
    """What happens between the rows of a track."""

    SLERP = "turns at constant rate about one axis (slerp)"
    RATE_LIMITED = "any motion within the stated body rate"
    SAMPLES = "nothing is said: rows only"


@dataclass(frozen=True, eq=False)
class Track(Region):
    """Attitudes over time: `times` (N,) increasing, `quaternions` (N, 4) scalar first.

    between: what happens between the rows. max_rate: largest body rate (rad per unit of time), needed for
    RATE_LIMITED; rows that turn faster contradict it and are refused. attitude_error: radius (rad) of the ball in which
    the true attitude lies around the recorded one; None says nothing is known, and every result is "measured, of the
    recorded estimate". longest_gap: rows further apart in time are not joined. norm_error: how far the lengths were
    from one at most; the quaternions kept are scaled to one.
    """

    times: Array
    quaternions: Array
    between: Between = Between.SLERP
    max_rate: float | None = None
    attitude_error: float | None = None
    longest_gap: float | None = None
    norm_error: float = field(init=False, repr=False, default=0.0)

    def __post_init__(self) -> None:
        times = np.ascontiguousarray(self.times, dtype=float)
        quaternions = np.ascontiguousarray(self.quaternions, dtype=float)
        _require_rows(times, quaternions)
        norms = np.einsum("ij,ij->i", quaternions, quaternions)
        _require_units(norms)
        if np.abs(norms - 1.0).max() > 4e-16:
            quaternions = quaternions / np.sqrt(norms)[:, None]
        object.__setattr__(self, "times", times)
        object.__setattr__(self, "quaternions", quaternions)
        object.__setattr__(self, "norm_error", float(np.abs(np.sqrt(norms) - 1.0).max()))
        if self.attitude_error is not None:
            require_ball(self.attitude_error, "attitude error")
        if self.longest_gap is not None and not self.longest_gap > 0.0:
            raise RegionError("the longest gap must be positive", remedy="state the time between rows still joined")
        if self.between is Between.RATE_LIMITED:
            _require_rate(self)


_CHUNK = 16384  # rows worked at once, so that they stay in cache
_QUATERNION_TOLERANCE = 1e-5  # on |q|^2; single precision logs stay below 1e-6


def _require_rows(times: Array, quaternions: Array) -> None:
    if times.ndim != 1 or quaternions.shape != (len(times), 4):
        raise RegionError(
            f"a track needs N times and N x 4 quaternions, got {times.shape} and {quaternions.shape}",
            remedy="one scalar-first quaternion a row",
        )
    if not len(times):
        raise RegionError("a track without rows", remedy="give at least one row")
    bad = ~(np.isfinite(times) & np.isfinite(quaternions).all(axis=1))
    if bad.any():
        raise RegionError(f"{_row(bad)} holds a value that is no number ({_count(bad)})", remedy="remove such rows")
    step = np.diff(times)
    if (step < 0.0).any():
        raise RegionError(f"time goes back after {_row(step < 0.0)}", remedy="rows in order of time")
    if (step == 0.0).any():
        raise RegionError(
            f"{_row(step == 0.0)} and the next bear the same time ({_count(step == 0.0)}): "
            "the times have lost resolution",
            remedy="give times with more digits, or remove repeated rows",
        )


def _require_units(norms: Array) -> None:
    bad = np.abs(norms - 1.0) > _QUATERNION_TOLERANCE
    if bad.any():
        raise RegionError(
            f"the quaternion of {_row(bad)} has length {np.sqrt(norms[bad][0]):.6g} ({_count(bad)})",
            remedy="unit quaternions; look for a wrong column or a wrong scale",
        )


def _require_rate(track: Track) -> None:
    """The rows themselves must keep the stated rate, as far as their own error lets one tell."""
    rate, gap = track.max_rate, track.longest_gap
    if rate is None or not (np.isfinite(rate) and rate > 0.0):
        raise RegionError("motion limited by a body rate needs that rate", remedy="state the maximum body rate")
    steps = step_angles(track.quaternions)
    spans = np.diff(track.times)
    excess = steps - rate * spans - 2.0 * (track.attitude_error or 0.0) - 1e-9
    bad = excess > 0.0
    if gap is not None:
        bad &= spans <= gap
    if bad.any():
        first = int(np.argmax(bad))
        raise RegionError(
            f"between rows {first + 1:,} and {first + 2:,} the body turns faster than the stated maximum: "
            f"{np.degrees(steps[first] / spans[first]):.4g} deg a unit of time, stated {np.degrees(rate):.4g} "
            f"({_count(bad)})",
            remedy="state a rate the data keep, or look for a jump in the data",
        )


def step_angles(quaternions: Array) -> Array:
    """Rotation angle (N-1,) rad between neighbouring unit quaternions (N, 4); q and -q are the same attitude."""
    steps = np.empty(max(len(quaternions) - 1, 0))
    for start in range(0, len(steps), _CHUNK):
        part = np.ascontiguousarray(quaternions[start : start + _CHUNK + 1].T)
        apart, together = part[:, 1:] - part[:, :-1], part[:, 1:] + part[:, :-1]
        far, near = (apart * apart).sum(axis=0), (together * together).sum(axis=0)
        ratio = np.minimum(far, near) / np.maximum(far, near)
        steps[start : start + _CHUNK] = 4.0 * np.arctan(np.sqrt(ratio))
    return steps


def _row(bad: NDArray[np.bool_]) -> str:
    return f"row {int(np.argmax(bad)) + 1:,}"


def _count(bad: NDArray[np.bool_]) -> str:
    count = int(np.count_nonzero(bad))
    return "one such row" if count == 1 else f"{count:,} such rows"


@dataclass(frozen=True, eq=False)
class Union(Region):
    """Phases: all attitudes of any of the named parts."""

    parts: dict[str, Region]

    def __post_init__(self) -> None:
        if not self.parts:
            raise RegionError("a union of no parts", remedy="name at least one region")


@dataclass(frozen=True, eq=False)
class Dispersed(Region):
    """Each attitude of `region` followed by any turn of at most `radius` rad."""

    region: Region
    radius: float

    def __post_init__(self) -> None:
        require_ball(self.radius, "dispersion")


@dataclass(frozen=True, eq=False)
class Mounted(Region):
    """The attitudes R_rb R_bs of something mounted on the body: R_bs (3, 3) takes its components to the body's."""

    region: Region
    R_bs: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "R_bs", require_rotation(self.R_bs, what="mounting matrix"))


@dataclass(frozen=True, eq=False)
class Referred(Region):
    """The attitudes R_qr R_rb relative to another reference q: R_qr (3, 3) takes r components to q's."""

    region: Region
    R_qr: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "R_qr", require_rotation(self.R_qr, what="reference rotation"))


def as_pairs(u: ArrayLike, v: ArrayLike) -> tuple[Array, Array]:
    """Reference directions u and body directions v as component-first unit arrays (3, M), broadcast together."""
    first, second = np.broadcast_arrays(unit(u, "reference direction"), unit(v, "body direction"))
    return first.reshape(-1, 3).T.copy(), second.reshape(-1, 3).T.copy()
