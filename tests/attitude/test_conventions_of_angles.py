"""Conventions: constants on both sides, senses, offsets, ranges, lock axes, and what is refused."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy
from trunnion.attitude.frames import Frame, attitude_from_axes
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

ALL = [(sequence, sense) for sequence in Sequence for sense in Sense]
IDS = [f"{sequence.name}-{sense.name.lower()}" for sequence, sense in ALL]
MORE = {
    "signs": (1, -1, -1),
    "offsets": (0.1, -0.2, 0.3),
    "left": Rotation.from_rotvec([0.3, -0.8, 1.1]).as_matrix(),
    "right": Rotation.from_rotvec([-1.0, 0.2, 0.7]).as_matrix(),
}
DEG = np.pi / 180.0


def off(R: np.ndarray, S: np.ndarray) -> float:
    """Largest rotation angle between two stacks, by scipy."""
    return float(np.max((Rotation.from_matrix(R).inv() * Rotation.from_matrix(S)).magnitude()))


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
def test_matrix_is_the_product_stated_in_the_docstring(
    sequence: Sequence, sense: Sense, convention: Callable[..., Convention]
) -> None:
    ours = convention(sequence, sense, **MORE)
    angles = np.array([0.4, 1.2, -2.0])
    turns = np.array(MORE["signs"]) * (angles - np.array(MORE["offsets"]))
    letters = sequence.name if sense is Sense.MOVING else sequence.name.lower()
    E = Rotation.from_euler(letters, turns).as_matrix()
    np.testing.assert_allclose(ours.matrix(angles), MORE["left"] @ E @ MORE["right"], rtol=0, atol=1e-15)


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
def test_angles_rebuild_the_attitude_whatever_the_constants(
    sequence: Sequence, sense: Sense, convention: Callable[..., Convention], random_attitudes: Rotation
) -> None:
    ours = convention(sequence, sense, **MORE)
    R = random_attitudes.as_matrix()[:1000]
    for other_branch in (False, True):
        found = ours.angles(R, other_branch=other_branch)
        assert off(ours.matrix(found.angles), R) < 4e-15
        np.testing.assert_allclose(found.margin, ours.lock_margin(R), rtol=0, atol=1e-15)


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
def test_lock_axes_meet_where_the_middle_turn_is_singular(
    sequence: Sequence, sense: Sense, convention: Callable[..., Convention]
) -> None:
    ours = convention(sequence, sense, **MORE)
    u, v = ours.lock_axes
    for singular in (0.0, np.pi) if sequence.repeated else (np.pi / 2, -np.pi / 2):
        R = ours.matrix(ours.stated_from_chain([0.7, singular, -0.4]))
        assert abs(abs(u @ R @ v) - 1.0) < 1e-15
        assert ours.lock_margin(R) < 1e-15
        last = ours.angles(R, Policy.LAST_ZERO)
        first = ours.angles(R, Policy.FIRST_ZERO)
        assert last.singular
        assert first.singular
        assert last.angles[2] == pytest.approx(MORE["offsets"][2])
        assert first.angles[0] == pytest.approx(MORE["offsets"][0])
        assert off(ours.matrix(last.angles), R) < 2e-15
        assert off(ours.matrix(first.angles), R) < 2e-15


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
def test_margin_is_the_rotation_angle_to_the_nearest_locked_attitude(
    sequence: Sequence, sense: Sense, convention: Callable[..., Convention], random_attitudes: Rotation
) -> None:
    ours = convention(sequence, sense, **MORE)
    R = random_attitudes.as_matrix()[:500]
    near = ours.locked_attitude_near(R)
    assert ours.lock_margin(near).max() < 2e-15
    distance = (Rotation.from_matrix(R).inv() * Rotation.from_matrix(near)).magnitude()
    np.testing.assert_allclose(distance, ours.lock_margin(R), rtol=0, atol=4e-15)
    locked = ours.matrix(ours.stated_from_chain(_locked_turns(sequence)))
    for M in R[:20]:  # no locked attitude of a dense set is nearer
        angles = (Rotation.from_matrix(M).inv() * Rotation.from_matrix(locked)).magnitude()
        assert angles.min() >= ours.lock_margin(M) - 1e-14


def _locked_turns(sequence: Sequence) -> np.ndarray:
    values = (0.0, np.pi) if sequence.repeated else (np.pi / 2, -np.pi / 2)
    return np.array([(a, b, 0.0) for a in np.linspace(-np.pi, np.pi, 400) for b in values])


RANGES = {
    "heading 0 to 360": ((0.0, 360.0), (-90.0, 90.0), (-180.0, 180.0)),
    "both outer 0 to 360": ((0.0, 360.0), (-90.0, 90.0), (0.0, 360.0)),
    "middle on the other branch": ((-180.0, 180.0), (90.0, 270.0), (-180.0, 180.0)),
    "middle a full turn, last a half": ((0.0, 360.0), (-180.0, 180.0), (-90.0, 90.0)),
    "middle a full turn, first a half": ((0.0, 180.0), (0.0, 360.0), (-180.0, 180.0)),
}


@pytest.mark.parametrize("stated", RANGES.values(), ids=RANGES.keys())
@pytest.mark.parametrize("sense", list(Sense))
def test_ranges_choose_the_triple(
    stated: Any, sense: Sense, convention: Callable[..., Convention], random_attitudes: Rotation
) -> None:
    """`middle a full turn, last a half` with z-x-y is how W3C device orientation writes alpha, beta, gamma (memory)."""
    ranges = tuple((low * DEG, high * DEG) for low, high in stated)
    ours = convention(Sequence.ZXY, sense, ranges=ranges)
    R = np.concatenate([random_attitudes.as_matrix()[:2000], Rotation.create_group("O").as_matrix()])
    found = ours.angles(R).angles
    for n, (low, high) in enumerate(ranges):
        assert found[:, n].min() >= low
        assert found[:, n].max() <= high
    assert off(ours.matrix(found), R) < 4e-15


@pytest.mark.parametrize("policy", list(Policy))
def test_lock_on_the_other_branch_keeps_the_policy(policy: Policy, convention: Callable[..., Convention]) -> None:
    """At lock both branches meet, so the zero angle is zero there too; the middle one is an end of its range."""
    ranges = ((-np.pi, np.pi), (np.pi / 2, 1.5 * np.pi), (-np.pi, np.pi))
    ours, free = convention(Sequence.ZYX, ranges=ranges), convention(Sequence.ZYX)
    zero = 0 if policy is Policy.FIRST_ZERO else 2
    for middle in (np.pi / 2, -np.pi / 2):
        R = ours.matrix((0.3, middle, -0.7))
        found, other = ours.angles(R, policy), free.angles(R, policy, other_branch=True)
        assert found.singular
        assert found.angles[zero] == other.angles[zero] == 0.0
        assert found.angles[1] in ranges[1]
        assert off(ours.matrix(found.angles), R) < 2e-15
    for distance in (1e-15, 1e-12, 5e-10, 1e-8):  # just inside: no digit is given to the end of the range
        R = ours.matrix((0.3, np.pi / 2 - distance, -0.7))
        assert off(ours.matrix(ours.angles(R, policy).angles), R) < 4e-15


def test_range_from_zero_holds_zero_and_a_range_about_zero_holds_its_upper_end(
    convention: Callable[..., Convention],
) -> None:
    compass = convention(Sequence.ZYX, ranges=((0.0, 2 * np.pi), (-np.pi / 2, np.pi / 2), (-np.pi, np.pi)))
    assert compass.angles(np.eye(3)).angles[0] == 0.0
    west = compass.angles(Rotation.from_euler("Z", -90, degrees=True).as_matrix()).angles
    assert west[0] == pytest.approx(1.5 * np.pi)
    inverted = compass.angles(Rotation.from_euler("X", 180, degrees=True).as_matrix()).angles
    assert inverted[2] == pytest.approx(np.pi)
    just_below = compass.angles(Rotation.from_euler("Z", -1e-18).as_matrix()).angles
    assert 0.0 <= just_below[0] < 2 * np.pi


REFUSED: list[tuple[str, dict[str, Any], str]] = [
    ("improper constant", {"left": np.diag([1.0, 1.0, -1.0])}, "the constant left of the chain is a reflection"),
    ("scaled constant", {"right": 1.02 * np.eye(3)}, "misses? unit length|miss unit length"),
    ("sign 0", {"signs": (1, 0, 1)}, r"has senses \(1, 0, 1\)"),
    ("offset no number", {"offsets": (0.0, np.nan, 0.0)}, "has offsets"),
    ("reversed range", {"ranges": ((np.pi, -np.pi), (-np.pi / 2, np.pi / 2), (-np.pi, np.pi))}, "empty or reversed"),
    ("travel as range", {"ranges": ((-1.0, 1.0), (-np.pi / 2, np.pi / 2), (-np.pi, np.pi))}, "exactly one triple"),
    ("two triples", {"ranges": ((-np.pi, np.pi), (-np.pi, np.pi), (-np.pi, np.pi))}, "exactly one triple"),
    ("lock inside", {"ranges": ((-np.pi, np.pi), (0.0, np.pi), (-np.pi, np.pi))}, "holds a singular value inside"),
]


@pytest.mark.parametrize(("more", "message"), [case[1:] for case in REFUSED], ids=[case[0] for case in REFUSED])
def test_what_a_convention_refuses(more: dict[str, Any], message: str, convention: Callable[..., Convention]) -> None:
    with pytest.raises(AttitudeError, match=message):
        convention(Sequence.ZYX, **more)


def test_left_handed_frame_and_equal_names_are_refused() -> None:
    left_handed = Frame("old", ("north", "east", "up"), left_handed=True)
    body = Frame("body", ("forward", "starboard", "down"))
    with pytest.raises(AttitudeError, match="stands on the left-handed frame 'old'"):
        Convention("c", left_handed, body, Sequence.ZYX, Sense.MOVING, ("a", "b", "c"))
    local = Frame("local", ("north", "east", "down"))
    with pytest.raises(AttitudeError, match="names its angles"):
        Convention("c", local, body, Sequence.ZYX, Sense.MOVING, ("a", "b", "a"))


def test_a_reflection_is_never_taken_for_an_attitude(convention: Callable[..., Convention]) -> None:
    ours = convention(Sequence.ZYX)
    with pytest.raises(AttitudeError, match="is a reflection"):
        ours.angles(np.diag([1.0, 1.0, -1.0]))
    with pytest.raises(AttitudeError, match="attitude 3 is not a rotation"):
        ours.angles(np.stack([np.eye(3)] * 3 + [1.01 * np.eye(3)]))
    with pytest.raises(AttitudeError, match="no number"):
        ours.angles(np.full((3, 3), np.nan))


FRAMES_REFUSED = [
    (("forward", "port", "down"), "left-handed"),
    (("north", "east", "up"), "left-handed"),
    (("forward", "aft", "down"), "two axes on one line"),
    (("x1", "x1", "z"), "two axes on one line"),
]


@pytest.mark.parametrize(("axes", "message"), FRAMES_REFUSED)
def test_frames_that_are_no_right_handed_triad(axes: tuple[str, str, str], message: str) -> None:
    with pytest.raises(AttitudeError, match=message):
        Frame("f", axes)


def test_attitude_from_axis_words() -> None:
    local = Frame("local", ("north", "east", "down"))
    body = Frame("body", ("forward", "starboard", "down"))
    np.testing.assert_array_equal(attitude_from_axes(local, body, {"forward": "north", "down": "down"}), np.eye(3))
    nose_up = attitude_from_axes(local, body, {"forward": "up", "down": "north"})
    np.testing.assert_array_equal(nose_up @ [1, 0, 0], [0, 0, -1])
    np.testing.assert_array_equal(nose_up @ [0, 0, 1], [1, 0, 0])
    with pytest.raises(AttitudeError, match="one axis does not fix"):
        attitude_from_axes(local, body, {"forward": "north"})
    with pytest.raises(AttitudeError, match="name one line twice"):
        attitude_from_axes(local, body, {"forward": "north", "aft": "east"})
    with pytest.raises(AttitudeError, match="mirror image"):
        attitude_from_axes(local, body, {"forward": "north", "down": "down", "starboard": "west"})


def test_sequence_texts() -> None:
    assert {Sequence.from_text(text) for text in ("3-2-1", "321", "ZYX", "z-y-x")} == {Sequence.ZYX}
    with pytest.raises(AttitudeError, match="twice in a row"):
        Sequence.from_text("3-3-1")
    with pytest.raises(AttitudeError, match="not a sequence of three axes"):
        Sequence.from_text("3-2-4")
