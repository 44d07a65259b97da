"""One-parameter searches on many problems at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from trunnion.envelope.vectors import Array

_SMALL = 1e-15  # of a function of size one


def bisect_parameter(function: Callable[[Array], Array], count: int, low: float = 0.0, high: float = 1.0) -> Array:
    """A sign change of `function` between low and high for `count` problems at once: (count,) parameters.

    `function` takes and returns (count,) arrays of size about one, with opposite signs at the two ends of each problem.
    False position with halved end values (the Illinois rule) two times out of three, bisection the third.
    """
    start, stop = np.full(count, low), np.full(count, high)
    at_start, at_stop = function(start), function(stop)
    guess = start
    for step in range(150):
        spread = at_stop - at_start
        secant = start - at_start * (stop - start) / np.where(spread == 0.0, 1.0, spread)
        inside = (secant > start) & (secant < stop) & (step % 3 != 2)
        guess = np.where(inside, secant, 0.5 * (start + stop))
        value = function(guess)
        if np.all((np.abs(value) <= _SMALL) | (stop - start <= 1e-16)):
            break
        same = np.sign(value) == np.sign(at_start)
        start, stop = np.where(same, guess, start), np.where(same, stop, guess)
        at_start = np.where(same, value, 0.5 * at_start)
        at_stop = np.where(same, 0.5 * at_stop, value)
    return guess
