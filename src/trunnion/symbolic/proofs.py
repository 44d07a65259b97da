"""Proof of every displayed identity: reduced to zero exactly, and evaluated with fifty digits at random angles.

The exact half works on polynomials: each cosine and sine is a symbol of its own, matrix entries are replaced by the
polynomials they stand for, and the difference of both sides is divided by c² + s² − 1 for every pair (a Gröbner
basis, because the leading terms are coprime). Only a remainder of zero counts. The numeric half takes matrices from
mpmath's matrix exponential, not from the polynomials, and so ties the formulas to what a turn is.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import mpmath
import sympy
from sympy.polys.domains import QQ
from sympy.polys.rings import ring

from trunnion.errors import CalculationError

DIGITS = 50
WORKING_DIGITS = 70
_LARGEST = mpmath.mpf(10) ** (-DIGITS)

# sine-like symbol, cosine-like symbol: of the three angles, their halves, the two constants and their halves, the
# margin and its half, the combination at a singular attitude
PAIRS = [(f"s{n}", f"c{n}") for n in (1, 2, 3)] + [(f"h{n}", f"g{n}") for n in (1, 2, 3)]
PAIRS += [("lL", "kL"), ("lB", "kB"), ("jL", "iL"), ("jB", "iB"), ("sm", "cm"), ("sn", "cn"), ("sd", "cd")]
ROOT_2 = sympy.Symbol("w", positive=True)
_FIRST = [sine for sine, _ in PAIRS] + ["w"]

Sample = Mapping[str, mpmath.mpf]


class ProofError(CalculationError):
    """A displayed identity that does not hold: the derivation stops."""


@dataclass(frozen=True)
class Proof:
    """How an identity was shown: the exact reduction in words, the count of points, digits, largest difference."""

    exact: str
    points: int
    digits: int
    largest: str

    def __str__(self) -> str:
        return f"{self.exact}; largest difference at {self.points} random points: {self.largest} ({self.digits} digits)"


@dataclass(frozen=True)
class Identity:
    """Two sides to be shown equal, entry by entry.

    `certificate` replaces `lhs − rhs` in the exact half where the sides are no rational functions (arctangents, square
    roots): expressions whose vanishing makes the identity true, said in `because`. `angle` compares modulo a turn.
    """

    lhs: tuple[sympy.Expr, ...]
    rhs: tuple[sympy.Expr, ...]
    certificate: tuple[sympy.Expr, ...] | None = None
    because: str = "difference of both sides reduced to 0 with c² + s² = 1"
    angle: bool = False


def identity(lhs: object, rhs: object, **more: object) -> Identity:
    """An Identity of two matrices, or two expressions."""
    return Identity(_entries(lhs), _entries(rhs), **more)  # type: ignore[arg-type]


def _entries(side: object) -> tuple[sympy.Expr, ...]:
    if isinstance(side, sympy.MatrixBase):
        return tuple(side)
    if isinstance(side, (list, tuple)):
        return tuple(sympy.sympify(entry) for entry in side)
    return (sympy.sympify(side),)


def remainder(expression: sympy.Expr, replacements: Mapping[sympy.Symbol, sympy.Expr] | None = None) -> sympy.Expr:
    """The expression with all replacements made, brought to its remainder modulo c² + s² − 1 of every pair.

    For a fraction this is the remainder of the numerator, which is enough to decide whether it is zero.
    """
    expression = sympy.sympify(expression).xreplace(dict(replacements or {}))
    if not expression.is_polynomial(*expression.free_symbols):
        expression = sympy.fraction(sympy.together(expression))[0]
    symbols = sorted(expression.free_symbols, key=_rank)
    if not symbols:
        return sympy.nsimplify(expression)
    polynomials, *generators = ring(symbols, QQ)
    by_name = {symbol.name: generator for symbol, generator in zip(symbols, generators, strict=True)}
    value = polynomials.from_expr(sympy.expand(expression))
    return value.rem(_relations(by_name)).as_expr()


def _rank(symbol: sympy.Symbol) -> tuple[int, str]:
    return (_FIRST.index(symbol.name) if symbol.name in _FIRST else len(_FIRST), symbol.name)


def _relations(by_name: Mapping[str, object]) -> list[object]:
    found = []
    for sine, cosine in PAIRS:
        if sine in by_name and cosine in by_name:
            found.append(by_name[sine] ** 2 + by_name[cosine] ** 2 - 1)  # type: ignore[operator]
    if "w" in by_name:
        found.append(by_name["w"] ** 2 - 2)  # type: ignore[operator]
    return found


def prove(
    what: str,
    claim: Identity,
    replacements: Mapping[sympy.Symbol, sympy.Expr],
    samples: Sequence[Sample],
) -> Proof:
    """Show the identity both ways, or raise ProofError naming it and the entry that fails."""
    if len(claim.lhs) != len(claim.rhs):
        raise ProofError(f"{what}: the sides have {len(claim.lhs)} and {len(claim.rhs)} entries")
    differences = claim.certificate
    if differences is None:
        differences = tuple(a - b for a, b in zip(claim.lhs, claim.rhs, strict=True))
    for place, difference in enumerate(differences, start=1):
        left_over = remainder(difference, replacements)
        if left_over != 0:
            raise ProofError(
                f"{what}: entry {place} does not reduce to zero but to {left_over}",
                remedy="the formula shown is not an identity for this convention",
            )
    worst = largest_difference(claim, samples)
    if not worst < _LARGEST:
        raise ProofError(
            f"{what}: the two sides differ by {mpmath.nstr(worst, 5)} at random angles ({DIGITS} digits)",
            remedy="the formula shown is not an identity for this convention",
        )
    return Proof(claim.because, len(samples), DIGITS, mpmath.nstr(worst, 2))


def largest_difference(claim: Identity, samples: Iterable[Sample]) -> mpmath.mpf:
    """Largest |lhs − rhs| over entries and sample points, with 70 working digits."""
    sides = [*claim.lhs, *claim.rhs]
    names = sorted(set().union(*(side.free_symbols for side in sides)), key=lambda symbol: symbol.name)
    function = sympy.lambdify(names, sides, modules="mpmath")
    worst = mpmath.mpf(0)
    with mpmath.workdps(WORKING_DIGITS):
        for sample in samples:
            values = function(*(sample[symbol.name] for symbol in names))
            half = len(claim.lhs)
            for a, b in zip(values[:half], values[half:], strict=True):
                gap = abs(mpmath.expjpi((a - b) / mpmath.pi) - 1) if claim.angle else abs(mpmath.mpf(a) - b)
                worst = gap if not gap <= worst else worst
    return worst
