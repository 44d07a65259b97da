"""Attitudes of a region to demonstrate with: the corners of boxes, the rows of tables, and evenly spread samples."""

from __future__ import annotations

from itertools import product
from typing import Any

import numpy as np

from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.envelope.regions import Box, Dispersed, Region, Track, Union
from trunnion.envelope.sampling import sample_region

SAMPLES = 4096


def attitudes(region: Region, count: int = SAMPLES) -> Any:
    """Attitudes (N, 3, 3) of a region; they demonstrate and prove nothing."""
    if isinstance(region, Track) and not region.attitude_error:
        return matrix_from_quaternion(region.quaternions)
    if isinstance(region, Union):
        return np.concatenate([attitudes(part, count) for part in region.parts.values()])
    samples = sample_region(region, count).matrices
    inner = region.region if isinstance(region, Dispersed) else region
    if isinstance(inner, Box):
        corners = np.array(list(product(*inner.ranges)))
        return np.concatenate([inner.convention.matrix(corners), samples])
    return samples
