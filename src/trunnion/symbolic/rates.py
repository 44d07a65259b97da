"""Section five: angle rates and angular velocity, both ways, in body and in reference axes; rank and conditioning."""

from __future__ import annotations

from dataclasses import dataclass

import sympy

from trunnion.symbolic.constants import cross_matrix
from trunnion.symbolic.notation import degrees_latex
from trunnion.symbolic.proofs import Sample, identity, remainder
from trunnion.symbolic.setting import Setting
from trunnion.symbolic.shape import Shape
from trunnion.symbolic.singular import Locked
from trunnion.symbolic.steps import Book, aligned, extended

MARGINS_DEG = (90, 60, 45, 30, 20, 15, 10, 5, 2, 1, 0.5, 0.1)
CM, SM, CN, SN, M = sympy.symbols("cm sm cn sn m")


@dataclass(frozen=True)
class Rates:
    """Rate matrices along chain axes (columns in stated order) and what they have in common.

    `body` takes angle rates to the angular velocity along the innermost axes, `reference` along the outermost ones;
    `determinant` ±ρ; `adjugate_*` with inverse = adjugate / determinant; `coupling` γ, the cosine of the angle between
    the first and the last turn axis (with their senses).
    """

    body: sympy.ImmutableMatrix
    reference: sympy.ImmutableMatrix
    determinant: sympy.Expr
    adjugate_body: sympy.ImmutableMatrix
    adjugate_reference: sympy.ImmutableMatrix
    coupling: sympy.Expr


def rates(book: Book, form: Shape, locked: tuple[Locked, Locked]) -> Rates:
    """Write the section; returns the matrices."""
    setting = book.setting
    book.open("Angle rates and angular velocity")
    body, reference = setting.rate_columns(outer=False), setting.rate_columns(outer=True)
    _forward(book, body, "body")
    _forward(book, reference, "reference")
    determinant = remainder(body.det(method="berkowitz"))
    found = Rates(
        body,
        reference,
        determinant,
        _adjugate(body),
        _adjugate(reference),
        remainder((body.T * body)[0, 2]),
    )
    _determinant(book, found)
    _inverse(book, found, "body")
    _inverse(book, found, "reference")
    _gram(book, found)
    for number, case in enumerate(locked, start=1):
        _rank(book, found, case, number)
    _conditioning(book, found, locked[0])
    return found


def _adjugate(matrix: sympy.ImmutableMatrix) -> sympy.ImmutableMatrix:
    """The adjugate from cross products of the columns, reduced."""
    columns = [matrix.col(n) for n in range(3)]
    rows = [columns[1].cross(columns[2]).T, columns[2].cross(columns[0]).T, columns[0].cross(columns[1]).T]
    return sympy.ImmutableMatrix(sympy.Matrix.vstack(*rows).applyfunc(lambda entry: remainder(sympy.expand(entry))))


def _names(setting: Setting, side: str) -> tuple[str, str, str]:
    """(components of ω, rate matrix, constant in front) for one side."""
    if side == "body":
        front = "" if setting.B.kind == "identity" else r"\mathbf{B}^{\mathsf{T}}\, "
        return r"\boldsymbol{\omega}_{b}", r"\mathbf{J}_{b}", front
    front = "" if setting.L.kind == "identity" else r"\mathbf{L}\, "
    return r"\boldsymbol{\omega}_{r}", r"\mathbf{J}_{r}", front


def rate_vector(setting: Setting) -> str:
    """The column of angle rates."""
    return r"\begin{bmatrix}" + r"\\".join(rf"\dot{{{turn.letter}}}" for turn in setting.turns) + r"\end{bmatrix}"


def _forward(book: Book, matrix: sympy.ImmutableMatrix, side: str) -> None:
    setting = book.setting
    vector, name, front = _names(setting, side)
    E = setting.chain_symbols
    lhs, rhs = [], []
    for place, turn in enumerate(setting.turns):
        rate = setting.E.applyfunc(lambda entry, turn=turn: setting.derivative(entry, turn))
        lhs += list(E.T * rate if side == "body" else rate * E.T)
        rhs += list(cross_matrix(list(matrix.col(place))))
    order = (
        "transposed chain times its derivative"
        if side == "body"
        else "derivative of the chain times the chain transposed"
    )
    frame = setting.convention.body if side == "body" else setting.convention.reference
    constant = "" if not front else " The constant in front brings it from the axes of the chain to those of the frame."
    book.show(
        f"rates-{side}",
        f"Angular velocity in {frame.name} axes",
        f"The {order} is the cross-product matrix of the angular velocity of {setting.convention.body.name} relative "
        f"to "
        f"{setting.convention.reference.name}; column by column.{constant}",
        f"{vector} = {front}{name} {rate_vector(setting)}, \\qquad {name}",
        setting.latex(matrix),
        identity(lhs, rhs),
        replacements=dict(zip(E, setting.E, strict=True)),
        samples=setting.anywhere,
    )


