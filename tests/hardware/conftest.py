"""Shared pieces for the mount and gimbal tests: frames and fixed-seed random rotations made by scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame


@pytest.fixture(scope="session")
def body() -> Frame:
    return Frame("body", ("forward", "starboard", "down"))


@pytest.fixture
def rng() -> np.random.Generator:
    return np.random.default_rng(20250611)


@pytest.fixture
def random_rotations(rng: np.random.Generator):
    """A function: count -> (count, 3, 3) uniformly distributed rotations from scipy."""
    return lambda count: Rotation.random(count, random_state=rng).as_matrix()
