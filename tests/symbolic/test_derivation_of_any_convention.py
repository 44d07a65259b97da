"""A derivation exists for every convention that can be stated, and says what the numbers of scipy say."""

from __future__ import annotations

import numpy as np
import pytest
import sympy
from scipy.spatial.transform import Rotation

from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError
from trunnion.symbolic.checking import confirmation, independent_check
from trunnion.symbolic.derivation import derive
from trunnion.symbolic.setting import Setting

SECTIONS = [
    "The three elementary turns",
    "The product",
    "Angles from the matrix",
    "The singular attitudes",
    "Angle rates and angular velocity",
    "Near the singular attitudes",
    "Small angles",
    "The quaternion",
    "Inverse and transposed mapping",
]


def agree(derivation) -> None:
    wrong = [row for row in independent_check(derivation) if not row.agrees]
    assert not wrong, wrong


@pytest.mark.parametrize("number", [0, 5, 10, 15, 18])
def test_any_convention_agrees_with_scipy(number: int, any_convention) -> None:
    """Five sequences, one of them about fixed axes, with random senses, offsets, constants and mapping direction."""
    agree(derive(any_convention(number)))


@pytest.mark.full
@pytest.mark.parametrize("number", range(60))
def test_many_conventions_agree_with_scipy(number: int, any_convention) -> None:
    agree(derive(any_convention(number)))


@pytest.mark.full
@pytest.mark.parametrize("sense", list(Sense), ids=lambda sense: sense.name)
@pytest.mark.parametrize("sequence", list(Sequence), ids=lambda sequence: sequence.name)
def test_all_24_plain_conventions_agree_with_scipy(sequence: Sequence, sense: Sense, convention) -> None:
    agree(derive(convention(sequence.name, sense)))


@pytest.mark.parametrize("name", ["ZYX", "ZXZ"])
def test_fixed_axes_agree_with_scipy(name: str, convention) -> None:
    agree(derive(convention(name, Sense.FIXED)))


def test_sections_come_in_the_order_of_the_argument(convention) -> None:
    derivation = derive(convention())
    assert [title for title, _ in derivation.sections()] == SECTIONS
    assert len({step.id for step in derivation.steps}) == len(derivation.steps)


def test_every_formula_carries_its_proof_with_fifty_digits(any_convention) -> None:
    for step in derive(any_convention(5)).steps:
        assert bool(step.lhs) == (step.proof is not None)
        if step.proof is not None:
            assert step.proof.digits == 50
            assert step.proof.points >= 1
            assert float(step.proof.largest) < 1e-50
            assert step.prose


def test_the_same_convention_is_derived_once(convention) -> None:
    assert derive(convention()) is derive(convention())
    assert derive(convention()) is not derive(convention(signs=(1, 1, -1)))


def test_unknown_step_names_the_steps_there_are(convention) -> None:
    with pytest.raises(AttitudeError, match="product"):
        derive(convention()).step("no such step")


def test_confirmation_lists_matrix_quaternion_and_angles(any_convention) -> None:
    rows = confirmation(derive(any_convention(15)))
    assert len(rows) == 16
    assert all(difference < 1e-12 for *_, difference in rows)


def test_reduction_can_be_followed_with_a_pencil(convention) -> None:
    """Heading, elevation, bank at elevation 90 degrees, written out."""
    derivation = derive(convention())
    addition = derivation.step("singular-1-addition").latex
    assert r"\cos(\psi - \phi) &= c_{\psi} c_{\phi} + s_{\psi} s_{\phi}" in addition
    turn = derivation.step("singular-1-one-turn")
    assert r"\mathbf{T}_{z}(\delta)\, \mathbf{K}" in turn.lhs
    words = derivation.step("singular-1-physical").prose
    assert "the nose (forward) points straight up" in words
    assert "two gimbal axes are opposite" in words
    assert "the nose (forward) points straight down" in derivation.step("singular-2-physical").prose


def test_kept_exact_constant_is_named_in_degrees(convention) -> None:
    nose_lowered = Rotation.from_euler("y", -40, degrees=True).as_matrix()
    derivation = derive(convention(right=nose_lowered))
    assert r"$-40^{\circ}$" in derivation.step("constant-B").prose
    assert derivation.setting.B.angle == -2 * sympy.pi / 9
    assert derivation.setting.B.kind == "turn"


def test_constant_about_the_axis_of_its_neighbour_is_called_an_offset(convention) -> None:
    """3-1-2 with the body turned about starboard: the last turn is about starboard as well."""
    derivation = derive(convention("ZXY", right=Rotation.from_euler("y", -40, degrees=True).as_matrix()))
    assert "it acts as an offset of that angle" in derivation.step("whole").prose


def test_arbitrary_constant_is_stated_by_its_numbers(convention) -> None:
    constant = Rotation.from_rotvec([0.3, 0.5, -0.2]).as_matrix()
    derivation = derive(convention(left=constant))
    assert derivation.setting.L.kind == "general"
    assert f"{constant[0, 1]:.10f}" in derivation.step("constant-L").rhs
    assert "shown by evaluation" in derivation.step("whole").proof.exact


@pytest.mark.parametrize(
    ("names", "letters"),
    [
        (("heading", "elevation", "bank"), (r"\psi", r"\theta", r"\phi")),
        (("roll", "pitch", "yaw"), (r"\phi", r"\theta", r"\psi")),
        (("alpha", "beta", "u"), (r"\alpha", r"\beta", "u")),
        (("pan", "tilt", "yaw"), (r"\alpha", r"\beta", r"\gamma")),  # pan and yaw would share a letter
        (("first", "second", "third"), (r"\alpha", r"\beta", r"\gamma")),
    ],
)
def test_letters_follow_the_angle_names(names, letters, convention) -> None:
    setting = Setting(convention(angle_names=names))
    assert tuple(turn.letter for turn in setting.turns) == letters
    assert {row[0] for row in setting.notation()} >= set(letters)


@pytest.mark.parametrize(
    ("name", "ranges"),
    [
        ("ZYX", ((-np.pi, np.pi), (np.pi / 2, 3 * np.pi / 2), (-np.pi, np.pi))),
        ("ZXZ", ((0.0, 2 * np.pi), (-np.pi, 0.0), (0.0, 2 * np.pi))),
    ],
)
def test_ranges_of_the_second_branch_give_its_formulas(name: str, ranges, convention) -> None:
    derivation = derive(convention(name, ranges=ranges))
    agree(derivation)
    stated = derivation.convention
    for angles in ((0.3, np.mean(ranges[1]) + 0.4, -0.7), (2.0, np.mean(ranges[1]) - 0.9, 1.0)):
        found = derivation.angles(stated.stated_matrix(stated.matrix(angles)))
        np.testing.assert_allclose(np.cos(found - np.asarray(angles)), 1.0, rtol=0, atol=1e-14)


def test_words_for_a_ship_differ_from_those_for_the_axis_letters(convention) -> None:
    """Fixed axes about the second-listed frame: the axes named are those of the reference."""
    derivation = derive(convention("XYZ", Sense.FIXED, angle_names=("roll", "pitch", "yaw")))
    assert "axis of local that stays where it is" in derivation.step("order").prose
