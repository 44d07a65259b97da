"""The algebra of one convention: symbols, exact chain, stated matrix, and sample points with fifty digits.

Letters: `r` reference, `b` body; the chain E takes components along the innermost turned axes to components along the
outermost ones; R_rb = L E B. y is a stated angle as it appears under a sine or cosine, t = sign · (angle − offset)
the turn about the positive axis. An offset that is a multiple of 90° is worked into the formulas; any other one is
carried as a shifted angle y = angle − offset.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property, lru_cache
from random import Random

import mpmath
import numpy as np
import sympy

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import plain_names
from trunnion.symbolic.constants import AXES, Constant, constant, cross_matrix, exact_angle, to_number, turn_matrix
from trunnion.symbolic.notation import degrees_latex, latex, letters
from trunnion.symbolic.proofs import WORKING_DIGITS, Sample, remainder

_QUARTER = 1e-13  # an offset this close to a multiple of 90 deg is that multiple (the double of one is within 1e-15)
_SEED = 20260101
_POINTS = 3


@dataclass(frozen=True)
class Turn:
    """One turn of the chain: `place` in stated order, axis, sense, offset, and its cosine and sine in y symbols."""

    place: int
    axis: int
    sign: int
    quarters: int | None
    offset: sympy.Expr
    letter: str
    name: str

    @property
    def y(self) -> sympy.Symbol:
        """The angle as it stands in the formulas."""
        return sympy.Symbol(f"y{self.place + 1}")

    @property
    def c(self) -> sympy.Symbol:
        """cos y."""
        return sympy.Symbol(f"c{self.place + 1}")

    @property
    def s(self) -> sympy.Symbol:
        """sin y."""
        return sympy.Symbol(f"s{self.place + 1}")

    @property
    def shifted(self) -> bool:
        """True when y is the stated angle less an offset that is no multiple of 90°."""
        return self.quarters is None

    @property
    def cosine(self) -> sympy.Expr:
        """cos t in the symbols of y."""
        return (self.c, self.s, -self.c, -self.s)[self.quarters or 0]

    @property
    def sine(self) -> sympy.Expr:
        """sin t in the symbols of y."""
        return self.sign * (self.s, -self.c, -self.s, self.c)[self.quarters or 0]

    @property
    def t(self) -> sympy.Expr:
        """The turn as an expression in y."""
        return self.sign * (self.y - sympy.pi / 2 * (self.quarters or 0))

    def y_at(self, turn: sympy.Expr) -> sympy.Expr:
        """y, in (−π, π], at which the turn is `turn`."""
        value = self.sign * turn + sympy.pi / 2 * (self.quarters or 0)
        return wrap_exact(value)

    def pair(self, cosine: sympy.Expr, sine: sympy.Expr) -> dict[sympy.Symbol, sympy.Expr]:
        """What c and s become when cos t and sin t are given."""
        C, S = cosine, self.sign * sine
        c, s = ((C, S), (-S, C), (-C, -S), (S, -C))[self.quarters or 0]
        return {self.c: c, self.s: s}

    @property
    def matrix(self) -> sympy.ImmutableMatrix:
        """The elementary rotation of this turn."""
        return turn_matrix(self.axis, self.cosine, self.sine)

    @property
    def y_latex(self) -> str:
        """The printed form of y."""
        return rf"\bar{{{self.letter}}}" if self.shifted else self.letter

    @property
    def t_latex(self) -> str:
        """The printed form of t: `\\psi`, `-\\psi`, `\\psi - 90^{\\circ}`, `-(\\psi - 90^{\\circ})`."""
        if self.shifted or self.quarters == 0:
            return self.y_latex if self.sign > 0 else f"-{self.y_latex}"
        amount = {1: r"- 90^{\circ}", 2: r"- 180^{\circ}", 3: r"+ 90^{\circ}"}[self.quarters or 0]
        inner = f"{self.letter} {amount}"
        return inner if self.sign > 0 else f"-({inner})"

    @property
    def factor_latex(self) -> str:
        """The elementary rotation by name: `\\mathbf{T}_{z}(\\psi)`."""
        return rf"\mathbf{{T}}_{{{AXES[self.axis]}}}({self.t_latex})"


def wrap_exact(value: sympy.Expr) -> sympy.Expr:
    """An exact multiple of π brought into (−π, π]."""
    turned = value - 2 * sympy.pi * sympy.floor(value / (2 * sympy.pi))
    return turned - 2 * sympy.pi if turned > sympy.pi else turned


def vee(matrix: sympy.MatrixBase) -> sympy.ImmutableMatrix:
    """The vector (3, 1) whose cross-product matrix this is."""
    return sympy.ImmutableMatrix([matrix[2, 1], matrix[0, 2], matrix[1, 0]])


@dataclass
class Setting:
    """Everything the sections share for one convention."""

    convention: Convention
    turns: tuple[Turn, Turn, Turn] = field(init=False)
    L: Constant = field(init=False)
    B: Constant = field(init=False)

    def __post_init__(self) -> None:
        self.convention = convention = plain_names(self.convention)
        drawn = letters(convention.angle_names)
        self.turns = tuple(  # type: ignore[assignment]
            _turn(convention, place, drawn[place]) for place in range(3)
        )
        self.L, self.B = constant(convention.left, "L"), constant(convention.right, "B")

    # -- the chain ------------------------------------------------------------------------------------------------

    @cached_property
    def order(self) -> tuple[Turn, Turn, Turn]:
        """The turns as they stand in the product from left to right: outermost first."""
        return self.turns if self.convention.sense is Sense.MOVING else self.turns[::-1]

    @cached_property
    def E(self) -> sympy.ImmutableMatrix:
        """The chain, multiplied out."""
        outer, middle, inner = (turn.matrix for turn in self.order)
        return sympy.ImmutableMatrix((outer * middle * inner).applyfunc(sympy.expand))

    @cached_property
    def repeated(self) -> bool:
        """True for sequences whose first and third axis are the same."""
        return self.convention.sequence.repeated

    @cached_property
    def branch(self) -> int:
        """+1 when the ranges ask for the triple with ρ ≥ 0 (the usual one), −1 for the one with ρ ≤ 0.

        ρ is the cosine of the middle turn (three different axes) or its sine (repeated axis). Where an outer angle and
        not the middle one singles out the triple, the usual one is derived and the other follows from it.
        """
        ranges = self.convention.ranges
        if ranges is None or abs(ranges[1][1] - ranges[1][0] - np.pi) > 1e-6:
            return 1
        centre = self.convention.signs[1] * ((ranges[1][0] + ranges[1][1]) / 2 - self.convention.offsets[1])
        value = np.sin(centre) if self.repeated else np.cos(centre)
        return 1 if value > 0 else -1

    @cached_property
    def plain(self) -> bool:
        """True when neither side has a constant: the chain is R itself."""
        return self.L.kind == self.B.kind == "identity"

    @cached_property
    def exact(self) -> bool:
        """True when both constants have exact entries."""
        return self.L.exact and self.B.exact

    @cached_property
    def R(self) -> sympy.ImmutableMatrix:
        """R_rb = L E B multiplied out (symbols of the constants kept)."""
        return sympy.ImmutableMatrix((self.L.matrix * self.E * self.B.matrix).applyfunc(sympy.expand))

    @cached_property
    def stated(self) -> sympy.ImmutableMatrix:
        """The matrix as the convention states it: R_rb or its transpose."""
        return self.R if self.convention.maps_body_to_reference else self.R.T

    @cached_property
    def M(self) -> sympy.ImmutableMatrix:
        """The stated matrix as nine symbols."""
        return nine("M")

    @cached_property
    def chain_symbols(self) -> sympy.ImmutableMatrix:
        """The chain as nine symbols, used where a constant is known by numbers only."""
        return nine("E")

    @cached_property
    def short(self) -> bool:
        """True when the entries of R and of the chain are the same but for places and signs."""
        return self.L.kind in ("identity", "relabelling") and self.B.kind in ("identity", "relabelling")

    @cached_property
    def wide(self) -> bool:
        """True when entries multiplied out with both constants would outgrow a page: the factors are shown instead."""
        return self.L.kind == self.B.kind == "turn"

    @cached_property
    def back(self) -> sympy.ImmutableMatrix:
        """The chain in entries of the stated matrix, E = Lᵀ R Bᵀ; exact constants only."""
        R = self.M if self.convention.maps_body_to_reference else self.M.T
        return sympy.ImmutableMatrix((self.L.matrix.T * R * self.B.matrix.T).applyfunc(sympy.expand))

    @cached_property
    def entries(self) -> sympy.ImmutableMatrix:
        """What stands for the chain in formulas: entries of the stated matrix if that stays short, else its own."""
        return self.back if self.short else self.chain_symbols

    @cached_property
    def replacements(self) -> dict[sympy.Symbol, sympy.Expr]:
        """What every matrix entry stands for in cosines and sines of the angles."""
        pairs = list(zip(self.chain_symbols, self.E, strict=True))
        if self.exact:
            pairs += list(zip(self.M, self.stated, strict=True))
        return dict(pairs)

    def derivative(self, expression: sympy.Expr, turn: Turn) -> sympy.Expr:
        """d/dy by c' = −s, s' = c."""
        return sympy.expand(turn.c * expression.diff(turn.s) - turn.s * expression.diff(turn.c))

    def rate_columns(self, *, outer: bool) -> sympy.ImmutableMatrix:
        """Angular velocity for unit rates of the stated angles (columns in stated order), along chain axes.

        outer: components along the outermost axes, from [ω]× = dE/dt Eᵀ; else along the innermost, Eᵀ dE/dt.
        """
        columns = []
        for turn in self.turns:
            rate = self.E.applyfunc(lambda entry, turn=turn: self.derivative(entry, turn))
            product = rate * self.E.T if outer else self.E.T * rate
            columns.append(vee(product).applyfunc(remainder))
        return sympy.ImmutableMatrix(sympy.Matrix.hstack(*columns))

    # -- print ----------------------------------------------------------------------------------------------------

    @cached_property
    def chain_latex(self) -> str:
        """The name of the chain matrix."""
        return r"\mathbf{R}" if self.plain else r"\mathbf{E}"

    @cached_property
    def stated_letter(self) -> str:
        """R when the stated matrix takes body to reference components, else C."""
        return "R" if self.convention.maps_body_to_reference else "C"

    @cached_property
    def names(self) -> dict[str, str]:
        """Printed form of every symbol."""
        names = {"m": "m", "w": r"\sqrt{2}", "cm": r"c_{m}", "sm": r"s_{m}", "cn": r"c_{m/2}", "sn": r"s_{m/2}"}
        names |= {"cd": r"c_{\delta}", "sd": r"s_{\delta}", "d": r"\delta", "sigma": r"\sigma"}
        for turn in self.turns:
            n, y = turn.place + 1, turn.y_latex
            half = rf"\bar{{{turn.letter}}}/2" if turn.quarters != 0 else rf"{turn.letter}/2"
            names |= {f"y{n}": y, f"c{n}": rf"c_{{{y}}}", f"s{n}": rf"s_{{{y}}}", f"o{n}": rf"{turn.letter}_{{0}}"}
            names |= {f"g{n}": rf"c_{{{half}}}", f"h{n}": rf"s_{{{half}}}", f"e{n}": rf"\delta {turn.letter}"}
            names |= {f"x{n}": turn.letter}
        for letter in "LB":
            names |= {f"k{letter}": rf"\kappa_{{{letter}}}", f"l{letter}": rf"\lambda_{{{letter}}}"}
            names |= {f"i{letter}": rf"\kappa_{{{letter}/2}}", f"j{letter}": rf"\lambda_{{{letter}/2}}"}
        for i in (1, 2, 3):
            for j in (1, 2, 3):
                names |= {f"M{i}{j}": rf"{self.stated_letter}_{{{i}{j}}}", f"E{i}{j}": rf"E_{{{i}{j}}}"}
                names |= {f"L{i}{j}": rf"L_{{{i}{j}}}", f"B{i}{j}": rf"B_{{{i}{j}}}"}
        prefix = "" if self.plain else "E"
        names |= {f"q{n}": f"q_{{{prefix}{n}}}" for n in range(4)}
        return names

    def latex(self, expression: object) -> str:
        """LaTeX with the printed symbols."""
        return latex(expression, self.names)

    def notation(self) -> list[tuple[str, str]]:
        """Rows (symbol, meaning) of the notation table."""
        rows = []
        for turn in self.turns:
            text = f"{turn.name}, the {('first', 'second', 'third')[turn.place]} angle"
            rows.append((turn.letter, text))
            if turn.shifted:
                rows.append(
                    (turn.y_latex, f"{turn.name} less its offset {float(np.degrees(float(turn.offset))):.10g}°")
                )
            rows.append((rf"c_{{{turn.y_latex}}},\; s_{{{turn.y_latex}}}", f"cosine and sine of ${turn.y_latex}$"))
        rows.append((r"\mathbf{T}_{z}(t)", "right-handed turn by t about the z axis (x, y likewise)"))
        for item in (self.L, self.B):
            side = "reference" if item.letter == "L" else "body"
            if item.kind != "identity":
                rows.append((rf"\mathbf{{{item.letter}}}", f"constant rotation on the {side} side"))
            if item.angle is not None:
                pair = rf"\kappa_{{{item.letter}}},\; \lambda_{{{item.letter}}}"
                rows.append((pair, f"cosine and sine of ${degrees_latex(item.angle)}$"))
        return rows

    # -- sample points --------------------------------------------------------------------------------------------

    @cached_property
    def regular(self) -> list[Sample]:
        """Random attitudes with the middle turn in its range."""
        draw = Random(_SEED)
        middle = (0.05, np.pi - 0.05) if self.repeated else (-np.pi / 2 + 0.05, np.pi / 2 - 0.05)
        if self.branch < 0:
            middle = (-middle[1], -middle[0]) if self.repeated else (middle[0] + np.pi, middle[1] + np.pi)
        return [self.sample([draw.uniform(-3, 3), draw.uniform(*middle), draw.uniform(-3, 3)]) for _ in range(_POINTS)]

    @cached_property
    def anywhere(self) -> list[Sample]:
        """Random attitudes with every turn anywhere."""
        draw = Random(_SEED + 1)
        return [self.sample([draw.uniform(-3, 3) for _ in range(3)]) for _ in range(_POINTS)]

    def locked(self, turn: sympy.Expr) -> list[Sample]:
        """Random outer turns with the middle turn exactly at `turn`."""
        draw = Random(_SEED + 2)
        return [self.sample([draw.uniform(-3, 3), turn, draw.uniform(-3, 3)]) for _ in range(_POINTS)]

    def sample(self, turns: list[object]) -> dict[str, mpmath.mpf]:
        """Values of all symbols at three turns (rad, stated order); matrices by mpmath's matrix exponential."""
        with mpmath.workdps(WORKING_DIGITS):
            t = [to_number(value) for value in turns]
            values: dict[str, mpmath.mpf] = {}
            factors = []
            for turn, value in zip(self.turns, t, strict=True):
                values |= _angle_values(turn, value)
                factors.append(_exponential(turn.axis, value))
                values |= _entries(f"F{turn.place + 1}", factors[-1])
            first, second, third = factors if self.convention.sense is Sense.MOVING else factors[::-1]
            E = first * second * third
            R = self.L.numbers * E * self.B.numbers
            M = R if self.convention.maps_body_to_reference else R.T
            matrices = {"E": E, "R": R, "M": M, "L": self.L.numbers, "B": self.B.numbers}
            for name, matrix in matrices.items():
                values |= _entries(name, matrix)
            return values | self.L.values() | self.B.values() | {"w": mpmath.sqrt(2)}


