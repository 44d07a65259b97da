"""Sections six and seven: the neighbourhood of the singular values, and small angles."""

from __future__ import annotations

import mpmath
import sympy

from trunnion.symbolic.constants import cross_matrix
from trunnion.symbolic.notation import degrees_latex
from trunnion.symbolic.proofs import WORKING_DIGITS, Sample, identity, remainder
from trunnion.symbolic.rates import CM, CN, SM, SN, M, Rates, margin_samples, margin_values, rate_vector
from trunnion.symbolic.setting import Setting
from trunnion.symbolic.singular import CD, SD, Locked
from trunnion.symbolic.steps import Book, aligned, extended

SIGMA = sympy.Symbol("sigma", positive=True)
_TINY = mpmath.mpf(10) ** -13  # with five or six powers of it left out, nothing is left at fifty digits
_TERMS = 6


def near_lock(book: Book, found: Rates, locked: tuple[Locked, Locked]) -> None:
    """How fast the outer angles run away, and how an attitude error turns into angle errors."""
    book.open("Near the singular attitudes")
    for number, case in enumerate(locked, start=1):
        _expansion(book, case, number)
    _gain(book)
    for number, case in enumerate(locked, start=1):
        _runaway(book, found, case, number)
    _errors(book, found, locked)


def _expansion(book: Book, case: Locked, number: int) -> None:
    """E = E0 + s_m E1 + (c_m − 1) E2, exact: the individual outer angles stand in E1 only."""
    setting = book.setting
    first, last = setting.turns[0], setting.turns[2]
    at = setting.E.subs(margin_values(setting, case), simultaneous=True).applyfunc(sympy.expand)
    slope = at.applyfunc(lambda entry: entry.coeff(SM))
    curve = at.applyfunc(lambda entry: entry.coeff(CM))
    start = case.matrix
    delta = {
        CD: first.c * last.c - case.relation * first.s * last.s,
        SD: first.s * last.c + case.relation * first.c * last.s,
    }
    samples = [{**sample, **_middle_at(setting, case, sample)} for sample in _delta_samples(setting, case)]
    name = setting.chain_latex
    symbols = ", ".join(t.y_latex for t in (first, last))
    book.show(
        f"near-{number}",
        f"Where the separate angles still stand, near {case.label}",
        f"At the margin $m$ the chain is $\\mathbf{{E}}_0 + \\sin m\\,\\mathbf{{E}}_1 + (\\cos m - "
        f"1)\\,\\mathbf{{E}}_2$, exactly. "
        f"$\\mathbf{{E}}_0$ knows only $\\delta$; ${symbols}$ by themselves stand in $\\mathbf{{E}}_1$ and enter "
        f"with the "
        "weight $m$. An error of the entries is divided by $m$ before it becomes an error of those angles.",
        name,
        rf"{setting.latex(start)} + m {setting.latex(sympy.ImmutableMatrix(slope))} + O(m^{{2}})",
        identity(setting.chain_symbols, start + SM * slope + (CM - 1) * curve),
        replacements=dict(zip(setting.chain_symbols, at, strict=True)) | delta,
        samples=samples,
    )


def _delta_samples(setting: Setting, case: Locked) -> list[Sample]:
    first, last = setting.turns[0], setting.turns[2]
    delta = first.y + case.relation * last.y
    return extended(margin_samples(setting), d=delta, cd=sympy.cos(delta), sd=sympy.sin(delta))


def _middle_at(setting: Setting, case: Locked, sample: Sample) -> dict[str, mpmath.mpf]:
    """All symbols with the middle turn moved to the margin m of the sample, matrices from the exponential again."""
    with mpmath.workdps(WORKING_DIGITS):
        turns = []
        for turn in setting.turns:
            quarters = mpmath.pi / 2 * (turn.quarters or 0)
            turns.append(turn.sign * (sample[f"y{turn.place + 1}"] - quarters))
        inward = {sympy.pi / 2: -1, -sympy.pi / 2: 1, sympy.S.Zero: 1, sympy.pi: -1}[case.turn]
        turns[1] = mpmath.mpf(sympy.N(case.turn, WORKING_DIGITS)) + inward * sample["m"]
        return setting.sample(list(turns))


def _gain(book: Book) -> None:
    setting = book.setting
    gain = sympy.series(1 / sympy.sin(M), M, 0, _TERMS - 1).removeO()
    condition = sympy.series(sympy.cot(M / 2), M, 0, _TERMS - 1).removeO()
    sine = sympy.series(sympy.sin(M), M, 0, 2 * _TERMS).removeO()
    half_sine, half_cosine = (sympy.series(f(M / 2), M, 0, 2 * _TERMS).removeO() for f in (sympy.sin, sympy.cos))
    certificate = [*_low_terms(sine * gain - 1), *_low_terms(condition * half_sine - half_cosine)]
    samples = [{"m": _TINY * n} for n in (1, 2, 3)]
    rows = [
        (r"\frac{1}{\sin m}", _series_latex(setting, gain)),
        (r"\cot \frac{m}{2}", _series_latex(setting, condition)),
    ]
    book.show(
        "near-gain",
        "Growth of the outer rates and of the condition number",
        "Both grow like one over the margin.",
        aligned(rows),
        "",
        identity(
            [1 / sympy.sin(M), sympy.cot(M / 2)],
            [gain, condition],
            certificate=tuple(certificate),
            because="series multiplied back, terms up to the order shown reduced to 0",
        ),
        samples=samples,
    )


