"""Formulas of forms that are no sequence: proven where shown, true of scipy's rotations, loud when wrong."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.forms import DirectionRoll, Level, RotationVector, TiltPair, TiltType
from trunnion.attitude.frames import Frame
from trunnion.attitude.stated_forms import StatedForm
from trunnion.symbolic import forms
from trunnion.symbolic.forms import form_steps
from trunnion.symbolic.proofs import ProofError

X, Y, Z = np.eye(3)
LOCAL, BODY = Frame("local", ("x", "y", "z")), Frame("body", ("x", "y", "z"))
SINE, TANGENT = TiltType.SINE, TiltType.TANGENT
KINDS = {
    "strapped": TiltPair(Level(Z, X), X, Y, Z, (SINE, SINE)),
    "pendulums": TiltPair(Level(Z, X), X, Y, Z, (TANGENT, TANGENT)),
    "gimballed": TiltPair(Level(Z, X), X, Y, Z, (SINE, TANGENT)),
    "other gimballed": TiltPair(Level(Z, X), X, Y, Z, (TANGENT, SINE)),
    "direction": DirectionRoll(Z, X, X, Z),
    "vector": RotationVector(),
}


@pytest.mark.parametrize("kind", KINDS)
def test_each_formula_is_proven(kind: str) -> None:
    steps = form_steps(StatedForm(kind, LOCAL, BODY, KINDS[kind]))
    assert len(steps) >= 2
    assert all(step.proof is not None and step.proof.digits == 50 for step in steps)


def test_a_wrong_formula_is_loud(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(
        forms, "_tangent_steps", lambda: forms._triad_step((forms.S1, forms.S2, forms.C1), forms.S3**0, [])
    )
    with pytest.raises(ProofError, match="does not reduce to zero"):
        form_steps(StatedForm("pendulums", LOCAL, BODY, KINDS["pendulums"]))


@pytest.mark.parametrize("kind", ["strapped", "pendulums"])
def test_the_formulas_as_printed_hold_for_scipys_rotations(kind: str) -> None:
    """u = R^T up by scipy; tilts and triad by the printed formulas; the library's numbers agree."""
    turned = Rotation.random(300, random_state=5)
    turned = turned[
        np.abs(turned.inv().apply(Z)[:, 2]) > 0.1
    ]  # closer to the singular set the printed form loses digits
    u = turned.inv().apply(Z)
    if kind == "strapped":
        a = np.arctan2(u[:, 0], np.hypot(u[:, 1], u[:, 2]))
        b = np.arctan2(u[:, 1], np.hypot(u[:, 0], u[:, 2]))
        again = np.stack([np.sin(a), np.sin(b), np.sign(u[:, 2]) * np.sqrt(1 - np.sin(a) ** 2 - np.sin(b) ** 2)], -1)
    else:
        a, b = np.arctan2(u[:, 0], np.abs(u[:, 2])), np.arctan2(u[:, 1], np.abs(u[:, 2]))
        scale = 1 / np.sqrt(1 - np.sin(a) ** 2 * np.sin(b) ** 2)
        entries = [np.sin(a) * np.cos(b), np.cos(a) * np.sin(b), np.sign(u[:, 2]) * np.cos(a) * np.cos(b)]
        again = np.stack(entries, -1) * scale[:, None]
    np.testing.assert_allclose(again, u, rtol=0, atol=2e-13)
    found = KINDS[kind].numbers(turned.as_matrix()).values
    np.testing.assert_allclose(found[:, 1:], np.stack([a, b], -1), rtol=0, atol=1e-14)
    ahead = turned.apply((X - u[:, :1] * u) / np.sqrt(1 - u[:, :1] ** 2))
    np.testing.assert_allclose(np.arctan2(-ahead[:, 1], ahead[:, 0]), found[:, 0], rtol=0, atol=1e-12)
