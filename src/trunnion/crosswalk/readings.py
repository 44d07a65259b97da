"""Every way to read three numbers as an attitude, and which of those ways are one and the same function.

A *reading* is a name: a sequence about moving or fixed axes, which column is which angle, the sign of each, which way
the matrix maps, degrees or radians. A *chain* is the function behind it, R = Rot(p, x) Rot(q, y) Rot(r, z) with p, q, r
signed coordinate axes and x, y, z the columns in some order. The 12 * 2 * 6 * 8 * 2 * 2 = 4608 readings are
96 * 6 * 2 = 1152 chains, four readings each: about moving axes I-J-K is about fixed axes K-J-I with the columns
reversed, and the transposed map reverses the order and all signs. No two chains are the same function, since p, q, r
are the directions of the derivatives at zero.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import elementary
from trunnion.attitude.sequences import Sense, Sequence

Array = NDArray[np.float64]
Triple = tuple[int, int, int]

COLUMN_ORDERS: tuple[Triple, ...] = tuple((i, j, k) for i, j, k in itertools.permutations(range(3)))
SIGNS: tuple[Triple, ...] = tuple((i, j, k) for i, j, k in itertools.product((1, -1), repeat=3))


@dataclass(frozen=True, order=True)
class Chain:
    """R = product over n of Rot(signs[n] * axis[n], column[columns[n]]), leftmost factor first.

    axes: 0, 1, 2 for x, y, z, neighbours different. columns: which of the three numbers turns that factor.
    degrees: the numbers are in degrees (else radians).
    """

    axes: Triple
    signs: Triple
    columns: Triple
    degrees: bool

    def matrix(self, numbers: ArrayLike) -> Array:
        """R (..., 3, 3) of numbers (..., 3) as they stand in the file."""
        written = np.asarray(numbers, dtype=float)
        turns = np.radians(written) if self.degrees else written
        first, second, third = (
            elementary(axis, sign * turns[..., column])
            for axis, sign, column in zip(self.axes, self.signs, self.columns, strict=True)
        )
        return first @ second @ third

    def readings(self) -> tuple[Reading, ...]:
        """The four names of this function: moving or fixed axes, direct or transposed map."""
        return tuple(_named(self, sense, direct) for direct in (True, False) for sense in (Sense.MOVING, Sense.FIXED))


@dataclass(frozen=True)
class Reading:
    """A name for a function: turn n of the sequence is signs[n] times the number in columns[n]."""

    sequence: Sequence
    sense: Sense
    columns: Triple
    signs: Triple
    maps_body_to_reference: bool
    degrees: bool

    def chain(self) -> Chain:
        """The function this reading is."""
        factors = list(zip(self.sequence.axes, self.signs, self.columns, strict=True))
        if self.sense is Sense.FIXED:
            factors.reverse()
        if not self.maps_body_to_reference:
            factors = [(axis, -sign, column) for axis, sign, column in reversed(factors)]
        axes, signs, columns = zip(*factors, strict=True)
        return Chain(axes, signs, columns, self.degrees)

    def words(self, names: tuple[str, str, str] = ("first number", "second number", "third number")) -> str:
        """In words: sequence and sense; what each turn is; unit; which way the matrix maps."""
        turns = ", ".join(
            f"{'−' if sign < 0 else ''}{names[column]}" for sign, column in zip(self.signs, self.columns, strict=True)
        )
        way = "body to reference" if self.maps_body_to_reference else "reference to body"
        unit = "deg" if self.degrees else "rad"
        return f"{self.sequence.value} about {self.sense.value}; turns: {turns}; {unit}; the matrix maps {way}"


def _named(chain: Chain, sense: Sense, direct: bool) -> Reading:
    factors = list(zip(chain.axes, chain.signs, chain.columns, strict=True))
    if not direct:
        factors = [(axis, -sign, column) for axis, sign, column in reversed(factors)]
    if sense is Sense.FIXED:
        factors.reverse()
    sequence = Sequence["".join("XYZ"[axis] for axis, _, _ in factors)]
    _, signs, columns = zip(*factors, strict=True)
    return Reading(sequence, sense, columns, signs, direct, chain.degrees)


@cache
def all_chains(*, degrees: bool | None = None) -> tuple[Chain, ...]:
    """All 1152 chains, or the 576 of one unit; in a fixed order."""
    units = (True, False) if degrees is None else (degrees,)
    return tuple(
        Chain(sequence.axes, signs, columns, unit)
        for unit in units
        for sequence in Sequence
        for columns in COLUMN_ORDERS
        for signs in SIGNS
    )


@cache
def all_readings() -> tuple[Reading, ...]:
    """All 4608 readings, in a fixed order."""
    return tuple(
        Reading(sequence, sense, columns, signs, direct, unit)
        for unit in (True, False)
        for direct in (True, False)
        for sense in Sense
        for sequence in Sequence
        for columns in COLUMN_ORDERS
        for signs in SIGNS
    )


def chain_matrices(numbers: ArrayLike, *, degrees: bool) -> Array:
    """R (576, N, 3, 3) of numbers (N, 3) under every chain of one unit, in the order of `all_chains`.

    Built from the 18 N elementary rotations that all chains share.
    """
    written = np.atleast_2d(np.asarray(numbers, dtype=float))
    turns = np.radians(written) if degrees else written
    factors = np.stack(
        [[[elementary(axis, sign * turns[:, column]) for column in range(3)] for sign in (1, -1)] for axis in range(3)]
    )  # (axis, sign, column, N, 3, 3)
    chains = all_chains(degrees=degrees)
    picks = np.array(
        [
            [
                (axis, 0 if sign > 0 else 1, column)
                for axis, sign, column in zip(c.axes, c.signs, c.columns, strict=True)
            ]
            for c in chains
        ]
    )
    first, second, third = (factors[picks[:, n, 0], picks[:, n, 1], picks[:, n, 2]] for n in range(3))
    return first @ second @ third
