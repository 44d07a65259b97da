"""The mistakes a bench test must be able to tell apart, each as the readings it would produce.

A mistake either puts the sensor into another seat (a rotation), relabels its channels (a signed exchange, on
one instrument or all), turns every static sign round, or mixes degrees with radians. Whatever two
explanations predict alike on the poses and turns used, the test cannot tell apart: `evidence` says so.

Letters: `b` host, `s` sensor.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

import numpy as np

from trunnion.attitude.rotations import rotation_angle
from trunnion.hardware.bench import BenchTable, Channels, expected_channels
from trunnion.hardware.mounts import TiltType
from trunnion.hardware.properness import channels_in_words
from trunnion.hardware.right_angles import (
    axes_in_words,
    nearest_right_angle,
    right_angle_mirrors,
    right_angle_rotations,
    turn_in_words,
)
from trunnion.hardware.vectors import Array

_VECTORS = ("accelerometer", "magnetometer", "gyro")
_DEGREES = 180.0 / np.pi


@dataclass(frozen=True, eq=False)
class Mistake:
    """One explanation: what kind, in words, and the readings it predicts. `rank` orders equal fits, simplest
    first.
    """

    kind: str
    words: str
    predicted: Channels
    rank: int


def map_channels(channels: Channels, change: Callable[[str, Array], Array]) -> Channels:
    """Every instrument's array put through `change(name, values)`."""
    return Channels(**{name: change(name, values) for name, values in channels.items()})


def reseated(table: BenchTable, R_bs: Array) -> Channels:
    """What the same instruments read when the sensor sits as R_bs instead of as drawn."""
    moved = replace(table.mount, R_bs=R_bs)
    return expected_channels(moved, table.poses, table.turns, table.field_l)


def mistakes(table: BenchTable) -> Iterator[Mistake]:
    """Every mistake that needs no fitting, simplest first; the nominal is not among them."""
    yield from _polarity(table)
    yield from _units(table)
    yield from _typed_in_the_other_unit(table)
    yield from _transposed(table)
    yield from _other_seats(table)
    yield from _tilts(table)
    yield from _exchanged_channels(table)


def _polarity(table: BenchTable) -> Iterator[Mistake]:
    if table.expected.accelerometer is None:
        return
    said = table.mount.reports()
    other = "gravity" if said.sign > 0 else "specific force"
    yield Mistake(
        "specific force / gravity mix-up",
        f"every static sign is opposite: the accelerometer reports {other}, not {said.value} as declared; "
        "the mount itself is not inverted",
        map_channels(table.expected, lambda name, v: -v if name == "accelerometer" else v),
        0,
    )


def _units(table: BenchTable) -> Iterator[Mistake]:
    for names, what in ((("gyro",), "turn rates"), (("clinometer",), "tilts")):
        if any(name in names for name, _ in table.expected.items()):
            for factor, words in ((_DEGREES, "degrees taken for radians"), (1 / _DEGREES, "radians taken for degrees")):
                yield Mistake(
                    "degrees / radians",
                    f"{what}: {words} (a factor {_DEGREES:.4g})",
                    map_channels(table.expected, _scaled(names, factor)),
                    1,
                )


def _scaled(names: tuple[str, ...], factor: float) -> Callable[[str, Array], Array]:
    return lambda name, values: values * factor if name in names else values


def _typed_in_the_other_unit(table: BenchTable) -> Iterator[Mistake]:
    if table.mount.stated_angles is None:
        return
    angles, convention = table.mount.stated_angles
    for factor, words in ((_DEGREES, "degrees entered where radians are taken"), (1 / _DEGREES, "radians for degrees")):
        yield Mistake(
            "degrees / radians",
            f"mount angles: {words}",
            reseated(table, convention.matrix(angles * factor)),
            1,
        )


def _transposed(table: BenchTable) -> Iterator[Mistake]:
    """Nothing for a mount that is its own inverse: there the mix-up changes nothing."""
    R_bs = table.mount.R_bs
    if rotation_angle(R_bs, R_bs.T) > 1e-9:
        yield Mistake(
            "transposed matrix",
            "the mounting matrix is used transposed (host to sensor taken for sensor to host)",
            reseated(table, R_bs.T),
            2,
        )


