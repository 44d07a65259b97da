"""Tilt pairs, direction and roll, rotation vectors: against scipy, ERFA, CSPICE, and their own singular sets."""

from __future__ import annotations

import itertools

import erfa
import numpy as np
import pytest
import spiceypy
from scipy.spatial.transform import Rotation

from trunnion.attitude.forms import DirectionRoll, Form, Level, RotationVector, TiltPair, TiltType
from trunnion.errors import AttitudeError

X, Y, Z = np.eye(3)
NED = Level(up=-Z, north=X)
SINE, TANGENT = TiltType.SINE, TiltType.TANGENT


def tilt(*types: TiltType) -> TiltPair:
    """Forward-starboard-down body: nose up, starboard down positive."""
    return TiltPair(NED, first=X, second=-Y, upright=-Z, types=types)


def off(R: np.ndarray, S: np.ndarray) -> np.ndarray:
    return (Rotation.from_matrix(R).inv() * Rotation.from_matrix(S)).magnitude()


FORMS: dict[str, Form] = {
    "tilts, sine": tilt(SINE, SINE),
    "tilts, tangent": tilt(TANGENT, TANGENT),
    "tilts, pitch inside": tilt(SINE, TANGENT),
    "tilts, roll inside": tilt(TANGENT, SINE),
    "direction and roll": DirectionRoll(pole=-Z, zero_azimuth=X, boresight=X, mark=-Z),
    "rotation vector": RotationVector(),
}


@pytest.mark.parametrize("form", FORMS.values(), ids=FORMS.keys())
def test_numbers_give_the_attitude_back(form: Form, random_attitudes: Rotation) -> None:
    R = random_attitudes.as_matrix()[:3000]
    found = form.numbers(R)
    flag = {"inverted": found.inverted} if isinstance(form, TiltPair) else {}
    again = form.rotation(found.values, **flag)
    # near its singular set a form loses digits as rounding over the margin; the worst of 3000 is at 1e-4 rad or so
    assert np.max(off(R, again) * np.minimum(1.0, found.margin)) < 2e-15
    assert off(R, again).max() < 1e-11
    assert not found.singular.any()
    assert form.singular_set


@pytest.mark.parametrize("form", FORMS.values(), ids=FORMS.keys())
def test_margin_changes_no_faster_than_the_attitude_turns(form: Form, random_attitudes: Rotation) -> None:
    one = random_attitudes[:3000]
    for scale in (1e-3, 0.3, 1.0):
        two = Rotation.from_rotvec(scale * random_attitudes[3000:6000].as_rotvec()) * one
        change = np.abs(form.margin(one.as_matrix()) - form.margin(two.as_matrix()))
        assert np.max(change - (one.inv() * two).magnitude()) < 2e-15


def test_sine_tilts_are_what_accelerometers_at_rest_give(random_attitudes: Rotation) -> None:
    R = random_attitudes.as_matrix()[:1000]
    up_in_body = random_attitudes[:1000].inv().apply([0.0, 0.0, -1.0])
    found = tilt(SINE, SINE).numbers(R).values
    np.testing.assert_allclose(np.sin(found[:, 1]), up_in_body[:, 0], rtol=0, atol=1e-15)
    np.testing.assert_allclose(np.sin(found[:, 2]), -up_in_body[:, 1], rtol=0, atol=1e-15)


def test_tangent_tilts_are_what_pendulums_give(random_attitudes: Rotation) -> None:
    R = random_attitudes.as_matrix()[:1000]
    up = random_attitudes[:1000].inv().apply([0.0, 0.0, -1.0])
    found = tilt(TANGENT, TANGENT).numbers(R)
    np.testing.assert_allclose(found.values[:, 1], np.arctan(up[:, 0] / np.abs(up[:, 2])), rtol=0, atol=1e-14)
    np.testing.assert_allclose(found.values[:, 2], np.arctan(-up[:, 1] / np.abs(up[:, 2])), rtol=0, atol=1e-14)
    np.testing.assert_array_equal(found.inverted, up[:, 2] > 0.0)


