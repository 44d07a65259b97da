"""Fixtures of the envelope tests: frames, conventions, random boxes, the hand-checkable tail-sitter."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.regions import Box, Cone, Union

LOCAL = Frame("local", ("north", "east", "down"))
BODY = Frame("body", ("forward", "starboard", "down"))
NAMES = ("first", "second", "third")


@pytest.fixture(scope="session")
def local() -> Frame:
    return LOCAL


@pytest.fixture(scope="session")
def body() -> Frame:
    return BODY


@pytest.fixture(scope="session")
def make_convention():
    """`make_convention("3-2-1", sense, left=…, right=…)`."""

    def make(text="3-2-1", sense=Sense.MOVING, names=NAMES, **constants):
        return Convention(text, LOCAL, BODY, Sequence.from_text(text), sense, names, **constants)

    return make


@pytest.fixture(scope="session")
def random_rotation():
    """`random_rotation(rng)` by scipy: uniform over all attitudes."""
    return lambda rng: Rotation.random(random_state=int(rng.integers(2**31))).as_matrix()


@pytest.fixture(scope="session")
def random_case(make_convention, random_rotation):
    """`random_case(rng, n)`: a box in one convention and another convention, constants on both sides of both."""
    texts = [sequence.value for sequence in Sequence]

    def convention(rng, n):
        sense = Sense.MOVING if n % 2 else Sense.FIXED
        left = random_rotation(rng) if n % 3 else np.eye(3)
        return make_convention(texts[rng.integers(12)], sense, left=left, right=random_rotation(rng))

    def case(rng, n):
        low = rng.uniform(-np.pi, np.pi, 3)
        width = rng.choice([0.0, 1e-9, 0.02, 0.3, 1.0, 3.0, 7.0], 3) * rng.uniform(0.1, 1.0, 3)
        return Box(convention(rng, n), tuple(zip(low, low + width, strict=True))), convention(rng, n + 1)

    return case


@pytest.fixture(scope="session")
def tail_sitter(make_convention):
    """Hover cone, transition and cruise boxes, in 3-2-1: margins that can be worked out by hand."""
    ordinary = make_convention("3-2-1", names=("heading", "elevation", "bank"))
    d = np.radians
    return Union(
        {
            "hover": Cone(BODY.direction("forward"), LOCAL.direction("up"), 0.0, d(10.0)),
            "transition": Box(ordinary, ((-np.pi, np.pi), (0.0, d(90.0)), (0.0, 0.0))),
            "cruise": Box(ordinary, ((-np.pi, np.pi), (d(-20.0), d(25.0)), (d(-45.0), d(45.0)))),
        }
    )
