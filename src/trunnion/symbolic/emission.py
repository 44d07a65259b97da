"""From a derivation to lines of source: what C and Python have in common.

The formulas written are those of the derivation; only the constants of the convention are put in as numbers. Every
line is an assignment whose right side reads the same in C and in Python.
"""

from __future__ import annotations

import re
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

import mpmath
import sympy

from trunnion.attitude.words import (
    default_ranges,
    mapping_sentence,
    range_sentence,
    singular_words,
    turn_sentences,
)
from trunnion.symbolic.constants import Constant, hamilton
from trunnion.symbolic.derivation import Derivation
from trunnion.symbolic.extraction import residual_of, second_middle
from trunnion.symbolic.proofs import ROOT_2, WORKING_DIGITS
from trunnion.symbolic.quaternions import turn_quaternion
from trunnion.symbolic.setting import Turn
from trunnion.symbolic.shape import middle_sides

_NOTHING = mpmath.mpf(10) ** -40  # an entry of a constant below this is an exact zero
_PLAIN = {"−": "-", "…": "...", "°": " deg", "→": "->", "×": "x"}


@dataclass(frozen=True)
class Language:
    """How one language (and precision) writes numbers, functions and assignments."""

    suffix: str
    functions: str
    declare: str
    end: str

    def number(self, value: object) -> str:
        """A literal that reads back as the same double."""
        text = repr(float(value))  # type: ignore[arg-type]
        return text + self.suffix

    def call(self, name: str, *arguments: str) -> str:
        """A function of the mathematics library."""
        return f"{self.functions}{name}{self.suffix.lower()}({', '.join(arguments)})"

    def let(self, name: str, value: str) -> str:
        """A new constant."""
        return f"{self.declare}{name} = {value}{self.end}"


C_DOUBLE = Language("", "", "const double ", ";")
C_FLOAT = Language("F", "", "const float ", ";")
PYTHON = Language("", "math.", "", "")

Matrix = Sequence[Sequence[mpmath.mpf]]


def plain_text(text: str) -> str:
    """Printable ASCII that can end neither a comment nor a string of any language."""
    for sign, letters in _PLAIN.items():
        text = text.replace(sign, letters)
    return re.sub(r"[^A-Za-z0-9 .,:;()'+=_<>-]", "?", text)


def stem_of(name: str) -> str:
    """A name that is an identifier in C and Python: `wing-last` becomes `wing_last`."""
    stem = re.sub(r"[^a-z0-9]+", "_", name.lower()).strip("_")
    return stem if stem and stem[0].isalpha() else f"convention_{stem}".rstrip("_")


def header_lines(derivation: Derivation) -> list[str]:
    """What the file is about, in plain sentences."""
    convention = derivation.convention
    lines = [f"Convention '{convention.name}'.", *turn_sentences(convention)]
    lines += [mapping_sentence(convention), range_sentence(convention)]
    lines += [f"Singular: {sentence}" for sentence in singular_words(convention)]
    lines.append("Quaternions: scalar first, Hamilton product, of the matrix as stated. Angles in radians.")
    lines.append("Attitude only: no origins, no lever arms.")
    return [row for line in lines for row in textwrap.wrap(plain_text(line), 104, subsequent_indent="  ")]


def linear(coefficients: Sequence[mpmath.mpf], names: Sequence[str], language: Language) -> str:
    """`a*x + y - b*z` with exact zeros left out and ones not multiplied."""
    parts: list[str] = []
    for value, name in zip(coefficients, names, strict=True):
        if abs(value) < _NOTHING:
            continue
        sign = " - " if value < 0 else " + "
        size = abs(value)
        parts += [sign, name if size == 1 else f"{language.number(size)}*{name}"]
    if not parts:
        return language.number(0.0)
    first = "-" if parts[0] == " - " else ""
    return first + "".join(parts[1:])


def polynomial(expression: sympy.Expr) -> str:
    """A polynomial with coefficients ±1 in the plain symbols; entries `E12` become `e12`."""
    return re.sub(r"\bE(\d\d)\b", r"e\1", str(sympy.expand(expression)))


