"""The basis of a number: how strong the ground is on which it stands."""

from __future__ import annotations

import enum


class Basis(enum.Enum):
    """exact > certified bound > sampled; measured satisfies only what asks for measured."""

    EXACT = "exact"
    CERTIFIED = "certified bound"
    SAMPLED = "sampled"
    MEASURED = "measured"
