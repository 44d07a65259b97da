"""The spec said back: sentences a person can check, numbers an outside library agrees with, nothing heavy loaded."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.spec import load_workbook
from trunnion.spec.model import NAMED_SECTIONS
from trunnion.spec.readback import read_back

HERE = Path(__file__).parent
HALF_LAST_DIGIT = 0.5e-4 + 1e-12  # the matrix is printed with four decimals


@pytest.fixture(scope="module")
def sections():
    return {section.title: section.lines for section in read_back(load_workbook(HERE / "example.yaml"))}


@pytest.fixture(scope="module")
def full():
    workbook = load_workbook(HERE / "full.yaml", check_files=False)
    return {section.title: section.lines for section in read_back(workbook)}


def printed_matrix(lines):
    rows = [line.replace("−", "-").split() for line in lines if re.match(r"    [+−]\d", line)]
    return np.array(rows, dtype=float)


def test_a_convention_is_told_as_one_would_turn_a_model(sections):
    lines = sections["Convention ordinary"]
    assert lines[1].startswith("At heading 0°, elevation 0° and bank 0°, forward lies along north")
    assert lines[2] == (
        "First turn the body by heading about its own down axis: growing heading swings forward towards starboard."
    )
    assert "elevation 90°: the nose (forward) points straight up; only heading − bank is determined." in lines


@pytest.mark.parametrize(
    ("name", "letters", "angles"),
    [("ordinary", "ZYX", (10, -35, 50)), ("wing-last", "ZXY", (10, -35, 50))],
)
def test_the_worked_matrix_is_that_of_scipy(sections, name, letters, angles):
    """scipy: capital letters are turns about moving axes; its matrix takes body to reference components."""
    expected = Rotation.from_euler(letters, angles, degrees=True).as_matrix()
    np.testing.assert_allclose(printed_matrix(sections[f"Convention {name}"]), expected, atol=HALF_LAST_DIGIT, rtol=0)


def test_a_body_side_constant_is_inside_the_turns(sections):
    """R = E B with B the turn by 40 deg about the second axis (scipy)."""
    E = Rotation.from_euler("ZYX", (10, -35, 50), degrees=True)
    B = Rotation.from_euler("y", 40, degrees=True)
    lines = sections["Convention nose-lowered"]
    np.testing.assert_allclose(printed_matrix(lines), (E * B).as_matrix(), atol=HALF_LAST_DIGIT, rtol=0)
    assert any("body side" in line for line in lines)
    assert any("40° from forward towards down points straight up" in line for line in lines)


def test_a_matrix_that_maps_the_other_way_is_printed_that_way(full):
    expected = Rotation.from_euler("ZYX", (10, -35, 50), degrees=True).as_matrix().T
    np.testing.assert_allclose(printed_matrix(full["Convention standard"]), expected, atol=HALF_LAST_DIGIT, rtol=0)


def test_what_a_standard_fixed_is_printed(full):
    assert full["Convention standard"][0].startswith("ISO 1151-1 fixes sequence, moving or fixed axes")
    assert "from memory" in full["Convention standard"][0]


def test_every_part_is_said_back(full):
    text = "\n".join([*full, *(line for lines in full.values() for line in lines)])
    workbook = load_workbook(HERE / "full.yaml", check_files=False)
    for section in (*NAMED_SECTIONS, "requirements", "deviations", "decisions"):
        for name in workbook.names(section):
            assert name in text, f"{section}: {name}"
    for phrase in (
        "from 170 deg to -170 deg, the way through 180 deg",
        "scalar first, taking body to local",
        "Damaged rows are left out, because: the last row is cut",
        "an axis that points up reads −1 g",
        "It looks along -w, which is up.",
        "left-handed; it is used only through its right-handed partner body",
        "grid north lies 1.2 deg east of true north",
    ):
        assert phrase in text


def test_reading_back_loads_nothing_heavy():
    """What `readback` needs imports no scipy, sympy, matplotlib, papermill, nbformat or pyarrow."""
    code = (
        "import sys; from trunnion.spec import load_workbook; from trunnion.spec.readback import read_back;"
        f"read_back(load_workbook({str(HERE / 'full.yaml')!r}, check_files=False));"
        "heavy = {'scipy', 'sympy', 'matplotlib', 'papermill', 'nbformat', 'pyarrow', 'IPython'};"
        "print(sorted(heavy & {name.partition('.')[0] for name in sys.modules}))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