def _determinant(book: Book, found: Rates) -> None:
    setting = book.setting
    book.show(
        "rates-determinant",
        "Determinant",
        "The same for both matrices (a constant in front does not change it). It is zero exactly at the singular "
        "values.",
        r"\det \mathbf{J}_{b} = \det \mathbf{J}_{r}",
        setting.latex(found.determinant),
        identity(
            [found.body.det(method="berkowitz"), found.reference.det(method="berkowitz")],
            [found.determinant, found.determinant],
        ),
        samples=setting.anywhere,
    )


def _inverse(book: Book, found: Rates, side: str) -> None:
    setting = book.setting
    matrix = found.body if side == "body" else found.reference
    adjugate = found.adjugate_body if side == "body" else found.adjugate_reference
    vector, name, front = _names(setting, side)
    back = {"": "", r"\mathbf{B}^{\mathsf{T}}\, ": r"\, \mathbf{B}", r"\mathbf{L}\, ": r"\, \mathbf{L}^{\mathsf{T}}"}[
        front
    ]
    symbol = found.determinant.free_symbols.copy().pop()
    sign = 1 if found.determinant == symbol else -1
    shown = sympy.ImmutableMatrix(sign * adjugate)
    book.show(
        f"rates-{side}-inverse",
        f"Angle rates from the angular velocity in {_frame(setting, side)} axes",
        f"Everything is divided by ${setting.latex(symbol)}$; only the row of {setting.order[1].name} is free of it.",
        f"{rate_vector(setting)} = {name}^{{-1}}{back}\\, {vector}, \\qquad {name}^{{-1}}",
        rf"\frac{{1}}{{{setting.latex(symbol)}}} {setting.latex(shown)}",
        identity(matrix * adjugate / found.determinant, sympy.eye(3)),
        samples=setting.anywhere,
    )


def _frame(setting: Setting, side: str) -> str:
    return setting.convention.body.name if side == "body" else setting.convention.reference.name


def _gram(book: Book, found: Rates) -> None:
    setting = book.setting
    gram = sympy.Matrix([[1, 0, found.coupling], [0, 1, 0], [found.coupling, 0, 1]])
    first, last = setting.turns[0].name, setting.turns[2].name
    book.show(
        "rates-gram",
        "Angles between the turn axes",
        f"The columns are unit vectors along the turn axes. The middle axis is perpendicular to both others; "
        f"{first} and {last} are turned about axes at an angle whose cosine is ${setting.latex(found.coupling)}$.",
        r"\mathbf{J}_{b}^{\mathsf{T}} \mathbf{J}_{b} = \mathbf{J}_{r}^{\mathsf{T}} \mathbf{J}_{r}",
        setting.latex(gram),
        identity([*(found.body.T * found.body), *(found.reference.T * found.reference)], [*gram, *gram]),
        samples=setting.anywhere,
    )


