"""Extraction on board: measured errors against the laws, thresholds, and scipy as a second rebuilder."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude import onboard
from trunnion.attitude.extraction import chain_angles
from trunnion.attitude.onboard import ExtractionForm, Precision
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

ALL = [(sequence, sense) for sequence in Sequence for sense in Sense]
IDS = [f"{sequence.name}-{sense.name.lower()}" for sequence, sense in ALL]
MARGINS = {
    Precision.DOUBLE: np.array([0.1, 1e-3, 1e-5, 1e-8, 1e-10]),
    Precision.SINGLE: np.array([0.1, 1e-2, 1e-3, 1e-4]),
}


@pytest.mark.parametrize(("sequence", "sense"), ALL, ids=IDS)
@pytest.mark.parametrize("precision", list(Precision))
@pytest.mark.parametrize("form", list(ExtractionForm))
def test_measured_errors_stay_below_the_laws_and_not_far_below(
    sequence: Sequence, sense: Sense, precision: Precision, form: ExtractionForm
) -> None:
    margins = MARGINS[precision]
    how = {"sequence": sequence, "sense": sense, "samples": 1000}
    found = onboard.measure_extraction(form, precision, margins, **how)
    law = onboard.extraction_law(form, precision, margins)
    for name in ("middle", "first", "last", "combination", "rebuilt", "rebuilt_largest"):
        ratio = getattr(found, name) / getattr(law, name)
        assert np.all(ratio <= 1.0), name
        assert np.all(ratio >= 0.05), name  # a law far too cautious would say nothing


def test_same_numbers_come_out_again() -> None:
    once = onboard.measure_extraction(ExtractionForm.ARC, Precision.SINGLE, [1e-2], samples=200)
    again = onboard.measure_extraction(ExtractionForm.ARC, Precision.SINGLE, [1e-2], samples=200)
    np.testing.assert_array_equal(np.array(once), np.array(again))


@pytest.mark.parametrize("letters", ["ZYX", "ZXZ"])
def test_residual_form_in_single_precision_rebuilt_by_scipy(letters: str) -> None:
    rotations = Rotation.random(2000, random_state=1)
    singular = 0.0 if letters == "ZXZ" else np.pi / 2
    near = Rotation.from_euler(
        letters, np.column_stack([rotations.as_euler("ZYX")[:, 0], np.full(2000, singular + 3e-6), np.zeros(2000)])
    )
    matrices = near.as_matrix().astype(np.float32)
    found = chain_angles(matrices, sequence=Sequence[letters], sense=Sense.MOVING)
    assert found.angles.dtype == np.float32
    off = (Rotation.from_euler(letters, found.angles.astype(float)) * near.inv()).magnitude()
    assert off.max() < 4 * np.finfo(np.float32).eps


def test_thresholds() -> None:
    degree = np.pi / 180
    angles = onboard.threshold_for_angles(Precision.SINGLE, 0.1 * degree)
    measured = onboard.measure_extraction(ExtractionForm.RESIDUAL, Precision.SINGLE, [angles.margin], samples=2000)
    assert measured.first[0] < 0.1 * degree
    assert onboard.threshold_for_attitude(ExtractionForm.RESIDUAL, Precision.SINGLE, 1e-5).margin == 0.0
    branch = onboard.threshold_for_attitude(ExtractionForm.ARC, Precision.SINGLE, 1e-3)
    assert branch.margin == branch.largest_error == onboard.crossing(Precision.SINGLE)
    above = onboard.measure_extraction(ExtractionForm.ARC, Precision.SINGLE, [branch.margin], samples=2000)
    assert above.rebuilt_largest[0] < branch.largest_error


@pytest.mark.parametrize(
    ("form", "accuracy", "message"),
    [
        (ExtractionForm.ARC, 1e-5, "no threshold keeps 1e-05 rad with arcsine or arccosine in float32"),
        (ExtractionForm.RESIDUAL, 1e-8, "below the rounding of float32"),
    ],
)
def test_accuracy_that_no_threshold_keeps(form: ExtractionForm, accuracy: float, message: str) -> None:
    with pytest.raises(AttitudeError, match=message):
        onboard.threshold_for_attitude(form, Precision.SINGLE, accuracy)
    with pytest.raises(AttitudeError, match="no margin is enough"):
        onboard.threshold_for_angles(Precision.SINGLE, 1e-8)


def test_consequences_of_a_threshold() -> None:
    rows = onboard.consequences(ExtractionForm.ARC, Precision.SINGLE, np.radians([0.01, 0.1, 1.0]))
    assert [row.outer_error for row in rows] == sorted((row.outer_error for row in rows), reverse=True)
    uniform = Rotation.random(200_000, random_state=3).as_matrix()[:, 2, 0]
    share = np.mean(np.arcsin(np.abs(uniform)) > np.pi / 2 - np.radians(1.0))
    assert rows[2].share_of_attitudes == pytest.approx(share, rel=0.3)
    assert rows[1].bits_lost == pytest.approx(np.log2(1 / np.radians(0.1)), rel=1e-6)
