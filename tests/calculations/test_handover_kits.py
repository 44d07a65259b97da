"""The kit as handed over: its C and Python are built by their own tools and pass on the kit's reference attitudes."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from trunnion.calculations.handover import hand_over
from trunnion.spec import load_workbook

WORKBOOK = """\
workbook: 1
document: {{number: T-8, title: Kits on trial, revision: A}}
frames:
  local: {{axes: [north, east, down], north: "true", carried: along, origin: the mast foot}}
  body: {{axes: [forward, starboard, down]}}
conventions:
{conventions}"""
CONVENTION = """\
  {name}: {{reference: local, body: body, sequence: {sequence}, about: {about}, angles: [one, two, three],
    positive: by axis, maps: {maps}}}
"""
SEQUENCES = [f"{i}-{j}-{k}" for i in "123" for j in "123" for k in "123" if i != j != k]
NAMES = [f"{sequence} about {about}" for sequence in SEQUENCES for about in ("moving axes", "fixed axes")]


@pytest.fixture(scope="module")
def workbook(tmp_path_factory):
    parts = []
    for number, name in enumerate(NAMES):
        sequence, about = name.split(" about ")
        maps = "body to reference" if number % 3 else "reference to body"
        parts.append(CONVENTION.format(name=name, sequence=sequence, about=about, maps=maps))
    folder = tmp_path_factory.mktemp("kits")
    (folder / "workbook.yaml").write_text(WORKBOOK.format(conventions="".join(parts)))
    return load_workbook(folder)


def passes_its_own_tests(workbook, name: str, folder: Path) -> None:
    hand_over(workbook, name, folder)
    (c_test,) = folder.glob("*_selftest.c")
    (python,) = folder.glob("*.py")
    command = ["gcc", "-std=c99", "-Wall", "-Wextra", "-pedantic", "-Werror", c_test.name, "-o", "run", "-lm"]
    subprocess.run(command, cwd=folder, check=True, capture_output=True)
    rows = sum(line[:1] in "AL" for line in (folder / "reference-attitudes.csv").read_text().splitlines())
    for program in ([str(folder / "run")], [sys.executable, python.name]):
        done = subprocess.run(program, cwd=folder, capture_output=True, text=True, check=False)
        assert (done.returncode, done.stdout) == (0, f"{rows} reference attitudes, 0 failures\n")


@pytest.mark.needs("gcc")
@pytest.mark.parametrize("name", ["3-2-1 about moving axes", "3-1-3 about fixed axes"])
def test_kits_pass_their_own_tests(name: str, workbook, tmp_path: Path) -> None:
    passes_its_own_tests(workbook, name, tmp_path)


@pytest.mark.full
@pytest.mark.needs("gcc")
@pytest.mark.parametrize("name", NAMES)
def test_kits_of_all_24_pass_their_own_tests(name: str, workbook, tmp_path: Path) -> None:
    passes_its_own_tests(workbook, name, tmp_path)


def test_the_statement_of_a_kit_carries_north_and_origin(workbook, tmp_path: Path) -> None:
    hand_over(workbook, "3-2-1 about moving axes", tmp_path)
    text = (tmp_path / "statement.txt").read_text()
    assert "North is true north. It travels along. Its origin is the mast foot (carried as text" in text
