"""What words mean, against scipy: senses, zero on either side, constants, standards, ranges, mounts."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import TrunnionError
from trunnion.spec.build import (
    budget_from_plain,
    convention_from_plain,
    frame_from_plain,
    gimbal_from_plain,
    link_from_plain,
    mount_from_plain,
    pass_from_plain,
    region_from_plain,
    sector_from_plain,
    survey_from_plain,
)

ROUNDING = 4e-15  # a few products of double precision
LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
YARD = {"name": "yard", "axes": ["east", "north", "up"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
FLU = {"name": "flu", "axes": ["forward", "port", "up"]}
ANGLES = (10.0, -35.0, 50.0)  # degrees; tells all readings of a triple apart


def convention(**changes):
    keys = {key.replace("_", " "): value for key, value in changes.items()}
    plain = {
        "name": "tried", "reference": LOCAL, "body": BODY, "sequence": "3-2-1", "about": "moving axes",
        "angles": ["heading", "elevation", "bank"], "maps": "body to reference", **keys,
    }  # fmt: skip
    return convention_from_plain({key: value for key, value in plain.items() if value is not None})


def close(actual, expected):
    np.testing.assert_allclose(actual, expected, atol=ROUNDING, rtol=0)


@pytest.mark.parametrize("sequence", ["321", "3-2-1", "z-y-x", "ZYX", 321])
def test_a_sequence_is_read_in_every_usual_writing(sequence):
    if isinstance(sequence, int):
        with pytest.raises(TrunnionError):
            convention(sequence=sequence)  # plain forms carry text; the file's 321 becomes text when read
        return
    expected = Rotation.from_euler("ZYX", ANGLES, degrees=True).as_matrix()
    close(convention(sequence=sequence).matrix(np.radians(ANGLES)), expected)


def test_fixed_axes():
    """scipy: small letters are turns about fixed axes, in the order written."""
    expected = Rotation.from_euler("zyx", ANGLES, degrees=True).as_matrix()
    close(convention(about="fixed axes").matrix(np.radians(ANGLES)), expected)


@pytest.mark.parametrize(
    ("body", "reference", "positive", "signs"),
    [
        (BODY, LOCAL, {"heading": "nose right", "elevation": "nose up", "bank": "starboard down"}, (1, 1, 1)),
        (BODY, LOCAL, {"heading": "bow east", "elevation": "bow down", "bank": "starboard side up"}, (1, -1, -1)),
        (BODY, LOCAL, {"heading": "nose left", "elevation": "tail down", "bank": "port wing up"}, (-1, 1, 1)),
        (FLU, YARD, {"heading": "nose right", "elevation": "nose up", "bank": "starboard down"}, (-1, -1, 1)),
        (FLU, YARD, {"heading": "by axis", "elevation": "against axis", "bank": "port up"}, (1, -1, 1)),
        (BODY, LOCAL, "by axis", (1, 1, 1)),
    ],
)
def test_senses_from_the_motion_they_name(body, reference, positive, signs):
    """By hand: z-up frames turn the nose left for a right-handed heading, and down for a right-handed elevation."""
    assert convention(body=body, reference=reference, positive=positive).signs == signs


def test_senses_hold_where_the_words_say_seen_by_moving_a_little():
    """Independent of the rule used: make a small turn with the finished convention and look where the axis went."""
    tried = convention(
        body=FLU, reference=YARD, positive={"heading": "nose right", "elevation": "nose up", "bank": "port up"}
    )
    zero = tried.matrix(np.zeros(3))
    small = 1e-3
    for index, (axis, towards) in enumerate(
        (([1, 0, 0], zero @ [0, -1, 0]), ([1, 0, 0], [0, 0, 1]), ([0, 1, 0], [0, 0, 1]))
    ):
        moved = tried.matrix(np.eye(3)[index] * small) @ axis - zero @ axis
        assert moved @ towards == pytest.approx(small, rel=1e-2)


def test_zero_on_either_side():
    """R = Z E on the reference side, R = E Z on the body side, for moving and fixed axes alike (scipy)."""
    Z = Rotation.from_matrix(np.column_stack([[0, 0, -1], [0, 1, 0], [1, 0, 0]]))  # forward up, starboard east
    for about, letters in (("moving axes", "ZYX"), ("fixed axes", "zyx")):
        E = Rotation.from_euler(letters, ANGLES, degrees=True)
        zero = {"forward": "up", "starboard": "east"}
        one = convention(about=about, zero={**zero, "side": "reference"})
        other = convention(about=about, zero={**zero, "side": "body"})
        close(one.matrix(np.radians(ANGLES)), (Z * E).as_matrix())
        close(other.matrix(np.radians(ANGLES)), (E * Z).as_matrix())
        close(one.matrix(np.zeros(3)), other.matrix(np.zeros(3)))


def test_a_zero_without_a_side_shows_both_readings():
    with pytest.raises(TrunnionError, match=r"if it is on the reference side .* if it is on the body side"):
        convention(zero={"forward": "up", "starboard": "east"})


@pytest.mark.parametrize(
    "turned",
    [
        {"about": "starboard", "angle": "40 deg"},
        {"about": [0, 2, 0], "angle": "40 deg"},
        {"angles": ["0 deg", "40 deg", "0 deg"], "sequence": "3-2-1", "about": "moving axes"},
        {"quaternion": [math.cos(math.radians(20)), 0, math.sin(math.radians(20)), 0], "scalar": "first",
         "maps": "turned to unturned"},
        {"quaternion": [0, -math.sin(math.radians(20)), 0, math.cos(math.radians(20))], "scalar": "last",
         "maps": "unturned to turned"},
        {"matrix": Rotation.from_euler("y", 40, degrees=True).as_matrix().tolist(), "maps": "turned to unturned"},
        {"matrix": Rotation.from_euler("y", -40, degrees=True).as_matrix().tolist(), "maps": "unturned to turned"},
    ],
)  # fmt: skip
def test_one_turned_body_in_seven_writings(turned):
    B = Rotation.from_euler("y", 40, degrees=True)
    E = Rotation.from_euler("ZYX", ANGLES, degrees=True)
    close(convention(body_turned_by=turned).matrix(np.radians(ANGLES)), (E * B).as_matrix())
    if turned.get("about") == "starboard":
        turned = {**turned, "about": "east"}  # the second axis of the other frame
    close(convention(reference_turned_by=turned).matrix(np.radians(ANGLES)), (B * E).as_matrix())


def test_offsets_and_direction_of_the_map():
    tried = convention(offsets={"heading": "90 deg"}, maps="local to body")
    expected = Rotation.from_euler("ZYX", (-80.0, -35.0, 50.0), degrees=True).as_matrix()
    close(tried.matrix(np.radians(ANGLES)), expected)
    close(tried.stated_matrix(tried.matrix(np.radians(ANGLES))), expected.T)


def test_standards_fix_what_they_fix():
    """ISO 8855 as adopted by ASAM OpenDRIVE: z up, positive pitch lowers the nose (read there); order from memory."""
    plain = {"name": "road", "reference": YARD, "body": FLU, "as": "ISO 8855", "maps": "body to reference"}
    road = convention_from_plain(plain)
    assert road.angle_names == ("yaw", "pitch", "roll")
    assert road.matrix(np.radians([0, 10, 0]))[2, 0] == pytest.approx(-math.sin(math.radians(10)))
    assert road.ranges[1] == (-math.pi / 2, math.pi / 2)


def test_mounts_in_four_writings():
    expected = np.column_stack([[0, 0, -1], [0, 1, 0], [1, 0, 0]])  # x up, y starboard, z forward
    base = {"name": "unit", "host": BODY, "accelerometer": "specific force"}
    forms = [
        {"axes": {"x": "up", "y": "starboard", "z": "forward"}},
        {"axes": {"x": "up", "y": "right"}},
        {"angles": ["0 deg", "90 deg", "0 deg"], "sequence": "3-2-1", "about": "moving axes"},
        {"matrix": expected.T.tolist(), "maps": "host to sensor"},
        {"quaternion": [0, math.sqrt(0.5), 0, math.sqrt(0.5)], "scalar": "last", "maps": "unit to body"},
        {"directions": [{"sensor": "x", "host": "up"}, {"sensor": [0, 1, 0], "host": "starboard"}]},
    ]
    for form in forms:
        close(mount_from_plain(base | form).R_bs, expected)


def test_a_sensor_whose_axes_stand_in_for_others():
    """Its z plays the part of forward: the sensor's own 3-2-1 then locks when z, not x, is vertical."""
    plain = {
        "name": "unit", "host": BODY, "accelerometer": "gravity", "axes": {"x": "up", "y": "starboard", "z": "forward"},
        "angles as": {"sequence": "3-2-1", "about": "moving axes", "relative to": LOCAL,
                      "x y z in place of": ["up", "starboard", "forward"]},
    }  # fmt: skip
    own = mount_from_plain(plain).angles_as
    close(own.lock_axes[1], [0, 0, 1])
    close(own.matrix(np.zeros(3)) @ [0, 0, 1], [1, 0, 0])


