"""Helpers of the attitude tests: frames, conventions, random attitudes from scipy (outside the project)."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence

LOCAL = Frame("local", ("north", "east", "down"))
BODY = Frame("body", ("forward", "starboard", "down"))


@pytest.fixture
def convention() -> Callable[..., Convention]:
    """`convention(sequence, sense, **more)`: a convention between two right-handed frames."""

    def make(sequence: Sequence, sense: Sense = Sense.MOVING, **more: Any) -> Convention:
        return Convention("under test", LOCAL, BODY, sequence, sense, ("first", "middle", "last"), **more)

    return make


@pytest.fixture(scope="session")
def random_attitudes() -> Rotation:
    """10 000 attitudes, uniform, fixed seed."""
    return Rotation.random(10_000, random_state=1977)


def turns(angles: np.ndarray) -> np.ndarray:
    """Angles as points of the circle: pi and -pi are one direction."""
    return np.exp(1j * np.asarray(angles))
