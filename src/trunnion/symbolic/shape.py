"""What the product shows about itself: which entry carries the middle angle, where the outer angles stand.

Nothing here is recalled from a table of twelve sequences: each position and sign is read off the multiplied-out chain.
"""

from __future__ import annotations

from dataclasses import dataclass

import sympy

from trunnion.symbolic.setting import Setting, Turn


@dataclass(frozen=True)
class Place:
    """An entry of the chain and the sign with which it carries something."""

    row: int
    column: int
    sign: int

    def of(self, matrix: sympy.MatrixBase) -> sympy.Expr:
        """Sign times that entry of `matrix`."""
        return self.sign * matrix[self.row, self.column]


@dataclass(frozen=True)
class Shape:
    """Axes a, b, c of the outermost, middle, innermost turn; ρ = cos t or sin t of the middle turn, not negative in
    its range; `sine`/`cosine` of outer and inner are the entries ρ sin y and ρ cos y; `along` the entry without them.
    """

    a: int
    b: int
    c: int
    rho: sympy.Expr
    along: Place
    outer_sine: Place
    outer_cosine: Place
    inner_sine: Place
    inner_cosine: Place

    @property
    def others(self) -> tuple[int, int]:
        """The two rows other than a."""
        first, second = (index for index in range(3) if index != self.a)
        return first, second


def shape(setting: Setting) -> Shape:
    """Read the shape off the chain of a convention."""
    outer, middle, inner = setting.order
    a, b, c = outer.axis, middle.axis, inner.axis
    rho = middle.sine if setting.repeated else middle.cosine
    column = [(row, c) for row in range(3) if row != a]
    row = [(a, column_) for column_ in range(3) if column_ != c]
    along_symbol = (middle.cosine if setting.repeated else middle.sine).free_symbols.pop()
    return Shape(
        a=a,
        b=b,
        c=c,
        rho=rho,
        along=_place(setting, [(a, c)], along_symbol),
        outer_sine=_place(setting, column, rho * outer.s),
        outer_cosine=_place(setting, column, rho * outer.c),
        inner_sine=_place(setting, row, rho * inner.s),
        inner_cosine=_place(setting, row, rho * inner.c),
    )


def _place(setting: Setting, candidates: list[tuple[int, int]], wanted: sympy.Expr) -> Place:
    """The candidate entry that equals plus or minus `wanted`."""
    for row, column in candidates:
        for sign in (1, -1):
            if sympy.expand(setting.E[row, column] - sign * wanted) == 0:
                return Place(row, column, sign)
    raise AssertionError(f"no entry of the chain carries {wanted}")


def middle_sides(setting: Setting, form: Shape, rho: sympy.Expr, along: sympy.Expr) -> tuple[sympy.Expr, sympy.Expr]:
    """(sin y, cos y) of the middle angle, given the value of ρ and of sign · along entry."""
    middle: Turn = setting.order[1]
    rho_symbol = form.rho.free_symbols.copy().pop()
    sign = 1 if form.rho == rho_symbol else -1
    return (sign * rho, along) if rho_symbol == middle.s else (along, sign * rho)
