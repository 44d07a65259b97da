"""What a margin calculation returns: bracketed extremes with their basis and the attitude where they are taken.

Inside, `Spread` carries four extremes of M pairs (u, v) at once: the least and largest angle between u and R v, and
the least and largest angle between their lines. Outside, people see `Extreme` and `AngleRange`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.basis import Basis
from trunnion.envelope.box import ROUNDING_BOUND
from trunnion.envelope.vectors import Array, angle_between

RIGHT_ANGLE = np.pi / 2
ZERO_BELOW = np.radians(1e-9)
"""A bound below this is reported as zero: 90 deg is itself not a floating point number of radians."""

TIE = np.radians(1e-9)
"""Parts of a union whose bounds differ by less than this share the first place."""

LEAST_ANGLE, LARGEST_ANGLE, LEAST_LINE, LARGEST_LINE = range(4)

_STRENGTH = (Basis.EXACT, Basis.CERTIFIED, Basis.SAMPLED, Basis.MEASURED)


def weakest(*bases: Basis) -> Basis:
    """The weakest of several bases; measured counts as the weakest, since only `measured` asks for it."""
    return max(bases, key=_STRENGTH.index)


@dataclass(frozen=True, eq=False)
class Witness:
    """An attitude of the region: matrix R_rb (3, 3), the angle there (rad), its time, and where it is in words."""

    matrix: Array
    value: float
    time: float | None
    where: str


@dataclass(frozen=True, eq=False)
class Extreme:
    """One extreme angle: the truth lies in [lo, hi] (rad) on the stated basis; governing names the union's parts."""

    lo: float
    hi: float
    basis: Basis
    witness: Witness | None
    governing: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class AngleRange:
    """Least and largest of an angle over a region."""

    least: Extreme
    largest: Extreme


MarginRange = AngleRange
"""An AngleRange of lock margins (angle between lines, 0 … pi/2)."""


@dataclass(frozen=True, eq=False)
class Spread:
    """Four extremes (first index, see the constants above) of M pairs; arrays (4, M, ...), angles rad.

    lo, hi bracket each extreme; matrices are witnesses (nan where none is known), times nan where there is none;
    where and governing are object arrays of texts and of tuples of part names.
    """

    lo: Array
    hi: Array
    matrices: Array
    times: Array
    where: NDArray[np.object_]
    governing: NDArray[np.object_]
    basis: Basis


def empty_texts(count: int) -> NDArray[np.object_]:
    """Object array (4, count) of empty texts."""
    texts = np.empty((4, count), dtype=object)
    texts[:] = ""
    return texts


def no_names(count: int) -> NDArray[np.object_]:
    """Object array (4, count) of empty tuples."""
    names = np.empty((4, count), dtype=object)
    for index in np.ndindex(4, count):
        names[index] = ()
    return names


@dataclass(frozen=True, eq=False)
class Ends:
    """The two ends of the angle over one connected set: M values with bracket, witness, time and place."""

    lo: Array
    hi: Array
    matrices: Array
    times: Array
    where: list[str]


def closed_form_ends(value: Array, matrices: Array, where: list[str], times: Array | None = None) -> Ends:
    """Ends known to the rounding bound of the closed forms."""
    times = np.full(value.shape, np.nan) if times is None else times
    lo = np.where(value < ZERO_BELOW, 0.0, value - ROUNDING_BOUND)
    return Ends(np.maximum(lo, 0.0), np.minimum(value + ROUNDING_BOUND, np.pi), matrices, times, where)


Crossing = Callable[[NDArray[np.intp]], tuple[Array, Array, list[str]]]
"""Given the numbers of pairs, attitudes of the set where u and R v are perpendicular: matrices, times, places."""


def connected(least: Ends, largest: Ends, crossing: Crossing, basis: Basis) -> Spread:
    """Spread of a connected set: its angles fill an interval, so the line angles follow from the two ends."""
    count = len(least.lo)
    flip = least.lo > np.pi - largest.hi  # the far end is nearer to its own line
    cross = (least.hi < RIGHT_ANGLE) & (largest.lo > RIGHT_ANGLE)
    beyond = ~cross & (least.hi + largest.lo > np.pi)  # all on the far side of the right angle
    mirrored_least, mirrored_largest = _mirrored(largest), _mirrored(least)
    parts = [
        least,
        largest,
        _choose(flip, mirrored_least, least),
        _choose(beyond, mirrored_largest, largest),
    ]
    lo, hi = (np.stack([getattr(part, name) for part in parts]) for name in ("lo", "hi"))
    lo[LARGEST_LINE] = np.where(cross, RIGHT_ANGLE - ROUNDING_BOUND, lo[LARGEST_LINE])
    hi[LARGEST_LINE] = np.where(cross, RIGHT_ANGLE, np.minimum(hi[LARGEST_LINE], RIGHT_ANGLE))
    spread = Spread(
        lo,
        hi,
        np.stack([part.matrices for part in parts]),
        np.stack([part.times for part in parts]),
        _texts([part.where for part in parts]),
        no_names(count),
        basis,
    )
    return _with_crossings(spread, np.flatnonzero(cross), crossing)


