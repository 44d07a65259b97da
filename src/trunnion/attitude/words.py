"""A convention in plain sentences: what a person would do with a model in the hand.

Letters: `r` the reference frame, `b` the body frame. Everything here is arithmetic on the constants of a
convention and needs numpy only, so that readback stays fast. The readings of the singular attitudes are
proved for every sequence in `symbolic`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense

Vector = NDArray[np.float64]

_SAME_DIRECTION = 1e-9  # components below this count as zero when a direction is named
_NAMES_OF_ENDS = {"forward": "the nose", "aft": "the tail"}
_SHORT_OF_ONE = 0.6188  # a fraction of a range that makes no round number


def degrees_text(angle: float, digits: int = 6) -> str:
    """An angle (rad) as typed by a person: `40°`, `−90°`, `12.345678°`; trailing zeros dropped."""
    text = f"{round(float(np.degrees(angle)), digits) + 0.0:.{digits}f}".rstrip("0").rstrip(".")
    return text.replace("-", "−") + "°"


def number_text(value: float, digits: int = 4) -> str:
    """A plain number with a fixed count of decimals and a true minus sign; no negative zero."""
    return f"{round(float(value), digits) + 0.0:.{digits}f}".replace("-", "−")


def vector_text(vector: Vector, digits: int = 4) -> str:
    """A vector (3,) as `(0.8067, 0.1422, 0.5736)`."""
    return "(" + ", ".join(number_text(value, digits) for value in vector) + ")"


def listed(words: list[str] | tuple[str, ...]) -> str:
    """`a, b and c`."""
    words = list(words)
    return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " and " + words[-1]


def plain_names(convention: Convention) -> Convention:
    """The same convention with no dollar sign in any name: sentences carry mathematics between dollar signs."""
    frames = (convention.reference, convention.body)
    if not any("$" in name for frame in frames for name in (frame.name, *frame.axes, *convention.angle_names)):
        return convention
    reference, body = (replace(frame, name=_no_dollar(frame.name), axes=_no_dollars(frame.axes)) for frame in frames)
    return replace(convention, reference=reference, body=body, angle_names=_no_dollars(convention.angle_names))


def _no_dollars(names: tuple[str, str, str]) -> tuple[str, str, str]:
    return _no_dollar(names[0]), _no_dollar(names[1]), _no_dollar(names[2])


def _no_dollar(name: str) -> str:
    return name.replace("$", " dollar ").strip()


def axis_words(vector: Vector, frame: Frame, digits: int = 6) -> str:
    """A direction (3,) of `frame` in words.

    A signed axis gives its name (`up`); a direction in a plane of two axes gives `40° from forward towards
    down`; any other one gives its components.
    """
    unit = np.asarray(vector, float) / np.linalg.norm(vector)
    order = np.argsort(-np.abs(unit), kind="stable")
    first, second, third = (int(index) for index in order)
    if abs(unit[second]) < _SAME_DIRECTION:
        return frame.word(first, int(np.sign(unit[first])))
    if abs(unit[third]) < _SAME_DIRECTION:
        angle = np.arctan2(abs(unit[second]), abs(unit[first]))
        near, far = (frame.word(index, int(np.sign(unit[index]))) for index in (first, second))
        return f"{degrees_text(angle, digits)} from {near} towards {far}"
    return f"the direction {vector_text(unit)} in {', '.join(frame.axes)}"


def end_words(vector: Vector, frame: Frame) -> str:
    """A body direction as the thing a person points with: `the nose (forward)`, `the starboard axis`."""
    words = axis_words(vector, frame)
    if words in _NAMES_OF_ENDS:
        return f"{_NAMES_OF_ENDS[words]} ({words})"
    return f"the {words} axis" if " " not in words else f"the direction {words.removeprefix('the direction ')}"


def zero_matrix(convention: Convention) -> NDArray[np.float64]:
    """R_rb (3, 3) where all three turns are zero, that is where every stated angle equals its offset."""
    return convention.left @ convention.right


def turn_axes(convention: Convention) -> NDArray[np.float64]:
    """The three turn axes as rows (3, 3), first turn first, in the sense in which the stated angle grows.

    About moving axes the rows are body components (the axes are fixed in the body); about fixed axes they are
    reference components.
    """
    moving = convention.sense is Sense.MOVING
    basis = convention.right.T if moving else convention.left
    return np.array(
        [sign * basis[:, axis] for sign, axis in zip(convention.signs, convention.sequence.axes, strict=True)]
    )


def swing(axis: Vector) -> tuple[Vector, Vector]:
    """What a right-handed turn about `axis` (3,) does first: (a frame axis that moves, where it moves).

    The frame axis is the x axis unless that lies along the turn axis; then the y axis.
    """
    lengths = [float(np.linalg.norm(np.cross(axis, unit))) for unit in np.eye(3)]
    index = 0 if lengths[0] > 0.5 else int(np.argmax(lengths))
    towards = np.cross(axis, np.eye(3)[index])
    return np.eye(3)[index], towards / np.linalg.norm(towards)


def _settings(convention: Convention) -> str:
    """`heading 0°, elevation 0° and bank 0°`: the stated angles at which nothing has been turned."""
    pairs = zip(convention.angle_names, convention.offsets, strict=True)
    return listed([f"{name} {degrees_text(offset)}" for name, offset in pairs])


def lying_words(direction: Vector, frame: Frame) -> str:
    """How something lies in a frame: `along north`, `40° from north towards down`, `along the direction (…) …`."""
    words = axis_words(direction, frame)
    return words if words[0].isdigit() else f"along {words}"


def zero_sentence(convention: Convention) -> str:
    """Where the body axes lie before anything is turned."""
    zero = zero_matrix(convention)
    places = [lying_words(zero[:, index], convention.reference) for index in range(3)]
    verbs = ("lies ", "", "")
    text = listed(
        [f"{axis} {verb}{place}" for axis, verb, place in zip(convention.body.axes, verbs, places, strict=True)]
    )
    return f"At {_settings(convention)}, {text}."


def _amount(name: str, offset: float) -> str:
    if abs(offset) < _SAME_DIRECTION:
        return name
    return f"{name} {'−' if offset > 0 else '+'} {degrees_text(abs(offset))}"


def _moving_turn(convention: Convention, place: int) -> str:
    axis, body = turn_axes(convention)[place], convention.body
    mover, towards = swing(axis)
    where = ("", ", where the first turn has left it", ", where the first two turns have left it")[place]
    words = axis_words(axis, body)
    line = f"its own {words} axis" if " " not in words else f"the axis fixed in it that lies {lying_words(axis, body)}"
    name = convention.angle_names[place]
    return (
        f"turn the {body.name} by {_amount(name, convention.offsets[place])} about {line}{where}: "
        f"growing {name} swings {axis_words(mover, body)} towards {axis_words(towards, body)}."
    )


def _fixed_turn(convention: Convention, place: int) -> str:
    axis, reference = turn_axes(convention)[place], convention.reference
    mover, towards = swing(axis)
    words = axis_words(axis, reference)
    line = f"the fixed {words} axis of {reference.name}"
    if " " in words:
        line = f"the axis fixed in {reference.name} that lies {lying_words(axis, reference)}"
    name = convention.angle_names[place]
    return (
        f"turn the {convention.body.name} by {_amount(name, convention.offsets[place])} about {line}: "
        f"growing {name} swings whatever points {axis_words(mover, reference)} towards "
        f"{axis_words(towards, reference)}."
    )


def turn_sentences(convention: Convention) -> list[str]:
    """Four sentences: the attitude to start from, then each turn as a person would make it with a model."""
    sentence = _moving_turn if convention.sense is Sense.MOVING else _fixed_turn
    starts = ("First ", "Then ", "Last, ")
    return [zero_sentence(convention)] + [starts[place] + sentence(convention, place) for place in range(3)]


@dataclass(frozen=True)
class Singular:
    """One of the two singular attitudes.

    `turn` (rad) is the middle turn there, `angle` (rad) the stated middle angle; `body_direction` (3,) in
    body components then lies along `reference_direction` (3,) in reference components. Of the outer stated
    angles, less their offsets, only `coefficients[0] * first + coefficients[1] * last` is determined.
    """

    turn: float
    angle: float
    body_direction: Vector
    reference_direction: Vector
    coefficients: tuple[int, int]


def product_order(convention: Convention) -> tuple[int, int, int]:
    """Which turn (0, 1, 2) stands first, second and third in the product E, read from left to right."""
    return (0, 1, 2) if convention.sense is Sense.MOVING else (2, 1, 0)


def wrapped(angle: float) -> float:
    """The angle (rad) brought into (−π, π]."""
    turned = float(np.remainder(angle + np.pi, 2 * np.pi) - np.pi)
    return np.pi if turned <= -np.pi + 1e-15 else turned


def singular_attitudes(convention: Convention) -> tuple[Singular, Singular]:
    """Both singular attitudes: middle turn +90°, −90° (three different axes) or 0°, 180° (repeated axis)."""
    axes = [convention.sequence.axes[turn] for turn in product_order(convention)]
    repeated = convention.sequence.repeated
    parity = 1 if (axes[1] - axes[0]) % 3 == 1 else -1
    # E[a, c] is parity * sin(middle turn), or cos(middle turn) for a repeated axis (HENDERSON-1977)
    cases = (
        ((0.0, 1, 1), (np.pi, -1, -1)) if repeated else ((np.pi / 2, parity, parity), (-np.pi / 2, -parity, -parity))
    )
    return tuple(_singular(convention, axes, *case) for case in cases)  # type: ignore[return-value]


def _singular(convention: Convention, axes: list[int], turn: float, entry: int, relation: int) -> Singular:
    first, middle, last = convention.signs
    return Singular(
        turn=turn,
        angle=wrapped(convention.offsets[1] + middle * turn),
        body_direction=convention.right.T[:, axes[2]].copy(),
        reference_direction=entry * convention.left[:, axes[0]],
        coefficients=(1, relation * first * last),
    )


def combination_text(convention: Convention, singular: Singular) -> str:
    """`heading − bank`: what is still determined at a singular attitude."""
    first, _, last = convention.angle_names
    return f"{first} {'+' if singular.coefficients[1] > 0 else '−'} {last}"


def _along(direction: Vector, frame: Frame) -> str:
    words = axis_words(direction, frame)
    if words in ("up", "down"):
        return f"points straight {words}"
    return f"points {words}" if " " not in words else f"lies {lying_words(direction, frame)}"


def singular_words(convention: Convention) -> list[str]:
    """One sentence for each of the two singular attitudes, in plain words."""
    name, sentences = convention.angle_names[1], []
    for singular in singular_attitudes(convention):
        thing = end_words(singular.body_direction, convention.body)
        place = _along(singular.reference_direction, convention.reference)
        sentences.append(
            f"{name} {degrees_text(singular.angle)}: {thing} {place}; "
            f"only {combination_text(convention, singular)} is determined."
        )
    return sentences


def mapping_sentence(convention: Convention) -> str:
    """Which way the stated matrix maps, as an equation and as what its columns or rows are."""
    body, reference = convention.body, convention.reference
    written = f"are the {body.name} axes {listed(body.axes)}, written in {reference.name} components "
    written += f"({', '.join(reference.axes)})"
    if convention.maps_body_to_reference:
        return (
            f"The matrix R takes {body.name} components to {reference.name} components: "
            f"v_{reference.name} = R v_{body.name}. Its columns {written}."
        )
    return (
        f"The matrix C takes {reference.name} components to {body.name} components: "
        f"v_{body.name} = C v_{reference.name}. Its rows {written}."
    )


def default_ranges(
    convention: Convention,
) -> tuple[tuple[float, float], tuple[float, float], tuple[float, float]]:
    """The stated ranges (rad), or those of the trade where none is stated.

    Unstated: outer angles (−180°, 180°]; the middle turn −90° … 90° (three different axes) or 0° … 180°
    (repeated axis), carried through its sense and offset.
    """
    if convention.ranges is not None:
        return convention.ranges
    turn = (0.0, np.pi) if convention.sequence.repeated else (-np.pi / 2, np.pi / 2)
    ends = sorted(convention.offsets[1] + convention.signs[1] * end for end in turn)
    full = (-np.pi, np.pi)
    return full, (float(ends[0]), float(ends[1])), full


def range_sentence(convention: Convention) -> str:
    """The ranges of the three angles, saying whether they were stated."""
    pairs = zip(convention.angle_names, default_ranges(convention), strict=True)
    text = listed([f"{name} {degrees_text(lo)} … {degrees_text(hi)}" for name, (lo, hi) in pairs])
    stated = "Ranges" if convention.ranges is not None else "Ranges (not stated; the usual ones)"
    return f"{stated}: {text}."


def worked_angles(convention: Convention) -> Vector:
    """Three stated angles (3,) rad inside the ranges that tell readings apart: turns of 10°, ∓35°, 50°."""
    ranges = default_ranges(convention)
    middle = 35.0 if convention.sequence.repeated else -35.0
    turns = np.radians([10.0, middle, 50.0])
    wanted = np.asarray(convention.offsets) + np.asarray(convention.signs) * turns
    chosen = []
    for value, (lo, hi) in zip(wanted, ranges, strict=True):
        inside = lo < value < hi
        chosen.append(value if inside else lo + _SHORT_OF_ONE * (hi - lo))
    return np.array(chosen)


@dataclass(frozen=True)
class WorkedVector:
    """A worked triple: stated angles (3,) rad, the stated matrix (3, 3), one body axis carried over."""

    angles: Vector
    matrix: NDArray[np.float64]
    body_vector: Vector
    reference_vector: Vector
    sentence: str


def worked_vector(convention: Convention) -> WorkedVector:
    """One triple worked through: the first body axis in reference components (four decimals)."""
    angles = worked_angles(convention)
    R_rb = np.asarray(convention.matrix(angles))
    body_vector = np.eye(3)[0]
    reference_vector = R_rb @ body_vector
    pairs = zip(convention.angle_names, angles, strict=True)
    triple = listed([f"{name} {degrees_text(value, 3)}" for name, value in pairs])
    sentence = (
        f"At {triple}, {end_words(body_vector, convention.body)} is {vector_text(reference_vector)} "
        f"in {', '.join(convention.reference.axes)}."
    )
    return WorkedVector(angles, np.asarray(convention.stated_matrix(R_rb)), body_vector, reference_vector, sentence)