def _turn(convention: Convention, place: int, letter: str) -> Turn:
    offset = float(convention.offsets[place])
    count = round(offset / (np.pi / 2))
    quarters = count % 4 if abs(offset - count * np.pi / 2) < _QUARTER * max(1, abs(count)) else None
    return Turn(
        place=place,
        axis=convention.sequence.axes[place],
        sign=int(convention.signs[place]),
        quarters=quarters,
        offset=exact_angle(offset),
        letter=letter,
        name=convention.angle_names[place],
    )


def _angle_values(turn: Turn, value: mpmath.mpf) -> dict[str, mpmath.mpf]:
    n = turn.place + 1
    offset = to_number(turn.offset)
    less = turn.sign * value  # the stated angle less its offset
    y = less if turn.shifted else less + (turn.quarters or 0) * mpmath.pi / 2
    values = {f"y{n}": y, f"c{n}": mpmath.cos(y), f"s{n}": mpmath.sin(y), f"x{n}": less + offset, f"o{n}": offset}
    return values | {f"g{n}": mpmath.cos(less / 2), f"h{n}": mpmath.sin(less / 2)}


def _entries(name: str, matrix: mpmath.matrix) -> dict[str, mpmath.mpf]:
    return {f"{name}{i + 1}{j + 1}": matrix[i, j] for i in range(3) for j in range(3)}


def nine(name: str) -> sympy.ImmutableMatrix:
    """A matrix (3, 3) of symbols `name11` … `name33`."""
    return sympy.ImmutableMatrix(3, 3, lambda i, j: sympy.Symbol(f"{name}{i + 1}{j + 1}"))


@lru_cache(maxsize=4096)
def _exponential(axis: int, value: mpmath.mpf) -> mpmath.matrix:
    n = cross_matrix([sympy.Integer(int(axis == index)) for index in range(3)])
    return mpmath.expm(mpmath.matrix([[value * int(entry) for entry in row] for row in n.tolist()]))
