"""Problem 3.38: the mount from two directions, first exact and by least squares, and what the other two pairs say."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame
from trunnion.hardware.mounts import mount_from_directions
from trunnion.hardware.surveys import survey_attitudes, survey_directions

PAIRS = np.loadtxt(Path(__file__).parent / "pairs.csv", delimiter=",", skiprows=1)
BODY, REFERENCE = PAIRS[:, :3], PAIRS[:, 3:]
SINGLE_PRECISION_RUN = 1e-7
FIFTEEN_DECIMALS = 2e-15


def test_first_pair_exact_solution_as_published():
    mount, _ = mount_from_directions(REFERENCE[:2], BODY[:2], Frame("body", ("x1", "x2", "x3")))
    published = [
        [0.4155587, -0.85509086, 0.3100492],
        [-0.83393234, -0.49427602, -0.24545473],
        [0.36313602, -0.15655923, -0.9184887],
    ]
    np.testing.assert_allclose(mount.R_bs, published, atol=SINGLE_PRECISION_RUN, rtol=0)


def test_least_squares_solution_as_published():
    survey = survey_directions(BODY[:2], REFERENCE[:2], 1e-3)
    published = [
        [0.4159363752581368, -0.8548935345184778, 0.31008704644926177],
        [-0.833756672976915, -0.4946367741646909, -0.24532482938017944],
        [0.36310706685988364, -0.1564976238875619, -0.9185106160050407],
    ]
    np.testing.assert_allclose(survey.R_bs, published, atol=FIFTEEN_DECIMALS, rtol=0)


def test_the_other_two_pairs_contradict_a_stated_accuracy_of_a_milliradian():
    """Root loss of the four-pair fit, 0.12224293637648806, computed with scipy from the published data."""
    survey = survey_directions(BODY, REFERENCE, 1e-3)
    chords = 2 * np.sin(survey.residuals / 2)
    assert np.sqrt(np.sum(chords**2)) == pytest.approx(0.12224293637648806, abs=1e-9)
    assert "larger than the stated accuracy" in survey.chi_square.words


def test_error_angle_between_an_estimate_and_the_truth():
    """A course solution seen in public repositories, six decimals: 1.834193 deg (entries rounded: 1e-4 deg)."""
    estimate = np.array(
        [[0.969846, 0.17101, 0.173648], [-0.200706, 0.96461, 0.17101], [-0.138258, -0.200706, 0.969846]]
    )
    truth = np.array(
        [[0.963592, 0.187303, 0.190809], [-0.223042, 0.956645, 0.187303], [-0.147454, -0.223042, 0.963592]]
    )
    clean = [Rotation.from_matrix(M).as_matrix()[None] for M in (truth, estimate)]
    survey = survey_attitudes(*clean, 1e-3)
    angle = np.degrees(np.arccos((np.trace(survey.R_bs) - 1) / 2))
    assert angle == pytest.approx(1.834193, abs=1e-4)