def _other_seats(table: BenchTable) -> Iterator[Mistake]:
    """The other 23 right-angle seats of the sensor, seen from its seat as drawn."""
    mount = table.mount
    square = nearest_right_angle(mount.R_bs, mount.host).deviation < 1e-9
    for P in right_angle_rotations()[1:]:
        turn = turn_in_words(P, mount.sensor_axes)
        seat = f": {axes_in_words(mount.R_bs @ P, mount.host, mount.sensor_axes)}" if square else ""
        yield Mistake(
            "inverted mount" if turn.startswith("half") else "swapped axes",
            f"the sensor sits turned by a {turn}{seat}",
            reseated(table, mount.R_bs @ P),
            3,
        )


def _tilts(table: BenchTable) -> Iterator[Mistake]:
    """A clinometer's two tilts exchanged, inverted, or formed the other way."""
    mount, tilts = table.mount, table.expected.clinometer
    if tilts is None or mount.tilt_axes is None or mount.clinometer is None:
        return
    one, other = mount.tilt_axes
    for words, change in (
        (f"tilt {one} inverted", np.diag([-1.0, 1.0])),
        (f"tilt {other} inverted", np.diag([1.0, -1.0])),
        ("both tilts inverted", -np.eye(2)),
        (f"tilts {one} and {other} exchanged", np.array([[0.0, 1.0], [1.0, 0.0]])),
    ):
        kind = "swapped axes" if "exchanged" in words else "flipped sign"
        yield Mistake(kind, words, map_channels(table.expected, _relabelled(("clinometer",), change)), 4)
    turned = TiltType.TANGENT if mount.clinometer is TiltType.SINE else TiltType.SINE
    yield Mistake(
        "tilt type",
        f"the clinometer forms its tilts the {turned.value} way, not the {mount.clinometer.value} way as declared",
        expected_channels(replace(mount, clinometer=turned), table.poses, table.turns, table.field_l),
        1,
    )


def _exchanged_channels(table: BenchTable) -> Iterator[Mistake]:
    """Mirrors of the channels: on all vector instruments, or on one of them alone (then proper ones too)."""
    axes = table.mount.sensor_axes
    present = tuple(name for name, _ in table.expected.items() if name in _VECTORS)
    for Q in right_angle_mirrors():
        kind = "flipped sign" if np.count_nonzero(np.diag(Q)) == 3 else "swapped axes"
        yield Mistake(
            kind,
            f"channels: {channels_in_words(Q, axes)} (the readings mirror)",
            map_channels(table.expected, _relabelled(present, Q)),
            4,
        )
    if len(present) < 2:
        return
    for name in present:
        for Q in (*right_angle_rotations()[1:], *right_angle_mirrors()):
            kind = "flipped sign" if np.count_nonzero(np.diag(Q)) == 3 else "swapped axes"
            yield Mistake(
                kind,
                f"{name} channels alone: {channels_in_words(Q, axes)}",
                map_channels(table.expected, _relabelled((name,), Q)),
                5,
            )


def _relabelled(names: tuple[str, ...], Q: Array) -> Callable[[str, Array], Array]:
    return lambda name, values: values @ Q if name in names else values


def misfit(observed: Channels, predicted: Channels, tolerance: Channels) -> float:
    """Largest |observed - predicted| in units of the tolerance, over what was read; 0 when nothing was
    read.
    """
    worst = 0.0
    for name, values in observed.items():
        expected = getattr(predicted, name)
        limits = getattr(tolerance, name)
        if expected is None or limits is None:
            continue
        away = np.abs(values - expected)
        if name == "clinometer":
            away = np.minimum(away, np.abs(2.0 * np.pi - away))
        ratio = away / limits
        if np.any(np.isfinite(ratio)):
            worst = max(worst, float(np.nanmax(ratio)))
    return worst


def only_read(expected: Channels, observed: Channels) -> Channels:
    """`expected` with nan wherever `observed` was not read."""
    return Channels(
        **{
            name: np.where(np.isfinite(values), getattr(expected, name), np.nan)
            for name, values in observed.items()
            if getattr(expected, name) is not None
        }
    )
