"""Section three: the angles from the matrix, with quadrants, in the form that survives the neighbourhood of lock."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import sympy

from trunnion.attitude.words import degrees_text, range_sentence
from trunnion.symbolic.constants import AXES
from trunnion.symbolic.notation import degrees_latex
from trunnion.symbolic.proofs import identity
from trunnion.symbolic.setting import Setting, Turn, nine, wrap_exact
from trunnion.symbolic.shape import Shape, middle_sides
from trunnion.symbolic.steps import Book


@dataclass(frozen=True)
class Formulas:
    """The extraction of y from entries: expressions in entries of the stated matrix (or of the chain).

    `residual_sine`, `residual_cosine`: sin y and cos y of the innermost angle once the outermost is known.
    """

    outer: sympy.Expr
    middle: sympy.Expr
    inner: sympy.Expr
    residual_sine: sympy.Expr
    residual_cosine: sympy.Expr
    sine_over: sympy.Expr
    cosine_over: sympy.Expr


def formulas(setting: Setting, form: Shape) -> Formulas:
    """Derive the extraction formulas from the shape of the chain."""
    X = setting.entries
    sign = setting.branch
    outer_sine, outer_cosine = sign * form.outer_sine.of(X), sign * form.outer_cosine.of(X)
    rho = sign * sympy.sqrt(outer_sine**2 + outer_cosine**2)
    sine, cosine = middle_sides(setting, form, rho, form.along.of(X))
    residual_sine, residual_cosine = residual_of(setting, form, X)
    return Formulas(
        outer=sympy.atan2(outer_sine, outer_cosine, evaluate=False),
        middle=sympy.atan2(sine, cosine, evaluate=False),
        inner=sympy.atan2(sign * form.inner_sine.of(X), sign * form.inner_cosine.of(X), evaluate=False),
        residual_sine=residual_sine,
        residual_cosine=residual_cosine,
        sine_over=outer_sine,
        cosine_over=outer_cosine,
    )


def residual_of(setting: Setting, form: Shape, X: sympy.MatrixBase) -> tuple[sympy.Expr, sympy.Expr]:
    """sin y and cos y of the innermost angle from row b of T(outer)ᵀ E = T(middle) T(inner), free of the middle."""
    outer, _, inner = setting.order
    factor, found = outer.matrix, {}
    for column in (index for index in range(3) if index != form.c):
        carried = inner.matrix[form.b, column]
        row = sum(factor[k, form.b] * X[k, column] for k in range(3))
        for symbol in (inner.s, inner.c):
            for sign in (1, -1):
                if sympy.expand(carried - sign * symbol) == 0:
                    found[symbol] = sympy.expand(sign * row)
    return found[inner.s], found[inner.c]


def extraction(book: Book, form: Shape) -> Formulas:
    """Write the section and return its formulas."""
    setting = book.setting
    found = formulas(setting, form)
    book.open("Angles from the matrix")
    _chain_entries(book)
    _carrier(book, form)
    _regular(book, form, found)
    _residual_step(book, form, found)
    _second_triple(book)
    return found


def _chain_entries(book: Book) -> None:
    setting = book.setting
    if setting.plain and setting.convention.maps_body_to_reference:
        return
    letter = rf"\mathbf{{{setting.stated_letter}}}"
    R = letter if setting.stated_letter == "R" else letter + r"^{\mathsf{T}}"
    left = r"\mathbf{L}^{\mathsf{T}} " if setting.L.kind != "identity" else ""
    right = r" \mathbf{B}^{\mathsf{T}}" if setting.B.kind != "identity" else ""
    used = "" if setting.short else " The entries $E_{ij}$ are used below."
    lhs = R if setting.plain else f"{setting.chain_latex} = {left}{R}{right}"
    prose = f"From the stated matrix back to the chain.{used}"
    if setting.exact:
        claim = identity(setting.chain_symbols, setting.back)
        if setting.wide:
            lhs, rhs = r"\mathbf{E}", f"{left}{R}{right}"
        else:
            rhs = setting.latex(setting.back)
        book.show("chain-entries", "Back to the chain", prose, lhs, rhs, claim, samples=setting.anywhere)
        return
    measured = nine("M") if setting.stated_letter == "R" else nine("M").T
    claim = identity(
        setting.chain_symbols,
        nine("L").T * measured * nine("B").T,
        certificate=(),
        because="constants known by numbers; shown by evaluation",
    )
    book.show(
        "chain-entries", "Back to the chain", prose, r"\mathbf{E}", f"{left}{R}{right}", claim, samples=setting.anywhere
    )


def _carrier(book: Book, form: Shape) -> None:
    setting = book.setting
    value = setting.E[form.a, form.c]
    book.show(
        "carrier",
        "One entry carries the middle angle alone",
        f"Row {AXES[form.a]}, column {AXES[form.c]} of the chain: the axis of the innermost turn seen along the axis "
        f"of "
        "the outermost one. Neither outer angle appears in it.",
        setting.latex(setting.entries[form.a, form.c]),
        setting.latex(value),
        identity(setting.entries[form.a, form.c], value),
        samples=setting.anywhere,
    )


def _regular(book: Book, form: Shape, found: Formulas) -> None:
    setting = book.setting
    outer, middle, inner = setting.order
    X, rho = setting.entries, sympy.expand(setting.branch * form.rho)
    factor = setting.latex(rho)
    quadrant = (
        f"Both arguments are the sine and the cosine multiplied by ${factor}$, which is not negative in the range of "
        f"{middle.name}, so the quadrant is right: sine from the sign of the first, cosine from that of the second."
    )
    for turn, sine, cosine, value in (
        (outer, form.outer_sine, form.outer_cosine, found.outer),
        (inner, form.inner_sine, form.inner_cosine, found.inner),
    ):
        sign = setting.branch
        certificate = (sign * sine.of(X) - rho * turn.s, sign * cosine.of(X) - rho * turn.c)
        because = "the two arguments less sine and cosine times the common factor reduced to 0"
        book.show(
            f"extract-{turn.place + 1}",
            f"{turn.name.capitalize()}",
            quadrant + _offset_words(turn),
            turn.y_latex,
            setting.latex(value),
            identity(turn.y, value, certificate=certificate, because=because, angle=True),
            samples=setting.regular,
        )
    _middle(book, form, found)


def _offset_words(turn: Turn) -> str:
    return (
        f" The stated angle is ${turn.letter} = {turn.y_latex} + {degrees_latex(turn.offset)}$." if turn.shifted else ""
    )


def _middle(book: Book, form: Shape, found: Formulas) -> None:
    setting = book.setting
    middle = setting.order[1]
    X = setting.entries
    square = found.sine_over**2 + found.cosine_over**2 - form.rho**2
    along = form.along.of(X) - form.along.of(setting.E)
    book.show(
        f"extract-{middle.place + 1}",
        f"{middle.name.capitalize()}",
        "The arctangent of both keeps all digits at every attitude. The arcsine or arccosine of the one entry loses "
        "half "
        f"of them near the singular attitudes and fails when rounding carries the entry past "
        f"one.{_offset_words(middle)}",
        middle.y_latex,
        setting.latex(found.middle),
        identity(
            middle.y,
            found.middle,
            certificate=(square, along),
            because="squares of the two entries less the square of the common factor, and the carrier, reduced to 0",
            angle=True,
        ),
        samples=setting.regular,
    )


def _residual_step(book: Book, form: Shape, found: Formulas) -> None:
    setting = book.setting
    outer, _, inner = setting.order
    value = sympy.atan2(found.residual_sine, found.residual_cosine, evaluate=False)
    book.show(
        "residual",
        f"{inner.name.capitalize()} once {outer.name} is known",
        f"Row {AXES[form.b]} of ${outer.factor_latex}^{{\\mathsf{{T}}}}$ times the chain is free of "
        f"{setting.order[1].name}: "
        f"there is no small factor in it. Whatever {outer.name} was found (and near the singular attitudes its "
        f"digits are "
        f"lost), this {inner.name} completes it to the attitude that was measured; two arctangents taken "
        f"independently do "
        "not.",
        inner.y_latex,
        setting.latex(value),
        identity(
            inner.y,
            value,
            certificate=(found.residual_sine - inner.s, found.residual_cosine - inner.c),
            because="first argument less the sine and second less the cosine reduced to 0",
            angle=True,
        ),
        samples=setting.anywhere,
    )


def second_triple(setting: Setting) -> dict[sympy.Symbol, sympy.Expr]:
    """Cosines and sines at the other triple of the same attitude, in those of the first."""
    outer, middle, inner = setting.order
    found: dict[sympy.Symbol, sympy.Expr] = {}
    for turn in (outer, inner):
        found |= {turn.c: -turn.c, turn.s: -turn.s}
    cosine, sine = (middle.cosine, -middle.sine) if setting.repeated else (-middle.cosine, middle.sine)
    return found | middle.pair(cosine, sine)


def second_middle(setting: Setting) -> tuple[sympy.Expr, str]:
    """The middle angle of the second triple: (constant k with y' = k − y, its LaTeX)."""
    middle = setting.order[1]
    constant = sympy.pi / 2 * (middle.quarters or 0) * 2 + (0 if setting.repeated else sympy.pi)
    constant = wrap_exact(constant)
    text = f"-{middle.y_latex}" if constant == 0 else f"{degrees_latex(constant)} - {middle.y_latex}"
    return constant, text


def _second_triple(book: Book) -> None:
    setting = book.setting
    other = setting.E.subs(second_triple(setting), simultaneous=True)
    parts = []
    for turn in setting.turns:
        parts.append(second_middle(setting)[1] if turn.place == 1 else rf"{turn.y_latex} + 180^{{\circ}}")
    name = setting.chain_latex
    book.show(
        "second-triple",
        "The second triple",
        f"Two triples give every attitude and both are right. {_branch_words(setting)}",
        rf"{name}\left({', '.join(parts)}\right)",
        rf"{name}\left({', '.join(turn.y_latex for turn in setting.turns)}\right)",
        identity(other, setting.chain_symbols),
        samples=setting.anywhere,
    )


def _branch_words(setting: Setting) -> str:
    """Which of the two the ranges ask for."""
    lo, hi = (0.0, np.pi) if setting.repeated else (-np.pi / 2, np.pi / 2)
    if setting.branch < 0:
        lo, hi = (-np.pi, 0.0) if setting.repeated else (np.pi / 2, 3 * np.pi / 2)
    text = (
        f"The formulas above return the one whose middle turn lies in {degrees_text(lo)} … {degrees_text(hi)}; "
        "the other one follows from it."
    )
    ranges = setting.convention.ranges
    if ranges is not None and abs(ranges[1][1] - ranges[1][0] - np.pi) > 1e-6:
        text += " Where the range of an outer angle rules that triple out, the second one is taken."
    return f"{text} {range_sentence(setting.convention)} Whole turns are added until each angle lies in its range."
