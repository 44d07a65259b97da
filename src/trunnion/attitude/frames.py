"""Frames: named right-handed triads with named axes, and the constant rotations stated by naming axes."""

from __future__ import annotations

from collections.abc import Mapping
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

#: Families of words with a known mutual orientation, each in right-handed order (x, y, z).
_FAMILIES: tuple[tuple[tuple[str, ...], tuple[str, ...], tuple[str, ...]], ...] = (
    (("forward",), ("starboard", "right"), ("down",)),
    (("north",), ("east",), ("down",)),
)


def opposite(word: str) -> str:
    """The opposite of an axis word: known pairs by name, others by a leading minus sign."""
    return OPPOSITES.get(word, word[1:] if word.startswith("-") else f"-{word}")


def handedness(axes: tuple[str, str, str]) -> int | None:
    """+1 right-handed, -1 left-handed, 0 when two axes lie on one line, None when the words do not tell.

    Known are forward/aft, starboard or right/port or left, up/down together, and north/south, east/west,
    up/down.
    """
    if len({word for axis in axes for word in (axis, opposite(axis))}) < 6:
        return 0
    for family in _FAMILIES:
        columns = [_in_family(axis, family) for axis in axes]
        if all(column is not None for column in columns):
            return round(float(np.linalg.det(np.column_stack([c for c in columns if c is not None]))))
    return None


def _in_family(word: str, family: tuple[tuple[str, ...], ...]) -> NDArray[np.float64] | None:
    for index, words in enumerate(family):
        if word in words:
            return np.eye(3)[index]
        if opposite(word) in words:
            return -np.eye(3)[index]
    return None


@dataclass(frozen=True)
class Frame:
    """A named triad: `axes` are the names of its x, y and z axis (`("forward", "starboard", "down")`).

    `left_handed` must be said of a left-handed triad; such a frame takes part in conversions through its
    right-handed `partner` only, and no convention may stand on it. Raises AttitudeError for equal or opposite
    axes, and when the words contradict the stated handedness.
    """

    name: str
    axes: tuple[str, str, str]
    left_handed: bool = False
    partner: Frame | None = None

    def __post_init__(self) -> None:
        if len(self.axes) != 3 or not all(self.axes):
            raise AttitudeError(f"frame '{self.name}' names {len(self.axes)} axes", remedy="name three: x, y, z")
        hand = handedness(self.axes)
        x, y, z = self.axes
        if hand == 0:
            raise AttitudeError(
                f"frame '{self.name}' has two axes on one line: {x}, {y}, {z}",
                remedy="three perpendicular axes, none the opposite of another",
            )
        if hand == -1 and not self.left_handed:
            raise AttitudeError(
                f"frame '{self.name}' ({x}, {y}, {z}) is left-handed",
                remedy=f"({x}, {y}, {opposite(z)}) is right-handed; a left-handed frame must be declared "
                "with its right-handed partner",
            )
        if hand == 1 and self.left_handed:
            raise AttitudeError(
                f"frame '{self.name}' ({x}, {y}, {z}) is declared left-handed but its axes are right-handed",
                remedy="remove the declaration, or correct an axis",
            )

    def direction(self, word: str) -> NDArray[np.float64]:
        """Unit vector (3,) in this frame of a named axis or its known opposite; `x`, `-y` … work too.

        Raises AttitudeError naming the axes that exist.
        """
        index = self._index(word)
        if index is not None:
            return np.eye(3)[index]
        index = self._index(opposite(word))
        if index is not None:
            return -np.eye(3)[index]
        known = ", ".join(f"{axis} (opposite {opposite(axis)})" for axis in self.axes)
        raise AttitudeError(
            f"frame '{self.name}' has no axis '{word}'",
            remedy=f"its axes are {known}; or x, y, z with a sign",
        )

    def word(self, index: int, sign: int = 1) -> str:
        """The name of axis `index`, or of its opposite for a negative sign."""
        axis = self.axes[index]
        return axis if sign > 0 else opposite(axis)

    def nearest_word(self, vector: NDArray[np.float64]) -> tuple[str, float]:
        """The axis word nearest to a direction (3,) of this frame, and the angle (rad) between the two."""
        v = np.asarray(vector, dtype=float)
        index = int(np.argmax(np.abs(v)))
        axis = np.eye(3)[index] * (1.0 if v[index] >= 0.0 else -1.0)
        angle = float(np.arctan2(np.linalg.norm(np.cross(axis, v)), axis @ v))
        return self.word(index, 1 if v[index] >= 0.0 else -1), angle

    def _index(self, word: str) -> int | None:
        if word in self.axes:
            return self.axes.index(word)
        return "xyz".index(word) if word in ("x", "y", "z") else None


def attitude_from_axes(reference: Frame, body: Frame, lies_along: Mapping[str, str]) -> NDArray[np.float64]:
    """R_rb (3, 3) from words: two or three body axes, each with the reference axis it lies along.

    `{"forward": "north", "down": "down"}`. The third axis follows from the right-hand rule. Raises
    AttitudeError when fewer than two are given, when they contradict each other, or when all three together
    are a mirror image.
    """
    pairs = [(body.direction(b), reference.direction(r), b, r) for b, r in lies_along.items()]
    if len(pairs) < 2:
        raise AttitudeError(
            "one axis does not fix an attitude", remedy="name two: {forward: north, down: down} for instance"
        )
    (b1, r1, *_), (b2, r2, *_) = pairs[:2]
    if abs(b1 @ b2) > 0.5 or abs(r1 @ r2) > 0.5:
        raise AttitudeError(
            f"'{pairs[0][2]}: {pairs[0][3]}' and '{pairs[1][2]}: {pairs[1][3]}' name one line twice",
            remedy="name two different body axes and two different reference axes",
        )
    R_rb = np.column_stack([r1, r2, np.cross(r1, r2)]) @ np.column_stack([b1, b2, np.cross(b1, b2)]).T
    for b, r, b_word, r_word in pairs[2:]:
        if R_rb @ b @ r < 0.5:
            raise AttitudeError(
                f"'{b_word}: {r_word}' makes the axes a mirror image: the first two put {b_word} along "
                f"{reference.nearest_word(R_rb @ b)[0]}",
                remedy="leave the third axis out, or correct one of the three",
            )
    return R_rb
