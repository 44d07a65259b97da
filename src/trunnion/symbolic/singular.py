"""Section four: both singular values of the middle angle, step by step down to one turn by a sum or a difference."""

from __future__ import annotations

from dataclasses import dataclass

import sympy

from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import (
    Singular,
    axis_words,
    combination_text,
    degrees_text,
    end_words,
    singular_attitudes,
    singular_words,
)
from trunnion.symbolic.constants import AXES, turn_matrix
from trunnion.symbolic.notation import degrees_latex
from trunnion.symbolic.proofs import ProofError, Sample, identity, remainder
from trunnion.symbolic.setting import Setting, Turn
from trunnion.symbolic.shape import Shape
from trunnion.symbolic.steps import Book, aligned, extended

CD, SD, D = sympy.symbols("cd sd d")


@dataclass(frozen=True)
class Locked:
    """What was derived at one singular value.

    `turn`: middle turn; `y`: the middle angle y there; `relation` r: only δ = y1 + r·y3 remains; `matrix`: the chain in
    c_δ, s_δ; `entry`: the value ±1 of the carrier; `sine`, `cosine`: s_δ and c_δ in entries of the stated matrix (or
    of the chain); `spin`: the sense in which δ turns about the outermost axis.
    """

    turn: sympy.Expr
    y: sympy.Expr
    relation: int
    matrix: sympy.ImmutableMatrix
    entry: int
    sine: sympy.Expr
    cosine: sympy.Expr
    spin: int
    words: Singular
    label: str


def singular(book: Book, form: Shape) -> tuple[Locked, Locked]:
    """Write the section; returns what was found at both values."""
    setting = book.setting
    book.open("The singular attitudes")
    _where(book, form)
    readings = singular_attitudes(setting.convention)
    turns = (sympy.S.Zero, sympy.pi) if setting.repeated else (sympy.pi / 2, -sympy.pi / 2)
    found = []
    for number, (turn, reading) in enumerate(zip(turns, readings, strict=True), start=1):
        found.append(_reduce(book, form, turn, reading, number))
    return found[0], found[1]


def _where(book: Book, form: Shape) -> None:
    setting = book.setting
    middle = setting.order[1]
    turns = (0, sympy.pi) if setting.repeated else (sympy.pi / 2, -sympy.pi / 2)
    values = [degrees_latex(middle.y_at(sympy.sympify(turn))) for turn in turns]
    column = [setting.entries[row, form.c] for row in form.others]
    square = sum(entry**2 for entry in column)
    book.show(
        "singular-where",
        "Where the formulas fail",
        f"The first two arctangents share the factor ${setting.latex(form.rho)}$. Where it is zero both are of zero "
        f"over "
        f"zero: at ${middle.y_latex} = {values[0]}$ and at ${middle.y_latex} = {values[1]}$.",
        setting.latex(square),
        setting.latex(form.rho**2),
        identity(square, form.rho**2),
        samples=setting.anywhere,
    )


def _reduce(book: Book, form: Shape, turn: sympy.Expr, reading: Singular, number: int) -> Locked:
    setting = book.setting
    middle = setting.order[1]
    cosine, sine = sympy.cos(turn), sympy.sin(turn)
    values = middle.pair(cosine, sine)
    substituted = sympy.ImmutableMatrix(setting.E.subs(values, simultaneous=True))
    y = middle.y_at(turn)
    relation = _relation(setting, substituted)
    samples = locked_samples(setting, turn, relation)
    at = f"{middle.y_latex} = {degrees_latex(y)}"
    label = f"{middle.name} {degrees_text(reading.angle)}"
    _substitution(book, substituted, values, at, label, number, samples)
    _addition(book, relation, label, number, samples)
    matrix = _one_angle(book, substituted, relation, at, label, number, samples)
    spin = _one_turn(book, form, matrix, relation, at, label, number, samples)
    locked = _recover(book, form, matrix, (turn, y, relation, spin), reading, label, number, samples)
    _null(book, locked, values, label, number)
    _physical(book, form, locked, substituted, label, number, samples)
    return locked


