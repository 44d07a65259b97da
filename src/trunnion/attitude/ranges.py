"""Ranges of stated angles: which triples a convention writes for an attitude that has two.

Every attitude has two triples (three at a second look: lock aside). Ranges single one out when either
the outer ranges are a full turn and the middle one half a turn between two neighbouring singular values, or
the middle range is a full turn and exactly one outer range half a turn (the other a full turn).
Anything narrower leaves attitudes without a triple, anything wider leaves two.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude import tolerances
from trunnion.attitude.extraction import wrap
from trunnion.attitude.sequences import Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]
Ranges = tuple[tuple[float, float], tuple[float, float], tuple[float, float]]

_TURN = 2.0 * np.pi


def check(
    ranges: Ranges,
    sequence: Sequence,
    signs: tuple[int, int, int],
    offsets: tuple[float, float, float],
    of: str,
) -> None:
    """Raise AttitudeError naming the impossible range of a convention (`of` says whose)."""
    if len(ranges) != 3 or not np.all(np.isfinite(np.asarray(ranges, dtype=float))):
        raise AttitudeError(f"{of} has ranges {ranges}", remedy="three pairs of finite angles")
    for place, (low, high) in zip(("first", "middle", "last"), ranges, strict=True):
        if not low < high:
            raise AttitudeError(
                f"{of}: the range of its {place} angle is empty or reversed ({_deg(low)} to {_deg(high)})",
                remedy="lower end first",
            )
    widths = [high - low for low, high in ranges]
    full = [_close(width, _TURN) for width in widths]
    half = [_close(width, np.pi) for width in widths]
    by_middle = full[0] and half[1] and full[2]
    by_outer = full[1] and sorted((full[0], full[2])) == [False, True] and (half[0] or half[2])
    if not (by_middle or by_outer):
        stated = ", ".join(f"{_deg(low)} to {_deg(high)}" for low, high in ranges)
        raise AttitudeError(
            f"{of}: ranges {stated} do not give every attitude exactly one triple",
            remedy="outer angles a full turn (-180 to 180 deg or 0 to 360 deg) and the middle one half a turn, "
            "or the middle one a full turn and one outer angle half a turn; "
            "travel limits belong into an envelope",
        )
    if by_middle and not _is_branch(ranges[1], sequence, signs[1], offsets[1]):
        raise AttitudeError(
            f"{of}: its middle range {_deg(ranges[1][0])} to {_deg(ranges[1][1])} holds a singular value inside",
            remedy="a branch runs from one singular value to the next: "
            + ("0 to 180 deg" if sequence.repeated else "-90 to 90 deg")
            + " before senses and offsets",
        )


def _is_branch(middle: tuple[float, float], sequence: Sequence, sign: int, offset: float) -> bool:
    turn = sign * (middle[0] - offset)
    singular = 0.0 if sequence.repeated else np.pi / 2.0
    steps = (turn - singular) / np.pi
    return abs(steps - round(steps)) * np.pi <= tolerances.RANGE


def place_outer(stated: Array) -> Array:
    """Outer angles into (-pi, pi]; the middle angle as it is (its branch is that of the chain)."""
    placed = stated.copy()
    placed[..., 0] = wrap(stated[..., 0])
    placed[..., 2] = wrap(stated[..., 2])
    return placed


def choose(stated: Array, other: Array, ranges: Ranges, of: str) -> Array:
    """Of the two triples of an attitude the one inside the ranges, placed into them."""
    one, one_fits = _into(stated, ranges)
    two, two_fits = _into(other, ranges)
    lost = ~(one_fits | two_fits)
    if np.any(lost):
        raise AttitudeError(f"{of}: an attitude has no triple inside the stated ranges", remedy="widen the ranges")
    return np.where(one_fits[..., None], one, two)


def _into(stated: Array, ranges: Ranges) -> tuple[Array, NDArray[np.bool_]]:
    placed = np.empty_like(stated)
    fits = np.ones(stated.shape[:-1], dtype=bool)
    for n, (low, high) in enumerate(ranges):
        placed[..., n], inside = _into_one(stated[..., n], low, high, outer=n != 1)
        fits &= inside
    return placed, fits


def _into_one(angle: Array, low: float, high: float, *, outer: bool) -> tuple[Array, NDArray[np.bool_]]:
    """Whole turns added so that the angle lies in [low, high]; a full turn is [low, high) from zero on, else
    (low, high].

    Within the slack of tolerances.RANGE outside an end of a narrower range counts as that end.
    """
    whole = _close(high - low, _TURN)
    if whole and low == 0.0:
        value = np.where((angle >= low) & (angle < high), angle, angle - _TURN * np.floor((angle - low) / _TURN))
        return np.where(value >= high, low, value), np.ones(np.shape(angle), dtype=bool)
    value = np.where((angle > low) & (angle <= high), angle, angle + _TURN * np.floor((high - angle) / _TURN))
    if whole:
        return np.where(value <= low, high, value), np.ones(np.shape(angle), dtype=bool)
    # A half turn: (low, high] after the shift may sit one turn low when the angle is at the lower end.
    value = np.where((value < low) & (value + _TURN <= high + tolerances.RANGE), value + _TURN, value)
    inside = (value >= low - tolerances.RANGE) & (value <= high + tolerances.RANGE)
    return np.clip(value, low, high, where=inside, out=value.copy()), inside


def _close(a: float, b: float) -> bool:
    return abs(a - b) <= tolerances.RANGE


def _deg(angle: float) -> str:
    return f"{np.degrees(angle):.6g} deg"