class Lines:
    """Assignments of one convention in one language."""

    def __init__(self, derivation: Derivation, language: Language) -> None:
        self.derivation, self.language = derivation, language
        self.setting, self.shape = derivation.setting, derivation.shape
        self.let = language.let

    # -- forward --------------------------------------------------------------------------------------------------

    def cosines(self) -> list[str]:
        """c1, s1 … of `angles`."""
        lines = []
        for turn in self.setting.turns:
            n, y = turn.place + 1, f"angles[{turn.place}]"
            if turn.shifted:
                y = f"{y}{self._less(turn)}"
            lines += [self.let(f"c{n}", self.language.call("cos", y)), self.let(f"s{n}", self.language.call("sin", y))]
        return lines

    def halves(self) -> list[str]:
        """g1, h1 … of half the stated angles less their offsets."""
        lines = []
        for turn in self.setting.turns:
            n, half = turn.place + 1, self.language.number(0.5)
            y = f"angles[{turn.place}]"
            if turn.offset != 0:
                y = f"({y}{self._less(turn)})"
            lines += [self.let(f"g{n}", self.language.call("cos", f"{half}*{y}"))]
            lines += [self.let(f"h{n}", self.language.call("sin", f"{half}*{y}"))]
        return lines

    def _less(self, turn: Turn) -> str:
        sign = "-" if turn.offset > 0 else "+"
        return f" {sign} {self.language.number(abs(turn.offset))}"

    def chain(self) -> list[str]:
        """e11 … e33."""
        return [self.let(f"e{i + 1}{j + 1}", polynomial(self.setting.E[i, j])) for i in range(3) for j in range(3)]

    def stated(self) -> list[str]:
        """Nine right sides, row by row, of the stated matrix in e11 … e33."""
        L, B = self._numbers(self.setting.L), self._numbers(self.setting.B)
        names = [f"e{i + 1}{j + 1}" for i in range(3) for j in range(3)]
        rows = {}
        for p in range(3):
            for q in range(3):
                weights = [L[p][i] * B[j][q] for i in range(3) for j in range(3)]
                rows[p, q] = linear(weights, names, self.language)
        direct = self.setting.convention.maps_body_to_reference
        return [rows[(p, q) if direct else (q, p)] for p in range(3) for q in range(3)]

    def quaternion(self) -> list[str]:
        """Lines p0 … p3 of the chain, then the four right sides of the stated quaternion."""
        outer, middle, inner = (turn_quaternion(turn) for turn in self.setting.order)
        four = hamilton(hamilton(outer, middle), inner)
        return [self.let(f"p{n}", polynomial(part)) for n, part in enumerate(four)]

    def stated_quaternion(self) -> list[str]:
        """Four right sides in p0 … p3, constants and mapping direction worked in."""
        left, right = self._quaternion(self.setting.L), self._quaternion(self.setting.B)
        table = [[_hamilton_numbers(_hamilton_numbers(left, unit), right)[row] for unit in _UNITS] for row in range(4)]
        if not self.setting.convention.maps_body_to_reference:
            table = [table[0]] + [[-entry for entry in row] for row in table[1:]]
        return [linear(row, [f"p{n}" for n in range(4)], self.language) for row in table]

    # -- back -----------------------------------------------------------------------------------------------------

    def back_to_chain(self) -> list[str]:
        """e11 … e33 from `m`, the stated matrix row by row."""
        L, B = self._numbers(self.setting.L), self._numbers(self.setting.B)
        direct = self.setting.convention.maps_body_to_reference
        lines = []
        for i in range(3):
            for j in range(3):
                weights, names = [], []
                for p in range(3):
                    for q in range(3):
                        weights.append(L[p][i] * B[j][q])
                        names.append(f"m[{3 * p + q if direct else 3 * q + p}]")
                lines.append(self.let(f"e{i + 1}{j + 1}", linear(weights, names, self.language)))
        return lines

    def outer_arguments(self) -> list[str]:
        """`sine`, `cosine` of the outermost angle times ρ, `along`, `across` = |ρ|, `margin`."""
        sign, E, form = self.setting.branch, self.setting.chain_symbols, self.shape
        call = self.language.call
        return [
            self.let("sine", polynomial(sign * form.outer_sine.of(E))),
            self.let("cosine", polynomial(sign * form.outer_cosine.of(E))),
            self.let("along", polynomial(form.along.of(E))),
            self.let("across", call("hypot", "sine", "cosine")),
            self.let("margin", call("atan2", "across", call("fabs", "along"))),
        ]

    def middle(self) -> str:
        """Right side of the middle angle y."""
        across = self.setting.branch * sympy.Symbol("across")
        sine, cosine = middle_sides(self.setting, self.shape, across, sympy.Symbol("along"))
        return self.language.call("atan2", str(sine), str(cosine))

    def locked_outer(self) -> str:
        """The outermost angle y when the innermost turn is zero: column b of the chain is that of its factor."""
        E, outer = self.setting.chain_symbols, self.setting.order[0]
        found = {}
        for row in self.shape.others:
            entry = outer.matrix[row, self.shape.b]
            for symbol in (outer.s, outer.c):
                for sign in (1, -1):
                    if entry == sign * symbol:
                        found[symbol] = sign * E[row, self.shape.b]
        return self.language.call("atan2", polynomial(found[outer.s]), polynomial(found[outer.c]))

    def inner(self) -> str:
        """Right side of the innermost angle y by the residual form, in c and s of the outermost."""
        sine, cosine = residual_of(self.setting, self.shape, self.setting.chain_symbols)
        return self.language.call("atan2", polynomial(sine), polynomial(cosine))

    def at_zero_turn(self, turn: Turn) -> str:
        """y where the turn is zero."""
        return self.language.number(turn.y_at(sympy.S.Zero))

    def with_offset(self, turn: Turn, name: str) -> str:
        """The stated angle from y."""
        if not turn.shifted:
            return name
        return f"{name} {'+' if turn.offset > 0 else '-'} {self.language.number(abs(turn.offset))}"

    def second(self) -> list[str]:
        """Three right sides: the second triple in y, first triple in y1, y2, y3."""
        constant, _ = second_middle(self.setting)
        half_turn = self.language.number(sympy.pi)
        middle = f"{self.language.number(constant)} - y2" if constant != 0 else "-y2"
        return [f"y1 + {half_turn}", middle, f"y3 + {half_turn}"]

    def ranges(self) -> tuple[tuple[str, str], tuple[str, str], tuple[str, str]]:
        """Literals of the ranges (the usual ones where none are stated)."""
        pairs = default_ranges(self.setting.convention)
        return tuple((self.language.number(lo), self.language.number(hi)) for lo, hi in pairs)  # type: ignore[return-value]

    def half_outer(self) -> int | None:
        """Which outer angle has half a turn of range and so singles out the triple; None when the middle one does."""
        for place in (0, 2):
            lo, hi = default_ranges(self.setting.convention)[place]
            if abs(hi - lo - float(sympy.pi)) < 1e-6:
                return place
        return None

    # -- rates ----------------------------------------------------------------------------------------------------

    def rate_lines(self, side: str) -> list[str]:
        """v0 … v2: angular velocity along chain axes from `rates`."""
        matrix = self.derivation.rates.body if side == "body" else self.derivation.rates.reference
        names = [sympy.Symbol(f"r{n}") for n in range(3)]
        vector = matrix * sympy.Matrix(names)
        text = [re.sub(r"\br(\d)\b", r"rates[\1]", polynomial(entry)) for entry in vector]
        return [self.let(f"v{n}", entry) for n, entry in enumerate(text)]

    def rate_sides(self, side: str) -> list[str]:
        """Three right sides: angular velocity along frame axes in v0 … v2."""
        item = self.setting.B if side == "body" else self.setting.L
        table = self._numbers(item)
        rows = [[table[j][i] for j in range(3)] for i in range(3)] if side == "body" else table
        return [linear(row, ["v0", "v1", "v2"], self.language) for row in rows]

    def back_rate_lines(self) -> list[str]:
        """w0 … w2: the body rate `omega` along chain axes."""
        table = self._numbers(self.setting.B)
        return [
            self.let(f"w{n}", linear(row, ["omega[0]", "omega[1]", "omega[2]"], self.language))
            for n, row in enumerate(table)
        ]

    def back_rate_sides(self) -> tuple[str, list[str]]:
        """(determinant, three right sides to be divided by it): angle rates in w0 … w2."""
        vector = self.derivation.rates.adjugate_body * sympy.Matrix([sympy.Symbol(f"w{n}") for n in range(3)])
        return str(self.derivation.rates.determinant), [polynomial(entry) for entry in vector]

    def _numbers(self, item: Constant) -> Matrix:
        return [[item.numbers[i, j] for j in range(3)] for i in range(3)]

    def _quaternion(self, item: Constant) -> list[mpmath.mpf]:
        with mpmath.workdps(WORKING_DIGITS):
            values = {sympy.Symbol(name): value for name, value in item.values().items()}
            values[ROOT_2] = mpmath.sqrt(2)
            names = list(values)
            return [mpmath.mpf(sympy.lambdify(names, part, "mpmath")(*values.values())) for part in item.quaternion]


_UNITS = [[mpmath.mpf(int(row == column)) for row in range(4)] for column in range(4)]


def _hamilton_numbers(p: Sequence[mpmath.mpf], q: Sequence[mpmath.mpf]) -> list[mpmath.mpf]:
    with mpmath.workdps(WORKING_DIGITS):
        return [
            p[0] * q[0] - p[1] * q[1] - p[2] * q[2] - p[3] * q[3],
            p[0] * q[1] + p[1] * q[0] + p[2] * q[3] - p[3] * q[2],
            p[0] * q[2] - p[1] * q[3] + p[2] * q[0] + p[3] * q[1],
            p[0] * q[3] + p[1] * q[2] - p[2] * q[1] + p[3] * q[0],
        ]