def _low_terms(expression: sympy.Expr) -> list[sympy.Expr]:
    polynomial = sympy.Poly(sympy.expand(expression * M), M)
    return [polynomial.coeff_monomial(M**n) for n in range(_TERMS)]


def _series_latex(setting: Setting, expression: sympy.Expr) -> str:
    terms = sorted(sympy.Add.make_args(expression), key=lambda term: sympy.degree(sympy.expand(term * M), M))
    text = setting.latex(terms[0])
    for term in terms[1:]:
        shown = setting.latex(term)
        text += f" {shown}" if shown.startswith("-") else f" + {shown}"
    return text + r" + O(m^{5})"


def _runaway(book: Book, found: Rates, case: Locked, number: int) -> None:
    """The part of the inverse that grows: one body direction drives both outer angles, in opposite or equal measure."""
    setting = book.setting
    middle = setting.order[1]
    values = middle.pair(sympy.cos(case.turn), sympy.sin(case.turn))
    margin = margin_values(setting, case)
    scale = sympy.cancel(found.determinant.subs(margin, simultaneous=True) / SM)
    leading = sympy.ImmutableMatrix((scale * found.adjugate_body.subs(values, simultaneous=True)).applyfunc(remainder))
    rate = rate_vector(setting)
    vector = r"\boldsymbol{\omega}_{b}" if setting.B.kind == "identity" else r"\mathbf{B}\, \boldsymbol{\omega}_{b}"
    inverse_at = found.adjugate_body.subs(margin, simultaneous=True).applyfunc(sympy.expand)
    scaled = sympy.ImmutableMatrix(scale * inverse_at)  # sin m times the inverse; its limit is claimed
    limit = scaled.subs({SM: 0, CM: 1}, simultaneous=True) - leading
    product = sympy.ImmutableMatrix(found.body.subs(values, simultaneous=True) * leading).applyfunc(remainder)
    book.show(
        f"near-runaway-{number}",
        f"What runs away, near {case.label}",
        f"The part that grows has rank one: {setting.turns[0].name} and {setting.turns[2].name} run "
        f"{'against each other' if case.relation > 0 else 'together'}, driven by the one body rate about the axis "
        f"that was "
        "lost; their determined combination stays calm.",
        rate,
        rf"\frac{{1}}{{m}} {setting.latex(leading)}\, {vector} + O(1)",
        identity(
            scaled,
            leading,
            certificate=(*limit, *product),
            because="limit of sin m times the inverse less what is shown, and the rate matrix times it, reduced to 0",
        ),
        samples=[
            {**sample, "sm": mpmath.mpf(10) ** -60, "cm": 1 - mpmath.mpf(10) ** -120 / 2} for sample in setting.anywhere
        ],
    )


def _errors(book: Book, found: Rates, locked: tuple[Locked, Locked]) -> None:
    setting = book.setting
    first, last = setting.turns[0], setting.turns[2]
    for number, case in enumerate(locked, start=1):
        margin = margin_values(setting, case)
        coupling = found.coupling.subs(margin, simultaneous=True)
        gram = sympy.Matrix([[1, 0, coupling], [0, 1, 0], [coupling, 0, 1]])
        inverse = sympy.ImmutableMatrix([[1, 0, -coupling], [0, SM**2, 0], [-coupling, 0, 1]])
        r = case.relation
        weights = sympy.Matrix([1, 0, r])
        variance = (weights.T * inverse * weights)[0] / SM**2
        halves = {CM: CN**2 - SN**2, SM: 2 * CN * SN}
        names = [turn.letter for turn in setting.turns]
        delta = f"{names[0]} {'+' if r > 0 else '-'} {names[2]}"
        correlation = setting.latex(-coupling).replace("c_{m}", r"\cos m")
        rows = [
            (rf"\sigma_{{{names[0]}}} = \sigma_{{{names[2]}}}", r"\frac{\sigma}{\sin m}"),
            (rf"\sigma_{{{names[1]}}}", r"\sigma"),
            (r"\text{correlation}", correlation),
            (rf"\sigma_{{{delta}}}", r"\sigma \sqrt{\frac{2}{1 + \cos m}} = \frac{\sigma}{\cos (m/2)}"),
        ]
        book.show(
            f"near-errors-{number}",
            f"Attitude error into angle error, near {case.label}",
            "An attitude error of $\\sigma$ about each of three perpendicular axes gives angle errors with the "
            "covariance "
            f"$\\sigma^2 (\\mathbf{{J}}^{{\\mathsf{{T}}}} \\mathbf{{J}})^{{-1}}$, as long as $\\sigma$ is small "
            f"against $m$ (below "
            f"a fifth of it). {first.name.capitalize()} and {last.name} are nearly fully correlated and each is "
            f"poor; their "
            "determined combination is as good as the attitude.",
            aligned(rows),
            "",
            identity([*(gram * inverse / SM**2), variance], [*sympy.eye(3), 1 / CN**2]),
            replacements=halves,
            samples=margin_samples(setting),
        )


