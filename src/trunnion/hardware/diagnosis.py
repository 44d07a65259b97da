"""From filled-in bench readings to pass, fail, and the mistake that fits a failure.

A clinometer's degrees factor is judged on the number as read. Letters: `b` host, `s` sensor.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.rotations import rotation_vector
from trunnion.errors import HardwareError
from trunnion.hardware.bench import BenchTable, Channels
from trunnion.hardware.instruments import UP
from trunnion.hardware.limits import SEPARATION
from trunnion.hardware.mistakes import map_channels, misfit, mistakes, only_read, reseated
from trunnion.hardware.mount_check import direction_words
from trunnion.hardware.mounts import Mount
from trunnion.hardware.right_angles import axes_in_words, right_angle_rotations
from trunnion.hardware.vectors import Array, angle_between, nearest_rotation, unit


@dataclass(frozen=True)
class Evidence:
    """What the poses and turns used can show.

    sufficient: every mistake considered would have shown. unseen: those that would not, in words. marks:
    why, per pose, turn or set (too level, planar, small).
    """

    sufficient: bool
    unseen: tuple[str, ...]
    marks: tuple[str, ...]


def evidence(table: BenchTable, observed: Channels | None = None) -> Evidence:
    """Which mistakes the table, or the part of it that was read, could not reveal.

    A mistake is revealed when some reading would differ from the nominal by more than `SEPARATION`
    tolerances.
    """
    read = table.expected if observed is None else only_read(table.expected, observed)
    unseen = tuple(m.words for m in mistakes(table) if misfit(read, m.predicted, table.tolerance) <= SEPARATION)
    return Evidence(not unseen, unseen, tuple(_marks(table, read)))


@dataclass(frozen=True)
class RowPower:
    """How many of the mistakes considered one row of one instrument reveals by itself."""

    instrument: str
    row: str
    revealed: int
    considered: int


def row_powers(table: BenchTable) -> list[RowPower]:
    """The revealing power of each row alone: low for a level pose, which is why it proves little."""
    considered = list(mistakes(table))
    found = []
    for name, values in table.expected.items():
        keys = [row.key for row in table.rows_of(name)]
        for k, key in enumerate(keys):
            alone = np.full(values.shape, np.nan)
            alone[k] = values[k]
            read = Channels(**{name: alone})
            seen = sum(misfit(read, m.predicted, table.tolerance) > SEPARATION for m in considered)
            found.append(RowPower(name, key, seen, len(considered)))
    return found


def _marks(table: BenchTable, read: Channels) -> Iterator[str]:
    ups = [p.up_b for k, p in enumerate(table.poses) if _row_read(read, k)]
    turns = [] if read.gyro is None else [k for k in range(len(table.turns)) if np.any(np.isfinite(read.gyro[k]))]
    axes = [table.turns[k].rate_b / np.linalg.norm(table.turns[k].rate_b) for k in turns]
    if not ups and not axes:
        yield "nothing was read"
        return
    spread = np.linalg.svd(np.array([*ups, *axes]), compute_uv=False)
    if len(ups) >= 1 and _rank(np.array(ups)) == 1 and not axes:
        yield "too level: every pose has the same line up, so a turn about it stays hidden"
    elif np.sum(spread > 0.2) == 2:
        yield "planar: every pose and turn lies in one plane, so a flip across it stays hidden"
    elif np.sum(spread > 0.2) == 1:
        yield "planar: all turns are about one line"
    if table.expected.gyro is not None and table.tolerance.gyro is not None:
        above = np.max(np.abs(table.expected.gyro / table.tolerance.gyro), axis=1)
        for k in turns:
            if above[k] < 3.0:
                yield f"small: the turn '{table.turns[k].key}' is hardly above the tolerance"


def _rank(rows: Array) -> int:
    return int(np.sum(np.linalg.svd(rows, compute_uv=False) > 0.2))


def _row_read(read: Channels, k: int) -> bool:
    return any(np.any(np.isfinite(v[k])) for name, v in read.items() if name != "gyro")


@dataclass(frozen=True, eq=False)
class Explanation:
    """One mistake judged: its largest deviation in tolerances, and what was fitted, if anything."""

    kind: str
    words: str
    misfit: float

    @property
    def fits(self) -> bool:
        """Every reading lies within its tolerance."""
        return self.misfit <= 1.0


@dataclass(frozen=True, eq=False)
class Diagnosis:
    """Pass or fail, and why.

    misfit: largest deviation from the nominal, in tolerances; worst: where. explanations: judged mistakes,
    best first. equally_good: other explanations that predict the same readings. verdict: one sentence.
    """

    passed: bool
    misfit: float
    worst: str
    explanations: tuple[Explanation, ...]
    equally_good: tuple[str, ...]
    evidence: Evidence
    verdict: str

    @property
    def mistake(self) -> Explanation | None:
        """The explanation named, or None when the readings pass or nothing fits."""
        return None if self.passed or not self.explanations[0].fits else self.explanations[0]


def diagnose(table: BenchTable, observed: Channels) -> Diagnosis:
    """Judge readings against the bench table and name the simplest mistake that explains a failure."""
    read = [values for _, values in observed.items() if np.any(np.isfinite(values))]
    if not read:
        raise HardwareError("the bench sheet holds no reading", remedy="fill in at least one row")
    shown = evidence(table, observed)
    nominal = misfit(observed, table.expected, table.tolerance)
    worst = _worst(table, observed)
    if nominal <= 1.0:
        verdict = "pass" if shown.sufficient else _pass_but(shown)
        return Diagnosis(True, nominal, worst, (), (), shown, verdict)
    judged = [
        (m.rank, Explanation(m.kind, m.words, misfit(observed, m.predicted, table.tolerance))) for m in mistakes(table)
    ]
    judged += [(6 + k, e) for k, e in enumerate(_fitted(table, observed))]
    judged.sort(key=lambda pair: (not pair[1].fits, pair[0] if pair[1].fits else 0, pair[1].misfit))
    ranked = tuple(e for _, e in judged)
    first = ranked[0]
    if not first.fits:
        verdict = (
            f"fail: none of the known mistakes fits; the best ({first.words}) misses by {first.misfit:.3g} tolerances"
        )
        return Diagnosis(False, nominal, worst, ranked, (), shown, verdict)
    same = tuple(e.words for rank, e in judged[1:] if e.fits and rank < 6)
    verdict = f"fail: {first.kind}: {first.words}"
    if same:
        verdict += f"; {len(same)} other explanation(s) fit these readings as well"
    return Diagnosis(False, nominal, worst, ranked, same, shown, verdict)


def _pass_but(shown: Evidence) -> str:
    why = "; ".join(shown.marks) or "the poses used cannot tell them apart"
    return f"readings agree, but the evidence is insufficient: {len(shown.unseen)} mistakes would read the same ({why})"


def _worst(table: BenchTable, observed: Channels) -> str:
    found = (-1.0, "")
    for name, values in observed.items():
        expected, limits = getattr(table.expected, name), getattr(table.tolerance, name)
        if expected is None:
            continue
        ratio = np.nan_to_num(np.abs(values - expected) / limits, nan=-1.0)
        row, column = np.unravel_index(int(np.argmax(ratio)), ratio.shape)
        key = table.rows_of(name)[row].key
        found = max(found, (float(ratio[row, column]), f"{name}, {key}, channel {column + 1}"))
    return found[1]


def _fitted(table: BenchTable, observed: Channels) -> Iterator[Explanation]:
    """Explanations with something fitted: a skewed turning axis, a wrong zero, a seat off by a general
    turn.
    """
    yield from _skewed_axis(table, observed)
    yield from _wrong_zero(table, observed)
    yield from _turned_seat(table, observed)


def _shifted(name: str, offset: Array) -> Callable[[str, Array], Array]:
    return lambda which, values: values + offset if which == name else values


def _replaced(name: str, new: Array) -> Callable[[str, Array], Array]:
    return lambda which, values: new if which == name else values


def _wrong_zero(table: BenchTable, observed: Channels) -> Iterator[Explanation]:
    for name, values in observed.items():
        expected, limits = getattr(table.expected, name), getattr(table.tolerance, name)
        complete = np.all(np.isfinite(values), axis=1) & np.all(np.isfinite(expected), axis=1)
        if name == "star_tracker" or np.sum(complete) < 3:
            continue
        offset = np.mean((values - expected)[complete], axis=0)
        if np.all(np.abs(offset) <= np.min(limits, axis=0)):
            continue
        moved = map_channels(table.expected, _shifted(name, offset))
        unit = {"accelerometer": "g", "gyro": "rad/s", "clinometer": "rad"}.get(name, "field units")
        said = ", ".join(f"{x:+.4g}" for x in offset)
        yield Explanation(
            "wrong zero",
            f"the {name} reads a constant ({said}) {unit} too much",
            misfit(observed, moved, table.tolerance),
        )


def _skewed_axis(table: BenchTable, observed: Channels) -> Iterator[Explanation]:
    """One turn made about another axis than asked for, all other readings being right."""
    nominal, limits = table.expected.gyro, table.tolerance.gyro
    if observed.gyro is None or nominal is None or limits is None:
        return
    if np.sum(np.all(np.isfinite(observed.gyro), axis=1)) < 2:
        return
    for k, turn in enumerate(table.turns):
        seen, rate = observed.gyro[k], float(np.linalg.norm(turn.rate_b))
        if not np.all(np.isfinite(seen)) or abs(np.linalg.norm(seen) - rate) > np.max(limits[k]):
            continue
        actual_b = table.mount.R_bs @ seen / np.linalg.norm(seen)
        skew = float(angle_between(actual_b, turn.rate_b / rate))
        if not 0.0 < skew < np.pi / 4:
            continue
        gyro = nominal.copy()
        gyro[k] = seen
        predicted = map_channels(table.expected, _replaced("gyro", gyro))
        where = direction_words(actual_b, table.mount.host)
        words = f"the turn '{turn.key}' was made about a skewed axis, {np.degrees(skew):.3g} deg off: {where}"
        yield Explanation("skewed turning axis", words, misfit(observed, predicted, table.tolerance))


def _turned_seat(table: BenchTable, observed: Channels) -> Iterator[Explanation]:
    """The best single rotation of the seat over all vector readings (least squares, SVD)."""
    pairs_b, pairs_s = [], []
    if observed.accelerometer is not None:
        pairs_b += [p.R_lb.T @ UP * table.mount.reports().sign for p in table.poses]
        pairs_s += list(observed.accelerometer)
    if observed.gyro is not None:
        pairs_b += [t.rate_b / np.linalg.norm(t.rate_b) for t in table.turns]
        pairs_s += [g / np.linalg.norm(t.rate_b) for g, t in zip(observed.gyro, table.turns, strict=True)]
    keep = [k for k, s in enumerate(pairs_s) if np.all(np.isfinite(s))]
    if len(keep) < 2 or _rank(np.array([pairs_b[k] for k in keep])) < 2:
        return
    B = sum((np.outer(pairs_b[k], pairs_s[k]) for k in keep), np.zeros((3, 3)))
    R_bs, _ = nearest_rotation(B)
    turn = rotation_vector(table.mount.R_bs.T @ R_bs)
    angle = float(np.linalg.norm(turn))
    axis = ", ".join(f"{x:.3g}" for x in (turn / angle if angle > 0 else turn))
    words = f"the sensor sits turned by {np.degrees(angle):.3g} deg about ({axis}) of its own axes"
    yield Explanation("misaligned seat", words, misfit(observed, reseated(table, R_bs), table.tolerance))


@dataclass(frozen=True, eq=False)
class RestingSeat:
    """One right-angle seat judged by a single reading at rest: its axes in words and how far the reading is off
    (rad).
    """

    matrix: Array
    words: str
    away: float


def seats_from_rest(mount: Mount, reading: ArrayLike, *, up: str = "up") -> list[RestingSeat]:
    """The 24 right-angle seats ordered by how well one accelerometer reading (3,) at rest fits each; best first.

    `up`: the host axis that points up. Four seats always fit alike, since a turn about the vertical does not show;
    mirrored axis maps are not offered. The reading's size does not matter here (compare it with 1 g).
    """
    measured = unit(reading, "the reading at rest") * mount.reports().sign
    up_b = mount.host.direction(up)
    seats = [
        RestingSeat(P, axes_in_words(P, mount.host, mount.sensor_axes), float(angle_between(P.T @ up_b, measured)))
        for P in right_angle_rotations()
    ]
    return sorted(seats, key=lambda seat: seat.away)
