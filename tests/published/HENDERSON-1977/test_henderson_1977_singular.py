"""All twelve sequences at both singular values: the combination left, both choices of a zero angle, the matrix."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy, chain_angles, chain_matrix
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.attitude.words import combination_text, singular_attitudes

OUTER = (0.3, -0.7)
with (Path(__file__).parent / "singular.csv").open() as file:
    ROWS = list(csv.DictReader(file))
IDS = [f"{row['sequence']} at {row['middle_deg']}" for row in ROWS]
FRAMES = Frame("reference", ("x", "y", "z")), Frame("body", ("x", "y", "z"))


def locked(row: dict[str, str]) -> np.ndarray:
    angles = (OUTER[0], np.radians(float(row["middle_deg"])), OUTER[1])
    return chain_matrix(np.array(angles), sequence=Sequence[row["sequence"]], sense=Sense.MOVING)


@pytest.mark.parametrize("row", ROWS, ids=IDS)
def test_matrix_at_the_singular_value(row: dict[str, str]) -> None:
    alpha = float(row["first_if_third_zero"])
    known = {"c": np.cos(alpha), "s": np.sin(alpha), "0": 0.0, "1": 1.0}
    entries = [
        [-known[e[1:]] if e.startswith("-") else known[e] for e in line.split()] for line in row["matrix"].split(";")
    ]
    np.testing.assert_allclose(locked(row), entries, rtol=0, atol=2e-16 * 2)


@pytest.mark.parametrize("row", ROWS, ids=IDS)
def test_angle_left_under_either_choice(row: dict[str, str]) -> None:
    sequence = Sequence[row["sequence"]]
    for policy, place, column in (
        (Policy.LAST_ZERO, 0, "first_if_third_zero"),
        (Policy.FIRST_ZERO, 2, "third_if_first_zero"),
    ):
        found = chain_angles(locked(row), sequence=sequence, sense=Sense.MOVING, policy=policy)
        assert found.angles[place] == pytest.approx(float(row[column]), abs=1e-15)
        assert found.angles[2 - place] == pytest.approx(0.0, abs=1e-15)
        assert found.margin < 2e-16


@pytest.mark.parametrize("row", ROWS, ids=IDS)
def test_combination_in_words(row: dict[str, str]) -> None:
    convention = Convention("table", *FRAMES, Sequence[row["sequence"]], Sense.MOVING, ("one", "two", "three"))
    middle = np.radians(float(row["middle_deg"]))
    near = [each for each in singular_attitudes(convention) if abs(each.angle - middle) < 1e-9]
    (attitude,) = near
    assert combination_text(convention, attitude) == f"one {row['combination'].replace('-', '−')} three"
