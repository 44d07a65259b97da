"""Every displayed formula is short enough for a page and stays inside the LaTeX that the binder sets."""

from __future__ import annotations

import re

import pytest

from trunnion.attitude.sequences import Sense
from trunnion.symbolic.derivation import derive

# A 3-2-1 matrix with the sines and cosines written out, about 150 glyphs in its longest row, was measured at 0.86 of
# its size on an A4 page with numbered formulas; 0.7 is what the binder still accepts.
LONGEST = 150

COMMANDS = {
    r"\alpha", r"\beta", r"\gamma", r"\psi", r"\theta", r"\phi", r"\delta", r"\omega", r"\kappa", r"\lambda", r"\sigma",
    r"\mathbf", r"\boldsymbol", r"\mathsf", r"\bar", r"\dot", r"\frac", r"\sqrt", r"\partial", r"\left", r"\right",
    r"\begin", r"\end", r"\operatorname", r"\text", r"\otimes", r"\cdot", r"\qquad", r"\det", r"\cos", r"\sin", r"\cot",
    r"\circ", r"\big", r"\times", r"\\", r"\,", r"\;",
}  # fmt: skip


def longest_row(latex: str) -> int:
    """Glyphs in the longest row: commands count as one, sub- and superscripts half."""
    latex = re.sub(
        r"\\begin\{aligned\}|\\end\{aligned\}|&=|\\left|\\right|\\operatorname|\\mathbf|\\text|\\,|\\;", "", latex
    )
    return max(_glyphs(line) for line in latex.split(r"\\"))


def _glyphs(line: str) -> int:
    scripts = re.findall(r"[_^]\{([^{}]*)\}", line)
    half = sum(len(re.sub(r"\\[a-zA-Z]+", "x", script)) for script in scripts)
    rest = re.sub(r"[_^]\{[^{}]*\}", "", line)
    rest = re.sub(r"\\(begin|end)\{bmatrix\}", "[", rest)
    rest = re.sub(r"\\[a-zA-Z]+", "x", rest)
    return len(re.sub(r"[\s{}]", "", rest)) + half // 2


@pytest.mark.parametrize("number", [1, 5, 8, 14, 22])
def test_rows_are_short(number: int, any_convention) -> None:
    for step in derive(any_convention(number)).steps:
        assert longest_row(step.latex) <= LONGEST, (step.id, longest_row(step.latex), step.latex)


@pytest.mark.parametrize("number", [2, 7, 13, 23])
def test_only_known_commands_are_used(number: int, any_convention) -> None:
    for step in derive(any_convention(number)).steps:
        used = set(re.findall(r"\\(?:[a-zA-Z]+|.)", step.latex))
        assert used <= COMMANDS, (step.id, used - COMMANDS)


def test_braces_balance_and_prose_mathematics_is_closed(convention) -> None:
    for step in derive(convention("ZXZ", Sense.FIXED)).steps:
        assert step.latex.count("{") == step.latex.count("}")
        assert step.prose.count("$") % 2 == 0