def locked_samples(setting: Setting, turn: sympy.Expr, relation: int) -> list[Sample]:
    """Sample points at a singular value with δ, its cosine and its sine."""
    first, last = setting.turns[0], setting.turns[2]
    delta = first.y + relation * last.y
    return extended(setting.locked(turn), d=delta, cd=sympy.cos(delta), sd=sympy.sin(delta))


def combination(setting: Setting, relation: int) -> dict[sympy.Symbol, sympy.Expr]:
    """c_δ and s_δ by the addition theorem."""
    first, last = setting.turns[0], setting.turns[2]
    return {
        CD: first.c * last.c - relation * first.s * last.s,
        SD: first.s * last.c + relation * first.c * last.s,
    }


def _relation(setting: Setting, substituted: sympy.ImmutableMatrix) -> int:
    """+1 or −1, whichever sum or difference the four remaining entries consist of: tried, not recalled."""
    for relation in (1, -1):
        if _in_delta(setting, substituted, relation) is not None:
            return relation
    raise ProofError("at the singular value the entries are neither of the sum nor of the difference")


def _in_delta(setting: Setting, substituted: sympy.ImmutableMatrix, relation: int) -> sympy.ImmutableMatrix | None:
    theorem = combination(setting, relation)
    found = []
    for entry in substituted:
        candidates = [entry] if entry.is_number else [sign * symbol for symbol in (CD, SD) for sign in (1, -1)]
        match = [item for item in candidates if remainder(entry - sympy.sympify(item).xreplace(theorem)) == 0]
        if not match:
            return None
        found.append(match[0])
    return sympy.ImmutableMatrix(3, 3, found)


def delta_latex(setting: Setting, relation: int) -> str:
    """`\\psi - \\phi`: the combination that is left."""
    first, last = setting.turns[0], setting.turns[2]
    return f"{first.y_latex} {'+' if relation > 0 else '-'} {last.y_latex}"


def _substitution(
    book: Book,
    substituted: sympy.ImmutableMatrix,
    values: dict[sympy.Symbol, sympy.Expr],
    at: str,
    label: str,
    number: int,
    samples: list[Sample],
) -> None:
    setting = book.setting
    put = ", ".join(f"${setting.latex(symbol)} = {setting.latex(value)}$" for symbol, value in values.items())
    book.show(
        f"singular-{number}-substitution",
        f"Substitution, {label}",
        f"With {put} in the product.",
        rf"{setting.chain_latex}\big|_{{{at}}}",
        setting.latex(substituted),
        identity(setting.chain_symbols, substituted),
        replacements=dict(zip(setting.chain_symbols, setting.E.subs(values, simultaneous=True), strict=True)),
        samples=samples,
    )


def _addition(book: Book, relation: int, label: str, number: int, samples: list[Sample]) -> None:
    setting = book.setting
    theorem = combination(setting, relation)
    delta = delta_latex(setting, relation)
    rows = [(rf"\cos({delta})", setting.latex(theorem[CD])), (rf"\sin({delta})", setting.latex(theorem[SD]))]
    angle = setting.turns[0].y + relation * setting.turns[2].y
    exact = [sympy.cos(angle), sympy.sin(angle)]
    expanded = [sympy.expand_trig(entry) for entry in exact]
    back = {sympy.cos(t.y): t.c for t in setting.turns} | {sympy.sin(t.y): t.s for t in setting.turns}
    certificate = tuple(e.xreplace(back) - theorem[symbol] for e, symbol in zip(expanded, (CD, SD), strict=True))
    book.show(
        f"singular-{number}-addition",
        f"Addition theorem, {label}",
        "Each of the four entries left is one side of these two lines, up to its sign.",
        aligned(rows),
        "",
        identity(exact, [theorem[CD], theorem[SD]], certificate=certificate),
        samples=samples,
    )


