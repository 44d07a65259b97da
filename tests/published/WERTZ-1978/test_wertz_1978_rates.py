"""Wertz 1978 table E-2 (contents from memory), confirmed by CSPICE: rate matrices, determinants, gains."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
import spiceypy

from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.rates import (
    RateAxes,
    angle_rate_matrix,
    body_rate_matrix,
    rate_determinant,
    rate_gains,
    reference_rate_matrix,
)
from trunnion.attitude.sequences import Sense, Sequence

HERE = Path(__file__).parent
ROUNDING = 1e-14  # values are correctly rounded; a product of three matrices stands between


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open() as file:
        return list(csv.DictReader(file))


def numbers(row: dict[str, str], *names: str) -> np.ndarray:
    return np.array([float(row[name]) for name in names])


@pytest.mark.parametrize("row", rows("rates.csv"), ids=lambda row: row["sequence"])
def test_rate_matrix_determinant_and_both_directions(row: dict[str, str]) -> None:
    sequence, angles = Sequence[row["sequence"]], numbers(row, "first", "middle", "third")
    how = {"sequence": sequence, "sense": Sense.MOVING}
    B = body_rate_matrix(angles, **how)
    rates = numbers(row, "d1", "d2", "d3")
    tabled = numbers(row, *(f"B{i}{k}" for i in "123" for k in "123")).reshape(3, 3)
    np.testing.assert_allclose(B, tabled, rtol=0, atol=ROUNDING)
    assert rate_determinant(angles, **how) == pytest.approx(float(row["det"]), abs=ROUNDING)
    assert np.linalg.det(B) == pytest.approx(float(row["det"]), abs=ROUNDING)
    np.testing.assert_allclose(B @ rates, numbers(row, "wb1", "wb2", "wb3"), rtol=0, atol=ROUNDING)
    w_r = reference_rate_matrix(angles, **how) @ rates
    np.testing.assert_allclose(w_r, numbers(row, "wr1", "wr2", "wr3"), rtol=0, atol=ROUNDING)
    found = angle_rate_matrix(angles, **how).matrix @ numbers(row, "in1", "in2", "in3")
    np.testing.assert_allclose(found, numbers(row, "out1", "out2", "out3"), rtol=0, atol=ROUNDING)


@pytest.mark.parametrize("row", rows("rates.csv"), ids=lambda row: row["sequence"])
def test_angular_velocity_against_cspice(row: dict[str, str]) -> None:
    sequence, angles = Sequence[row["sequence"]], numbers(row, "first", "middle", "third")
    rates = numbers(row, "d1", "d2", "d3")
    i, j, k = (axis + 1 for axis in sequence.axes)
    _, w_r = spiceypy.xf2rav(spiceypy.eul2xf([*angles[::-1], *rates[::-1]], k, j, i))
    ours = reference_rate_matrix(angles, sequence=sequence, sense=Sense.MOVING) @ rates
    np.testing.assert_allclose(ours, w_r, rtol=0, atol=ROUNDING)
    C = chain_matrix(angles, sequence=sequence, sense=Sense.MOVING).T.copy()
    theirs, _ = spiceypy.xf2eul(spiceypy.rav2xf(C, w_r), k, j, i)
    inverse = angle_rate_matrix(angles, sequence=sequence, sense=Sense.MOVING, axes=RateAxes.REFERENCE).matrix
    np.testing.assert_allclose(inverse @ w_r, theirs[5:2:-1], rtol=0, atol=ROUNDING)


@pytest.mark.parametrize("row", rows("gains.csv"), ids=lambda row: row["middle_deg"])
@pytest.mark.parametrize("kind", ["different", "repeated"])
def test_gains_against_the_middle_angle(row: dict[str, str], kind: str) -> None:
    middle = np.radians(float(row["middle_deg"]))
    margin = np.pi / 2 - middle if kind == "different" else middle
    gains = rate_gains(margin)
    expected = numbers(row, f"{kind}_outer", f"{kind}_norm", f"{kind}_condition")
    with_relative = 1e-12  # the margin formed from pi/2 - middle carries the rounding of pi/2
    np.testing.assert_allclose([gains.outer, gains.together, gains.condition], expected, rtol=with_relative)
    for sequence in Sequence:
        if sequence.repeated != (kind == "repeated") or margin == 0.0:
            continue
        for sense in Sense:
            inverse = angle_rate_matrix((0.3, middle, -0.7), sequence=sequence, sense=sense).matrix
            lengths = np.linalg.norm(inverse, axis=1)
            np.testing.assert_allclose(lengths, [expected[0], 1.0, expected[0]], rtol=with_relative)
            assert np.linalg.norm(inverse, 2) == pytest.approx(expected[1], rel=1e-9)
            assert np.linalg.cond(inverse) == pytest.approx(expected[2], rel=1e-9)
