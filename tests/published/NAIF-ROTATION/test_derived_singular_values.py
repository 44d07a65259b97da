"""The 24 singular cases against the derivation: sum or difference, the angle left, the matrix; CSPICE asked as well."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
import spiceypy

HERE = Path(__file__).parent
TWO_ROUNDINGS = 1e-15


def rows() -> list[dict[str, str]]:
    with (HERE / "singular_values.csv").open() as file:
        return list(csv.DictReader(file))


def name_of(row: dict[str, str]) -> str:
    return f"{row['sequence']} at {np.degrees(float(row['middle'])):.0f}"


@pytest.mark.parametrize("row", rows(), ids=name_of)
def test_the_reduction_leaves_the_combination_of_the_table(row: dict[str, str], derived) -> None:
    derivation = derived(row["sequence"])
    middle = float(row["middle"])
    number = next(n for n, case in enumerate(derivation.locked) if abs(float(case.turn) - middle) < 1e-12)
    case = derivation.locked[number]
    assert case.relation == (1 if row["known"] == "sum" else -1)
    matrix = np.array([float(row[f"R{i}{k}"]) for i in "123" for k in "123"]).reshape(3, 3)
    assert derivation.combination(number, matrix) == pytest.approx(
        float(row["first_when_last_zero"]), abs=TWO_ROUNDINGS
    )
    last = case.relation * derivation.combination(number, matrix)
    assert last == pytest.approx(float(row["last_when_first_zero"]), abs=TWO_ROUNDINGS)
    angles = np.array([float(row[name]) for name in ("first", "middle", "third")])
    np.testing.assert_allclose(derivation.value("matrix", angles), matrix, rtol=0, atol=TWO_ROUNDINGS)


@pytest.mark.parametrize("row", rows(), ids=name_of)
def test_cspice_returns_the_same_combination(row: dict[str, str], derived) -> None:
    """m2eul zeroes its left-most angle, which is the last of ours; its matrix is the transpose of ours."""
    derivation = derived(row["sequence"])
    middle = float(row["middle"])
    number = next(n for n, case in enumerate(derivation.locked) if abs(float(case.turn) - middle) < 1e-12)
    angles = np.array([float(row[name]) for name in ("first", "middle", "third")])
    matrix = derivation.value("matrix", angles)
    i, j, k = ("XYZ".index(letter) + 1 for letter in row["sequence"])
    last, _, first = spiceypy.m2eul(matrix.T.copy(), k, j, i)
    assert last == 0.0
    assert derivation.combination(number, matrix) == pytest.approx(first, abs=1e-15)
