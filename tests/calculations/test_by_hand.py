"""A sheet stands on its own: moved with its folder and run again by hand, it says the same."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import nbformat
import pytest
from nbclient import NotebookClient

from trunnion.calculations.notebooks import items


@pytest.mark.parametrize("name", ["C01-tiny-margin", "C02-tiny-sum"])
def test_a_sheet_moved_and_run_again_by_hand_records_the_same(computed: Path, tmp_path: Path, name: str) -> None:
    folder = tmp_path / "somewhere else"
    shutil.move(computed.parent / "outputs" / "miniature" / "A", folder)
    sheet = nbformat.read(folder / f"{name}.ipynb", as_version=4)
    before = [payload for payload, _ in items(json.loads(json.dumps(sheet)))]
    for cell in sheet.cells:
        if cell.cell_type == "code":
            cell.outputs = []
    NotebookClient(sheet, kernel_name="python3", resources={"metadata": {"path": str(folder)}}).execute()
    assert [payload for payload, _ in items(json.loads(json.dumps(sheet)))] == before
