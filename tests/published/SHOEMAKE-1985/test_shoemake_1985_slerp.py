"""Shoemake 1985 (formula from memory): attitude between two attitudes at a constant rate."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.rotations import positive_quaternion, quaternion_angle, quaternion_from_matrix, slerp
from trunnion.attitude.sequences import Sense, Sequence

with (Path(__file__).parent / "slerp.csv").open() as _file:
    ROWS = list(csv.DictReader(_file))
ROUNDING = 1e-14


def end(row: dict[str, str], which: str) -> np.ndarray:
    angles = [float(row[f"{which}{n}"]) for n in "123"]
    return quaternion_from_matrix(chain_matrix(angles, sequence=Sequence.ZYX, sense=Sense.MOVING))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["t"])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_between_two_attitudes_whatever_the_quaternion_signs(row: dict[str, str], sign: float) -> None:
    start, finish = end(row, "a"), sign * end(row, "b")
    q = slerp(start, finish, float(row["t"]))
    expected = [float(row[name]) for name in ("q0", "qx", "qy", "qz")]
    np.testing.assert_allclose(positive_quaternion(q), expected, rtol=0, atol=ROUNDING)
    assert quaternion_angle(start, q) == pytest.approx(float(row["angle_from_start"]), abs=ROUNDING)


def test_half_way_to_the_cyclic_permutation_of_the_axes() -> None:
    q = slerp([1.0, 0.0, 0.0, 0.0], [0.5, 0.5, 0.5, 0.5], 0.5)
    third = 1.0 / np.sqrt(12.0)
    np.testing.assert_allclose(q, [np.sqrt(0.75), third, third, third], rtol=0, atol=1e-15)


def test_ends_and_nothing_in_between() -> None:
    a, b = end(ROWS[0], "a"), end(ROWS[0], "b")
    np.testing.assert_allclose(slerp(a, b, [0.0, 1.0]), [a, b], rtol=0, atol=1e-15)
    np.testing.assert_allclose(slerp(a, a, 0.3), a, rtol=0, atol=1e-15)