@pytest.mark.parametrize(
    ("types", "letters", "order"), [((SINE, TANGENT), "ZYX", (0, 1, 2)), ((TANGENT, SINE), "ZXY", (0, 2, 1))]
)
def test_gimballed_pairs_are_sequences(
    types: tuple[TiltType, TiltType], letters: str, order: tuple[int, ...], random_attitudes: Rotation
) -> None:
    found = tilt(*types).numbers(random_attitudes.as_matrix()[:1000]).values
    theirs = random_attitudes[:1000].as_euler(letters)[:, order]
    np.testing.assert_allclose(np.exp(1j * found), np.exp(1j * theirs), rtol=0, atol=1e-13)
    with pytest.raises(AttitudeError, match="no sequence of turns"):
        tilt(SINE, SINE).as_convention()


def test_all_four_pairs_agree_for_one_axis_and_part_for_two() -> None:
    pairs = [tilt(*types) for types in itertools.product(TiltType, repeat=2)]
    alone = [pair.rotation([0.4, 0.3, 0.0]) for pair in pairs]
    assert max(off(alone[0], R) for R in alone) < 1e-15
    both = [pair.rotation([0.4, 0.3, 0.5]) for pair in pairs]
    assert min(off(R, S) for R, S in itertools.combinations(both, 2)) > np.radians(1.0)


def test_upside_down_needs_its_flag() -> None:
    R = Rotation.from_euler("ZYX", [20, 10, 170], degrees=True).as_matrix()
    for types in ((SINE, SINE), (TANGENT, TANGENT)):
        found = tilt(*types).numbers(R)
        assert found.inverted
        assert off(R, tilt(*types).rotation(found.values, inverted=True)) < 1e-15
        assert off(R, tilt(*types).rotation(found.values)) > np.radians(100)


def test_tilt_numbers_at_their_singular_set() -> None:
    knife_edge = Rotation.from_euler("ZYX", [20, 10, 90], degrees=True).as_matrix()
    exact = np.array([[0.0, 0.0, 1.0], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]])  # upright axis horizontal, entries exact
    for types in ((SINE, SINE), (TANGENT, TANGENT)):
        assert tilt(*types).margin(knife_edge) < 1e-15
        found = tilt(*types).numbers(exact)
        assert found.singular
        assert found.margin == 0.0


@pytest.mark.parametrize(
    ("types", "values", "message"),
    [
        ((SINE, SINE), (0.0, np.radians(60), np.radians(40)), "add up to 100 deg"),
        ((TANGENT, TANGENT), (0.0, np.pi / 2, 0.1), "90 deg or more"),
        ((SINE, SINE), (0.0, np.pi / 2, 0.0), "first axis is vertical"),
    ],
)
def test_tilts_that_no_attitude_has(types: tuple[TiltType, TiltType], values: tuple[float, ...], message: str) -> None:
    with pytest.raises(AttitudeError, match=message):
        tilt(*types).rotation(values)


def test_axes_that_are_not_perpendicular_are_refused() -> None:
    with pytest.raises(AttitudeError, match="the first and the second axis are not at right angles: 45 deg"):
        TiltPair(NED, X, X + Y, -Z, (SINE, SINE))
    with pytest.raises(AttitudeError, match="up and north are not at right angles"):
        Level(up=Z, north=X + Z)


def test_directions_against_erfa() -> None:
    """SOFA s2c: longitude grows counter-clockwise about the pole."""
    form = DirectionRoll(pole=Z, zero_azimuth=X, boresight=Z, mark=Y, clockwise=False, with_roll=False)
    rng = np.random.default_rng(11)
    longitude, latitude = rng.uniform(0, 2 * np.pi, 200), rng.uniform(-np.pi / 2, np.pi / 2, 200)
    theirs = erfa.s2c(longitude, latitude)
    np.testing.assert_allclose(form.direction(longitude, latitude), theirs, rtol=0, atol=1e-15)
    back = form.azimuth_elevation(theirs)
    np.testing.assert_allclose(back[:, 0], erfa.anp(erfa.c2s(theirs)[0]), rtol=0, atol=1e-12)
    np.testing.assert_allclose(back[:, 1], latitude, rtol=0, atol=1e-15)


