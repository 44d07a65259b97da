"""Extraction on board: forms against scipy, measured errors against the laws, thresholds."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.sequences import Sequence
from trunnion.envelope.onboard import (
    Form,
    Precision,
    branch_margin,
    consequences,
    extract,
    law,
    measure,
    threshold,
)
from trunnion.errors import RegionError


@pytest.mark.parametrize("sequence", list(Sequence))
@pytest.mark.parametrize("form", list(Form))
def test_all_forms_agree_with_scipy_away_from_lock(sequence, form):
    R = Rotation.random(200, random_state=4)
    theirs = R.as_euler(sequence.name)
    away = np.abs(np.sin(theirs[:, 1]) if sequence.repeated else np.cos(theirs[:, 1])) > 0.05
    ours = extract(R.as_matrix(), sequence, form)
    assert np.allclose(ours[away], theirs[away], rtol=0.0, atol=1e-12)


@pytest.mark.parametrize("precision", list(Precision))
@pytest.mark.parametrize("form", list(Form))
@pytest.mark.parametrize("text", ["3-2-1", "2-3-1", "3-1-3"])
def test_measured_errors_keep_the_laws(text, form, precision, count):
    """From 10 deg down: at most a quarter above the laws, at least a fifth of them."""
    margins = np.radians([10.0, 1.0, 0.1, 0.01] + ([1e-4, 1e-6] if precision is Precision.DOUBLE else []))
    for errors in measure(Sequence.from_text(text), form, precision, margins, count=count(20_000)):
        expected = law(form, precision, errors.margin)
        for name in ("first", "third", "combination", "rebuilt"):
            ours, law_says = getattr(errors, name), getattr(expected, name)
            assert 0.2 * law_says <= ours <= 1.25 * law_says
        assert errors.middle <= 1.25 * expected.middle


def test_residual_form_rebuilds_at_every_margin():
    margins = np.radians([10.0, 1e-3, 1e-6, 1e-9, 1e-12])
    for errors in measure(Sequence.ZYX, Form.RESIDUAL, Precision.DOUBLE, margins, count=2000):
        assert errors.rebuilt < 1.5e-15
    for errors in measure(Sequence.ZYX, Form.RESIDUAL, Precision.SINGLE, np.radians([10.0, 0.1, 1e-4]), count=2000):
        assert errors.rebuilt < 6e-7


def test_thresholds():
    assert threshold(Form.RESIDUAL, Precision.SINGLE, 1e-6).margin == 0.0
    assert "none is needed" in threshold(Form.RESIDUAL, Precision.SINGLE, 1e-6).reason
    assert np.degrees(branch_margin(Precision.DOUBLE)) == pytest.approx(1e-6, rel=0.05)
    assert np.degrees(branch_margin(Precision.SINGLE)) == pytest.approx(0.0234, rel=0.01)
    with pytest.raises(RegionError, match="beyond float32"):
        threshold(Form.RESIDUAL, Precision.SINGLE, 1e-8)


@pytest.mark.parametrize("form", [Form.ARCSINE, Form.TWO_ARCTANGENTS])
@pytest.mark.parametrize("accuracy", [1e-5, 1e-4])
def test_accuracy_is_kept_at_the_threshold(form, accuracy):
    margin = threshold(form, Precision.SINGLE, accuracy).margin
    errors = measure(Sequence.ZYX, form, Precision.SINGLE, np.array([margin]), count=4000)[0]
    assert errors.rebuilt <= accuracy
    assert errors.rebuilt >= 0.3 * accuracy


def test_consequence_table():
    rows = consequences(Form.TWO_ARCTANGENTS, Precision.SINGLE, np.array([1e-3, 1e-5]))
    assert rows[0].threshold < rows[1].threshold
    assert rows[0].outer_error == pytest.approx(0.6e-3)
