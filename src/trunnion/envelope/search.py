"""One-parameter searches on many problems at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from trunnion.envelope.vectors import Array

_PARTS = 32  # cuts of the interval a round: few rounds, since a call costs more than its arithmetic
_ROUNDS = 11  # 32^11 = 2^55: down to the last place of the parameter


def sign_change(function: Callable[[Array], Array], count: int) -> Array:
    """A sign change of `function` between 0 and 1 for `count` problems at once: (count,) parameters.

    `function` takes parameters (K, count) to values (K, count) and has opposite signs at 0 and 1 in each problem.
    """
    start, width = np.zeros(count), np.ones(count)
    sign = np.sign(function(start[None]))[0]
    steps = np.arange(1, _PARTS + 1)[:, None] / _PARTS
    every = np.arange(count)
    for _ in range(_ROUNDS):
        points = start + steps * width
        changed = np.sign(function(points)) != sign
        changed[-1] = True
        first = np.argmax(changed, axis=0)
        start = np.where(first > 0, points[np.maximum(first - 1, 0), every], start)
        width = width / _PARTS
    return start