def box(**ranges):
    plain = {
        "name": "region", "box": ranges,
        "convention": {"name": "c", "reference": LOCAL, "body": BODY, "sequence": "3-2-1", "about": "moving axes",
                       "angles": ["heading", "elevation", "bank"], "maps": "body to reference"},
    }  # fmt: skip
    return region_from_plain(plain, open_table=None)


def test_ranges_of_boxes():
    made = box(heading=["170 deg", "-170 deg"], elevation="5 deg", bank=["-400 deg", "400 deg"])
    lo, hi = made.ranges[0]
    assert (lo, hi) == pytest.approx((math.radians(170), math.radians(190)))
    assert made.ranges[1] == (math.radians(5), math.radians(5))
    assert made.ranges[2][1] - made.ranges[2][0] == pytest.approx(2 * math.pi)
    with pytest.raises(TrunnionError, match="runs from 45 deg down to -45 deg"):
        box(heading="any", elevation="0 deg", bank=["45 deg", "-45 deg"])


def test_unions_products_and_dispersion():
    inner = {"name": "hover", "cone": {"axis": "forward", "around": "up", "half angle": "10 deg", "roll": "any"},
             "reference": LOCAL, "body": BODY}  # fmt: skip
    mount = {"name": "unit", "host": BODY, "axes": {"x": "up", "y": "starboard"}, "accelerometer": "specific force"}
    plain = {"name": "all", "phases": {"one": inner, "two": {
        "name": "two", "product": {"host": inner, "mount": mount}, "dispersion": "1 deg"}}}  # fmt: skip
    made = region_from_plain(plain, open_table=None)
    assert list(made.parts) == ["one", "two"]
    assert made.parts["two"].radius == math.radians(1)
    close(made.parts["two"].region.R_bs[:, 0], [0, 0, -1])


