"""What a standard fixes when a convention is declared `as:` that standard.

Nothing here applies unless the spec names it. `seen` repeats how much of the standard was read.
"""

from __future__ import annotations

from dataclasses import dataclass

_TURN = ("-180 deg", "180 deg")
_HALF = ("-90 deg", "90 deg")


@dataclass(frozen=True)
class Standard:
    """Body axes, sequence, senses and ranges a standard fixes; `axes` lists the words allowed for x, y and
    z."""

    name: str
    axes: tuple[tuple[str, ...], tuple[str, ...], tuple[str, ...]]
    third_reference_axis: str
    sequence: str
    about: str
    angles: tuple[str, str, str]
    ranges: tuple[tuple[str, str], tuple[str, str], tuple[str, str]]
    seen: str

    @property
    def axes_text(self) -> str:
        """`forward, starboard or right, down`."""
        return ", ".join(" or ".join(words) for words in self.axes)


_FORWARD, _RIGHT, _LEFT = ("forward",), ("starboard", "right"), ("port", "left")

STANDARDS: dict[str, Standard] = {
    standard.name: standard
    for standard in (
        Standard(
            "ISO 1151-1", (_FORWARD, _RIGHT, ("down",)), "down", "3-2-1", "moving axes",
            ("azimuth", "inclination", "bank"), (_TURN, _HALF, _TURN),
            "ISO 1151-1:1988: catalogue abstract; order and ranges from memory",
        ),
        Standard(
            "ISO 8855", (_FORWARD, _LEFT, ("up",)), "up", "3-2-1", "moving axes",
            ("yaw", "pitch", "roll"), (_TURN, _HALF, _TURN),
            "ISO 8855:2011: preview pages; order and signs as adopted by ASAM OpenDRIVE; ranges from memory",
        ),
        Standard(
            "SNAME 1-5", (_FORWARD, _RIGHT, ("down",)), "down", "3-2-1", "moving axes",
            ("yaw", "pitch", "roll"), (_TURN, _HALF, _TURN),
            "SNAME Technical and Research Bulletin 1-5 (1950): citations; text from memory",
        ),
        Standard(
            "SAE J670", (_FORWARD, _RIGHT, ("down",)), "down", "3-2-1", "moving axes",
            ("yaw", "pitch", "roll"), (_TURN, _HALF, _TURN),
            "SAE J670 (1976 form): from memory",
        ),
        Standard(
            "REP-103", (_FORWARD, _LEFT, ("up",)), "up", "1-2-3", "fixed axes",
            ("roll", "pitch", "yaw"), (_TURN, _HALF, _TURN),
            "REP-103: order of its fixed-axis angles read; ranges from memory",
        ),
    )
}  # fmt: skip