def _one_angle(
    book: Book,
    substituted: sympy.ImmutableMatrix,
    relation: int,
    at: str,
    label: str,
    number: int,
    samples: list[Sample],
) -> sympy.ImmutableMatrix:
    setting = book.setting
    matrix = _in_delta(setting, substituted, relation)
    assert matrix is not None
    book.show(
        f"singular-{number}-one-angle",
        f"One angle is left, {label}",
        f"With $\\delta = {delta_latex(setting, relation)}$.",
        rf"{setting.chain_latex}\big|_{{{at}}}",
        setting.latex(matrix),
        identity(substituted, matrix),
        replacements=combination(setting, relation),
        samples=samples,
    )
    return matrix


def _one_turn(
    book: Book,
    form: Shape,
    matrix: sympy.ImmutableMatrix,
    relation: int,
    at: str,
    label: str,
    number: int,
    samples: list[Sample],
) -> int:
    setting = book.setting
    fixed = sympy.ImmutableMatrix(matrix.subs({CD: 1, SD: 0}, simultaneous=True))
    for spin in (1, -1):
        turn = turn_matrix(form.a, CD, spin * SD)
        if turn * fixed == matrix:
            break
    else:
        raise ProofError("the matrix at the singular value is no single turn about the outermost axis")
    sign = "" if spin > 0 else "-"
    book.show(
        f"singular-{number}-one-turn",
        f"It is a single turn, {label}",
        f"One turn by ${sign}\\delta$ about the {AXES[form.a]} axis, after a fixed rotation. Three angles, one turn.",
        rf"{setting.chain_latex}\big|_{{{at}}} = \mathbf{{T}}_{{{AXES[form.a]}}}({sign}\delta)\, \mathbf{{K}}, "
        rf"\qquad \mathbf{{K}}",
        setting.latex(fixed),
        identity(setting.chain_symbols, turn_matrix(form.a, CD, spin * SD) * fixed),
        replacements=dict(zip(setting.chain_symbols, matrix, strict=True)),
        samples=samples,
    )
    return spin


def _recover(
    book: Book,
    form: Shape,
    matrix: sympy.ImmutableMatrix,
    facts: tuple[sympy.Expr, sympy.Expr, int, int],
    reading: Singular,
    label: str,
    number: int,
    samples: list[Sample],
) -> Locked:
    setting = book.setting
    turn, y, relation, spin = facts
    found = {}
    for row in form.others:
        for symbol in (CD, SD):
            for sign in (1, -1):
                if matrix[row, form.b] == sign * symbol:
                    found[symbol] = sign * setting.entries[row, form.b]
    value = sympy.atan2(found[SD], found[CD], evaluate=False)
    first, last = setting.turns[0], setting.turns[2]
    entries = dict(zip(setting.chain_symbols, matrix, strict=True)) | _entries_at(setting, matrix)
    certificate = tuple(remainder(found[symbol].xreplace(entries) - symbol) for symbol in (SD, CD))
    book.show(
        f"singular-{number}-recover",
        f"What can be recovered, {label}",
        f"Only $\\delta$. {first.name.capitalize()} and {last.name} one by one cannot be had from the attitude. "
        f"{_agreed(first, last, relation, solved='first')} {_agreed(first, last, relation, solved='last')}",
        rf"\delta = {delta_latex(setting, relation)}",
        setting.latex(value),
        identity(
            D, value, certificate=certificate, because="arguments less sine and cosine of δ reduced to 0", angle=True
        ),
        samples=samples,
    )
    entry = int(matrix[form.a, form.c])
    return Locked(turn, y, relation, matrix, entry, found[SD], found[CD], spin, reading, label)


def _agreed(first: Turn, last: Turn, relation: int, *, solved: str) -> str:
    """The two policies: the turn of the one outer angle is agreed to be zero, the other carries δ."""
    zero, other = (last, first) if solved == "first" else (first, last)
    value = zero.y_at(sympy.S.Zero)
    shift = -relation * value
    sign = "-" if solved == "last" and relation < 0 else ""
    amount = f" {'+' if shift > 0 else '-'} {degrees_latex(abs(shift))}" if value != 0 else ""
    if solved == "last" and value != 0:
        amount = f" {'-' if relation * value > 0 else '+'} {degrees_latex(abs(value))}"
    return f"With ${zero.y_latex} = {degrees_latex(value)}$ agreed, ${other.y_latex} = {sign}\\delta{amount}$."