def small_angles(book: Book) -> None:
    """First and second order about zero turns."""
    setting = book.setting
    book.open("Small angles")
    small = [turn.sign * sympy.Symbol(f"e{turn.place + 1}") for turn in setting.turns]
    generators = [cross_matrix([sympy.Integer(int(t.axis == n)) for n in range(3)]) for t in setting.turns]
    first_order = sum((e * g for e, g in zip(small, generators, strict=True)), sympy.zeros(3, 3))
    second_order = sum((e**2 * g * g / 2 for e, g in zip(small, generators, strict=True)), sympy.zeros(3, 3))
    order = [turn.place for turn in setting.order]
    for left, right in ((order[0], order[1]), (order[0], order[2]), (order[1], order[2])):
        second_order = second_order + small[left] * small[right] * generators[left] * generators[right]
    second_order = sympy.ImmutableMatrix(second_order.applyfunc(sympy.expand))
    certificate = _derivatives(setting, sympy.Matrix(first_order), second_order)
    settings = ", ".join(f"${t.y_latex} = {degrees_latex(t.y_at(sympy.S.Zero))}$" for t in setting.turns)
    samples = _small_samples(setting)
    deviations = ", ".join(rf"\delta {turn.letter}" for turn in setting.turns)
    name = setting.chain_latex
    claim = identity(
        setting.chain_symbols,
        sympy.eye(3) + first_order + second_order,
        certificate=certificate,
        because="first and second derivatives at zero turn of both sides reduced to 0",
    )
    book.show(
        "small-first",
        "First order",
        _small_words(setting, settings, deviations),
        rf"{name} - \mathbf{{I}}",
        setting.latex(sympy.ImmutableMatrix(first_order)) + r" + O(\delta^{2})",
        claim,
        samples=samples,
    )
    book.show(
        "small-second",
        "Second order",
        "Here the order of the turns shows for the first time: exchanging two turns changes these products. Products "
        "of "
        "two small angles are the size of the mistake made by ignoring the order.",
        rf"{name} - \mathbf{{I}} - \text{{first order}}",
        setting.latex(second_order) + r" + O(\delta^{3})",
        claim,
        samples=samples,
    )


def _small_words(setting: Setting, settings: str, deviations: str) -> str:
    text = f"Near {settings}, with ${deviations}$ the small deviations: "
    text += "the cross-product matrix of one small rotation vector."
    if setting.repeated:
        outer = setting.turns[0].name, setting.turns[2].name
        text += (
            f" {outer[0].capitalize()} and {outer[1]} act about the same axis here: zero turns are a singular "
            f"attitude of "
            "this sequence, and the third component of a small rotation cannot be expressed at all."
        )
    return text


def _derivatives(setting: Setting, first: sympy.Matrix, second: sympy.ImmutableMatrix) -> tuple[sympy.Expr, ...]:
    """Differences of first and second derivatives at zero turn."""
    zero: dict[sympy.Symbol, sympy.Expr] = {}
    for turn in setting.turns:
        zero |= turn.pair(sympy.S.One, sympy.S.Zero)
    found: list[sympy.Expr] = list(setting.E.subs(zero, simultaneous=True) - sympy.eye(3))
    for turn in setting.turns:
        e = sympy.Symbol(f"e{turn.place + 1}")
        slope = setting.E.applyfunc(lambda entry, turn=turn: setting.derivative(entry, turn))
        found += list(slope.subs(zero, simultaneous=True) - first.diff(e))
        for other in setting.turns:
            f = sympy.Symbol(f"e{other.place + 1}")
            curve = slope.applyfunc(lambda entry, other=other: setting.derivative(entry, other))
            found += list(curve.subs(zero, simultaneous=True) - second.diff(e).diff(f))
    return tuple(found)


def _small_samples(setting: Setting) -> list[Sample]:
    found: list[Sample] = []
    with mpmath.workdps(WORKING_DIGITS):
        for scale in (1, 2, 3):
            deviations = [scale * mpmath.mpf(n) * mpmath.mpf(10) ** -18 for n in (3, -5, 7)]
            turns = [t.sign * d for t, d in zip(setting.turns, deviations, strict=True)]
            found.append(setting.sample(list(turns)) | {f"e{n + 1}": d for n, d in enumerate(deviations)})
    return found