def test_roll_of_a_mark_towards_a_second_direction_is_erfas_position_angle() -> None:
    """SOFA pap(a, b): at a, from north through east to b; east is clockwise seen along the boresight outwards."""
    form = DirectionRoll(pole=Z, zero_azimuth=X, boresight=X, mark=Z, clockwise=False, roll_right_handed=False)
    rng = np.random.default_rng(12)
    for a, b in [((1.0, 0.1, 0.2), (-3.0, 1e-3, 0.2)), *rng.normal(size=(50, 2, 3))]:
        boresight = np.array(a) / np.linalg.norm(a)
        mark = b - (np.array(b) @ boresight) * boresight
        mark /= np.linalg.norm(mark)
        R = np.column_stack([boresight, np.cross(mark, boresight), mark])
        assert form.numbers(R).values[2] == pytest.approx(erfa.pap(np.array(a), np.array(b)), abs=1e-14)


@pytest.mark.parametrize(
    ("mark", "axes", "angles"),
    [
        (Y, (3, 1, 3), lambda ra, dec: (np.pi / 2 - dec, np.pi / 2 + ra)),
        (-X, (3, 2, 3), lambda ra, dec: (np.pi / 2 - dec, ra)),
    ],
    ids=["twist from the 3-1-3 form", "twist from the 3-2-3 form"],
)
def test_right_ascension_declination_twist_against_cspice(mark: np.ndarray, axes: tuple[int, ...], angles) -> None:
    """NAIF required reading names both: the same three words, marks a quarter turn apart."""
    form = DirectionRoll(pole=Z, zero_azimuth=X, boresight=Z, mark=mark, clockwise=False)
    rng = np.random.default_rng(13)
    for ra, dec, twist in rng.uniform([0, -1.5, -3], [6, 1.5, 3], (50, 3)):
        C = spiceypy.eul2m(twist, *angles(ra, dec), *axes)
        np.testing.assert_allclose(form.rotation((ra, dec, twist)).T, C, rtol=0, atol=1e-15)
        np.testing.assert_allclose(form.numbers(C.T).values, (ra, dec, twist), rtol=0, atol=1e-13)


def test_two_numbers_fix_a_direction_only() -> None:
    form = DirectionRoll(pole=-Z, zero_azimuth=X, boresight=X, mark=-Z, with_roll=False)
    with pytest.raises(AttitudeError, match="leave the turn about the boresight free"):
        form.rotation((0.3, 0.2))
    one, two = form.rotation((0.3, 0.2), roll=0.0), form.rotation((0.3, 0.2), roll=1.0)
    np.testing.assert_allclose(one[:, 0], two[:, 0], rtol=0, atol=1e-15)
    np.testing.assert_allclose(form.numbers(two).values, (0.3, 0.2), rtol=0, atol=1e-15)
    # azimuth clockwise from north in north-east-down: east is +90 deg
    np.testing.assert_allclose(form.direction(np.pi / 2, 0.0), Y, rtol=0, atol=1e-15)
    np.testing.assert_allclose(form.direction(0.0, np.pi / 2), -Z, rtol=0, atol=1e-15)


def test_rotation_vector_against_scipy_margin_and_gain(random_attitudes: Rotation) -> None:
    form, R = RotationVector(), random_attitudes.as_matrix()
    found = form.numbers(R)
    np.testing.assert_allclose(found.values, random_attitudes.as_rotvec(), rtol=0, atol=1e-14)
    np.testing.assert_allclose(found.margin, np.pi - random_attitudes.magnitude(), rtol=0, atol=1e-14)
    step = 1e-6 * Rotation.random(len(R), random_state=9).as_rotvec()
    moved = form.numbers((Rotation.from_rotvec(step) * random_attitudes).as_matrix()).values
    near = found.margin > 1e-3
    growth = np.linalg.norm(moved - found.values, axis=1) / np.linalg.norm(step, axis=1)
    assert np.max((growth - form.gain(R))[near]) < 1e-5
    half_turn = np.diag([1.0, -1.0, -1.0])
    assert form.numbers(half_turn).singular
    np.testing.assert_array_equal(form.numbers(half_turn).values, [np.pi, 0.0, 0.0])
