"""Which attitude to measure next, so that what is left is told apart best."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.crosswalk.fitting import angle_between
from trunnion.crosswalk.identify import Identification

Array = NDArray[np.float64]

_RANDOM = 400
_GRID_STEP_DEG = 30.0
_MOST_READINGS = 96
_SEED = 8


@dataclass(frozen=True, eq=False)
class NextMeasurement:
    """Numbers (3,) to set, in the unit of the readings left, and the least and largest separation (rad) they give."""

    numbers: Array
    degrees: bool
    least_separation: float
    largest_separation: float
    readings: int


def next_measurement(found: Identification, *, reach: float = np.pi) -> NextMeasurement | None:
    """The triple among 400 random ones and a 30-degree grid whose predictions differ most, None when nothing is left.

    reach: largest size of each number (rad). With more than 96 readings left a fixed selection of them is compared.
    """
    fits = [fit for fit in found.fits if fit.reading.chain is not None]
    if len(fits) < 2:
        return None
    generator = np.random.default_rng(_SEED)
    if len(fits) > _MOST_READINGS:
        fits = [fits[index] for index in sorted(generator.permutation(len(fits))[:_MOST_READINGS])]
    degrees = bool(sum(fit.reading.chain.degrees for fit in fits if fit.reading.chain) * 2 >= len(fits))
    pool = _pool(generator, reach)
    numbers = np.degrees(pool) if degrees else pool
    predicted = np.array(
        [fit.left @ fit.reading.chain.matrix(numbers) @ fit.right for fit in fits if fit.reading.chain is not None]
    )
    least = np.full(len(pool), np.inf)
    largest = np.zeros(len(pool))
    for index in range(len(predicted) - 1):
        apart = angle_between(predicted[index], predicted[index + 1 :])
        least = np.minimum(least, apart.min(axis=0))
        largest = np.maximum(largest, apart.max(axis=0))
    best = int(np.argmax(least))
    return NextMeasurement(numbers[best], degrees, float(least[best]), float(largest[best]), len(found.fits))


def _pool(generator: np.random.Generator, reach: float) -> Array:
    steps = np.radians(np.arange(-180.0, 180.0, _GRID_STEP_DEG))
    steps = steps[np.abs(steps) <= reach + 1e-12]
    grid = np.array(np.meshgrid(steps, steps, steps, indexing="ij")).reshape(3, -1).T
    random = np.radians(np.round(np.degrees(generator.uniform(-reach, reach, size=(_RANDOM, 3)))))
    return np.vstack([random, grid])