def _entries_at(setting: Setting, matrix: sympy.ImmutableMatrix) -> dict[sympy.Symbol, sympy.Expr]:
    if not setting.exact:
        return {}
    R = setting.L.matrix * matrix * setting.B.matrix
    stated = R if setting.convention.maps_body_to_reference else R.T
    return dict(zip(setting.M, stated, strict=True))


def _null(book: Book, locked: Locked, values: dict[sympy.Symbol, sympy.Expr], label: str, number: int) -> None:
    setting = book.setting
    first, last = setting.turns[0], setting.turns[2]
    slope = setting.E.applyfunc(
        lambda entry: setting.derivative(entry, first) - locked.relation * setting.derivative(entry, last)
    ).subs(values, simultaneous=True)
    sign = "-" if locked.relation > 0 else "+"
    other = "the opposite amount" if locked.relation > 0 else "the same amount"
    book.show(
        f"singular-{number}-null",
        f"The null direction, {label}",
        f"Change {first.name} by any amount and {last.name} by {other}: $\\delta$ stays and so does the attitude. The "
        "whole line of triples is one attitude.",
        rf"\frac{{\partial {setting.chain_latex}}}{{\partial {first.y_latex}}} {sign} "
        rf"\frac{{\partial {setting.chain_latex}}}{{\partial {last.y_latex}}}",
        r"\mathbf{0}",
        identity(slope, sympy.zeros(3, 3)),
        samples=locked_samples(setting, locked.turn, locked.relation),
    )


def _physical(
    book: Book,
    form: Shape,
    locked: Locked,
    substituted: sympy.ImmutableMatrix,
    label: str,
    number: int,
    samples: list[Sample],
) -> None:
    setting = book.setting
    _agree_with_words(setting, locked)
    convention = setting.convention
    sentence = singular_words(convention)[number - 1]
    axis = sympy.Matrix([int(form.c == index) for index in range(3)])
    target = sympy.Matrix([locked.entry * int(form.a == index) for index in range(3)])
    signed = "" if locked.entry > 0 else "-"
    book.show(
        f"singular-{number}-physical",
        f"What it means, {label}",
        f"{sentence[0].upper()}{sentence[1:]} {_gimbals(setting, locked)}",
        rf"{setting.chain_latex}\, \mathbf{{e}}_{{{AXES[form.c]}}}",
        rf"{signed}\mathbf{{e}}_{{{AXES[form.a]}}}",
        identity(setting.chain_symbols * axis, target),
        replacements=dict(zip(setting.chain_symbols, substituted, strict=True)),
        samples=samples,
    )


def _gimbals(setting: Setting, locked: Locked) -> str:
    convention = setting.convention
    first, last = setting.turns[0], setting.turns[2]
    # senses of the stated angles about the axes that have become one line
    same = locked.entry * first.sign * last.sign > 0
    relation = "parallel" if same else "opposite"
    body = axis_words(locked.words.body_direction, convention.body)
    line = end_words(locked.words.body_direction, convention.body)
    if convention.sense is Sense.MOVING:
        text = f"The axis of {last.name} ({body}) has come to lie along the axis of {first.name}"
    else:
        text = f"{line[0].upper()}{line[1:]} about which {first.name} was turned now lies along the axis of {last.name}"
    return (
        f"{text}: two gimbal axes are {relation}, both turn the {convention.body.name} about one line, and no turn "
        f"is left about the line that is perpendicular to it and to the axis of {setting.order[1].name}. "
        f"Determined: {combination_text(convention, locked.words)}."
    )


def _agree_with_words(setting: Setting, locked: Locked) -> None:
    """The plain sentences come from `attitude.words`; they must say what was derived here."""
    reading = locked.words
    same = abs(float(locked.turn) - reading.turn) < 1e-12 and reading.coefficients == (1, locked.relation)
    outer = setting.order[0].axis
    direction = locked.entry * setting.convention.left[:, outer]
    if not same or abs(reading.reference_direction - direction).max() > 1e-12:
        raise ProofError(f"the plain words for {setting.order[1].name} at lock contradict the derivation")
