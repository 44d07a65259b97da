"""Reference attitudes: few rows, at least one of which shows up every wrong reading by more than a degree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.words import singular_attitudes
from trunnion.crosswalk.wrong_readings import ChainFamily, Rows, WrongReading, single_readings

Array = NDArray[np.float64]

CAUGHT = np.radians(1.0)
"""A wrong reading counts as shown up by a row that it misses by more than this rotation angle."""

_SAME = 1e-6  # rad; readings that stay this close on every candidate are one function under two names
_TIMES = 3  # rows that show up each wrong reading, so that one mistyped row does not decide
_POOL = 160
_SEED = 1977
_CLEAR_OF_LOCK = np.radians(20.0)
_NEAR_LOCK_DEG = (1.0, 1e-3)
_NAMES_PER_FUNCTION = 4
_NAMES_PER_RELABELLED = 96


@dataclass(frozen=True, eq=False)
class Caught:
    """What one row shows up that no row before it did, and the least miss (rad) among it."""

    row: int
    count: int
    least: float


@dataclass(frozen=True, eq=False)
class Family:
    """One family of readings tried: how many names and functions, how many are ours, who catches the rest."""

    name: str
    names: int
    functions: int
    same: int
    caught: tuple[Caught, ...]

    @property
    def missed(self) -> int:
        """Functions that are not ours and that no row shows up."""
        return self.functions - self.same - sum(part.count for part in self.caught)


@dataclass(frozen=True, eq=False)
class ReferenceSet:
    """Regular rows that separate every wrong reading, extra rows at and near lock, and the account of what was tried.

    same_names: every name, among the readings of three numbers, of the very function this convention is.
    """

    convention: Convention
    regular: Rows
    extra: Rows
    extra_words: tuple[str, ...]
    families: tuple[Family, ...]
    same_names: tuple[str, ...]
    least_miss: float


def reference_set(convention: Convention) -> ReferenceSet:
    """Choose rows for a convention: greedily from a fixed pool, each time the row that shows up most of what is left.

    Every function of the families in `wrong_readings` that differs from the convention misses at least one regular
    row by more than `CAUGHT`.
    """
    pool = Rows.of(convention, _pool(convention))
    chains = ChainFamily(convention)
    separations = chains.separations(pool)
    table = separations.reshape(-1, _POOL)
    singles = single_readings(convention)
    others = np.array([rotation_angle(reading.attitudes(pool), pool.truth) for reading in singles])
    everything = np.vstack([table, others])
    same = everything.max(axis=1) < _SAME
    chosen = _greedy(everything[~same])
    regular = Rows.of(convention, pool.angles[chosen])
    apart = everything[:, chosen]
    plain = np.zeros(len(everything), dtype=bool)
    plain[: len(table) : 24] = True
    relabelled = np.zeros_like(plain)
    relabelled[: len(table)] = ~plain[: len(table)]
    families = [
        _family("readings of three numbers", plain, apart, same, _NAMES_PER_FUNCTION),
        _family("the same with relabelled or mirrored frames", relabelled, apart, same, _NAMES_PER_RELABELLED),
        *_single_families(singles, apart, same, len(table)),
    ]
    extra, words = _lock_rows(convention)
    return ReferenceSet(
        convention,
        regular,
        Rows.of(convention, extra),
        words,
        tuple(families),
        _same_names(chains, separations),
        float(apart[~same].max(axis=1).min()),
    )


def _pool(convention: Convention) -> Array:
    """Candidate rows (_POOL, 3) rad, whole degrees, well clear of lock, no two numbers equal in size."""
    generator = np.random.default_rng(_SEED)
    centre = np.pi / 2 if convention.sequence.repeated else 0.0
    reach = np.pi / 2 - _CLEAR_OF_LOCK
    rows: list[Array] = []
    while len(rows) < _POOL:
        turns = np.array(
            [generator.uniform(-2.8, 2.8), centre + generator.uniform(-reach, reach), generator.uniform(-2.8, 2.8)]
        )
        stated = np.round(np.degrees(convention.stated_from_chain(turns)))
        size = np.sort(np.abs(stated))
        if size[0] >= 7 and np.diff(size).min() >= 7:
            rows.append(np.radians(stated))
    return np.array(rows)


def _greedy(separations: Array) -> list[int]:
    """Columns that together exceed CAUGHT `_TIMES` times in every row, taking first what shows up most of what is left.

    With far more than CAUGHT where the pool allows it.
    """
    chosen: list[int] = []
    for threshold in (5.0 * CAUGHT, CAUGHT):
        caught = separations > threshold
        lacking = _TIMES - caught[:, chosen].sum(axis=1)
        while (lacking > 0).any():
            worth = (caught & (lacking > 0)[:, None]).sum(axis=0)
            worth[chosen] = 0
            best = int(np.argmax(worth))
            if not worth[best]:
                break
            chosen.append(best)
            lacking -= caught[:, best]
    return chosen


def _family(name: str, mask: NDArray[np.bool_], apart: Array, same: NDArray[np.bool_], names: int) -> Family:
    left = mask & ~same
    caught = []
    for row in range(apart.shape[1]):
        new = left & (apart[:, row] > CAUGHT)
        if new.any():
            caught.append(Caught(row, int(new.sum()), float(apart[new, row].min())))
        left &= ~new
    count = int(mask.sum())
    return Family(name, count * names, count, int((mask & same).sum()), tuple(caught))


def _single_families(singles: list[WrongReading], apart: Array, same: NDArray[np.bool_], start: int) -> list[Family]:
    found = []
    for name in dict.fromkeys(reading.family for reading in singles):
        mask = np.zeros(len(apart), dtype=bool)
        for index, reading in enumerate(singles):
            mask[start + index] = reading.family == name
        found.append(_family(name, mask, apart, same, 1))
    return found


def _same_names(chains: ChainFamily, separations: Array) -> tuple[str, ...]:
    plain = separations[:, 0, :].max(axis=1) < _SAME
    names = chains.convention.angle_names
    return tuple(
        reading.words(names) for index in np.flatnonzero(plain) for reading in chains.chain(int(index)).readings()
    )


def _lock_rows(convention: Convention) -> tuple[Array, tuple[str, ...]]:
    """Rows (6, 3) rad at both singular attitudes and 1 deg and 0.001 deg from them, with what each is."""
    rows, words = [], []
    outer = convention.stated_from_chain(np.radians([35.0, 0.0, -70.0]))
    middle = convention.angle_names[1]
    for attitude in singular_attitudes(convention):
        value = f"{middle} {np.degrees(attitude.angle):g} deg"
        inward = _inward(convention, attitude.turn)
        for off in (0.0, *np.radians(_NEAR_LOCK_DEG)):
            rows.append([outer[0], attitude.angle + inward * off, outer[2]])
            words.append(f"at lock, {value}" if off == 0.0 else f"{np.degrees(off):g} deg from lock, {value}")
    return np.array(rows), tuple(words)


def _inward(convention: Convention, turn: float) -> float:
    """Sign of the stated middle angle's step that leads from a singular value into the convention's own branch."""
    centre = np.pi / 2 if convention.sequence.repeated else 0.0
    return float(np.sign(centre - turn) * convention.signs[1])
