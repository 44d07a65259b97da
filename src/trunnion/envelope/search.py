"""One-parameter searches on many problems at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from trunnion.envelope.vectors import Array


def bisect_parameter(function: Callable[[Array], Array], count: int, low: float = 0.0, high: float = 1.0) -> Array:
    """A sign change of `function` between low and high for `count` problems at once: (count,) parameters.

    `function` takes and returns (count,) arrays and has opposite signs at the two ends of each problem.
    """
    start, stop = np.full(count, low), np.full(count, high)
    sign = np.sign(function(start))
    for _ in range(54):
        middle = 0.5 * (start + stop)
        same = np.sign(function(middle)) == sign
        start, stop = np.where(same, middle, start), np.where(same, stop, middle)
    return 0.5 * (start + stop)
