"""The convention statement: one page of words and numbers for an interface document. No SymPy needed.

Letters: `r` the reference frame, `b` the body frame; v_r = R_rb v_b.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import elementary
from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import (
    degrees_text,
    listed,
    mapping_sentence,
    plain_names,
    range_sentence,
    singular_words,
    turn_axes,
    turn_sentences,
    vector_text,
    worked_vector,
    zero_matrix,
)

Array = NDArray[np.float64]

_DRAWN = np.radians([40.0, 30.0, 35.0])  # the turns of the drawing: large enough to see, no two alike


@dataclass(frozen=True)
class Part:
    """One heading with its paragraphs (plain text)."""

    title: str
    paragraphs: tuple[str, ...]


@dataclass(frozen=True)
class TurnPicture:
    """One turn to be drawn: `axis` (3,) in reference components, about which it is right-handed; `angle` rad;
    `before` and `after` (3, 3), columns the body axes in reference components.
    """

    name: str
    axis: Array
    angle: float
    before: Array
    after: Array


@dataclass(frozen=True)
class ConventionStatement:
    """Everything another party has to know about a convention, in words, with the data of the drawing.

    `stages`: four (3, 3) matrices, the body axes in reference components at zero and after each turn, with a caption
    each; `turns` the same turn by turn with axis and angle; the worked triple as stated angles rad, stated matrix and
    quaternion of the stated matrix, scalar first.
    """

    title: str
    parts: tuple[Part, ...]
    turns: tuple[TurnPicture, TurnPicture, TurnPicture]
    stages: tuple[Array, Array, Array, Array]
    stage_captions: tuple[str, str, str, str]
    worked_angles: Array
    worked_matrix: Array
    worked_quaternion: Array

    def paragraphs(self) -> list[str]:
        """All paragraphs in order, headings left out."""
        return [paragraph for part in self.parts for paragraph in part.paragraphs]


def statement(
    convention: Convention,
    *,
    frame_notes: Mapping[str, str] | None = None,
    standard: str | None = None,
    fixed_by_standard: Sequence[str] = (),
) -> ConventionStatement:
    """The statement of one convention.

    `frame_notes`: per frame name, text to carry along (which north, origin, lever arm); `standard` with
    `fixed_by_standard`: the standard that the workbook named and, one sentence each, what was taken from it.
    """
    convention = plain_names(convention)
    turns = _turns(convention)
    stages = (turns[0].before, turns[0].after, turns[1].after, turns[2].after)
    worked = worked_vector(convention)
    quaternion = convention.stated_quaternion(convention.matrix(worked.angles))
    parts = [
        Part("Frames", (*_frames(convention, frame_notes or {}), _scope())),
        Part(
            "The three turns, as made with a model in the hand",
            (*turn_sentences(convention), range_sentence(convention)),
        ),
        Part("Singular attitudes", _singular(convention)),
        Part("The matrix", (mapping_sentence(convention),)),
        Part("The quaternion", _quaternion(convention)),
        Part("A worked triple", _worked(convention, worked.sentence, worked.matrix, quaternion)),
        Part("The same convention under another name", (_other_name(convention),)),
    ]
    if standard is not None:
        parts.append(Part("Taken from a standard", _standard(standard, fixed_by_standard)))
    return ConventionStatement(
        title=f"Convention {convention.name}: {convention.body.name} relative to {convention.reference.name}",
        parts=tuple(parts),
        turns=turns,
        stages=stages,
        stage_captions=_captions(convention),
        worked_angles=worked.angles,
        worked_matrix=worked.matrix,
        worked_quaternion=quaternion,
    )


def _turns(convention: Convention) -> tuple[TurnPicture, TurnPicture, TurnPicture]:
    """The turns one after the other, each by a growing stated angle."""
    axes = turn_axes(convention)
    here, pictures = zero_matrix(convention), []
    done = np.eye(3)
    for place, axis in enumerate(convention.sequence.axes):
        turn = elementary(axis, convention.signs[place] * _DRAWN[place])
        if convention.sense is Sense.MOVING:
            line, done = here @ axes[place], done @ turn
        else:
            line, done = axes[place], turn @ done
        after = convention.left @ done @ convention.right
        pictures.append(TurnPicture(convention.angle_names[place], line, float(_DRAWN[place]), here, after))
        here = after
    return pictures[0], pictures[1], pictures[2]


def _captions(convention: Convention) -> tuple[str, str, str, str]:
    settings = [
        f"{name} {degrees_text(offset)}"
        for name, offset in zip(convention.angle_names, convention.offsets, strict=True)
    ]
    found = [f"start: {listed(settings)}"]
    for place, name in enumerate(convention.angle_names):
        found.append(f"after {name} {degrees_text(convention.offsets[place] + float(_DRAWN[place]))}")
    return found[0], found[1], found[2], found[3]


def _frames(convention: Convention, notes: Mapping[str, str]) -> tuple[str, ...]:
    found = []
    for role, frame in (("reference", convention.reference), ("body", convention.body)):
        text = f"{frame.name} ({role} frame): x {frame.axes[0]}, y {frame.axes[1]}, z {frame.axes[2]}, right-handed."
        note = notes.get(frame.name)
        found.append(f"{text} {note}" if note else text)
    return tuple(found)


def _singular(convention: Convention) -> tuple[str, ...]:
    words = [sentence[0].upper() + sentence[1:] for sentence in singular_words(convention)]
    first, _, last = convention.angle_names
    words.append(
        f"There {first} and {last} one by one mean nothing; near there they change by one over the lock margin "
        "times any change of attitude. Compare attitudes by the angle of the turn between them, never triple by triple."
    )
    return tuple(words)


def _quaternion(convention: Convention) -> tuple[str, ...]:
    letter = "R" if convention.maps_body_to_reference else "C"
    source, target = convention.body.name, convention.reference.name
    if not convention.maps_body_to_reference:
        source, target = target, source
    return (
        f"Four numbers, scalar first, (q0, q1, q2, q3), with Hamilton's product (i j = k), of the same map as "
        f"{letter}: v_{target} = q v_{source} q*. For a turn by t about the unit vector n, (cos t/2, n sin t/2). "
        "The opposite of all four numbers is the same attitude; the one with positive scalar is given.",
    )


def _worked(convention: Convention, sentence: str, matrix: Array, quaternion: Array) -> tuple[str, ...]:
    letter = "R" if convention.maps_body_to_reference else "C"
    rows = ", ".join(vector_text(row, 6) for row in matrix)
    return sentence, f"{letter} has the rows {rows}; the quaternion is {vector_text(quaternion, 6)}."


def _other_name(convention: Convention) -> str:
    moving = convention.sense is Sense.MOVING
    reverse = "-".join(reversed(convention.sequence.value.split("-")))
    own, other = ("moving", "fixed") if moving else ("fixed", "moving")
    names = listed(list(reversed(convention.angle_names)))
    return (
        f"{convention.sequence.value} about {own} axes is the same as {reverse} about {other} axes with the angles "
        f"in the order {names}. With the angles in their own order, {convention.sequence.value} about {other} axes is "
        "another convention."
    )


def _scope() -> str:
    return (
        "Trunnion computes attitude only. Origins and lever arms are carried as text; no position, velocity or "
        "acceleration is transferred from one point to another."
    )


def _standard(standard: str, fixed: Sequence[str]) -> tuple[str, ...]:
    head = f"The workbook names {standard}. What was taken from it:"
    return (head, *(fixed or ("nothing: every part was stated.",)))
