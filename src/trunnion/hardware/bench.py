"""The bench table: put the vehicle so, and the instruments must read so.

Letters: `l` bench (north, east, down), `b` host, `s` sensor. Six static poses (each host axis up, both ways)
and three turns (right-handed about each host axis) tell every right-angle mount from every other.
"""

from __future__ import annotations

from collections.abc import Sequence as Rows
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.frames import Frame
from trunnion.errors import HardwareError
from trunnion.hardware import instruments
from trunnion.hardware.instruments import BENCH, UP
from trunnion.hardware.mounts import Instrument, Mount
from trunnion.hardware.properness import require_proper
from trunnion.hardware.vectors import Array, unit


@dataclass(frozen=True, eq=False)
class Pose:
    """One way to put the vehicle on the bench: a short key, the instruction, and the host attitude R_lb (3,
    3).
    """

    key: str
    words: str
    R_lb: Array

    @property
    def up_b(self) -> Array:
        """The bench's up (3,) in host components."""
        return self.R_lb.T @ UP


@dataclass(frozen=True, eq=False)
class Turn:
    """One turn of the vehicle: key, instruction, and its rate (3,) rad/s in host components."""

    key: str
    words: str
    rate_b: Array


def pose(host: Frame, *, up: str, north: str, key: str | None = None) -> Pose:
    """A pose from two host axis words: which axis points up and which (square to it) points north."""
    up_b, north_b = host.direction(up), host.direction(north)
    if abs(float(up_b @ north_b)) > 1e-9:
        raise HardwareError(
            f"a pose cannot have {up} up and {north} north: they lie along one line",
            remedy="the axis that points north must be square to the one that points up",
        )
    R_lb = np.column_stack([BENCH.direction("north"), BENCH.direction("down"), BENCH.direction("east")])
    R_lb = R_lb @ np.column_stack([north_b, -up_b, np.cross(-up_b, north_b)]).T
    # bench columns are north, down, east; in the host those are north_b, -up_b and down x north
    name = {"up": "level", "down": "upside down"}.get(up, f"{up} up")
    said = {"up": "stand the vehicle level", "down": "turn the vehicle upside down"}.get(
        up, f"turn the vehicle until its {up} axis points straight up"
    )
    return Pose(key or name, f"{said}, its {north} axis to the north", R_lb)


def six_poses(host: Frame) -> tuple[Pose, ...]:
    """Each host axis up, both ways; the next axis in cyclic order points north."""
    return tuple(
        pose(host, up=host.word(j, sign), north=host.word((j + 1) % 3, 1)) for j in range(3) for sign in (1, -1)
    )


def pose_from_attitude(key: str, R_lb: ArrayLike, *, words: str = "") -> Pose:
    """A pose at any attitude R_lb (3, 3) of the host on the bench (north, east, down)."""
    R, _ = require_proper(R_lb, BENCH, what=f"the attitude of pose '{key}'")
    return Pose(key, words or key, R)


def turn(host: Frame, axis: str, rate: float) -> Turn:
    """A right-handed turn about a named host axis at `rate` (rad/s, > 0), with what moves where in words."""
    if not np.isfinite(rate) or rate <= 0.0:
        raise HardwareError(f"the bench turn rate is {rate} rad/s", remedy="give a rate above zero")
    line = host.direction(axis)
    j = int(np.argmax(np.abs(line)))
    sign = int(np.sign(line[j]))
    moves, towards = host.word((j + 1) % 3, 1), host.word((j + 2) % 3, sign)
    words = f"turn the vehicle about its {axis} axis so that its {moves} axis moves towards {towards}"
    return Turn(f"about {axis}", words, rate * line)


def three_turns(host: Frame, rate: float) -> tuple[Turn, ...]:
    """Right-handed turns about the three host axes at `rate` (rad/s)."""
    return tuple(turn(host, axis, rate) for axis in host.axes)


@dataclass(frozen=True)
class BenchAccuracy:
    """How well the bench and the instruments are known.

    placing: how well the vehicle is put into a pose (rad). accelerometer (g), gyro (fraction of the turn
    rate), magnetometer (fraction of the field), clinometer and star_tracker (rad): largest error of the
    instrument itself.
    """

    placing: float = np.radians(1.0)
    accelerometer: float = 0.02
    gyro: float = 0.03
    magnetometer: float = 0.1
    clinometer: float = np.radians(0.5)
    star_tracker: float = np.radians(0.1)

    def __post_init__(self) -> None:
        for name, value in vars(self).items():
            if not np.isfinite(value) or value <= 0.0:
                raise HardwareError(
                    f"bench accuracy '{name}' is {value:g}", remedy="every accuracy is a number above zero"
                )


@dataclass(frozen=True, eq=False)
class Channels:
    """Readings or expectations of every instrument, row by row; None where the instrument is not used.

    accelerometer (P, 3) g; clinometer (P, 2) rad; magnetometer (P, 3); star_tracker (P, 3) boresight
    direction in the bench frame; gyro (T, 3) rad/s. nan marks a reading that was not taken.
    """

    accelerometer: Array | None = None
    clinometer: Array | None = None
    magnetometer: Array | None = None
    star_tracker: Array | None = None
    gyro: Array | None = None

    def items(self) -> list[tuple[str, Array]]:
        """The instruments in use with their arrays."""
        return [(name, values) for name, values in vars(self).items() if values is not None]


@dataclass(frozen=True, eq=False)
class BenchTable:
    """Poses and turns with the expected readings and the largest deviation to accept, entry by entry."""

    mount: Mount
    poses: tuple[Pose, ...]
    turns: tuple[Turn, ...]
    expected: Channels
    tolerance: Channels
    accuracy: BenchAccuracy
    field_l: Array | None = field(default=None)

    def rows_of(self, instrument: str) -> tuple[Pose, ...] | tuple[Turn, ...]:
        """The rows an instrument is read in: the turns for the gyro, the poses for all others."""
        return self.turns if instrument == "gyro" else self.poses


