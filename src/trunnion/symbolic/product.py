"""Sections one and two: the three elementary turns, their product, the constants, the mapping direction."""

from __future__ import annotations

import sympy

from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import mapping_sentence, zero_sentence
from trunnion.symbolic.constants import AXES, Constant, cross_matrix
from trunnion.symbolic.notation import degrees_latex
from trunnion.symbolic.proofs import identity
from trunnion.symbolic.setting import Setting, Turn, nine
from trunnion.symbolic.steps import Book

ORDINAL = ("first", "second", "third")


def elementary_turns(book: Book) -> None:
    """Each factor from Rodrigues' formula, shown to be the turn whose rate is about its own axis."""
    book.open("The three elementary turns")
    book.say(
        "turns",
        "What a turn is",
        "A right-handed turn by $t$ about the unit vector $n$ is $\\mathbf{I} + \\sin t\\,[n]_\\times + "
        "(1-\\cos t)\\,[n]_\\times^2$. It is the one matrix that is $\\mathbf{I}$ at $t = 0$ and whose derivative is "
        "$[n]_\\times$ times itself; this is what is checked for each factor below.",
    )
    for turn in book.setting.turns:
        _elementary(book, turn)


def _elementary(book: Book, turn: Turn) -> None:
    setting, matrix = book.setting, turn.matrix
    n = cross_matrix([sympy.Integer(int(turn.axis == index)) for index in range(3)])
    rate = matrix.applyfunc(lambda entry: setting.derivative(entry, turn))
    start = matrix.subs(turn.pair(sympy.S.One, sympy.S.Zero), simultaneous=True)
    claim = identity(
        nine(f"F{turn.place + 1}"),
        matrix,
        certificate=(*(rate - turn.sign * n * matrix), *(start - sympy.eye(3))),
        because="derivative less [n]× times the matrix, and the value at zero turn less I, reduced to 0",
    )
    name, axis = turn.name, AXES[turn.axis]
    book.show(
        f"turn-{turn.place + 1}",
        f"{ORDINAL[turn.place].capitalize()} turn: {name} about {axis}",
        f"The {ORDINAL[turn.place]} turn is made about the {axis} axis.{_sense(turn)}",
        turn.factor_latex,
        setting.latex(matrix),
        claim,
        samples=setting.anywhere,
    )


def _sense(turn: Turn) -> str:
    text = "" if turn.sign > 0 else f" The angle counts against the positive sense of the {AXES[turn.axis]} axis."
    if turn.shifted:
        text += f" Here ${turn.y_latex} = {turn.letter} - {turn.letter}_0$ with ${turn.letter}_0 = "
        text += f"{degrees_latex(turn.offset)}$."
    elif turn.quarters:
        text += f" The turn is zero at ${turn.letter} = {degrees_latex(turn.y_at(sympy.S.Zero))}$."
    return text


def product(book: Book) -> None:
    """The product of the three factors, that it is a rotation, the constants, the stated matrix."""
    setting = book.setting
    book.open("The product")
    outer, middle, inner = setting.order
    book.say("order", "Order of the factors", _order_words(setting))
    pair = sympy.ImmutableMatrix(outer.matrix * middle.matrix)
    book.show(
        "product-of-two",
        "The first two factors",
        "Multiplied out from the left; $c$ and $s$ with an index are the cosine and sine of that angle.",
        f"{outer.factor_latex}\\, {middle.factor_latex}",
        setting.latex(pair),
        identity(nine(_factor(outer)) * nine(_factor(middle)), pair),
        replacements=_factors(setting),
        samples=setting.anywhere,
    )
    name = setting.chain_latex
    book.show(
        "product",
        "All three factors",
        _product_words(setting),
        f"{name} = {outer.factor_latex}\\, {middle.factor_latex}\\, {inner.factor_latex}",
        setting.latex(setting.E),
        identity(nine(_factor(outer)) * nine(_factor(middle)) * nine(_factor(inner)), setting.E),
        replacements=_factors(setting),
        samples=setting.anywhere,
    )
    _rotation(book)
    if not setting.plain:
        _constants(book)
    _stated(book)


def _factor(turn: Turn) -> str:
    return f"F{turn.place + 1}"


def _factors(setting: Setting) -> dict[sympy.Symbol, sympy.Expr]:
    pairs: dict[sympy.Symbol, sympy.Expr] = {}
    for turn in setting.turns:
        pairs |= dict(zip(nine(_factor(turn)), turn.matrix, strict=True))
    return pairs


def _order_words(setting: Setting) -> str:
    body, reference = setting.convention.body.name, setting.convention.reference.name
    if setting.convention.sense is Sense.MOVING:
        return (
            f"Each turn is made about an axis of the {body} where the turns before have left it. Components along the "
            "innermost axes go through the last turn first, so the first turn stands on the left."
        )
    return (
        f"Each turn is made about an axis of {reference} that stays where it is. A later turn acts on what the earlier "
        "ones have already turned, so it stands on the left and the first turn on the right."
    )


def _product_words(setting: Setting) -> str:
    if setting.plain:
        return "This matrix takes body components to reference components."
    return "This is the chain; the constants of the convention stand to its left and right, see below."


