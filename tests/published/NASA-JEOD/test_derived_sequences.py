"""NASA JEOD euler_angles.cc against the derivation: carrier of the middle angle, twelve products, way back."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

HERE = Path(__file__).parent
TWO_ROUNDINGS = 1e-15


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open() as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("middle_element.csv"), ids=lambda row: row["sequence"])
def test_the_carrier_step_shows_the_element_and_function_of_the_source(row: dict[str, str], derived) -> None:
    derivation = derived(row["sequence"])
    step = derivation.step("carrier")
    # The source's matrix takes reference to body components: row and column change places.
    assert step.lhs == f"R_{{{row['column']}{row['row']}}}"
    letter = derivation.setting.turns[1].letter
    sign = "- " if row["carries"].startswith("-") else ""
    assert step.rhs == f"{sign}{'c' if row['carries'].endswith('cos') else 's'}_{{{letter}}}"


@pytest.mark.parametrize("row", rows("regular.csv"), ids=lambda row: row["sequence"])
def test_derived_product_quaternion_and_extraction_meet_the_regular_triple(row: dict[str, str], derived) -> None:
    derivation = derived(row["sequence"])
    angles = np.array([float(row[name]) for name in ("first", "middle", "third")])
    expected = np.array([float(row[f"R{i}{k}"]) for i in "123" for k in "123"]).reshape(3, 3)
    q = np.array([float(row[name]) for name in ("q0", "qx", "qy", "qz")])
    np.testing.assert_allclose(derivation.value("matrix", angles), expected, rtol=0, atol=TWO_ROUNDINGS)
    np.testing.assert_allclose(derivation.value("quaternion", angles)[0], q, rtol=0, atol=TWO_ROUNDINGS)
    np.testing.assert_allclose(derivation.angles(expected), angles, rtol=0, atol=TWO_ROUNDINGS)
