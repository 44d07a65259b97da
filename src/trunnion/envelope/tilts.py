"""Margins of forms that are no sequence over a region: tilt pairs and rotation vectors.

The singular set of a tilt pair is not two attitudes but all with the upright axis horizontal; that of a rotation vector
all half turns away from the reference.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from trunnion.envelope.margins import direction_clearance, ranges_of, spread_of
from trunnion.envelope.regions import Region, as_pairs
from trunnion.envelope.results import Extreme

_ROUNDING = 4e-15  # cosines summed: what rounding may take from the trace


def tilt_margin(region: Region, up: ArrayLike, upright: ArrayLike) -> Extreme:
    """Least rotation angle (rad) over a region to an attitude with the upright body axis (3,) horizontal.

    That is a right angle less the largest angle between the lines of `up` (3,), in reference components, and the
    carried upright axis.
    """
    u, v = as_pairs(up, upright)
    largest = ranges_of(spread_of(region, u, v), u, v, line=True)[0].largest
    right = np.pi / 2.0
    witness = largest.witness
    if witness is not None:
        witness = replace(witness, value=max(right - witness.value, 0.0))
    return Extreme(
        max(right - largest.hi, 0.0), max(right - largest.lo, 0.0), largest.basis, witness, largest.governing
    )


def turn_margin(region: Region) -> float:
    """A lower bound (rad) over a region of the rotation angle to the nearest half turn, from three clearances.

    The trace of R_rb is the sum of the cosines between each reference axis and its body axis; with each at its own
    largest angle it cannot be smaller, so the turn cannot be larger. Certified, and attained only where one attitude
    has all three at their largest.
    """
    axes = np.eye(3)
    trace = sum(float(np.cos(direction_clearance(region, axis, axis).largest.hi)) for axis in axes)
    cosine = np.clip((trace - 1.0) / 2.0 - _ROUNDING, -1.0, 1.0)
    return float(np.pi - np.arccos(cosine))
