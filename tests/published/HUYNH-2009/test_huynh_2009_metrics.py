"""Huynh 2009 (formulas from memory): the rotation angle and what follows from it."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.rotations import quaternion_angle, quaternion_from_matrix, rotation_angle
from trunnion.attitude.sequences import Sense, Sequence

with (Path(__file__).parent / "metrics.csv").open() as _file:
    ROWS = list(csv.DictReader(_file))
ROUNDING = 1e-14


def attitude(row: dict[str, str], which: str) -> np.ndarray:
    angles = [float(row[f"{which}{n}"]) for n in "123"]
    return chain_matrix(angles, sequence=Sequence[row[f"sequence_{which}"]], sense=Sense.MOVING)


@pytest.mark.parametrize("row", ROWS)
def test_angle_and_the_four_metrics_that_follow(row: dict[str, str]) -> None:
    A, B = attitude(row, "a"), attitude(row, "b")
    p, q = quaternion_from_matrix(A), quaternion_from_matrix(B)
    angle = rotation_angle(A, B)
    dot = abs(p @ q)
    found = {
        "angle": angle,
        "half_angle": quaternion_angle(p, q) / 2.0,
        "least_quaternion_difference": min(np.linalg.norm(p - q), np.linalg.norm(p + q)),
        "one_minus_dot": 1.0 - dot,
        "frobenius": np.linalg.norm(np.eye(3) - A @ B.T),
    }
    for name, value in found.items():
        assert value == pytest.approx(float(row[name]), abs=ROUNDING), name
    assert 2.0 * np.sin(angle / 4.0) == pytest.approx(float(row["least_quaternion_difference"]), abs=ROUNDING)
    assert 2.0 * np.sqrt(2.0) * np.sin(angle / 2.0) == pytest.approx(float(row["frobenius"]), abs=ROUNDING)