def expected_channels(mount: Mount, poses: Rows[Pose], turns: Rows[Turn], field_l: Array | None = None) -> Channels:
    """What every declared instrument of `mount` must read, row by row (see `Channels`)."""
    R_lb = np.array([p.R_lb for p in poses]).reshape(-1, 3, 3)
    rates = np.array([t.rate_b for t in turns]).reshape(-1, 3)
    inside = set(mount.instruments)
    if Instrument.MAGNETOMETER in inside and field_l is None:
        raise HardwareError(
            f"mount '{mount.name}' has a magnetometer, and the field at the bench is not given",
            remedy="give strength, dip and declination at the bench",
        )
    stands, turned = len(R_lb) > 0, len(rates) > 0
    return Channels(
        instruments.accelerometer(mount, R_lb) if stands and Instrument.ACCELEROMETER in inside else None,
        instruments.clinometer(mount, R_lb) if stands and Instrument.CLINOMETER in inside else None,
        instruments.magnetometer(mount, R_lb, field_l)
        if stands and field_l is not None and Instrument.MAGNETOMETER in inside
        else None,
        _boresights(mount, R_lb) if stands and Instrument.STAR_TRACKER in inside else None,
        instruments.gyro(mount, rates) if turned and Instrument.GYRO in inside else None,
    )


def _boresights(mount: Mount, R_lb: Array) -> Array:
    if mount.boresight is None:
        raise HardwareError(f"star tracker mount '{mount.name}' has no boresight", remedy="name it")
    return R_lb @ mount.R_bs @ mount.sensor_direction(mount.boresight)


def bench_table(
    mount: Mount,
    *,
    poses: Rows[Pose] | None = None,
    turns: Rows[Turn] | None = None,
    turn_rate: float = np.radians(30.0),
    field_l: ArrayLike | None = None,
    accuracy: BenchAccuracy | None = None,
) -> BenchTable:
    """The bench table of a mount: six poses and three turns unless others are given.

    field_l: the magnetic field at the bench (3,) north, east, down, for a magnetometer. An accelerometer
    that does not say what it reports is an error, never a guess.
    """
    used = tuple(six_poses(mount.host) if poses is None else poses)
    turned = tuple(three_turns(mount.host, turn_rate) if turns is None else turns)
    at_bench = None if field_l is None else np.asarray(field_l, dtype=float)
    expected = expected_channels(mount, used, turned, at_bench)
    accuracy = accuracy or BenchAccuracy()
    return BenchTable(mount, used, turned, expected, _tolerances(mount, expected, turned, accuracy), accuracy, at_bench)


def _swing(values: Array, length: Array, angle: float) -> Array:
    """Largest change of a component when its vector of `length` turns by up to `angle`: exact, not
    linearised.
    """
    away = np.arccos(np.clip(values / length, -1.0, 1.0))
    lower = np.cos(np.minimum(np.pi, away + angle))
    upper = np.cos(np.maximum(0.0, away - angle))
    return length * np.maximum(upper - np.cos(away), np.cos(away) - lower)


def _tolerances(mount: Mount, expected: Channels, turns: Rows[Turn], accuracy: BenchAccuracy) -> Channels:
    tilt = accuracy.placing + (mount.tolerance.largest_turn or 0.0)
    rate = np.linalg.norm([t.rate_b for t in turns], axis=1)[:, None] if turns else np.ones((0, 1))
    found: dict[str, Array] = {}
    for name, values in expected.items():
        if name == "clinometer":
            found[name] = np.full(values.shape, tilt + accuracy.clinometer)
        elif name == "star_tracker":
            found[name] = _swing(values, np.array(1.0), tilt + accuracy.star_tracker)
        elif name == "accelerometer":
            found[name] = _swing(values, np.array(1.0), tilt) + accuracy.accelerometer
        else:
            size = rate if name == "gyro" else np.linalg.norm(values, axis=1, keepdims=True)
            found[name] = _swing(values, size, tilt) + getattr(accuracy, name) * size
    return Channels(**found)


def readings_from_rows(table: BenchTable, rows: Rows[dict[str, Any]]) -> Channels:
    """Filled-in readings put back into the table's order; what was not filled in stays nan.

    Each row: {"row": pose or turn key, "instrument": name, "values": numbers in g or rad or rad/s}. A star tracker
    gives its boresight's azimuth and elevation (rad), or its direction (3,). Unknown rows and instruments are errors
    naming those that exist.
    """
    blank = {name: np.full(values.shape, np.nan) for name, values in table.expected.items()}
    for entry in rows:
        name, key = str(entry.get("instrument", "")), str(entry.get("row", ""))
        if name not in blank:
            raise HardwareError(f"no instrument '{name}' on this bench sheet", remedy=f"it has {', '.join(blank)}")
        keys = [row.key for row in table.rows_of(name)]
        if key not in keys:
            raise HardwareError(f"no row '{key}' for the {name}", remedy=f"its rows are {', '.join(keys)}")
        values: Array = np.asarray(entry.get("values"), dtype=float)
        if name == "star_tracker" and values.shape == (2,):
            values = instruments.direction_from_azimuth_elevation(values)
        if values.shape != blank[name].shape[1:]:
            raise HardwareError(f"row '{key}' of the {name} has {values.size} readings, expected {blank[name][0].size}")
        blank[name][keys.index(key)] = unit(values) if name == "star_tracker" else values
    return Channels(**blank)
