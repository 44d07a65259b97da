"""Shared by the published-value tests: the derivation of a plain convention (no constants, no offsets)."""

from __future__ import annotations

import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence


@pytest.fixture(scope="session")
def derived():
    """`derived("ZYX")`: the derivation for a sequence about moving axes, body to reference, angles a, b, d."""
    from trunnion.symbolic.derivation import derive

    level = Frame("level", ("north", "east", "down"))
    body = Frame("body", ("forward", "starboard", "down"))

    def make(name: str, sense: Sense = Sense.MOVING):
        return derive(Convention("plain", level, body, Sequence[name], sense, ("a", "b", "d")))

    return make
