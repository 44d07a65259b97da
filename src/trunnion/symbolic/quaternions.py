"""Sections eight and nine: the quaternion of the sequence; inverse, transposed mapping, equal readings."""

from __future__ import annotations

import re

import numpy as np
import sympy

from trunnion.attitude.sequences import Sense
from trunnion.symbolic.constants import AXES, hamilton, matrix_of, relabelling_quaternion
from trunnion.symbolic.proofs import ROOT_2, identity, remainder
from trunnion.symbolic.setting import Setting, Turn, nine
from trunnion.symbolic.shape import Shape
from trunnion.symbolic.singular import CD, SD, D, Locked, combination, delta_latex, locked_samples
from trunnion.symbolic.steps import Book, aligned, extended

Four = tuple[sympy.Expr, sympy.Expr, sympy.Expr, sympy.Expr]


def turn_quaternion(turn: Turn) -> Four:
    """Quaternion of one turn in g = cos and h = sin of half the stated angle less its offset."""
    g, h = sympy.symbols(f"g{turn.place + 1} h{turn.place + 1}")
    parts: list[sympy.Expr] = [g, sympy.S.Zero, sympy.S.Zero, sympy.S.Zero]
    parts[turn.axis + 1] = turn.sign * h
    return tuple(parts)


def halves(setting: Setting) -> dict[sympy.Symbol, sympy.Expr]:
    """c and s of the angles in half-angle symbols."""
    found: dict[sympy.Symbol, sympy.Expr] = {}
    for turn in setting.turns:
        g, h = sympy.symbols(f"g{turn.place + 1} h{turn.place + 1}")
        found |= turn.pair(g**2 - h**2, turn.sign * 2 * g * h)
    for letter in "LB":
        i, j, cosine, sine = sympy.symbols(f"i{letter} j{letter} k{letter} l{letter}")
        found |= {cosine: i**2 - j**2, sine: 2 * i * j}
    return found


def quaternion(book: Book, form: Shape, locked: tuple[Locked, Locked]) -> Four:
    """Write the section; returns the quaternion of R_rb, scalar first."""
    setting = book.setting
    book.open("The quaternion")
    outer, middle, inner = (turn_quaternion(turn) for turn in setting.order)
    chain = hamilton(hamilton(outer, middle), inner)
    _chain(book, chain)
    whole = hamilton(hamilton(setting.L.quaternion, chain), setting.B.quaternion)
    if not setting.plain:
        _whole(book)
    for number, case in enumerate(locked, start=1):
        _at_lock(book, form, chain, case, number)
    return whole


def _at_lock(book: Book, form: Shape, chain: Four, case: Locked, number: int) -> None:
    """δ from the four components, by taking the fixed rotation K of the singular attitude off again."""
    setting, middle = book.setting, book.setting.order[1]
    fixed = case.matrix.subs({CD: 1, SD: 0}, simultaneous=True)
    w, x, y, z = relabelling_quaternion(np.array(fixed.tolist(), dtype=float))
    parts = sympy.symbols("q:4")
    left = hamilton(parts, (w, -x, -y, -z))
    scalar, along = left[0], case.spin * left[form.a + 1]
    scale = ROOT_2 if left[0].has(ROOT_2) or left[form.a + 1].has(ROOT_2) else sympy.S.One
    shown = [remainder(scale * part) for part in (along, scalar)]
    half_cosine, half_sine = (exact_root(f(case.turn / 2)) for f in (sympy.cos, sympy.sin))
    n = middle.place + 1
    there = {sympy.Symbol(f"g{n}"): half_cosine, sympy.Symbol(f"h{n}"): middle.sign * half_sine}
    four = dict(zip(parts, (part.subs(there, simultaneous=True) for part in chain), strict=True))
    doubled = [value.subs(halves(setting), simultaneous=True) for value in combination(setting, case.relation).values()]
    certificate = (
        (scalar**2 - along**2).subs(four, simultaneous=True) - doubled[0],
        (2 * scalar * along).subs(four, simultaneous=True) - doubled[1],
    )
    samples = locked_samples(setting, case.turn, case.relation)
    book.show(
        f"quaternion-lock-{number}",
        f"What is left, from the quaternion at {case.label}",
        "The fixed rotation of this singular attitude taken off, a turn by $\\delta$ about one axis is left. Either "
        "sign of the quaternion gives the same $\\delta$ but for a whole turn.",
        rf"\delta = {delta_latex(setting, case.relation)}",
        "2 " + setting.latex(sympy.atan2(*shown, evaluate=False)),
        identity(
            D,
            2 * sympy.atan2(along, scalar, evaluate=False),
            certificate=certificate,
            because="double-angle forms of both arguments less cosine and sine of δ reduced to 0",
            angle=True,
        ),
        samples=extended(samples, **{f"q{n}": part for n, part in enumerate(chain)}),
    )


