"""4608 names are 1152 functions, four names each, and each name is the function scipy makes of it."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.sequences import Sense
from trunnion.crosswalk.readings import Reading, all_chains, all_readings, chain_matrices

GENERIC = np.array([[10.0, -35.0, 50.0], [0.4, 1.1, -0.7]])  # degrees-like and radians-like numbers


def scipy_matrix(reading: Reading, numbers: np.ndarray) -> np.ndarray:
    """The reading carried out by scipy: upper case moving axes, lower case fixed axes."""
    turns = numbers[:, list(reading.columns)] * np.array(reading.signs)
    letters = reading.sequence.name if reading.sense is Sense.MOVING else reading.sequence.name.lower()
    rotation = Rotation.from_euler(letters, turns, degrees=reading.degrees)
    return (rotation if reading.maps_body_to_reference else rotation.inv()).as_matrix()


def test_names_and_functions_are_counted() -> None:
    assert len(set(all_readings())) == 4608
    assert len(set(all_chains())) == 1152
    assert Counter(Counter(reading.chain() for reading in all_readings()).values()) == {4: 1152}


def test_no_two_chains_are_the_same_function() -> None:
    prints = {chain.matrix(GENERIC).round(9).tobytes() for chain in all_chains()}
    assert len(prints) == 1152


@pytest.mark.parametrize("reading", all_readings()[::37], ids=lambda reading: reading.words())
def test_a_reading_is_what_scipy_makes_of_it(reading: Reading) -> None:
    assert np.allclose(reading.chain().matrix(GENERIC), scipy_matrix(reading, GENERIC), rtol=0, atol=1e-14)


def test_each_chain_gives_back_its_four_names() -> None:
    for chain in all_chains()[::13]:
        names = chain.readings()
        assert len(set(names)) == 4
        assert {name.chain() for name in names} == {chain}


@pytest.mark.parametrize("degrees", [True, False])
def test_all_chains_at_once_are_the_chains_one_by_one(degrees: bool) -> None:
    together = chain_matrices(GENERIC, degrees=degrees)
    for matrices, chain in zip(together[::29], all_chains(degrees=degrees)[::29], strict=True):
        assert np.allclose(matrices, chain.matrix(GENERIC), rtol=0, atol=1e-15)
