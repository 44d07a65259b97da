"""SOFA test program values (ERFA t_erfa_c.c): elementary turns, rotation vectors, chains near lock, directions."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import erfa
import numpy as np
import pytest

from trunnion.attitude.extraction import chain_angles, chain_matrix, wrap
from trunnion.attitude.margins import direction_angle
from trunnion.attitude.rotations import (
    elementary,
    from_rotation_vector,
    rotation_vector,
    unit,
)
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

CALLS: dict[str, dict[str, Any]] = {
    case["call"].split("(")[0]: case for case in json.loads((Path(__file__).parent / "calls.json").read_text())
}


def check(actual: Any, name: str) -> None:
    case = CALLS[name]
    np.testing.assert_allclose(actual, case["value"], rtol=0, atol=case["tolerance"])


@pytest.mark.parametrize(("name", "axis"), [("rx", 0), ("ry", 1), ("rz", 2)])
def test_elementary_passive_turns(name: str, axis: int) -> None:
    angle, r = CALLS[name]["arguments"].values()
    check(elementary(axis, angle).T @ np.array(r), name)


def test_published_input_of_rm2v_is_a_reflection_and_is_refused() -> None:
    """The printed matrix has determinant -1; the published vector comes from its antisymmetric part alone."""
    r = np.array(CALLS["rm2v"]["arguments"]["r"])
    check(erfa.rm2v(r), "rm2v")
    with pytest.raises(AttitudeError, match="is a reflection"):
        rotation_vector(r)
    check(np.linalg.norm(CALLS["rm2v"]["value"]) * np.array([0.0, 0.6, -0.8]), "rm2v")


def test_rotation_vectors_of_matrices_against_the_library() -> None:
    w = np.random.default_rng(6).normal(size=(200, 3))
    w *= (np.pi * np.random.default_rng(7).random((200, 1))) / np.linalg.norm(w, axis=1, keepdims=True)
    R = erfa.rv2m(w)
    np.testing.assert_allclose(-rotation_vector(R), erfa.rm2v(R), rtol=0, atol=1e-14)


def test_passive_matrix_of_a_rotation_vector() -> None:
    check(from_rotation_vector(CALLS["rv2m"]["arguments"]["w"]).T, "rv2m")


def test_fw2m_four_turns() -> None:
    a = CALLS["fw2m"]["arguments"]
    product = elementary(0, a["eps"]) @ elementary(2, a["psi"])
    check(product @ chain_matrix((-a["phib"], -a["gamb"], 0.0), sequence=Sequence.XZX, sense=Sense.MOVING), "fw2m")


def test_c2ixys_is_3_2_3_close_to_lock_and_comes_back() -> None:
    x, y, s = CALLS["c2ixys"]["arguments"].values()
    E, d = np.arctan2(y, x), np.arctan(np.sqrt((x * x + y * y) / (1.0 - x * x - y * y)))
    C = chain_matrix((E, d, -(E + s)), sequence=Sequence.ZYZ, sense=Sense.MOVING).T
    check(C, "c2ixys")
    found = chain_angles(np.array(CALLS["c2ixys"]["value"]).T, sequence=Sequence.ZYZ, sense=Sense.MOVING)
    # printed to 1e-16 in the entries; an outer angle knows that only over the margin, their sum fully
    assert found.margin == pytest.approx(d, abs=1e-15)
    assert found.angles[0] == pytest.approx(E, abs=1e-15 / d)
    assert found.angles[0] + found.angles[2] == pytest.approx(-s, abs=1e-14)


def test_pom00_is_3_2_1_of_small_angles() -> None:
    xp, yp, sp = CALLS["pom00"]["arguments"].values()
    C = chain_matrix((sp, -xp, -yp), sequence=Sequence.ZYX, sense=Sense.MOVING).T
    check(C, "pom00")
    found = chain_angles(np.array(CALLS["pom00"]["value"]).T, sequence=Sequence.ZYX, sense=Sense.MOVING)
    np.testing.assert_allclose(found.angles, (sp, -xp, -yp), rtol=0, atol=1e-16)


def test_angle_between_vectors() -> None:
    a, b = CALLS["sepp"]["arguments"].values()
    check(direction_angle(a, b), "sepp")


def test_unit_vector() -> None:
    p = CALLS["pn"]["arguments"]["p"]
    np.testing.assert_allclose(unit(p), CALLS["pn"]["value"][1:], rtol=0, atol=1e-12)


def test_angle_into_half_turns_either_way() -> None:
    check(wrap(CALLS["anpm"]["arguments"]["a"]), "anpm")


@pytest.mark.parametrize("angle", [0.3456789, -2.9, 0.0])
def test_elementary_turns_against_the_library(angle: float) -> None:
    for axis, routine in enumerate((erfa.rx, erfa.ry, erfa.rz)):
        np.testing.assert_allclose(elementary(axis, angle).T, routine(angle, np.eye(3)), rtol=0, atol=1e-15)


def test_rotation_vectors_against_the_library() -> None:
    w = np.random.default_rng(5).normal(size=(200, 3))
    np.testing.assert_allclose(np.swapaxes(from_rotation_vector(w), -1, -2), erfa.rv2m(w), rtol=0, atol=1e-15)