def exact_root(value: sympy.Expr) -> sympy.Expr:
    """√2/2 as half the symbol w; 0 and ±1 as they are."""
    return value.subs(sympy.sqrt(2), ROOT_2)


def _bar_words(setting: Setting) -> str:
    moved = [turn for turn in setting.turns if turn.quarters != 0]
    if not moved:
        return ""
    names = ", ".join(f"$\\bar{{{turn.letter}}}$" for turn in moved)
    return f" {names}: the angle less its offset."


def _chain(book: Book, chain: Four) -> None:
    setting = book.setting
    name = "q" if setting.plain else "q_{E}"
    rows = [
        (f"{name}_{{{n}}}" if setting.plain else f"q_{{E{n}}}", setting.latex(part)) for n, part in enumerate(chain)
    ]
    factors = r" \otimes ".join(f"q_{{{AXES[t.axis]}}}({t.t_latex})" for t in setting.order)
    rows.insert(0, (name, factors))
    book.show(
        "quaternion",
        "Product of three half-angle quaternions",
        "Scalar first, Hamilton's product, the same map as the chain: $v \\mapsto q\\, v\\, q^{*}$. A turn by $t$ "
        "about $n$ is "
        f"$(\\cos t/2,\\; n \\sin t/2)$. The opposite quaternion is the same attitude.{_bar_words(setting)}",
        aligned(rows),
        "",
        identity(matrix_of(chain), setting.chain_symbols),
        replacements=dict(zip(setting.chain_symbols, setting.E.subs(halves(setting), simultaneous=True), strict=True)),
        samples=setting.anywhere,
    )


def _whole(book: Book) -> None:
    setting = book.setting
    factors = [f"q_{{{item.letter}}}" for item in (setting.L,) if item.kind != "identity"] + ["q_{E}"]
    factors += [f"q_{{{item.letter}}}" for item in (setting.B,) if item.kind != "identity"]
    rows = [("q", r" \otimes ".join(factors))]
    lhs: list[sympy.Expr] = []
    rhs: list[sympy.Expr] = []
    exact: list[sympy.Expr] = []
    for item in (setting.L, setting.B):
        if item.kind != "identity":
            rows.append((f"q_{{{item.letter}}}", _four_latex(setting, item.quaternion, exact=item.exact)))
            lhs += list(matrix_of(item.quaternion))
            rhs += list(nine(item.letter))
        if item.exact:
            exact += list(matrix_of(item.quaternion) - item.matrix.subs(halves(setting), simultaneous=True))
    p, q = sympy.symbols("p:4"), sympy.symbols("q:4")
    exact += [sympy.expand(e) for e in matrix_of(hamilton(p, q)) - matrix_of(p) * matrix_of(q)]
    book.show(
        "quaternion-whole",
        "With the constants",
        "The matrix of a product of quaternions is the product of their matrices, so the constants go to the same "
        "sides.",
        aligned(rows),
        "",
        identity(
            lhs,
            rhs,
            certificate=tuple(exact),
            because="matrix of each constant's quaternion less the constant, and the product rule, reduced to 0",
        ),
        samples=setting.anywhere[:1],
    )