def _texts(rows: list[list[str]]) -> NDArray[np.object_]:
    texts = np.empty((len(rows), len(rows[0])), dtype=object)
    for index, row in enumerate(rows):
        texts[index, :] = row
    return texts


def _mirrored(ends: Ends) -> Ends:
    return replace(ends, lo=np.pi - ends.hi, hi=np.pi - ends.lo)


def _choose(mask: NDArray[np.bool_], one: Ends, other: Ends) -> Ends:
    return Ends(
        np.where(mask, one.lo, other.lo),
        np.where(mask, one.hi, other.hi),
        np.where(mask[:, None, None], one.matrices, other.matrices),
        np.where(mask, one.times, other.times),
        [a if take else b for take, a, b in zip(mask, one.where, other.where, strict=True)],
    )


def _with_crossings(spread: Spread, pairs: NDArray[np.intp], crossing: Crossing) -> Spread:
    if len(pairs):
        matrices, times, where = crossing(pairs)
        spread.matrices[LARGEST_LINE, pairs] = matrices
        spread.times[LARGEST_LINE, pairs] = times
        spread.where[LARGEST_LINE, pairs] = where
    return spread


def joined(parts: dict[str, Spread], *, named: bool = True) -> Spread:
    """Spread of a union: the governing part of each extreme, ties named together."""
    names = list(parts)
    spreads = list(parts.values())
    lows, highs = np.stack([s.lo for s in spreads]), np.stack([s.hi for s in spreads])
    sign = np.array([1.0, -1.0, 1.0, -1.0])[:, None]  # least extremes look down, largest ones up
    deciding = np.where(sign > 0, lows, -highs)
    attained = np.where(sign > 0, highs, -lows)
    choice = np.argmin(attained, axis=0)
    governing = no_names(lows.shape[2])
    if named:
        tied = deciding <= deciding.min(axis=0) + TIE
        for index in np.ndindex(*choice.shape):
            governing[index] = tuple(name for name, tie in zip(names, tied[(slice(None), *index)], strict=True) if tie)

    def pick(arrays: list[Any]) -> Any:
        stacked = np.stack(arrays)
        rows, columns = np.indices(choice.shape)
        return stacked[choice, rows, columns]

    return Spread(
        np.where(sign > 0, lows.min(axis=0), lows.max(axis=0)),
        np.where(sign > 0, highs.min(axis=0), highs.max(axis=0)),
        pick([s.matrices for s in spreads]),
        pick([s.times for s in spreads]),
        pick([s.where for s in spreads]),
        governing if named else pick([s.governing for s in spreads]),
        weakest(*(s.basis for s in spreads)),
    )


def spread_from(pairs: list[tuple[Extreme, ...]]) -> Spread:
    """The Spread of M pairs from the four extremes of each, in the order of the constants above."""
    count = len(pairs)
    matrices, times = np.full((4, count, 3, 3), np.nan), np.full((4, count), np.nan)
    where, governing = empty_texts(count), no_names(count)
    lo, hi = (np.array([[getattr(e, end) for e in pair] for pair in pairs], dtype=float).T for end in ("lo", "hi"))
    for pair, extremes in enumerate(pairs):
        for which, one in enumerate(extremes):
            governing[which, pair] = one.governing
            if one.witness is not None:
                matrices[which, pair], where[which, pair] = one.witness.matrix, one.witness.where
                times[which, pair] = np.nan if one.witness.time is None else one.witness.time
    return Spread(lo, hi, matrices, times, where, governing, weakest(*(e.basis for pair in pairs for e in pair)))


def witness_angles(spread: Spread, u: Array, v: Array) -> Array:
    """The angle at each witness, (4, M) rad, recomputed from its matrix; nan where there is none."""
    carried = np.einsum("xmij,jm->ixm", spread.matrices, v)
    angle = angle_between(np.broadcast_to(u[:, None], carried.shape), carried)
    angle[LEAST_LINE:] = np.minimum(angle[LEAST_LINE:], np.pi - angle[LEAST_LINE:])
    return angle


def extreme(spread: Spread, which: int, pair: int, values: Array) -> Extreme:
    """One Extreme out of a spread; `values` are the witness angles."""
    matrix, value, time = spread.matrices[which, pair], values[which, pair], spread.times[which, pair]
    witness = None
    if np.isfinite(value):
        stamp = float(time) if np.isfinite(time) else None
        witness = Witness(matrix, float(value), stamp, str(spread.where[which, pair]))
    lo, hi = float(spread.lo[which, pair]), float(spread.hi[which, pair])
    return Extreme(lo, hi, spread.basis, witness, spread.governing[which, pair])
