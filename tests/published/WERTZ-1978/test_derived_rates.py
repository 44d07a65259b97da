"""Kinematic equations of the twelve sequences against the derivation; CSPICE; gains from 30 to 89.9 degrees."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
import spiceypy

from trunnion.attitude.sequences import Sequence

HERE = Path(__file__).parent
FEW_ROUNDINGS = 1e-14
RELATIVE = 1e-12


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open() as file:
        return list(csv.DictReader(file))


def numbers(row: dict[str, str], *names: str) -> np.ndarray:
    return np.array([float(row[name]) for name in names])


@pytest.mark.parametrize("row", rows("rates.csv"), ids=lambda row: row["sequence"])
def test_derived_rate_matrices_determinant_and_inverse(row: dict[str, str], derived) -> None:
    derivation = derived(row["sequence"])
    angles, speeds = numbers(row, "first", "middle", "third"), numbers(row, "d1", "d2", "d3")
    B = numbers(row, *(f"B{i}{k}" for i in "123" for k in "123")).reshape(3, 3)
    body, reference = (derivation.value(f"{side} rates", angles) for side in ("body", "reference"))
    np.testing.assert_allclose(body, B, rtol=0, atol=FEW_ROUNDINGS)
    np.testing.assert_allclose(body @ speeds, numbers(row, "wb1", "wb2", "wb3"), rtol=0, atol=FEW_ROUNDINGS)
    np.testing.assert_allclose(reference @ speeds, numbers(row, "wr1", "wr2", "wr3"), rtol=0, atol=FEW_ROUNDINGS)
    back = derivation.value("body rates inverse", angles) @ numbers(row, "in1", "in2", "in3")
    np.testing.assert_allclose(back, numbers(row, "out1", "out2", "out3"), rtol=0, atol=FEW_ROUNDINGS)
    assert derivation.value("determinant", angles)[0, 0] == pytest.approx(float(row["det"]), abs=1e-15)


@pytest.mark.parametrize("row", rows("rates.csv"), ids=lambda row: row["sequence"])
def test_cspice_finds_the_same_angular_velocity_in_reference_axes(row: dict[str, str], derived) -> None:
    derivation = derived(row["sequence"])
    a, s = numbers(row, "first", "middle", "third"), numbers(row, "d1", "d2", "d3")
    i, j, k = ("XYZ".index(letter) + 1 for letter in row["sequence"])
    _, velocity = spiceypy.xf2rav(spiceypy.eul2xf([a[2], a[1], a[0], s[2], s[1], s[0]], k, j, i))
    np.testing.assert_allclose(derivation.value("reference rates", a) @ s, velocity, rtol=0, atol=FEW_ROUNDINGS)


@pytest.mark.parametrize("name", ["ZYX", "XZY", "ZXZ", "YZY"])
@pytest.mark.parametrize("row", rows("gains.csv"), ids=lambda row: row["middle_deg"])
def test_gains_of_the_derived_inverse(row: dict[str, str], name: str, derived) -> None:
    derivation = derived(name)
    kind = "repeated" if Sequence[name].repeated else "different"
    angles = np.array([0.3, np.radians(float(row["middle_deg"])), -0.7])
    inverse = derivation.value("body rates inverse", angles)
    assert np.linalg.norm(inverse[0]) == pytest.approx(float(row[f"{kind}_outer"]), rel=RELATIVE)
    assert np.linalg.norm(inverse[2]) == pytest.approx(float(row[f"{kind}_outer"]), rel=RELATIVE)
    assert np.linalg.norm(inverse[1]) == pytest.approx(1.0, rel=RELATIVE)
    assert np.linalg.norm(inverse, 2) == pytest.approx(float(row[f"{kind}_norm"]), rel=RELATIVE)
    condition = np.linalg.cond(derivation.value("body rates", angles))
    assert condition == pytest.approx(float(row[f"{kind}_condition"]), rel=1e-9)  # numpy's singular values


@pytest.mark.parametrize("row", rows("gains.csv"), ids=lambda row: row["middle_deg"])
def test_tabulated_conditions_are_those_of_the_source(row: dict[str, str], derived) -> None:
    margin = 90.0 - float(row["middle_deg"])
    for known, determinant, gain, condition in derived("ZYX").conditions:
        if abs(known - margin) < 1e-9:
            assert condition == pytest.approx(float(row["different_condition"]), rel=RELATIVE)
            assert gain == pytest.approx(float(row["different_outer"]), rel=RELATIVE)
            assert determinant * gain == pytest.approx(1.0, rel=RELATIVE)


def test_explicit_rates_of_heading_pitch_roll(derived) -> None:
    """The trade's equations for z-y-x (common knowledge, from memory): the derived inverse at random angles."""
    derivation = derived("ZYX")
    for angles in np.random.default_rng(7).uniform(-1.4, 1.4, (20, 3)):
        _, theta, phi = angles
        p, q, r = 0.3, -0.2, 0.7
        turn = q * np.sin(phi) + r * np.cos(phi)
        expected = [turn / np.cos(theta), q * np.cos(phi) - r * np.sin(phi), p + turn * np.tan(theta)]
        found = derivation.value("body rates inverse", angles) @ [p, q, r]
        np.testing.assert_allclose(found, expected, rtol=0, atol=1e-13)


def test_explicit_rates_of_precession_nutation_spin(derived) -> None:
    """The equations for z-x-z (common knowledge, from memory)."""
    derivation = derived("ZXZ")
    for angles in np.random.default_rng(8).uniform(0.2, 2.9, (20, 3)):
        _, theta, psi = angles
        x, y, z = 0.3, -0.2, 0.7
        along = x * np.sin(psi) + y * np.cos(psi)
        expected = [along / np.sin(theta), x * np.cos(psi) - y * np.sin(psi), z - along / np.tan(theta)]
        found = derivation.value("body rates inverse", angles) @ [x, y, z]
        np.testing.assert_allclose(found, expected, rtol=0, atol=1e-13)
