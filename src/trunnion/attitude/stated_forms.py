"""A form between two named frames, and what it says in words. R_rb takes body to reference components."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.forms import DirectionRoll, FormNumbers, RotationVector, TiltPair, TiltType
from trunnion.attitude.frames import Frame
from trunnion.attitude.words import axis_words, degrees_text, end_words, listed, number_text, vector_text

Array = NDArray[np.float64]

_WORKED_DEG = (40.0, 12.0, -20.0)


@dataclass(frozen=True, eq=False)
class StatedForm:
    """A form with the frames it stands between and the name a workbook gives it."""

    name: str
    reference: Frame
    body: Frame
    form: TiltPair | DirectionRoll | RotationVector

    @property
    def names(self) -> tuple[str, ...]:
        """The names of its numbers; two where the roll is left free."""
        names = tuple(self.form.names)
        return names[:2] if isinstance(self.form, DirectionRoll) and not self.form.with_roll else names

    @property
    def kind(self) -> str:
        """What sort of form it is, in the words of the trade."""
        if isinstance(self.form, TiltPair):
            first, second = self.form.types
            mount = "gimballed sensor" if self.form.gimballed else "sensor fixed to the body"
            return f"heading and tilt pair, {first.value} and {second.value} ({mount})"
        if isinstance(self.form, DirectionRoll):
            return "direction and roll" if self.form.with_roll else "direction, the roll left free"
        return "rotation vector"

    def rotation(self, values: ArrayLike) -> Array:
        """R_rb (..., 3, 3) of its numbers (..., n); a free roll is taken as zero, a tilt pair as upright."""
        if isinstance(self.form, DirectionRoll) and not self.form.with_roll:
            return self.form.rotation(values, roll=0.0)
        return self.form.rotation(values)

    def numbers(self, R_rb: ArrayLike) -> FormNumbers:
        """Its numbers of attitudes (..., 3, 3)."""
        return self.form.numbers(R_rb)

    def as_convention(self) -> Convention | None:
        """The sequence it is, between its own frames, or None when it is none."""
        if isinstance(self.form, RotationVector):
            return None
        if isinstance(self.form, TiltPair) and not self.form.gimballed:
            return None
        found = self.form.as_convention()
        return Convention(
            self.name, self.reference, self.body, found.sequence, found.sense, found.angle_names,
            found.signs, found.offsets, found.left, found.right, found.ranges,
        )  # fmt: skip

    def worked(self) -> tuple[Array, Array]:
        """Numbers (n,) rad of one plain attitude and its R_rb (3, 3)."""
        values = np.radians(_WORKED_DEG)[: len(self.names)]
        return values, self.rotation(values)


def form_sentences(stated: StatedForm) -> list[str]:
    """What each number is and which way it grows."""
    form = stated.form
    if isinstance(form, TiltPair):
        return _tilt_sentences(stated, form)
    if isinstance(form, DirectionRoll):
        return _pointing_sentences(stated, form)
    rest = (stated.body.name, stated.reference.name)
    source, target = (rest[1], rest[0]) if form.reverse else rest
    return [
        f"{listed(form.names)} are the axis of the single turn, right-handed, times its angle in radians.",
        f"Of the map v_{target} = R v_{source}; its components are the same in both frames, since the turn leaves its "
        "axis alone. The opposite vector is the inverse map.",
    ]


def _tilt_sentences(stated: StatedForm, form: TiltPair) -> list[str]:
    level, (heading, one, two) = form.level, form.names
    grows = "clockwise" if level.clockwise else "counterclockwise"
    first = end_words(np.asarray(form.first), stated.body)
    said = [
        f"{heading} is the direction of {first} seen from above, from "
        f"{axis_words(np.asarray(level.north), stated.reference)}, growing {grows}."
    ]
    for name, axis, kind in ((one, form.first, form.types[0]), (two, form.second, form.types[1])):
        words = end_words(np.asarray(axis), stated.body)
        if kind is TiltType.SINE:
            said.append(f"{name} is the angle of {words} itself to the horizontal, positive with {words} up (sine).")
        else:
            upright = end_words(np.asarray(form.upright), stated.body)
            said.append(
                f"{name} is the angle to the horizontal seen in the plane of {words} and {upright}, positive with "
                f"{words} up (tangent)."
            )
    if not form.gimballed:
        said.append(
            "Each tilt stands on its own: the two are no turns one after the other, and one more sign says whether the "
            "body is upside down."
        )
    return said


def _pointing_sentences(stated: StatedForm, form: DirectionRoll) -> list[str]:
    azimuth, elevation, roll = form.names
    pole = axis_words(np.asarray(form.pole), stated.reference)
    zero = axis_words(np.asarray(form.zero_azimuth), stated.reference)
    sight, mark = (end_words(np.asarray(axis), stated.body) for axis in (form.boresight, form.mark))
    grows = "clockwise" if form.clockwise else "counterclockwise"
    said = [
        f"{azimuth} is the direction of {sight} around {pole}, from {zero}, growing {grows} seen from {pole}.",
        f"{elevation} is the angle of {sight} above the plane across {pole}, positive towards {pole}.",
    ]
    if not form.with_roll:
        return [*said, f"The turn about {sight} is left free: two numbers fix a direction, no attitude."]
    hand = "right-handed" if form.roll_right_handed else "left-handed"
    return [*said, f"{roll} turns {mark} about {sight}, {hand}; at zero {mark} points towards the side of {pole}."]


def worked_sentences(stated: StatedForm) -> list[str]:
    """One worked set of numbers with its matrix."""
    values, R = stated.worked()
    if isinstance(stated.form, RotationVector):
        shown = [f"{name} {number_text(float(v), 6)}" for name, v in zip(stated.names, values, strict=True)]
    else:
        shown = [f"{name} {degrees_text(float(v))}" for name, v in zip(stated.names, values, strict=True)]
    rows = ", ".join(vector_text(row, 6) for row in R)
    free = " with the roll at zero" if len(stated.names) == 2 else ""
    return [f"At {listed(shown)}{free}, R has the rows {rows}; v_{stated.reference.name} = R v_{stated.body.name}."]
