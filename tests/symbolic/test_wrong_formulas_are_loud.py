"""A wrong identity stops the derivation; a corrupted derivation is reported by the independent check."""

from __future__ import annotations

import ast
import dataclasses
from pathlib import Path

import pytest
import sympy

import trunnion.symbolic.checking as checking
from trunnion.symbolic.checking import independent_check
from trunnion.symbolic.derivation import derive
from trunnion.symbolic.proofs import Identity, ProofError, identity, prove
from trunnion.symbolic.setting import Setting, nine

C1, S1, C2 = sympy.symbols("c1 s1 c2")


@pytest.fixture(scope="module")
def setting(convention) -> Setting:
    return Setting(convention())


def test_wrong_sign_does_not_reduce_to_zero(setting: Setting) -> None:
    wrong = setting.E.as_mutable()
    wrong[0, 1] = -wrong[0, 1]
    with pytest.raises(ProofError, match="entry 2 does not reduce to zero"):
        prove("the product", identity(setting.M, wrong), setting.replacements, setting.anywhere)


def test_transposed_matrix_does_not_reduce_to_zero(setting: Setting) -> None:
    with pytest.raises(ProofError, match="the product"):
        prove("the product", identity(setting.M, setting.E.T), setting.replacements, setting.anywhere)


def test_square_sum_is_one(setting: Setting) -> None:
    assert prove("square", identity(C1**2 + S1**2, 1), {}, setting.anywhere).points == 3


def test_certificate_alone_does_not_carry_a_false_equation(setting: Setting) -> None:
    """The fifty-digit half catches what a badly chosen certificate lets through."""
    claim = identity(sympy.sqrt(C2**2), C2, certificate=(sympy.S.Zero,))
    with pytest.raises(ProofError, match="differ by"):
        prove("root", claim, {}, [{"c2": -setting.regular[0]["c2"]}])


def test_tiny_numeric_error_is_still_an_error(setting: Setting) -> None:
    claim = Identity((C1,), (C1 + sympy.Rational(1, 10**45),), certificate=())
    with pytest.raises(ProofError, match="50 digits"):
        prove("almost", claim, {}, setting.anywhere)


def test_unequal_numbers_of_entries_are_refused(setting: Setting) -> None:
    with pytest.raises(ProofError, match="9 and 1 entries"):
        prove("shapes", identity(nine("M"), 1), {}, setting.anywhere)


def _swap(matrix: sympy.MatrixBase) -> sympy.MatrixBase:
    return sympy.ImmutableMatrix(matrix.T)


def _flip(matrix: sympy.MatrixBase) -> sympy.MatrixBase:
    changed = matrix.as_mutable()
    place = next(n for n, entry in enumerate(changed) if entry != 0)
    changed[place] = -changed[place]
    return sympy.ImmutableMatrix(changed)


CORRUPTIONS = [
    ("matrix", _swap, "entries of the stated matrix"),
    ("matrix", _flip, "entries of the stated matrix"),
    ("quaternion", _flip, "quaternion"),
    ("outer", _flip, "angles from the matrix"),
    ("middle", _flip, "angles from the matrix"),
    ("inner", _flip, "angles from the matrix"),
    ("body rates", _swap, "rate matrix in body axes"),
    ("body rates", _flip, "rate matrix in body axes"),
    ("reference rates", _flip, "rate matrix in reference axes"),
    ("body rates inverse", _swap, "inverse rate matrix in body axes"),
    ("reference rates inverse", _flip, "inverse rate matrix in reference axes"),
    ("determinant", _flip, "determinant"),
    ("combination 0", _flip, "the combination recovered at elevation 90"),
    ("combination 1", _flip, "the combination recovered at elevation -90"),
]


@pytest.mark.parametrize(
    ("name", "corrupt", "reported"), CORRUPTIONS, ids=[f"{n}-{c.__name__}" for n, c, _ in CORRUPTIONS]
)
def test_corrupted_formula_is_reported(name: str, corrupt, reported: str, convention) -> None:
    derivation = derive(convention())
    expressions = {**derivation.expressions, name: corrupt(derivation.expressions[name])}
    rows = independent_check(dataclasses.replace(derivation, expressions=expressions))
    assert any(not row.agrees and row.what.startswith(reported) for row in rows)


def test_sum_taken_for_difference_is_reported(convention) -> None:
    derivation = derive(convention())
    first, second = derivation.locked
    swapped = (dataclasses.replace(first, relation=-first.relation), second)
    rows = independent_check(dataclasses.replace(derivation, locked=swapped))
    assert any(not row.agrees and "sliding along" in row.what for row in rows)


def test_wrong_condition_number_is_reported(convention) -> None:
    derivation = derive(convention())
    rows = list(derivation.conditions)
    rows[3] = (*rows[3][:3], rows[3][3] * 1.01)
    found = independent_check(dataclasses.replace(derivation, conditions=tuple(rows)))
    assert any(not row.agrees and "condition" in row.what for row in found)


def test_the_check_imports_nothing_of_the_derivation() -> None:
    """At run time; the one import for annotations is behind TYPE_CHECKING."""
    tree = ast.parse(Path(checking.__file__).read_text(encoding="utf-8"))
    at_run_time = [node for node in tree.body if isinstance(node, (ast.Import, ast.ImportFrom))]
    modules = {getattr(node, "module", None) or node.names[0].name for node in at_run_time}
    assert not any(module.startswith(("trunnion.symbolic", "sympy")) for module in modules)
