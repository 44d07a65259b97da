"""The example workbooks computed once for all tests that look at them."""

from __future__ import annotations

import json
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

WORKBOOKS = Path(__file__).parents[2] / "workbooks"


@dataclass(frozen=True)
class Computed:
    """One computed workbook: exit code, screen text, revision folder, results.json."""

    code: int
    screen: str
    folder: Path
    results: dict[str, Any]

    def result(self, quantity: str, of: str, over: str) -> dict[str, Any]:
        """The one recorded result of that name."""
        (found,) = [
            result
            for calculation in self.results["calculations"]
            for result in calculation["results"]
            if (result["quantity"], result["of"], result["over"]) == (quantity, of, over)
        ]
        return found

    def requirement(self, identity: str) -> dict[str, Any]:
        """A requirement with its candidates."""
        (found,) = [row for row in self.results["requirements"] if row["id"] == identity]
        return found


def compute(workbook: Path, output: Path, *options: str) -> Computed:
    """Run the command as a user would, in a process of its own."""
    command = [
        str(Path(sys.executable).with_name("trunnion")),
        "compute",
        str(workbook),
        "--output",
        str(output),
        *options,
    ]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    folders = [path.parent for path in output.glob("*/*/results.json")]
    assert len(folders) == 1, done.stdout + done.stderr
    results = json.loads((folders[0] / "results.json").read_text(encoding="utf-8"))
    return Computed(done.returncode, done.stdout + done.stderr, folders[0], results)


@pytest.fixture(scope="session")
def sedgewing(tmp_path_factory: pytest.TempPathFactory) -> Computed:
    """The example workbook, computed with its package."""
    return compute(WORKBOOKS / "sedgewing", tmp_path_factory.mktemp("sedgewing"))


@pytest.fixture(scope="session")
def brackwater(tmp_path_factory: pytest.TempPathFactory) -> Computed:
    """The survey boat's workbook, computed with its package."""
    return compute(WORKBOOKS / "brackwater", tmp_path_factory.mktemp("brackwater"))


@pytest.fixture(scope="session")
def emberstaff(tmp_path_factory: pytest.TempPathFactory) -> Computed:
    """The sounding rocket's workbook, computed with its package."""
    return compute(WORKBOOKS / "emberstaff", tmp_path_factory.mktemp("emberstaff"))
