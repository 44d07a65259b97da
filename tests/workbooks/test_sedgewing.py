"""The example workbook end to end: figures that can be checked by hand, verdicts, the package, the notebooks.

By hand: in hover the nose is within 10 deg of straight up, so that an axis a degrees below the nose keeps a - 10 deg
from the vertical; in transition elevation runs from 0 to 90 deg with level wings, which leaves min(a, 90 - a); in
cruise elevation is at least -20 deg, which leaves 70 - a. With the last turn about the wing the margin is that of the
wing from the vertical: 90 - 45 deg at the largest bank.
"""

from __future__ import annotations

import json
from pathlib import Path

import nbformat
import pytest

NANODEGREE = 1e-9


def test_every_calculation_ran_and_the_exit_code_says_met(sedgewing) -> None:
    assert sedgewing.code == 0, sedgewing.screen
    assert {calculation["state"] for calculation in sedgewing.results["calculations"]} == {"computed"}


@pytest.mark.parametrize(
    ("convention", "region", "margin"),
    [
        ("ordinary", "hover", 0.0),
        ("ordinary", "transition", 0.0),
        ("ordinary", "cruise", 65.0),
        ("nose-lowered", "hover", 40.0 - 10.0),
        ("nose-lowered", "transition", min(40.0, 90.0 - 40.0)),
        ("nose-lowered", "cruise", 70.0 - 40.0),
        ("wing-last", "hover", 80.0),
        ("wing-last", "transition", 90.0),
        ("wing-last", "cruise", 45.0),
    ],
)
def test_margins_are_those_worked_out_by_hand(sedgewing, convention: str, region: str, margin: float) -> None:
    result = sedgewing.result("lock margin", convention, region)
    assert result["lo"] == pytest.approx(margin, abs=NANODEGREE, rel=0)
    assert result["hi"] == pytest.approx(margin, abs=NANODEGREE, rel=0)
    assert result["basis"] == "certified bound"


def test_the_units_own_angles_lock_in_level_cruise_and_not_in_hover(sedgewing) -> None:
    assert sedgewing.result("lock margin", "inertial-unit", "cruise")["hi"] == pytest.approx(0.0, abs=NANODEGREE)
    assert sedgewing.result("lock margin", "inertial-unit", "hover")["lo"] == pytest.approx(80.0, abs=NANODEGREE)


def test_the_ordinary_convention_is_rejected_and_the_chosen_one_meets(sedgewing) -> None:
    rows = {row["name"]: row for row in sedgewing.requirement("ATT-04")["candidates"]}
    assert rows["ordinary"]["verdict"] == "does not meet"
    assert not rows["ordinary"]["counts"]
    assert rows["wing-last"]["verdict"] == "meets"
    assert rows["wing-last"]["counts"]
    assert all(row["verdict"] == "meets" for row in sedgewing.results["requirements"])


def test_every_independent_check_agrees(sedgewing) -> None:
    checks = [check for calculation in sedgewing.results["calculations"] for check in calculation["checks"]]
    assert len(checks) > 30
    assert all(check["agrees"] for check in checks)


def test_notebooks_are_valid_and_hold_nothing_of_the_machine(sedgewing) -> None:
    notebooks = sorted(sedgewing.folder.glob("C*.ipynb"))
    assert len(notebooks) == len(sedgewing.results["calculations"])
    for path in notebooks:
        text = path.read_text(encoding="utf-8")
        nbformat.validate(nbformat.reads(text, as_version=4))
        assert str(Path.home()) not in text
        assert str(sedgewing.folder) not in text


def test_the_page_is_one_file_that_loads_nothing(sedgewing) -> None:
    page = (sedgewing.folder / "package.html").read_text(encoding="utf-8")
    assert "<script" not in page
    assert 'src="http' not in page
    assert "does not meet" in page
    assert str(sedgewing.folder / "package.html") in sedgewing.screen.replace("\n", "")


def test_a_notebook_runs_again_by_hand_in_a_moved_folder(sedgewing, tmp_path: Path) -> None:
    import shutil

    from nbclient import NotebookClient

    moved = tmp_path / "moved"
    shutil.copytree(sedgewing.folder, moved)
    (path,) = moved.glob("C03-*.ipynb")
    before = json.loads(path.read_text(encoding="utf-8"))
    notebook = nbformat.read(path, as_version=4)
    NotebookClient(notebook, resources={"metadata": {"path": str(moved)}}).execute()
    shown = [cell.get("outputs", []) for cell in notebook.cells if cell.cell_type == "code"]
    stored = [cell.get("outputs", []) for cell in before["cells"] if cell["cell_type"] == "code"]
    assert [len(outputs) for outputs in shown] == [len(outputs) for outputs in stored]
