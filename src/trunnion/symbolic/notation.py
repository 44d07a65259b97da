"""Letters for angles and short symbols for their sines and cosines; LaTeX that fits a page.

Inside the room every symbol has a plain name (`c1` is the cosine of the first angle, `M23` an entry of the stated
matrix); what is printed for it is decided here, from the angle names of the convention.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

import sympy
from sympy.printing.latex import LatexPrinter

_LETTERS = {
    r"\psi": ("heading", "yaw", "azimuth", "course", "pan", "psi", "bearing", "train", "traverse"),
    r"\theta": ("elevation", "pitch", "inclination", "nutation", "trim", "theta", "tilt", "altitude"),
    r"\phi": ("bank", "roll", "heel", "phi", "list", "twist", "polarization", "cross-elevation", "spin"),
    r"\Omega": ("node", "right ascension of the node", "precession"),
}
_GREEK = set(
    re.findall(
        r"\w+",
        "alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi rho sigma tau upsilon "
        "phi chi psi omega",
    )
)
_GENERIC = (r"\alpha", r"\beta", r"\gamma")
_TAKEN = {r"\delta", "m", r"\omega", r"\kappa", r"\lambda", r"\gamma"}  # used for other things in the formulas


def letters(names: tuple[str, str, str]) -> tuple[str, str, str]:
    """LaTeX letters for three angle names: those of the trade, a letter that is itself the name, or α, β, γ.

    If one of the three finds no letter, or two find the same, all three get α, β, γ.
    """
    found = [_letter(name) for name in names]
    if None in found or len(set(found)) < 3:
        return _GENERIC
    return tuple(found)  # type: ignore[return-value]


def _letter(name: str) -> str | None:
    plain = name.strip().lower()
    for letter, words in _LETTERS.items():
        if plain in words:
            return letter
    if plain in _GREEK and f"\\{plain}" not in _TAKEN:
        return f"\\{plain}"
    if re.fullmatch(r"[a-zA-Z]", name.strip()) and name.strip() not in ("c", "s", "m", "R", "C", "E", "L", "B", "T"):
        return name.strip()
    return None


def degrees_latex(angle: sympy.Expr) -> str:
    """An exact angle in degrees: `90^{\\circ}`, `-12.5^{\\circ}`."""
    degrees = sympy.nsimplify(angle * 180 / sympy.pi) if angle.has(sympy.pi) else angle * 180 / sympy.pi
    if degrees.is_Rational:
        text = str(degrees.p) if degrees.q == 1 else f"{float(degrees):.10g}"
    else:
        text = f"{float(degrees):.12g}"
    return text + r"^{\circ}"


class _Printer(LatexPrinter):
    """SymPy's printer with our symbols, two-argument arctangents as the trade writes them, and plain brackets."""

    def __init__(self, names: Mapping[str, str]) -> None:
        super().__init__({"mat_str": "bmatrix", "mat_delim": ""})
        self._names = names

    def _print_Symbol(self, expr: sympy.Symbol, style: str = "plain") -> str:
        return self._names.get(expr.name, super()._print_Symbol(expr))

    def _print_Mul(self, expr: sympy.Mul) -> str:
        number, factors = expr.as_coeff_mul()
        if not all(factor.is_Symbol for factor in factors) or not number.is_Integer:
            return super()._print_Mul(expr)
        letters = " ".join(self._print(factor) for factor in sorted(factors, key=_by_angle))
        if abs(number) == 1:
            return letters if number > 0 else f"- {letters}"
        return f"{self._print(number)} {letters}"

    def _print_atan2(self, expr: sympy.Expr) -> str:
        y, x = (self._print(argument) for argument in expr.args)
        return rf"\operatorname{{atan2}}\left({y},\, {x}\right)"

    def _print_asin(self, expr: sympy.Expr) -> str:
        return rf"\arcsin\left({self._print(expr.args[0])}\right)"

    def _print_acos(self, expr: sympy.Expr) -> str:
        return rf"\arccos\left({self._print(expr.args[0])}\right)"


def _by_angle(symbol: sympy.Symbol) -> tuple[bool, str, str]:
    """Factors in the order of the angles: s_ψ c_φ, not c_φ s_ψ; constants first."""
    name = symbol.name
    trig = len(name) == 2 and name[0] in "csghy" and name[1].isdigit()
    return (trig, name[1] if trig else "", name)


def latex(expression: object, names: Mapping[str, str]) -> str:
    """LaTeX of an expression or matrix with the printed symbols of a derivation."""
    return _Printer(names).doprint(sympy.sympify(expression))
