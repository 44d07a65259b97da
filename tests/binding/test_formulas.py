"""Every formula is typeset rightly or refused by name: no third outcome."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ElementTree

import pytest
import sympy as sp
import typst

from trunnion.binding.maths import FormulaError, read_formula
from trunnion.binding.maths.mathml import mathml
from trunnion.binding.maths.typst_maths import quoted, typst_maths
from trunnion.glyphs import FONT_FOLDER, can_show

MATHML = "{http://www.w3.org/1998/Math/MathML}"
# MathML Core, W3C Candidate Recommendation 2025, section 2: elements a browser lays out.
_LEAVES = "math semantics annotation mrow mi mn mo mtext mspace mfrac msqrt mroot mstyle mphantom mpadded"
_LAYOUT = "msub msup msubsup munder mover munderover mtable mtr mtd"
CORE = {*_LEAVES.split(), *_LAYOUT.split()}


def compile_typst(formulas: list[str]) -> bytes:
    """All formulas in one PDF/A-3a and PDF/UA-1 document."""
    template = (FONT_FOLDER.parent / "binding" / "data" / "trunnion.typ").read_bytes()
    lines = [
        '#import "trunnion.typ": *',
        '#show: package.with(title: "formulas", date: datetime(year: 2026, month: 3, day: 14))',
    ]
    for latex in formulas:
        formula = read_formula(latex)
        body = f"${typst_maths(formula)}$.body"
        lines.append(f'#display-maths(none, none, {quoted(latex)}, none, ("C01", "cell"), {body})')
        lines.append(f"#line-maths({quoted(latex)}, {body});")
    files = {"main": "\n".join(lines).encode(), "trunnion.typ": template}
    compiler = typst.Compiler(files, font_paths=[str(FONT_FOLDER)], ignore_system_fonts=True)
    return compiler.compile(format="pdf", pdf_standards=["a-3a", "ua-1"], timestamp=0)


def test_every_accepted_formula_compiles_for_paper(formulas, tmp_path):
    assert len(formulas["typeset"]) >= 88
    (tmp_path / "all.pdf").write_bytes(compile_typst(formulas["typeset"]))


def test_every_accepted_formula_is_well_formed_core_mathml_with_its_source(formulas):
    for latex in formulas["typeset"]:
        for display in (True, False):
            tree = ElementTree.fromstring(mathml(read_formula(latex), display=display))
            names = {element.tag.removeprefix(MATHML) for element in tree.iter()}
            assert names <= CORE, latex
            annotation = tree.find(f".//{MATHML}annotation")
            assert annotation is not None
            assert annotation.text == read_formula(latex).latex


def test_no_accepted_formula_leaves_latex_or_unshown_characters_behind(formulas):
    for latex in formulas["typeset"]:
        page = re.sub(r"<annotation.*?</annotation>", "", mathml(read_formula(latex), display=True))
        shown = "".join(ElementTree.fromstring(page).itertext())
        assert not re.search(r"\\[A-Za-z]", shown), latex
        assert all(can_show(char, maths=True) or char in "\u00a0\u2009" for char in shown), latex


def test_refused_formulas_are_refused_with_their_reason(formulas):
    assert len(formulas["refused"]) >= 10
    for latex, reason in formulas["refused"].items():
        with pytest.raises(FormulaError, match=re.escape(reason)):
            read_formula(latex)


@pytest.mark.parametrize(
    ("latex", "reason"),
    [
        (r"\frac{a}{b", "ends too early|found 'the end"),
        (r"a}", "without its counterpart"),
        (r"\left( a", r"\\left without its \\right"),
        (r"\begin{pmatrix} a \end{bmatrix}", "closed by"),
        (r"a^b^c", "two superscripts"),
        (r"x_1_2", "two subscripts"),
        (r"\frobnicate x", r"\\frobnicate is not in the subset"),
        (r"\begin{tikzpicture} \end{tikzpicture}", "environment"),
        (r"\mathcal{\alpha}", "in the alphabet"),
        ("", "empty"),
        ("漢", "U\\+6F22"),
        ("{" * 60 + "x" + "}" * 60, "nested deeper"),
        (r"\text{a \frac{1}{2}}", "inside"),
        (r"\begin{array}{|c|} a \end{array}", "edge"),
    ],
)
def test_mistakes_are_named(latex, reason):
    with pytest.raises(FormulaError, match=reason):
        read_formula(latex)


def sympy_expressions() -> list[object]:
    """What sympy prints for the kinds of results calculations show; its printer is the outside source here."""
    x, y, t = sp.symbols("x y t", real=True)
    psi, theta, phi = sp.symbols("psi theta phi", real=True)
    f, n = sp.Function("f"), sp.Symbol("n", integer=True)
    a = sp.MatrixSymbol("A", 3, 3)
    turn = sp.rot_axis3(psi) * sp.rot_axis1(phi)
    return [
        turn,
        turn.T,
        turn.det(),
        turn.inv(),
        sp.trigsimp(turn.T * turn),
        sp.eye(3),
        sp.zeros(2, 12),
        sp.Matrix([[x], [y]]),
        sp.atan2(y, x),
        sp.asin(x),
        sp.acos(2 * x - 1),
        sp.sqrt(x**2 + y**2),
        sp.cbrt(x),
        sp.Rational(1, 3) * x,
        x / y,
        sp.sin(theta) ** 2 + sp.cos(theta) ** -1,
        sp.exp(-x),
        sp.log(x),
        sp.Abs(x),
        sp.Abs(sp.cos(theta) / y),
        sp.sign(x),
        sp.Derivative(f(x, y), x, y),
        sp.Derivative(f(t), t, 2),
        sp.Integral(sp.sin(x), (x, 0, sp.pi)),
        sp.Integral(f(x), x),
        sp.Sum(n**2, (n, 1, sp.oo)),
        sp.Product(n, (n, 1, 5)),
        sp.Limit(sp.sin(x) / x, x, 0),
        sp.Limit(1 / x, x, 0, "-"),
        sp.Piecewise((x, x < 0), (y, sp.And(x >= 0, x < 1)), (1, True)),
        sp.Eq(x, y),
        sp.Ne(x, y),
        sp.Le(x, y),
        sp.Not(sp.Eq(x, y)),
        sp.Interval(0, 1),
        sp.Interval.open(0, sp.oo),
        sp.FiniteSet(1, 2),
        sp.S.Reals,
        sp.S.Integers,
        sp.Union(sp.Interval(0, 1), sp.Interval(2, 3)),
        sp.ConditionSet(x, x > 0, sp.S.Reals),
        sp.ImageSet(sp.Lambda(n, n * sp.pi), sp.S.Integers),
        sp.EmptySet,
        sp.S.NaN,
        sp.zoo,
        -sp.oo,
        sp.Float("1.5e-12"),
        sp.Float(20.25),
        sp.Integer(-7),
        sp.I * x,
        sp.conjugate(x + sp.I * t),
        sp.re(sp.Symbol("z")),
        sp.im(sp.Symbol("z")),
        sp.Symbol("x_max"),
        sp.Symbol("R_rb"),
        sp.Symbol("omega_x^b"),
        sp.Symbol("hatq"),
        sp.Symbol("qbar_1"),
        sp.Symbol("vdot"),
        sp.Symbol("c_theta"),
        a.T,
        a**-1,
        a * a,
        sp.Trace(a),
        sp.Determinant(a),
        sp.Tuple(x, y),
        [x, y],
        {x: y},
        sp.Subs(f(x), x, 0),
        sp.Order(x**3),
        sp.floor(x),
        sp.ceiling(x),
        sp.Mod(x, 2 * sp.pi),
        sp.Max(x, y),
        sp.Min(x, y),
        sp.Heaviside(x),
        sp.DiracDelta(x),
        sp.factorial(n),
        sp.Quaternion(sp.Symbol("q_0"), sp.Symbol("q_1"), sp.Symbol("q_2"), sp.Symbol("q_3")),
        sp.tan(x) ** -1,
        sp.cot(x),
        sp.sec(x),
        sp.csc(x),
        sp.Symbol("alpha").diff(x),
        sp.binomial(n, 2),
        sp.gamma(x),
        sp.besselj(0, x),
        sp.KroneckerDelta(n, 1),
        sp.Lambda(x, x**2),
        sp.true,
        sp.false,
    ]


def test_what_sympy_prints_is_typeset_or_refused_by_name():
    """All of the usual results, none refused but scalar printing sympy itself cannot give in mathematics."""
    latex = [sp.latex(expression) for expression in sympy_expressions()]
    refused = {}
    for text in latex:
        try:
            mathml(read_formula(text), display=True)
        except FormulaError as error:
            refused[text] = str(error)
    assert refused == {}
    compile_typst(latex)


def test_own_numbers_are_told():
    assert read_formula(r"a = b \tag{3.1}").tag == "3.1"
    assert read_formula(r"a = b \label{eq:x}").label == "eq:x"
    assert not read_formula(r"a = b \nonumber").numbered


def test_signs_stand_where_tex_would_put_them():
    """A minus with nothing before it is no binary operator (TeXbook, chapter 18)."""
    alone = mathml(read_formula("-a"), display=True)
    between = mathml(read_formula("b-a"), display=True)
    assert "<mspace" not in alone
    assert between.count("<mspace") == 2
    assert "−" in alone


def test_nothing_of_a_formula_is_typst_code():
    for latex in (
        r"\text{#panic(\"x\")}",
        r"\text{\$ \#panic(1) ]\ }",
        r"\# \$ \_ a/b:c,d;e",
        r"\operatorname{eval}(x)",
    ):
        try:
            compile_typst([latex])
        except FormulaError:
            continue
