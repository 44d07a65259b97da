"""Every formula is read by the binder's strict reader and fits an A4 page at 0.7 of its size or more, measured."""

from __future__ import annotations

import json
import re

import pytest

from trunnion.binding.maths.parse import read_formula
from trunnion.binding.maths.typst_maths import typst_maths
from trunnion.symbolic.derivation import derive
from trunnion.symbolic.statement import statement

# 160 mm of text width less 7 em on one side for the equation number, at 10.5 pt
AVAILABLE_POINTS = 160 / 25.4 * 72 - 7 * 10.5
LEAST_SCALE = 0.7


def widths(formulas: dict[str, str], folder) -> dict[str, float]:
    """Width in points of each typst formula, measured by typst itself."""
    import typst

    lines = ["#set page(width: 210mm, height: auto, margin: 25mm)", "#set text(size: 10.5pt)"]
    for name, body in formulas.items():
        shown = f"measure(math.equation(block: true, ${body}$)).width.pt()"
        lines.append(f'#context [#metadata((id: "{name}", w: {shown}))<w>]')
    source = folder / "widths.typ"
    source.write_text("\n".join(lines), encoding="utf-8")
    compiler = typst.Compiler(str(source), root=str(folder), ignore_system_fonts=True)
    return {row["id"]: row["w"] for row in json.loads(compiler.query("<w>", field="value"))}


@pytest.mark.parametrize("number", [5, 10])
def test_each_formula_fits(number: int, any_convention, tmp_path) -> None:
    steps = [step for step in derive(any_convention(number)).steps if step.latex]
    found = widths({step.id: typst_maths(read_formula(step.latex)) for step in steps}, tmp_path)
    assert len(found) == len(steps)
    narrow = {name: AVAILABLE_POINTS / width for name, width in found.items() if width * LEAST_SCALE > AVAILABLE_POINTS}
    assert not narrow


@pytest.mark.full
@pytest.mark.parametrize("number", range(0, 24, 2))
def test_each_formula_of_many_conventions_fits(number: int, any_convention, tmp_path) -> None:
    test_each_formula_fits(number, any_convention, tmp_path)


@pytest.mark.parametrize("number", [0, 10, 15, 18])
def test_mathematics_in_prose_and_notation_is_read(number: int, any_convention) -> None:
    derivation = derive(any_convention(number))
    for step in derivation.steps:
        assert step.prose.count("$") % 2 == 0
        for formula in re.findall(r"\$([^$]+)\$", step.prose):
            read_formula(formula)
    for symbol, meaning in derivation.notation:
        read_formula(symbol)
        for formula in re.findall(r"\$([^$]+)\$", meaning):
            read_formula(formula)


def test_names_cannot_open_or_break_mathematics(convention) -> None:
    """Angle names are free text: a dollar sign, a brace or a backslash in one stays text."""
    stated = convention(angle_names=("he$ading", "\\frac{", "ba}nk$$"))
    derivation = derive(stated)
    assert derivation.convention is stated
    for step in derivation.steps:
        assert step.prose.count("$") % 2 == 0
        for formula in [step.latex, *re.findall(r"\$([^$]+)\$", step.prose)]:
            if formula:
                read_formula(formula)
    assert all("$" not in paragraph for paragraph in statement(stated).paragraphs())
