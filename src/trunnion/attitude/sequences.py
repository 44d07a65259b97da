"""The twelve three-angle sequences and what about moving or fixed axes means for them."""

from __future__ import annotations

import enum

from trunnion.errors import AttitudeError

_LETTERS = "XYZ"


class Sense(enum.Enum):
    """About which axes the second and third turn are made."""

    MOVING = "moving axes"
    FIXED = "fixed axes"


class Sequence(enum.Enum):
    """A sequence of three axes, first turn first; the value is the trade's digits form."""

    XYZ = "1-2-3"
    YZX = "2-3-1"
    ZXY = "3-1-2"
    XZY = "1-3-2"
    YXZ = "2-1-3"
    ZYX = "3-2-1"
    XYX = "1-2-1"
    XZX = "1-3-1"
    YXY = "2-1-2"
    YZY = "2-3-2"
    ZXZ = "3-1-3"
    ZYZ = "3-2-3"

    @property
    def axes(self) -> tuple[int, int, int]:
        """Axis indices 0, 1, 2 for x, y, z in the order of the turns."""
        first, second, third = (_LETTERS.index(letter) for letter in self.name)
        return first, second, third

    @property
    def repeated(self) -> bool:
        """True when the first and third axis are the same (3-1-3 and the like)."""
        return self.name[0] == self.name[2]

    @property
    def third_axis(self) -> int:
        """The axis that completes first and second: the third for three different axes, else the unused
        one.
        """
        i, j, _ = self.axes
        return 3 - i - j

    @property
    def parity(self) -> int:
        """+1 when (first, second, completing axis) is an even permutation of (x, y, z), else -1."""
        i, j, _ = self.axes
        return 1 if (j - i) % 3 == 1 else -1

    @classmethod
    def from_text(cls, text: str) -> Sequence:
        """Read `3-2-1`, `321`, `ZYX`, `z-y-x`. Letter case carries no meaning.

        Raises AttitudeError naming equal neighbours or unknown axes.
        """
        marks = [mark for mark in text.upper() if mark not in "- ,"]
        letters = "".join(_LETTERS[int(mark) - 1] if mark in "123" else mark for mark in marks)
        if len(letters) != 3 or any(letter not in _LETTERS for letter in letters):
            raise AttitudeError(
                f"'{text}' is not a sequence of three axes",
                remedy="write three axis digits, first turn first, such as 3-2-1",
            )
        if letters[0] == letters[1] or letters[1] == letters[2]:
            raise AttitudeError(
                f"sequence '{text}' turns twice in a row about the same axis, so it has only two free angles",
                remedy="neighbouring axes must differ: 3-2-1, 3-1-3, …",
            )
        return cls["".join(letters)]
