"""NAIF Required Reading and CSPICE headers: the toolkit's documented values and all 24 singular values."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
import spiceypy
from spiceypy.utils.exceptions import SpiceBADAXISNUMBERS, SpiceNOTAROTATION

from trunnion.attitude.extraction import Policy, chain_angles, chain_matrix
from trunnion.attitude.rates import RateAxes, quaternion_rate
from trunnion.attitude.rotations import (
    about,
    elementary,
    matrix_from_quaternion,
    quaternion_from_matrix,
    quaternion_product,
    rotation_vector,
    scalar_first,
)
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

HERE = Path(__file__).parent
TWO_ROUNDINGS = 1e-15
CALLS = {case["call"]: case for case in json.loads((HERE / "calls.json").read_text())}


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open() as file:
        return list(csv.DictReader(file))


def numbers(row: dict[str, str], *names: str) -> np.ndarray:
    return np.array([float(row[name]) for name in names])


def passive_chain(a3: float, a2: float, a1: float, *axes: int) -> np.ndarray:
    """[a3]k [a2]j [a1]i of CSPICE eul2m from our elementary turns."""
    k, j, i = (axis - 1 for axis in axes)
    return elementary(k, a3).T @ elementary(j, a2).T @ elementary(i, a1).T


@pytest.mark.parametrize(
    "row", rows("singular_values.csv"), ids=lambda row: f"{row['sequence']}{float(row['middle']):+.2f}"
)
@pytest.mark.parametrize("given", ["exact zeros", "product in double precision"])
def test_all_24_singular_values_both_policies(row: dict[str, str], given: str) -> None:
    sequence = Sequence[row["sequence"]]
    first, middle, third = numbers(row, "first", "middle", "third")
    R = numbers(row, *(f"R{i}{k}" for i in "123" for k in "123")).reshape(3, 3)
    product = chain_matrix((first, middle, third), sequence=sequence, sense=Sense.MOVING)
    np.testing.assert_allclose(product, R, rtol=0, atol=TWO_ROUNDINGS)
    E = R if given == "exact zeros" else product
    last_zero = chain_angles(E, sequence=sequence, sense=Sense.MOVING, policy=Policy.LAST_ZERO)
    first_zero = chain_angles(E, sequence=sequence, sense=Sense.MOVING, policy=Policy.FIRST_ZERO)
    assert last_zero.singular
    assert first_zero.singular
    assert last_zero.angles[1] == first_zero.angles[1] == middle  # exactly the singular value
    assert last_zero.angles[2] == first_zero.angles[0] == 0.0
    assert last_zero.angles[0] == pytest.approx(float(row["first_when_last_zero"]), abs=TWO_ROUNDINGS)
    assert first_zero.angles[2] == pytest.approx(float(row["last_when_first_zero"]), abs=TWO_ROUNDINGS)
    known = first + third if row["known"] == "sum" else first - third
    assert last_zero.angles[0] == pytest.approx(known, abs=TWO_ROUNDINGS)


@pytest.mark.parametrize(
    "row", rows("singular_values.csv"), ids=lambda row: f"{row['sequence']}{float(row['middle']):+.2f}"
)
def test_singular_values_as_the_toolkit_returns_them(row: dict[str, str]) -> None:
    R = numbers(row, *(f"R{i}{k}" for i in "123" for k in "123")).reshape(3, 3)
    i, j, k = (axis + 1 for axis in Sequence[row["sequence"]].axes)
    theirs = spiceypy.m2eul(R.T.copy(), k, j, i)[::-1]
    ours = chain_angles(R, sequence=Sequence[row["sequence"]], sense=Sense.MOVING).angles
    np.testing.assert_allclose(ours, theirs, rtol=0, atol=TWO_ROUNDINGS)


@pytest.mark.parametrize("row", rows("m2eul_degenerate.csv"))
def test_degenerate_rows_of_the_m2eul_header(row: dict[str, str]) -> None:
    axes = [int(row[name]) for name in ("axis3", "axis2", "axis1")]
    C = passive_chain(*numbers(row, "angle3", "angle2", "angle1"), *axes)
    found = numbers(row, "found3", "found2", "found1")
    np.testing.assert_allclose(spiceypy.m2eul(C, *axes), found, rtol=0, atol=TWO_ROUNDINGS)
    sequence = Sequence["".join("XYZ"[axis - 1] for axis in reversed(axes))]
    ours = chain_angles(C.T, sequence=sequence, sense=Sense.MOVING, policy=Policy.LAST_ZERO)
    np.testing.assert_allclose(ours.angles[::-1], found, rtol=0, atol=TWO_ROUNDINGS)


@pytest.mark.parametrize("call", ["eul2m(0,0,π/2,1,1,3)", "eul2m(−50°,60°,30°,3,2,3)"])
def test_eul2m_header_products(call: str) -> None:
    case = CALLS[call]
    np.testing.assert_allclose(passive_chain(*case["arguments"]), case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_eul2m_header_turns_plus_x_to_minus_y() -> None:
    case = CALLS["eul2m(π/2,0,0,3,1,1)·(1,0,0)"]
    turned = passive_chain(*case["arguments"]) @ [1.0, 0.0, 0.0]
    np.testing.assert_allclose(turned, case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_m2eul_header_camera_example_3_1_3() -> None:
    case = CALLS["m2eul(ticam,3,1,3)"]
    C = np.array(case["arguments"])
    found = chain_angles(C.T, sequence=Sequence.ZXZ, sense=Sense.MOVING)
    np.testing.assert_allclose(np.degrees(found.angles[::-1]), case["value"], rtol=0, atol=case["tolerance"])


def test_m2q_header_quaternion_of_a_passive_turn() -> None:
    case = CALLS["m2q(rotate(π/2,3))"]
    angle, axis = case["arguments"]
    q = quaternion_from_matrix(elementary(axis - 1, angle).T)
    np.testing.assert_allclose(q, case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_q2m_header_quarter_turn() -> None:
    case = CALLS["q2m((√½,0,0,−√½))"]
    np.testing.assert_allclose(matrix_from_quaternion(case["arguments"][0]), case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_q2m_header_quaternion_not_of_unit_length_is_refused_and_its_direction_agrees() -> None:
    case = CALLS["q2m((0.5,0.4,0.3,0.1))"]
    q = np.array(case["arguments"][0])
    with pytest.raises(AttitudeError, match="has length 0\\.714142843"):
        matrix_from_quaternion(q)
    R = matrix_from_quaternion(q / np.linalg.norm(q))
    np.testing.assert_allclose(R, case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_axisar_raxisa_headers() -> None:
    axis, angle = CALLS["axisar((0,0,1),π/2)"]["arguments"]
    value = CALLS["axisar((0,0,1),π/2)"]["value"]
    np.testing.assert_allclose(about(axis, angle), value, rtol=0, atol=TWO_ROUNDINGS)
    case = CALLS["raxisa(axisar((1,2,3),0.2π))"]
    vector = rotation_vector(about(*case["arguments"]))
    axis_and_angle = [*(vector / np.linalg.norm(vector)), np.linalg.norm(vector)]
    np.testing.assert_allclose(axis_and_angle, case["value"], rtol=0, atol=TWO_ROUNDINGS)


def test_rotate_rotmat_rotvec_headers() -> None:
    angle, axis = CALLS["rotate(π/4,3)"]["arguments"]
    np.testing.assert_allclose(
        elementary(axis - 1, angle).T, CALLS["rotate(π/4,3)"]["value"], rtol=0, atol=TWO_ROUNDINGS
    )
    M, angle, axis = CALLS["rotmat(I,π/2,2)"]["arguments"]
    np.testing.assert_allclose(
        elementary(axis - 1, angle).T @ M, CALLS["rotmat(I,π/2,2)"]["value"], rtol=0, atol=TWO_ROUNDINGS
    )
    v, angle, axis = CALLS["rotvec((√2,0,0),π/4,3)"]["arguments"]
    np.testing.assert_allclose(
        elementary(axis - 1, angle).T @ v, CALLS["rotvec((√2,0,0),π/4,3)"]["value"], rtol=0, atol=TWO_ROUNDINGS
    )


def test_qxq_header_hamilton_product() -> None:
    case = CALLS["qxq(i,j), qxq(j,k), qxq(k,i)"]
    i, j, k = case["arguments"]
    products = np.concatenate([quaternion_product(i, j), quaternion_product(j, k), quaternion_product(k, i)])
    np.testing.assert_array_equal(products, case["value"])


def test_qdq2av_header_angular_velocity_in_reference_axes() -> None:
    case = CALLS["qdq2av(q, −½·qxq(q,(0,1,2,3)))"]
    C = passive_chain(*case["arguments"])
    q_spice, w = quaternion_from_matrix(C), np.array(case["value"], dtype=float)
    q = quaternion_from_matrix(C.T)  # ours belongs to body to reference
    theirs = -0.5 * quaternion_product(q_spice, np.array([0.0, *w]))
    ours = quaternion_rate(q, w, RateAxes.REFERENCE)
    np.testing.assert_allclose(ours * [1, -1, -1, -1], theirs, rtol=0, atol=case["tolerance"])


def test_one_matrix_three_quaternions() -> None:
    case = json.loads((HERE / "one_matrix_three_quaternions.json").read_text())
    C = np.array(case["C"], dtype=float)
    spice = quaternion_from_matrix(C)
    np.testing.assert_allclose(spice, case["spice_wxyz"], rtol=0, atol=TWO_ROUNDINGS)
    np.testing.assert_allclose(spiceypy.m2q(C), case["spice_wxyz"], rtol=0, atol=TWO_ROUNDINGS)
    ccsds = scalar_first(case["ccsds_xyzw"])  # of the body-to-reference map C^T, CCSDS 504.0-B-2 annex F
    np.testing.assert_allclose(quaternion_from_matrix(C.T), ccsds, rtol=0, atol=TWO_ROUNDINGS)
    scipy_order = scalar_first(case["scipy_from_matrix_xyzw"])
    np.testing.assert_allclose(quaternion_from_matrix(C), scipy_order, rtol=0, atol=TWO_ROUNDINGS)


def test_what_the_toolkit_refuses_is_refused_here() -> None:
    """m2eul header: SPICE(BADAXISNUMBERS) for a middle axis equal to a neighbour, SPICE(NOTAROTATION)."""
    mirrored = np.diag([1.0, 1.0, -1.0])
    with pytest.raises(SpiceBADAXISNUMBERS):
        spiceypy.m2eul(np.eye(3), 3, 3, 1)
    with pytest.raises(AttitudeError, match="twice in a row"):
        Sequence.from_text("3-3-1")
    with pytest.raises(SpiceNOTAROTATION):
        spiceypy.m2q(mirrored)
    with pytest.raises(AttitudeError, match="is a reflection"):
        quaternion_from_matrix(mirrored)
