"""Frames: named right-handed triads with named axes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import AttitudeError

OPPOSITES: dict[str, str] = {}
for _one, _other in (
    ("forward", "aft"),
    ("starboard", "port"),
    ("right", "left"),
    ("up", "down"),
    ("north", "south"),
    ("east", "west"),
):
    OPPOSITES[_one], OPPOSITES[_other] = _other, _one


@dataclass(frozen=True)
class Frame:
    """A named triad: `axes` are the names of its x, y and z axis (`("forward", "starboard", "down")`)."""

    name: str
    axes: tuple[str, str, str]

    def direction(self, word: str) -> NDArray[np.float64]:
        """Unit vector (3,) in this frame of a named axis or its known opposite; `x`, `-y` … work too.

        Raises AttitudeError naming the axes that exist.
        """
        index = self._index(word)
        if index is not None:
            return np.eye(3)[index]
        opposite = OPPOSITES.get(word, word[1:] if word.startswith("-") else f"-{word}")
        index = self._index(opposite)
        if index is not None:
            return -np.eye(3)[index]
        known = ", ".join(f"{axis} (opposite {OPPOSITES.get(axis, '-' + axis)})" for axis in self.axes)
        raise AttitudeError(
            f"frame '{self.name}' has no axis '{word}'", remedy=f"its axes are {known}; or x, y, z with a sign"
        )

    def word(self, index: int, sign: int = 1) -> str:
        """The name of axis `index`, or of its opposite for a negative sign."""
        axis = self.axes[index]
        return axis if sign > 0 else OPPOSITES.get(axis, f"-{axis}")

    def _index(self, word: str) -> int | None:
        if word in self.axes:
            return self.axes.index(word)
        return "xyz".index(word) if word in ("x", "y", "z") else None
