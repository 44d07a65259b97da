"""The spec lines written for a reading: loaded by the spec's own loader they give the attitudes of the samples."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.fragment import fragment
from trunnion.crosswalk.identify import identify_angles
from trunnion.crosswalk.near_fits import difference, explanations
from trunnion.crosswalk.offsets import identify_with_offsets, offsets_of
from trunnion.crosswalk.readings import all_chains
from trunnion.spec.build import convention_from_plain
from trunnion.spec.load import load_text
from trunnion.spec.plain import plain_part

NAMES = ("yaw (deg)", "p", "no")
HEAD = """workbook: 1
document: {number: T-1, title: Trial, revision: A}
people:
  - {id: p1, name: Someone, signs as: [prepared]}
frames:
  local: {axes: [north, east, down], north: "true", carried: along}
  body: {axes: [forward, starboard, down]}
"""


def loaded(lines: list[str]):
    """The convention the lines state, through the spec's loader."""
    text = HEAD + "\n".join(lines) + "\n"
    workbook = load_text(text.encode(), Path("workbook.yaml"), check_files=False)
    return convention_from_plain(plain_part(workbook, "conventions", "found"))


@pytest.mark.parametrize("constants", [Constants.NONE, Constants.RELABELLED, Constants.RIGHT, Constants.LEFT])
@pytest.mark.parametrize("pick", [3, 77, 410, 700, 1100])
def test_the_lines_load_and_give_the_same_attitudes(constants: Constants, pick: int) -> None:
    chain = all_chains()[pick]
    generator = np.random.default_rng(pick)
    numbers = generator.uniform(-60, 60, size=(8, 3)) if chain.degrees else generator.uniform(-1, 1, size=(8, 3))
    truth = Rotation.from_matrix(chain.matrix(numbers))
    side = Rotation.random(random_state=pick)
    if constants is Constants.RELABELLED:
        side = Rotation.from_euler("zx", [90, 180], degrees=True)
    known = {Constants.NONE: truth, Constants.LEFT: side * truth}.get(constants, truth * side).as_matrix()
    found = identify_angles(numbers, known, constants=constants, names=NAMES)
    (finding,) = found.fits
    convention = loaded(fragment(finding, NAMES, reference="local", body="body"))
    order = [NAMES.index(name) for name in convention.angle_names]
    stated = np.radians(numbers[:, order]) if chain.degrees else numbers[:, order]
    apart = Rotation.from_matrix(convention.matrix(stated)).inv() * Rotation.from_matrix(known)
    assert np.degrees(apart.magnitude()).max() < 1e-8


def test_offsets_go_into_the_lines() -> None:
    numbers = np.random.default_rng(3).uniform(-50, 50, size=(12, 3))
    truth = Rotation.from_euler("ZXY", numbers + np.array([0, 90, 7.5]), degrees=True).as_matrix()
    found = identify_with_offsets(numbers, truth, names=NAMES)
    (finding,) = found.fits
    lines = fragment(finding, NAMES, reference="local", body="body", offsets=offsets_of(finding))
    convention = loaded(lines)
    order = [NAMES.index(name) for name in convention.angle_names]
    apart = Rotation.from_matrix(convention.matrix(np.radians(numbers[:, order]))).inv() * Rotation.from_matrix(truth)
    assert np.degrees(apart.magnitude()).max() < 1e-7


def test_a_near_fit_is_explained_by_the_mistake_that_leads_to_it() -> None:
    # Small angles: the order of the turns is the nearest other reading.
    names = ("yaw", "pitch", "roll")
    numbers = np.random.default_rng(9).uniform(-20, 20, size=(12, 3))
    found = identify_angles(numbers, Rotation.from_euler("ZYX", numbers, degrees=True).as_matrix(), names=names)
    (line,) = explanations(found, names)
    assert line.startswith("the turns taken in the order ")


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda c: {"degrees": not c.degrees}, "degrees taken for radians"),
        (lambda c: {"signs": (c.signs[0], -c.signs[1], c.signs[2])}, "the sign of pitch reversed"),
        (lambda c: {"columns": c.columns[::-1]}, "yaw and roll exchanged"),
        (
            lambda c: {"axes": c.axes[::-1], "columns": c.columns[::-1], "signs": c.signs[::-1]},
            "the turns taken in the order roll, pitch, yaw",
        ),
        (
            lambda c: {"axes": c.axes[::-1], "columns": c.columns[::-1], "signs": tuple(-s for s in c.signs[::-1])},
            "the matrix taken the other way round",
        ),
    ],
)
def test_single_mistakes_are_named(change, words: str) -> None:
    from dataclasses import replace

    chain = next(c for c in all_chains() if (c.axes, c.signs, c.columns) == ((2, 1, 0), (1, 1, 1), (0, 1, 2)))
    assert difference(chain, replace(chain, **change(chain)), ("yaw", "pitch", "roll")) == words
