"""NASA JEOD euler_angles.cc: which element carries the middle angle, and the twelve products at one regular triple."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.extraction import chain_angles, chain_matrix
from trunnion.attitude.rotations import quaternion_from_matrix
from trunnion.attitude.sequences import Sense, Sequence

HERE = Path(__file__).parent
TWO_ROUNDINGS = 1e-15  # values are correctly rounded doubles; our product adds a rounding or two


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open() as file:
        return list(csv.DictReader(file))


def numbers(row: dict[str, str], *names: str) -> np.ndarray:
    return np.array([float(row[name]) for name in names])


@pytest.mark.parametrize("row", rows("middle_element.csv"), ids=lambda row: row["sequence"])
def test_element_of_the_reference_to_body_matrix_carries_the_middle_angle(row: dict[str, str]) -> None:
    angles = np.radians([10.0, 35.0, 50.0])
    R = chain_matrix(angles, sequence=Sequence[row["sequence"]], sense=Sense.MOVING)
    function = np.cos if row["carries"].endswith("cos") else np.sin
    expected = function(angles[1]) * (-1.0 if row["carries"].startswith("-") else 1.0)
    assert R.T[int(row["row"]) - 1, int(row["column"]) - 1] == pytest.approx(expected, abs=TWO_ROUNDINGS)


@pytest.mark.parametrize("row", rows("regular.csv"), ids=lambda row: row["sequence"])
def test_regular_triple_matrix_quaternion_and_back(row: dict[str, str]) -> None:
    sequence = Sequence[row["sequence"]]
    angles = numbers(row, "first", "middle", "third")
    expected = numbers(row, *(f"R{i}{k}" for i in "123" for k in "123")).reshape(3, 3)
    R = chain_matrix(angles, sequence=sequence, sense=Sense.MOVING)
    np.testing.assert_allclose(R, expected, rtol=0, atol=TWO_ROUNDINGS)
    q = quaternion_from_matrix(expected)
    np.testing.assert_allclose(q, numbers(row, "q0", "qx", "qy", "qz"), rtol=0, atol=TWO_ROUNDINGS)
    found = chain_angles(expected, sequence=sequence, sense=Sense.MOVING)
    np.testing.assert_allclose(found.angles, angles, rtol=0, atol=TWO_ROUNDINGS)
    turned_about = chain_matrix(angles[::-1], sequence=_reversed(sequence), sense=Sense.FIXED)
    np.testing.assert_allclose(turned_about, expected, rtol=0, atol=TWO_ROUNDINGS)


def _reversed(sequence: Sequence) -> Sequence:
    return Sequence[sequence.name[::-1]]
