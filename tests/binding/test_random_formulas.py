"""Random formulas over the whole subset: accepted ones compile and are well-formed, the rest are refused by name."""

from __future__ import annotations

import random
import xml.etree.ElementTree as ElementTree

import typst

from trunnion.binding.maths import Formula, FormulaError, read_formula
from trunnion.binding.maths import symbols as s
from trunnion.binding.maths.mathml import mathml
from trunnion.binding.maths.typst_maths import quoted, typst_maths
from trunnion.glyphs import FONT_FOLDER

SIGNS = [
    "\\,",
    "\\;",
    "\\!",
    "\\quad",
    "~",
    "|",
    "\\|",
    *",;:!()[]+-*/=<>",
    "x'",
    "a",
    "b",
    "Z",
    "1",
    "2.5",
    ".5",
    "\\{",
]
TABLES = (s.GREEK, s.CAPITALS, s.ORDINARY, s.BINARY, s.RELATION, s.INNER, s.BIG, s.FUNCTIONS, s.LIMIT_FUNCTIONS)
COMMANDS = [f"\\{name}" for table in TABLES for name in sorted(table)]
# {} stands for any run of parts, [] for a run that is not empty
FORMS = (
    "[][]",
    "[][]",
    "[]",
    "[]",
    "\\frac{{}}{[]}",
    "\\sqrt{{}}",
    "\\sqrt[3]{[]}",
    "{{}}_{[]}^{[]}",
    "\\sum_{[]}^{[]}",
    "\\left({}\\right)",
    "\\left[[]\\right\\}",
    "\\left|{}\\right\\rangle",
    "\\left\\langle {}\\right.",
    "\\left.[]\\right\\rVert",
    "\\begin{pmatrix}{} & [] \\\\ {} & []\\end{pmatrix}",
    "\\begin{cases}{} & [] \\\\ {} & {}\\end{cases}",
    "\\begin{aligned}{} & [] \\\\ {} & []\\end{aligned}",
    "\\begin{array}{c|c}{} & [] \\\\ \\hline {} & {}\\end{array}",
    "\\begin{smallmatrix}{} & []\\end{smallmatrix}",
    "\\hat{{}}",
    "\\widehat{[]}",
    "\\overline{{}}",
    "\\vec{[]}",
    "\\dddot{[]}",
    "\\mathbf{R2}",
    "\\mathrm{atan2}",
    "\\boldsymbol{\\omega}",
    "\\mathcal{BA}",
    '\\text{if #f(x) \\_ $x^2$ "q" */}',
    "\\operatorname{arg\\,max}_{[]}",
    "\\overset{{}}{[]}",
    "\\underset{[]}{=}",
    "\\binom{{}}{[]}",
    "\\boxed{{}}",
    "\\phantom{[]}",
    "\\vphantom{[]}",
    "\\hphantom{{}}",
    "\\xrightarrow{[]}",
    "\\underbrace{[]}_{[]}",
    "\\bigl([]\\bigr)",
    "\\displaystyle []",
    "\\int\\limits_{0}^{1}",
    "\\substack{a\\\\ []}",
    "\\not=",
    "a \\bmod []",
    "\\pmod{[]}",
)


def formula(chance: random.Random, depth: int) -> str:
    """One random formula, nested at most `depth` levels."""
    if depth <= 0:
        return chance.choice(COMMANDS + SIGNS * 4) + " "
    text = chance.choice(FORMS)
    out, index = "", 0
    while index < len(text):
        if text.startswith(("{}", "[]"), index):
            least = 0 if text[index] == "{" else 1
            out += "".join(formula(chance, depth - 1 - chance.randrange(2)) for _ in range(chance.randrange(least, 4)))
            index += 2
        else:
            out += text[index]
            index += 1
    return out


def compiles(formulas: list[Formula]) -> bool:
    template = (FONT_FOLDER.parent / "binding" / "data" / "trunnion.typ").read_bytes()
    head = '#import "trunnion.typ": *\n#show: package.with(title: "x", date: datetime(year: 2026, month: 3, day: 14))\n'
    lines = [f"#line-maths({quoted(one.latex)}, ${typst_maths(one)}$.body);" for one in formulas]
    files = {"main": (head + "\n".join(lines)).encode(), "trunnion.typ": template}
    compiler = typst.Compiler(files, font_paths=[str(FONT_FOLDER)], ignore_system_fonts=True)
    try:
        compiler.compile(format="pdf", pdf_standards=["a-3a", "ua-1"], timestamp=0)
    except typst.TypstError:
        return False
    return True


def test_no_random_formula_has_a_third_outcome(count):
    chance = random.Random(20260314)
    accepted, refused = [], 0
    for _ in range(count(6000)):
        latex = formula(chance, 3)
        try:
            accepted.append(read_formula(latex))
        except FormulaError:
            refused += 1
    assert len(accepted) > 10 * refused
    for one in accepted:
        ElementTree.fromstring(mathml(one, display=True))
    for start in range(0, len(accepted), 200):
        batch = accepted[start : start + 200]
        bad = [] if compiles(batch) else [one.latex for one in batch if not compiles([one])]
        assert bad == []


def test_random_characters_are_read_or_refused_never_more(count):
    chance = random.Random(7)
    alphabet = [
        *"\\{}[]()$&#%^_~'\"|/<>=+-.,;:!?@ \n\t",
        *"abcxyz019",
        "\\left",
        "\\right",
        "\\begin",
        "\\end",
        "{cases}",
        "\\frac",
        "\\sqrt",
        "\\text",
        "\\\\",
        "é",
        "漢",
        "\u202e",
        "→",
        "θ",
        "\x07",
        "𝐑",
    ]
    for _ in range(count(20000)):
        text = "".join(chance.choice(alphabet) for _ in range(chance.randrange(1, 25)))
        try:
            ElementTree.fromstring(mathml(read_formula(text), display=True))
        except FormulaError:
            continue
