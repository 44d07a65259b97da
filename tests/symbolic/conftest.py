"""Conventions for the tests of this room; all scenarios are invented."""

from __future__ import annotations

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import about, elementary
from trunnion.attitude.sequences import Sense, Sequence

LOCAL = Frame("local", ("north", "east", "down"))
BODY = Frame("body", ("forward", "starboard", "down"))


def _convention(name: str = "ZYX", sense: Sense = Sense.MOVING, **more: object) -> Convention:
    angles = more.pop("angle_names", ("heading", "elevation", "bank"))
    return Convention("stated", LOCAL, BODY, Sequence[name], sense, angles, **more)


@pytest.fixture(scope="session")
def convention():
    """`convention("ZYX", Sense.MOVING, signs=…)`."""
    return _convention


def _constant(draw: np.random.Generator) -> np.ndarray:
    kind = draw.integers(4)
    relabelled = np.round(elementary(int(draw.integers(3)), np.pi / 2 * draw.integers(4)))
    relabelled = relabelled @ np.round(elementary(int(draw.integers(3)), np.pi / 2 * draw.integers(4)))
    if kind == 0:
        return np.eye(3)
    if kind == 1:
        return relabelled
    if kind == 2:
        return (
            elementary(int(draw.integers(3)), np.radians(draw.choice([40.0, 12.5, 33.333, 71.123456789]))) @ relabelled
        )
    return about(draw.normal(size=3), draw.uniform(0.2, 3.0))


@pytest.fixture(scope="session")
def any_convention():
    """`any_convention(n)`: the n-th of a fixed list of conventions with everything a workbook can state."""

    def make(number: int) -> Convention:
        draw = np.random.default_rng(number)
        sequence = list(Sequence)[number % 12]
        sense = list(Sense)[(number // 12) % 2]
        offsets = draw.choice([0.0, 0.0, np.pi / 2, -np.pi / 2, np.pi, 0.3, np.radians(30.0)], 3)
        signs = tuple(int(sign) for sign in draw.choice([1, -1], 3))
        return _convention(
            sequence.name,
            sense,
            angle_names=("alpha", "beta", "twist") if number % 3 else ("heading", "elevation", "bank"),
            signs=signs,
            offsets=tuple(float(offset) for offset in offsets),
            left=_constant(draw),
            right=_constant(draw),
            maps_body_to_reference=bool(number % 2),
        )

    return make
