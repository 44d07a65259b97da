"""Known attitudes from what people can see or measure: gravity with a compass heading, poses in plain words.

Letters: `r` the reference frame, `b` the body; R_rb takes body to reference components. The reference frame must name
north or south, and up or down; the body frame must name the axis whose heading is told.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import about
from trunnion.errors import AttitudeError, UnitError
from trunnion.units import parse_quantity, shown

Array = NDArray[np.float64]

LEAST_HEADING_MARGIN = np.radians(2.0)
"""rad; nearer to vertical than this the heading of an axis is not worth using."""

_COMPASS = {"north": 0.0, "north-east": 45.0, "east": 90.0, "south-east": 135.0, "south": 180.0, "south-west": 225.0,
            "west": 270.0, "north-west": 315.0}  # fmt: skip
_BODY_WORDS = {"nose": "forward", "tail": "aft", "top": "up", "belly": "down", "wing": "", "side": ""}
_POSE_FORMS = (
    "'nose up 30 deg, wings level, heading east', 'level, heading 45 deg', "
    "'nose level, banked 20 deg to starboard, heading north', or two axes: 'nose towards up, belly towards north'"
)


@dataclass(frozen=True, eq=False)
class KnownAttitudes:
    """R_rb (N, 3, 3), and which samples (N,) have one; the others stand as the identity and are not to be used."""

    matrices: Array
    usable: NDArray[np.bool_]


def from_gravity_and_heading(
    gravity: ArrayLike,
    heading: ArrayLike,
    *,
    reference: Frame,
    body: Frame,
    points_down: bool,
    heading_of: str = "forward",
) -> KnownAttitudes:
    """Attitudes of N samples from vertical vectors in body components and headings.

    gravity (N, 3) in any unit; it points down (gravity itself) or, with points_down False, up (specific force at rest).
    heading (N,) rad, clockwise from north seen from above: of the horizontal part of the body axis `heading_of`.
    Samples with that axis within 2 deg of the vertical, or without a vector, are not usable.
    Raises AttitudeError when the frames do not name the directions, or for shapes that do not go together.
    """
    g, psi = np.asarray(gravity, dtype=float), np.asarray(heading, dtype=float)
    if g.ndim != 2 or g.shape[1] != 3 or psi.shape != g.shape[:1]:
        raise AttitudeError(
            f"vertical vectors of shape {g.shape} and headings of shape {psi.shape} do not go together",
            remedy="three components and one heading a sample",
        )
    length = np.linalg.norm(g, axis=1)
    there = np.isfinite(g).all(axis=1) & np.isfinite(psi) & (length > 0.0)
    up_b = np.where(there[:, None], g, [0.0, 0.0, 1.0]) / np.where(there, length, 1.0)[:, None]
    up_b = -up_b if points_down else up_b
    ahead_b = body.direction(heading_of) - (up_b @ body.direction(heading_of))[:, None] * up_b
    flat = np.linalg.norm(ahead_b, axis=1)
    usable = there & (flat > np.sin(LEAST_HEADING_MARGIN))
    spare = np.cross(up_b, np.roll(np.abs(up_b), 1, axis=1) + 1.0)
    ahead_b = np.where(usable[:, None], ahead_b, spare)
    ahead_b /= np.linalg.norm(ahead_b, axis=1, keepdims=True)
    north, east, up = _level(reference)
    turned = np.where(usable, psi, 0.0)[:, None]
    ahead_r = np.cos(turned) * north + np.sin(turned) * east
    R = _triad(ahead_r, np.broadcast_to(up, ahead_r.shape)) @ np.swapaxes(_triad(ahead_b, up_b), 1, 2)
    return KnownAttitudes(np.where(usable[:, None, None], R, np.eye(3)), usable)


def from_pose(text: str, *, reference: Frame, body: Frame) -> Array:
    """R_rb (3, 3) of a pose in plain words, such as `nose up 30 deg, wings level, heading east`.

    Clauses: `level`; `nose up|down ANGLE`, `nose level`; `wings level`, `banked ANGLE to starboard|port` (a turn about
    the nose), `inverted`; `heading ANGLE|east …`; or two clauses `AXIS towards DIRECTION`.
    Raises AttitudeError naming the clause that is not understood, missing or said twice.
    """
    clauses = [" ".join(part.lower().split()) for part in text.split(",") if part.strip()]
    if not clauses:
        raise _pose_error(text, "says nothing")
    if all(" towards " in clause for clause in clauses):
        return _from_two_axes(text, clauses, reference, body)
    told: dict[str, float] = {}
    for clause in clauses:
        for key, value in _clause(text, clause).items():
            if key in told:
                raise _pose_error(text, f"says the {key} twice")
            told[key] = value
    missing = [key for key in ("elevation of the nose", "bank", "heading") if key not in told]
    if missing:
        raise _pose_error(text, f"leaves open the {' and the '.join(missing)}")
    return _from_three(told, reference, body)


def from_poses(texts: Sequence[str], *, reference: Frame, body: Frame) -> KnownAttitudes:
    """The attitudes of N poses in words; empty texts are not usable samples."""
    matrices = np.array(
        [from_pose(text, reference=reference, body=body) if text.strip() else np.eye(3) for text in texts]
    )
    return KnownAttitudes(matrices, np.array([bool(text.strip()) for text in texts], dtype=bool))


def _from_three(told: dict[str, float], reference: Frame, body: Frame) -> Array:
    """Heading about up, then the nose up about starboard, then the bank about the nose: each in the axes as carried."""
    north, east, up = _level(reference)
    start = np.column_stack([north, east, -up])  # forward, starboard, down of a level body heading north
    axes = np.column_stack([body.direction(word) for word in ("forward", "starboard", "down")])
    x, y, z = np.eye(3)
    turned = about(z, told["heading"]) @ about(y, told["elevation of the nose"]) @ about(x, told["bank"])
    made: Array = start @ turned @ axes.T
    return made


def _clause(text: str, clause: str) -> dict[str, float]:
    nose, bank, heading = "elevation of the nose", "bank", "heading"
    if clause in ("level", "upright and level"):
        return {nose: 0.0, bank: 0.0}
    if clause in ("nose level", "wings level"):
        return {nose if clause.startswith("nose") else bank: 0.0}
    if clause == "inverted":
        return {bank: np.pi}
    if match := re.fullmatch(r"nose (up|down) (.+)", clause):
        size = _angle(text, match[2])
        if not 0.0 <= size < np.pi / 2.0 - LEAST_HEADING_MARGIN:
            raise _pose_error(text, f"says '{clause}', where the nose has no heading", "name two axes")
        return {nose: size if match[1] == "up" else -size}
    if match := re.fullmatch(r"banked (.+) to (starboard|port|the right|the left)", clause):
        size = _angle(text, match[1])
        return {bank: size if match[2] in ("starboard", "the right") else -size}
    if match := re.fullmatch(r"heading (.+)", clause):
        word = match[1]
        return {heading: np.radians(_COMPASS[word]) if word in _COMPASS else _angle(text, word)}
    if re.match(r"(starboard|port|left|right)( wing| side)? (up|down)", clause):
        side = "starboard" if ("starboard" in clause or "right" in clause) == ("down" in clause) else "port"
        raise _pose_error(
            text,
            f"says '{clause}': a tilt to the horizontal and a turn about the nose differ",
            f"for a turn about the nose say 'banked 20 deg to {side}'",
        )
    raise _pose_error(text, f"says '{shown(clause)}', which is not understood")


def _from_two_axes(text: str, clauses: list[str], reference: Frame, body: Frame) -> Array:
    if len(clauses) != 2:
        raise _pose_error(text, "names " + str(len(clauses)) + " axes", "name two")
    ones, others = [], []
    for clause in clauses:
        axis, _, direction = clause.partition(" towards ")
        word = " ".join(_BODY_WORDS.get(part, part) for part in axis.split()).strip()
        ones.append(body.direction(word))
        others.append(reference.direction(direction.strip()))
    if abs(float(ones[0] @ ones[1])) > 0.5 or abs(float(others[0] @ others[1])) > 0.5:
        raise _pose_error(text, "names one line twice", "name two axes at right angles, and where each points")
    there = np.column_stack([others[0], others[1], np.cross(others[0], others[1])])
    here = np.column_stack([ones[0], ones[1], np.cross(ones[0], ones[1])])
    made: Array = there @ here.T
    return made


def _angle(text: str, written: str) -> float:
    try:
        return parse_quantity(written, kind="angle").value
    except UnitError as err:
        raise _pose_error(text, err.fault.cause, err.fault.remedy) from err


def _pose_error(text: str, what: str, remedy: str = "") -> AttitudeError:
    return AttitudeError(f"the pose '{shown(text, 100)}' {what}", remedy=remedy or f"say for instance {_POSE_FORMS}")


def _level(reference: Frame) -> tuple[Array, Array, Array]:
    """North, east and up in components of the reference frame."""
    try:
        north, up = reference.direction("north"), reference.direction("up")
    except AttitudeError as err:
        raise AttitudeError(
            f"the reference frame '{reference.name}' ({', '.join(reference.axes)}) does not say where north and up are",
            remedy="name its axes, for instance north, east, down",
        ) from err
    return north, np.cross(north, up), up


def _triad(ahead: Array, up: Array) -> Array:
    return np.stack([ahead, np.cross(up, ahead), up], axis=-1)