def test_plain_parts_that_are_wrong_say_so():
    with pytest.raises(TrunnionError, match="not written out"):
        convention_from_plain({"name": "c", "reference": "local", "body": BODY, "maps": "body to reference"})
    with pytest.raises(TrunnionError, match="axes"):
        frame_from_plain({"name": "f", "axis": ["x", "y", "z"]})
    with pytest.raises(TrunnionError, match="left-handed"):
        frame_from_plain({"name": "f", "axes": ["forward", "starboard", "up"]})


def test_a_gimbal_turns_its_payload_as_its_words_say():
    """Azimuth about down, elevation about east: scipy's z then y about moving axes, after the payload's own zero."""
    plain = {
        "name": "pedestal", "base": LOCAL, "zero": {"x": "north", "y": "down"},
        "payload": {"name": "dish", "axes": ["x", "y", "z"]},
        "joints": [{"name": "azimuth", "axis": "down", "travel": "any", "max rate": "10 deg/s"},
                   {"name": "elevation", "axis": [0, 2, 0], "travel": ["-5 deg", "95 deg"]}],
    }  # fmt: skip
    chain = gimbal_from_plain(plain)
    zero = np.column_stack([[1, 0, 0], [0, 0, 1], [0, -1, 0]])
    expected = Rotation.from_euler("ZY", (30, 40), degrees=True).as_matrix() @ zero
    close(chain.attitude(np.radians([30, 40])), expected)
    assert chain.joints[0].rate == math.radians(10)
    assert chain.joints[1].travel == (math.radians(-5), math.radians(95))