def _rotation(book: Book) -> None:
    setting = book.setting
    E, name = setting.chain_symbols, setting.chain_latex
    replacements = dict(zip(E, setting.E, strict=True))
    determinant = E.det(method="berkowitz")
    book.show(
        "rotation",
        "It is a rotation",
        "Transposed times itself is the unit matrix and the determinant is one, for all angles.",
        f"{name}^{{\\mathsf{{T}}}} {name}",
        rf"\mathbf{{I}}, \qquad \det {name} = 1",
        identity([*(E.T * E), determinant], [*sympy.eye(3), sympy.S.One]),
        replacements=replacements,
        samples=setting.anywhere,
    )


def _constants(book: Book) -> None:
    setting = book.setting
    for item, side in ((setting.L, "reference"), (setting.B, "body")):
        if item.kind != "identity":
            _constant(book, item, side)
    letters = [r"\mathbf{L}" if setting.L.kind != "identity" else "", r"\mathbf{E}"]
    letters.append(r"\mathbf{B}" if setting.B.kind != "identity" else "")
    L, E, B = nine("L"), setting.chain_symbols, nine("B")
    numbers = f"{zero_sentence(setting.convention)} "
    if not setting.exact:
        text = "A constant is known by numbers only, so the exact work below is done on the chain."
        claim = identity(nine("R"), L * E * B, certificate=(), because="definition; shown by evaluation")
        book.show(
            "whole",
            "The whole map",
            numbers + text,
            r"\mathbf{R}",
            r"\, ".join(filter(None, letters)),
            claim,
            samples=setting.anywhere,
        )
        return
    product = r"\, ".join(filter(None, letters))
    shown = sympy.ImmutableMatrix((setting.L.matrix * _shown_chain(setting) * setting.B.matrix).applyfunc(sympy.expand))
    book.show(
        "whole",
        "The whole map",
        numbers + _commuting(setting),
        r"\mathbf{R}" if setting.wide else rf"\mathbf{{R}} = {product}",
        product if setting.wide else setting.latex(shown),
        identity(nine("R"), setting.R),
        replacements=dict(zip(nine("R"), setting.L.matrix * setting.E * setting.B.matrix, strict=True)),
        samples=setting.anywhere,
    )


def _shown_chain(setting: Setting) -> sympy.ImmutableMatrix:
    """With relabellings only, entries in the angles stay short; else entries of the chain keep the page width."""
    return setting.E if setting.short else setting.chain_symbols


def _constant(book: Book, item: Constant, side: str) -> None:
    setting, letter = book.setting, rf"\mathbf{{{item.letter}}}"
    if item.kind == "general":
        rows = [[f"{float(item.numbers[i, j]):.12f}" for j in range(3)] for i in range(3)]
        body = r"\\".join(" & ".join(row) for row in rows)
        text = f"The constant rotation on the {side} side is no simple angle about one axis; its numbers are stated."
        matrix = rf"\begin{{bmatrix}}{body}\end{{bmatrix}}"
    else:
        matrix = setting.latex(item.matrix)
        text = f"The constant rotation on the {side} side."
        if item.angle is not None:
            pair = rf"\kappa_{{{item.letter}}}, \lambda_{{{item.letter}}}"
            text += f" Here ${pair}$ are the cosine and sine of ${degrees_latex(item.angle)}$."
    symbols = nine(item.letter)
    if item.exact:
        claim = identity(
            symbols,
            item.matrix,
            certificate=tuple(item.matrix.T * item.matrix - sympy.eye(3)),
            because="transposed times itself less I reduced to 0",
        )
    else:
        claim = identity(
            symbols.T * symbols,
            sympy.eye(3),
            certificate=(),
            because="nearest rotation to the stated numbers; shown by evaluation",
        )
    book.show(
        f"constant-{item.letter}",
        f"The constant on the {side} side",
        text,
        letter,
        matrix,
        claim,
        samples=setting.anywhere[:1],
    )


def _commuting(setting: Setting) -> str:
    """A constant about the axis of the turn next to it is nothing but an offset of that angle."""
    outer, _, inner = setting.order
    text = ""
    for item, turn, side in ((setting.L, outer, "reference"), (setting.B, inner, "body")):
        if item.kind == "turn" and item.axis == turn.axis and item.relabelling == sympy.eye(3):
            text += (
                f"The constant on the {side} side turns about the same axis as {turn.name}: it acts as an offset of "
                f"that angle. "
            )
    return text.strip()


def _stated(book: Book) -> None:
    setting = book.setting
    prose = mapping_sentence(setting.convention)
    if setting.convention.maps_body_to_reference:
        book.say("mapping", "Which way the matrix maps", prose)
        return
    if not setting.short:
        book.say("mapping", "Which way the matrix maps", prose + " It is the transpose of the matrix above.")
        return
    shown = setting.stated
    book.show(
        "mapping",
        "Which way the matrix maps",
        prose,
        r"\mathbf{C} = \mathbf{R}^{\mathsf{T}}",
        setting.latex(shown),
        identity(setting.M, shown),
        samples=setting.anywhere,
    )
