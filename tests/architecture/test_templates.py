"""Templates stay thin, declare what they take and record, and keep the order a reviewer expects."""

from __future__ import annotations

import ast
import json
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
TEMPLATES = sorted((ROOT / "templates").glob("*.ipynb"))
SECTIONS = (
    "Purpose",
    "Inputs",
    "Assumptions",
    "Method and references",
    "Calculation",
    "Independent check",
    "Results",
    "Limits of validity and caution",
)
FORBIDDEN = (
    ast.FunctionDef,
    ast.AsyncFunctionDef,
    ast.ClassDef,
    ast.Lambda,
    ast.For,
    ast.While,
    ast.If,
    ast.IfExp,
    ast.Try,
    ast.With,
    ast.ListComp,
    ast.SetComp,
    ast.DictComp,
    ast.GeneratorExp,
    ast.BinOp,
    ast.BoolOp,
    ast.Compare,
)

pytestmark = pytest.mark.parametrize("path", TEMPLATES, ids=lambda path: path.stem)


def _cells(path: Path, kind: str) -> list[dict]:
    return [cell for cell in json.loads(path.read_text(encoding="utf-8"))["cells"] if cell["cell_type"] == kind]


def _code(path: Path) -> list[tuple[bool, ast.Module]]:
    """(is the parameters cell, syntax tree) of every code cell."""
    return [
        ("parameters" in cell["metadata"].get("tags", []), ast.parse("".join(cell["source"])))
        for cell in _cells(path, "code")
    ]


def test_no_logic_and_no_mathematics_lives_in_a_template(path: Path) -> None:
    for is_parameters, tree in _code(path):
        found = [type(node).__name__ for node in ast.walk(tree) if isinstance(node, FORBIDDEN)]
        assert found == []
        numbers = [
            node.value
            for node in ast.walk(tree)
            if isinstance(node, ast.Constant) and isinstance(node.value, int | float | complex)
        ]
        assert is_parameters or numbers == []


def test_a_cell_makes_one_library_call(path: Path) -> None:
    for is_parameters, tree in _code(path):
        if not is_parameters:
            calls = [statement for statement in tree.body if not isinstance(statement, ast.Import | ast.ImportFrom)]
            assert len(calls) <= 1


def test_only_the_sheet_room_is_imported(path: Path) -> None:
    for _, tree in _code(path):
        for node in ast.walk(tree):
            if isinstance(node, ast.Import):
                raise AssertionError(f"import {node.names[0].name}: templates import from trunnion.sheet only")
            if isinstance(node, ast.ImportFrom):
                assert (node.module or "").startswith("trunnion.sheet")


def test_sections_stand_in_the_usual_order(path: Path) -> None:
    headings = [
        line.removeprefix("## ").strip()
        for cell in _cells(path, "markdown")
        for line in "".join(cell["source"]).splitlines()
        if line.startswith("## ")
    ]
    assert tuple(headings) == SECTIONS


def test_template_declares_what_it_takes_and_records(path: Path) -> None:
    notebook = json.loads(path.read_text(encoding="utf-8"))
    declared = notebook["metadata"]["trunnion"]
    assert declared["title"]
    assert declared["purpose"]
    assert declared["records"]
    (parameters,) = [tree for is_parameters, tree in _code(path) if is_parameters]
    names = {target.id for node in parameters.body if isinstance(node, ast.Assign) for target in node.targets}
    assert names == set(declared["takes"])
    assert all(take["kind"] and take["help"] for take in declared["takes"].values())


def test_template_is_stored_clean(path: Path) -> None:
    for cell in _cells(path, "code"):
        assert cell["outputs"] == []
        assert cell["execution_count"] is None


def test_template_has_its_line_in_the_readme(path: Path) -> None:
    assert f"`{path.stem}`" in (ROOT / "README.md").read_text(encoding="utf-8")


def test_template_is_checked_against_published_values(path: Path) -> None:
    """Each template's numbers are compared with something outside the project, in a test named after it."""
    marker = f"published check of {path.stem}"
    texts = [test.read_text(encoding="utf-8") for test in (ROOT / "tests").rglob("test_*.py") if test != Path(__file__)]
    assert any(marker in text for text in texts)