def _rank(book: Book, found: Rates, case: Locked, number: int) -> None:
    setting = book.setting
    middle = setting.order[1]
    values = middle.pair(sympy.cos(case.turn), sympy.sin(case.turn))
    at = found.body.subs(values, simultaneous=True)
    first, second, last = (at.col(n) for n in range(3))
    lost = first.cross(second).applyfunc(remainder)
    claim_lhs = [*(first - case.relation * last), *(lost.T * at), lost.dot(lost), second.dot(first)]
    claim_rhs = [0, 0, 0, 0, 0, 0, 1, 0]
    sign = "" if case.relation > 0 else "-"
    n = setting.turns
    rows = [
        (rf"\mathbf{{J}}_{{b}}\big|_{{{middle.y_latex} = {degrees_latex(case.y)}}}", setting.latex(at)),
        (
            r"\mathbf{n}",
            setting.latex(sympy.ImmutableMatrix(lost))
            + r", \qquad \mathbf{n}^{\mathsf{T}} \mathbf{J}_{b} = \mathbf{0}",
        ),
    ]
    book.show(
        f"rates-rank-{number}",
        f"Loss of rank, {case.label}",
        f"The column of {n[0].name} is {'equal to' if not sign else 'the opposite of'} that of {n[2].name}, the "
        f"middle one "
        "is perpendicular to it: the rank is two. No angle rates give an angular velocity along $\\mathbf{n}$, and "
        "angle "
        f"rates along ${n[0].y_latex} {'-' if case.relation > 0 else '+'} {n[2].y_latex}$ alone turn nothing.",
        aligned(rows),
        "",
        identity(claim_lhs, claim_rhs),
        samples=setting.locked(case.turn),
    )


def _conditioning(book: Book, found: Rates, case: Locked) -> None:
    setting = book.setting
    middle = setting.order[1]
    margin = margin_values(setting, case)
    coupling = found.coupling.subs(margin, simultaneous=True)
    determinant = found.determinant.subs(margin, simultaneous=True)
    samples = margin_samples(setting)
    # eigenvalues of the Gram matrix are 1, 1 ± γ: shown by its characteristic polynomial
    x = sympy.Symbol("x")
    gram = sympy.Matrix([[1, 0, coupling], [0, 1, 0], [coupling, 0, 1]])
    polynomial = (gram - x * sympy.eye(3)).det(method="berkowitz")
    certificate = (
        polynomial - (1 - x) * (1 - CM - x) * (1 + CM - x),
        determinant**2 - SM**2,
        (1 + CM) * SN**2 - (1 - CM) * CN**2,
    )
    halves = {CM: CN**2 - SN**2, SM: 2 * CN * SN}
    rows = [
        (r"\text{singular values of } \mathbf{J}", r"\sqrt{1 + \cos m},\; 1,\; \sqrt{1 - \cos m}"),
        (r"\kappa(\mathbf{J})", r"\sqrt{\frac{1 + \cos m}{1 - \cos m}} = \cot \frac{m}{2}"),
        (r"\left|\det \mathbf{J}\right|", r"\sin m"),
    ]
    value = sympy.sqrt((1 + CM) / (1 - CM))
    book.show(
        "rates-condition",
        f"Condition number against {middle.name}",
        "With $m$ the lock margin, the turn of the middle axis to the nearest singular value. A unit body rate asks "
        "up to "
        "$1/\\sin m$ of either outer angle and never more than one of the middle one.",
        aligned(rows),
        "",
        identity(
            [value, sympy.sqrt(determinant**2)],
            [CN / SN, SM],
            certificate=certificate,
            because="characteristic polynomial, squared determinant and half-angle relation reduced to 0",
        ),
        replacements=halves,
        samples=samples,
    )


def margin_values(setting: Setting, case: Locked) -> dict[sympy.Symbol, sympy.Expr]:
    """c and s of the middle angle at the margin m inside the range from a singular value, in c_m and s_m."""
    cosine, sine = sympy.cos(case.turn), sympy.sin(case.turn)
    if setting.repeated:  # 0 + m or π − m
        return setting.order[1].pair(cosine * CM, SM)
    return setting.order[1].pair(SM, sine * CM)  # ±(90° − m)


def margin_samples(setting: Setting) -> list[Sample]:
    """Sample points with a random margin m and its half."""
    margin = (setting.turns[0].y + 4) / 9  # any map of (−π, π) and offsets into (0, π/2) will do
    half = margin / 2
    more = {"m": margin, "cm": sympy.cos(margin), "sm": sympy.sin(margin), "cn": sympy.cos(half), "sn": sympy.sin(half)}
    return extended(setting.anywhere, **more)


def condition_table() -> list[tuple[float, float, float, float]]:
    """Rows (margin in deg, |det|, largest outer rate for a unit rate, condition number); exact formulas above."""
    rows = []
    for degrees in MARGINS_DEG:
        m = sympy.pi * sympy.Rational(str(degrees)) / 180
        sine, half = float(sympy.N(sympy.sin(m), 20)), sympy.N(sympy.cot(m / 2), 20)
        rows.append((float(degrees), sine, 1 / sine, float(half)))
    return rows
