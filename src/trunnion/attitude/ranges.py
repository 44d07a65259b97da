"""Ranges of stated angles: which triples a convention writes for an attitude that has two.

Every attitude has two triples (at lock a whole line of them). Ranges single one out when either
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
    """Of the two triples (..., 3) of an attitude the one inside the ranges, placed into them.

    The first where both fit, which happens at lock and on the edges of the ranges only.
    """
    one, one_off = _into(stated, ranges)
    two, two_off = _into(other, ranges)
    if np.any(np.minimum(one_off, two_off) > tolerances.RANGE):
        raise AttitudeError(f"{of}: an attitude has no triple inside the stated ranges", remedy="widen the ranges")
    return np.where((one_off <= two_off)[..., None], one, two)


def _into(stated: Array, ranges: Ranges) -> tuple[Array, Array]:
    """The triple with whole turns added so that it lies in the ranges, and the distance (...) by which it does not."""
    placed = np.empty_like(stated)
    off = np.zeros(stated.shape[:-1])
    for n, (low, high) in enumerate(ranges):
        value = _into_one(stated[..., n], low, high)
        inside = np.clip(value, low, high)
        off = np.maximum(off, np.abs(value - inside))
        placed[..., n] = inside
    return placed, np.where(off <= tolerances.RANGE_ROUNDING, 0.0, off)


def _into_one(angle: Array, low: float, high: float) -> Array:
    """Whole turns added: a full turn is [low, high) from zero on, else (low, high]; half a turn: the nearer end."""
    if not _close(high - low, _TURN):
        centre = 0.5 * (low + high)
        near = np.abs(angle - centre) <= np.pi
        return np.where(near, angle, centre + wrap(angle - centre))
    if low == 0.0:
        value = np.where((angle >= low) & (angle < high), angle, angle - _TURN * np.floor(angle / _TURN))
        return np.where(value >= high, low, value)
    value = np.where((angle > low) & (angle <= high), angle, angle + _TURN * np.floor((high - angle) / _TURN))
    return np.where(value <= low, high, value)


def _close(a: float, b: float) -> bool:
    return abs(a - b) <= tolerances.RANGE


def _deg(angle: float) -> str:
    return f"{np.degrees(angle):.6g} deg"