def test_passes_sectors_surveys_and_budgets_carry_their_numbers():
    circular = pass_from_plain(
        {"name": "p", "circular": {"altitude": "500 km", "highest": "80 deg", "step": "1 s"}}, open_pass=None
    )
    assert math.degrees(math.asin(np.max(-circular.direction_g[:, 2]))) == pytest.approx(80, abs=1e-6)
    table = SimpleNamespace(times=[0.0, 1.0, 2.0], azimuth=[0.0, 0.1, 0.2], elevation=[0.5, 0.5, 0.5])
    columns = {"time": {"column": "t", "unit": "s"}, "azimuth": "a", "elevation": "e", "unit": "deg"}
    made = pass_from_plain({"name": "q", "table": "q.csv", "columns": columns}, open_pass=lambda plain: table)
    assert made.direction_g[0, 2] == pytest.approx(-math.sin(0.5))
    corners = [["10 deg", "0 deg"], ["20 deg", "0 deg"], ["20 deg", "60 deg"]]
    assert sector_from_plain({"name": "mast", "corners": corners}).corners[2, 1] == math.radians(60)
    sightings = [{"sensor": "x", "host": "up"}, {"sensor": "y", "host": "port", "accuracy": "2 arcmin"}]
    survey = survey_from_plain({"name": "s", "host": BODY, "sightings": sightings, "accuracy": "1 arcmin"})
    np.testing.assert_array_equal(survey["in_host"], [[0, 0, -1], [0, -1, 0]])
    np.testing.assert_allclose(survey["sigma"], np.radians([1 / 60, 2 / 60]), rtol=1e-15)


def test_the_pointing_budget_of_a_standard():
    """ECSS-E-ST-60-10C annex C prints x: 13.51 arcsec for the root sum square of these seven terms (see text there)."""
    sigmas = {
        "time": 10,
        "bias": 6.67,
        "control": 3.16,
        "thermal": 1.63,
        "mount": 2.89,
        "targeting": 3.54,
        "flex": 2.12,
    }
    terms = [
        {"name": name, "kind": "sensor", "source": "ECSS-E-ST-60-10C", "gaussian": [f"{sigma} arcsec"]}
        for name, sigma in sigmas.items()
    ]
    total = budget_from_plain({"name": "b", "axes": ["x"], "terms": terms}).total("APE", n_sigma=1.0)
    assert math.degrees(total.sigma[0]) * 3600 == pytest.approx(13.51, abs=0.005)


def test_links_are_constants_or_records():
    turned = {
        "name": "yard-grid",
        "of": YARD,
        "in": LOCAL,
        "constant": {"east": "east", "up": "up"},
        "time offset": "20 ms",
    }
    link = link_from_plain(turned, open_table=None)
    close(link.R_pc, [[0, 1, 0], [1, 0, 0], [0, 0, -1]])
    assert link.time_offset == 0.02
    log = {
        "name": "log", "table": "log.csv", "between samples": "slerp", "max gap": "2 s", "scalar": "first",
        "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": ["a", "b", "c", "d"]},
        "maps": "body to local", "reference": "local", "body": "body", "attitude error": "1 deg",
    }  # fmt: skip
    table = SimpleNamespace(times=[0.0, 1.0], quaternions=[[1.0, 0, 0, 0], [1.0, 0, 0, 0]])
    flown = link_from_plain({"name": "flown", "of": BODY, "in": LOCAL, "attitude": log}, open_table=lambda plain: table)
    assert (flown.parent, flown.child, flown.longest_gap) == ("local", "body", 2.0)
    assert flown.attitude_error == math.radians(1)