def _four_latex(setting: Setting, parts: Four, *, exact: bool) -> str:
    shown = [setting.latex(part) if exact else f"{float(part):.12f}" for part in parts]
    return r"\left(" + r",\; ".join(shown) + r"\right)"


def inverse(book: Book) -> None:
    """The inverse, the transposed mapping, and the reading that is equal."""
    setting = book.setting
    book.open("Inverse and transposed mapping")
    backwards = sympy.eye(3)
    for turn in reversed(setting.order):
        backwards = backwards * turn.matrix.subs(
            {turn.s: -turn.s} if turn.quarters in (0, None) else turn.pair(turn.cosine, -turn.sine), simultaneous=True
        )
    factors = r"\, ".join(_reversed_factor(turn) for turn in reversed(setting.order))
    name = setting.chain_latex
    book.show(
        "inverse",
        "The inverse",
        "The inverse is the transpose: the turns undone in reverse order, each by the opposite amount. It is not the "
        "same "
        "triple with opposite signs in the same order.",
        rf"{name}^{{-1}} = {name}^{{\mathsf{{T}}}} = {factors}",
        setting.latex(setting.E.T),
        identity([*backwards, *(setting.chain_symbols * setting.E.T)], [*setting.E.T, *sympy.eye(3)]),
        samples=setting.anywhere,
    )
    _transposed(book)
    book.say("equal-reading", "The same numbers read the other way", _equal_words(setting))


def _reversed_factor(turn: Turn) -> str:
    inner = turn.t_latex
    opposite = f"-{inner}" if " " not in inner else f"-({inner})"
    text = inner[1:].strip("()") if inner.startswith("-") else opposite
    return rf"\mathbf{{T}}_{{{AXES[turn.axis]}}}({text})"


def _transposed(book: Book) -> None:
    setting = book.setting
    body, reference = (
        re.sub(r"[^\w .-]", " ", frame.name) for frame in (setting.convention.body, setting.convention.reference)
    )
    rows = [
        (rf"\mathbf{{v}}_{{\text{{{reference}}}}}", rf"\mathbf{{R}}\, \mathbf{{v}}_{{\text{{{body}}}}}"),
        (rf"\mathbf{{v}}_{{\text{{{body}}}}}", rf"\mathbf{{R}}^{{\mathsf{{T}}}} \mathbf{{v}}_{{\text{{{reference}}}}}"),
    ]
    R = nine("R")
    vector = sympy.Matrix([sympy.Rational(1, 3), sympy.Rational(-2, 3), sympy.Rational(2, 3)])
    certificate = tuple(setting.E.T * setting.E - sympy.eye(3))
    book.show(
        "transposed",
        "Both mapping directions",
        "The same attitude, either way round; the quaternion of the transposed matrix is the conjugate "
        "$(q_0, -q_1, -q_2, -q_3)$.",
        aligned(rows),
        "",
        identity(
            R.T * (R * vector),
            vector,
            certificate=certificate,
            because="chain transposed times itself less I reduced to 0",
        ),
        samples=setting.anywhere,
    )


def _equal_words(setting: Setting) -> str:
    convention = setting.convention
    own = "-".join(AXES[turn.axis] for turn in setting.turns)
    other = "-".join(AXES[turn.axis] for turn in reversed(setting.turns))
    names = ", ".join(turn.name for turn in reversed(setting.turns))
    here, there = ("moving", "fixed") if convention.sense is Sense.MOVING else ("fixed", "moving")
    return (
        f"Turns {own} about {here} axes are turns {other} about {there} axes with the same angles in the order "
        f"{names}: the "
        "product is the same, factor by factor. The two are one convention under two names."
    )
