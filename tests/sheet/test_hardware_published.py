"""Budgets, surveys, frame chains and gimbals against something published, through the very calls their cells make.

* published check of error-budget
* published check of alignment-survey
* published check of gimbal-travel
* published check of frame-chain
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from trunnion.errors import TrunnionError
from trunnion.sheet.budget import ErrorBudget
from trunnion.sheet.frame_chain import FrameChainCheck
from trunnion.sheet.gimbal import GimbalTravel
from trunnion.sheet.mount import MountCheck
from trunnion.sheet.survey import AlignmentSurvey

LEVEL = {"name": "level", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
HULL = {"name": "hull", "axes": ["forward", "starboard", "down"]}
BOAT = {
    "name": "boat",
    "reference": LEVEL,
    "body": HULL,
    "sequence": "3-2-1",
    "about": "moving axes",
    "angles": ["heading", "pitch", "roll"],
    "positive": "by axis",
    "maps": "body to reference",
}

# ECSS-E-ST-60-10C (15 November 2008), annex C: one sigma a contributor, arc seconds, printed with two decimals.
ECSS_TERMS = {
    "STR time": ([10, 5, 5], ["APE", "RPE"]),
    "STR bias": ([6.67, 3.33, 3.33], ["APE"]),
    "controller": ([3.16, 3.16, 3.16], ["APE", "RPE"]),
    "thermoelastic": ([1.63, 1.63, 1.63], ["APE"]),
    "misalignment": ([2.89, 2.89, 2.89], ["APE"]),
    "targeting": ([3.54, 0.71, 3.54], ["APE"]),
    "flexible": ([2.12, 3.54, 2.12], ["APE", "RPE"]),
}
ECSS_BUDGET = {
    "name": "annex C",
    "axes": ["x", "y", "z"],
    "terms": [
        {
            "name": name,
            "kind": "sensor",
            "source": "annex C",
            "gaussian": [f"{value} arcsec" for value in sigma],
            "counts in": counts,
        }
        for name, (sigma, counts) in ECSS_TERMS.items()
    ],
}


def results(shown: list[dict[str, Any]], quantity: str) -> dict[tuple[str, Any], dict[str, Any]]:
    """Recorded results of one quantity by (of, over)."""
    return {
        (item["of"], item["over"]): item for item in shown if item["kind"] == "result" and item["quantity"] == quantity
    }


def agreed(shown: list[dict[str, Any]]) -> int:
    """How many checks were shown; all of them must agree."""
    checks = [item for item in shown if item["kind"] == "check"]
    assert all(item["agrees"] for item in checks), [item["id"] for item in checks if not item["agrees"]]
    return len(checks)


@pytest.mark.parametrize(
    ("index", "limit", "published", "within"),
    [
        ("APE", ["60 arcsec", "20 arcsec", "20 arcsec"], (27.01, 16.75, 17.21), (True, True, True)),
        ("RPE", ["30 arcsec", "10 arcsec", "10 arcsec"], (21.40, 13.78, 12.57), (True, False, False)),
    ],
)
def test_published_check_of_error_budget(
    index: str, limit: list[str], published: tuple[float, ...], within: tuple[bool, ...], shown: list
) -> None:
    work = ErrorBudget(budget=ECSS_BUDGET, limit=limit, index=index)
    work.show_sums()
    found = results(shown, "pointing error at 2 sigma")
    for axis, value in zip("xyz", published, strict=True):
        # rows are rounded to 0.005, and so is the sum that was doubled
        assert 3600 * found["annex C", axis]["hi"] == pytest.approx(value, abs=0.011)
    assert work.total.within == within
    work.show_checks()
    assert agreed(shown) == 4


def test_published_check_of_alignment_survey(shown: list) -> None:
    # Schaub & Junkins, Analytical Mechanics of Space Systems, problem 3.38, public solution: optimal rotation of two
    # pairs with equal weights, 15 decimals; reference to body, so the reference directions are the sensor's here.
    body = [[0.8273, 0.5541, -0.0920], [-0.8285, 0.5522, -0.0955]]
    inertial = [[-0.1517, -0.9669, 0.2050], [-0.8393, 0.4494, -0.3044]]
    published = [
        [0.4159363752581368, -0.8548935345184778, 0.31008704644926177],
        [-0.833756672976915, -0.4946367741646909, -0.24532482938017944],
        [0.36310706685988364, -0.1564976238875619, -0.9185106160050407],
    ]
    rows = [{"sensor": n, "host": b} for n, b in zip(inertial, body, strict=True)]
    work = AlignmentSurvey(survey={"name": "pair", "host": HULL, "sightings": rows, "accuracy": "1 arcmin"})
    work.show_fit()
    np.testing.assert_allclose(work.found.R_bs, published, rtol=0, atol=5e-15)
    work.show_checks()
    assert agreed(shown) == 2


def test_covariance_is_the_closed_form_of_an_orthogonal_pair(shown: list) -> None:
    # Markley 1988: P = diag(s2^2, s1^2, 1/(s1^-2 + s2^-2)) for directions along x and y.
    rows = [
        {"sensor": [1, 0, 0], "host": [1, 0, 0], "accuracy": "0.0001 rad"},
        {"sensor": [0, 1, 0], "host": [0, 1, 0], "accuracy": "0.0003 rad"},
    ]
    work = AlignmentSurvey(survey={"name": "pair", "host": HULL, "sightings": rows, "accuracy": "1 arcmin"})
    np.testing.assert_allclose(work.found.covariance, np.diag([9e-8, 1e-8, 9e-9]), rtol=1e-10, atol=1e-18)


def _joint(name: str, axis: str, **limits: Any) -> dict[str, Any]:
    return {"name": name, "axis": axis, "travel": "any", **limits}


def _pedestal(rate: str) -> dict[str, Any]:
    return {
        "name": "pedestal",
        "base": LEVEL,
        "boresight": "north",
        "joints": [_joint("azimuth", "down", **{"max rate": rate}), _joint("elevation", "east")],
    }


def test_published_check_of_gimbal_travel(shown: list) -> None:
    # The keyhole formula of the trade: an azimuth limit of 1/cos(85 deg) = 11.473713245669854 line of sight rates
    # follows down to a zenith distance of 5 deg.
    work = GimbalTravel(
        gimbal=_pedestal("11.473713245669854 deg/s"), envelopes={}, passes={}, sectors={}, sight_rate="1 deg/s"
    )
    work.show_keyhole()
    assert results(shown, "keyhole half angle")["pedestal", None]["hi"] == pytest.approx(5.0, abs=1e-9)
    work.show_checks()
    assert agreed(shown) == 2


def test_two_axes_level_a_deck_by_plain_trigonometry(shown: list) -> None:
    # Plain trigonometry (common practice): with the outer axis fore and aft and the inner one across, the outer ring
    # undoes the roll and the inner one the pitch, and lock is 90 deg less the pitch away.
    leveller = {
        "name": "leveller",
        "base": HULL,
        "boresight": "up",
        "joints": [_joint("roll ring", "forward"), _joint("pitch ring", "starboard")],
    }
    deck = {
        "name": "deck",
        "convention": BOAT,
        "box": {"heading": "any", "pitch": ["-12 deg", "20 deg"], "roll": ["-35 deg", "35 deg"]},
    }
    work = GimbalTravel(gimbal=leveller, envelopes={"deck": deck}, passes={}, sectors={}, host_rate="10 deg/s")
    work.show_host_clearance()
    work.show_host_rates()
    assert results(shown, "gimbal clearance")["leveller", "deck"]["lo"] == pytest.approx(70.0, abs=1e-9)
    rate = results(shown, "joint rate of roll ring")["leveller", "deck"]["hi"]
    assert rate == pytest.approx(10.0 / np.cos(np.radians(20.0)), abs=1e-9)
    from trunnion.sheet.parameters import convention

    attitude = convention(BOAT).matrix(np.radians([77.0, 14.0, -9.0]))
    angles = np.degrees(work.host.solutions(attitude[None]).angles[0])
    assert min(np.max(np.abs(row - [9.0, -14.0])) for row in angles) < 1e-9
    work.show_checks()
    assert agreed(shown) >= 3


def test_a_skewed_chain_has_the_unreachable_cones_of_the_published_set(shown: list) -> None:
    # Piovan & Bullo 2012: three axes reach |l12 - l23| <= d <= pi - |pi - l12 - l23|; here 90 and 60 deg leave two
    # cones of 30 deg out of reach.
    tilted = [float(np.cos(np.radians(60))), 0.0, float(np.sin(np.radians(60)))]
    chain = {
        "name": "skewed",
        "base": HULL,
        "joints": [
            _joint("one", "down"),
            _joint("two", "forward"),
            {"name": "three", "axis": tilted, "travel": "any"},
        ],
    }
    work = GimbalTravel(gimbal=chain, envelopes={}, passes={}, sectors={})
    work.show_chain()
    found = results(shown, "unreachable cone")
    assert found["skewed", "ahead"]["hi"] == pytest.approx(30.0, abs=1e-9)
    assert found["skewed", "behind"]["hi"] == pytest.approx(30.0, abs=1e-9)


def test_published_check_of_frame_chain(shown: list) -> None:
    # REP-103: a camera's optical frame (x right, y down, z ahead) sits in the body (forward, left, up) with the
    # quaternion (x, y, z, w) = (-0.5, 0.5, -0.5, 0.5).
    deck = {"name": "deck", "axes": ["forward", "port", "up"]}
    eye = {"name": "eye", "axes": ["x", "y", "z"]}
    seat = {"name": "seat", "of": eye, "in": deck, "constant": {"x": "starboard", "y": "down"}}
    work = FrameChainCheck(links={"seat": seat}, of="eye", relative_to="deck")
    work.show_path()
    work.show_attitude()
    from scipy.spatial.transform import Rotation

    published = Rotation.from_quat([-0.5, 0.5, -0.5, 0.5]).as_matrix()
    np.testing.assert_allclose(work.found.R[0], published, rtol=0, atol=1e-15)
    work.show_errors()
    work.show_checks()
    assert agreed(shown) == 1


BAD_GIMBALS = {
    "parallel": ([_joint("one", "down"), _joint("two", "up")], "from parallel"),
    "no zero": (
        [{"name": "one", "axis": "down", "travel": ["5 deg", "90 deg"]}, _joint("two", "east")],
        "excludes zero",
    ),
    "no rate": ([_joint("one", "down", **{"max rate": "0 deg/s"}), _joint("two", "east")], "above zero"),
    "one axis": ([_joint("one", "down")], "two, three or four"),
    "no unit": ([_joint("one", "down", **{"max rate": "5"}), _joint("two", "east")], "unit"),
}


@pytest.mark.parametrize("name", BAD_GIMBALS)
def test_bad_gimbals_are_refused_with_a_reason(name: str) -> None:
    joints, words = BAD_GIMBALS[name]
    with pytest.raises(TrunnionError, match=words):
        GimbalTravel(gimbal={"name": "g", "base": LEVEL, "joints": joints}, envelopes={}, passes={}, sectors={})


def test_a_polygon_that_crosses_itself_is_refused() -> None:
    corners = [["0 deg", "0 deg"], ["10 deg", "10 deg"], ["10 deg", "0 deg"], ["0 deg", "10 deg"]]
    with pytest.raises(TrunnionError, match="crosses itself"):
        GimbalTravel(
            gimbal=_pedestal("5 deg/s"),
            envelopes={},
            passes={},
            sectors={"bow tie": {"name": "bow tie", "corners": corners}},
        )


def test_a_survey_along_one_line_is_refused() -> None:
    rows = [{"sensor": [1, 0, 0], "host": "forward"}, {"sensor": [-1, 0, 0], "host": "aft"}]
    with pytest.raises(TrunnionError, match="independent"):
        _ = AlignmentSurvey(survey={"name": "s", "host": HULL, "sightings": rows, "accuracy": "1 arcmin"}).found


def test_a_limit_of_zero_is_refused() -> None:
    with pytest.raises(TrunnionError, match="zero or below"):
        _ = ErrorBudget(budget=ECSS_BUDGET, limit="0 deg").total


@pytest.mark.parametrize(
    ("matrix", "words"),
    [
        ([[1, 0, 0], [0, 1, 0], [0, 0, -1]], "mirror"),
        ([[1, 0, 0], [0, 1, 0.2], [0, 0, 1]], "rotation"),
    ],
)
def test_matrices_that_are_no_rotation_are_refused(matrix: list[list[float]], words: str) -> None:
    with pytest.raises(TrunnionError, match=words):
        MountCheck(mount=_tilted_mount(matrix), envelopes={})


def _tilted_mount(matrix: Any) -> dict[str, Any]:
    return {
        "name": "unit",
        "host": HULL,
        "matrix": np.asarray(matrix).tolist(),
        "maps": "sensor to host",
        "instruments": ["camera"],
        "boresight": "z",
    }


def test_boresight_and_clocking_stay_apart_and_a_transposed_matrix_is_named(shown: list) -> None:
    from scipy.spatial.transform import Rotation

    drawn = Rotation.from_euler("ZYX", [40, 20, 10], degrees=True)
    clocked = drawn * Rotation.from_euler("z", 0.4, degrees=True)
    work = MountCheck(mount=_tilted_mount(clocked.as_matrix()), drawing=_tilted_mount(drawn.as_matrix()), envelopes={})
    work.show_comparison()
    assert results(shown, "boresight error")["unit", None]["hi"] == pytest.approx(0.0, abs=1e-6)
    assert results(shown, "clocking error")["unit", None]["hi"] == pytest.approx(0.4, abs=1e-9)
    turned = MountCheck(
        mount=_tilted_mount(drawn.as_matrix().T), drawing=_tilted_mount(drawn.as_matrix()), envelopes={}
    )
    turned.show_comparison()
    assert any("transposed" in item["text"] for item in shown if item["kind"] == "finding")


def test_a_tilt_pair_is_not_pitch_and_roll(shown: list) -> None:
    # Plain trigonometry (common practice): at pitch p and roll r of the 3-2-1 sequence the starboard axis dips by
    # asin(sin r cos p); taken for a roll it turns the boat by the difference about its fore and aft axis.
    mount = {
        "name": "clinometer",
        "host": HULL,
        "axes": {"x": "forward", "y": "starboard", "z": "down"},
        "instruments": ["clinometer"],
        "clinometer": "sine",
        "tilt axes": ["x", "y"],
    }
    pitch, roll = np.radians(25.0), np.radians(40.0)
    pose = {
        "name": "pose",
        "poses": [{"angles": ["70 deg", "25 deg", "40 deg"], "convention": BOAT}],
        "reference": LEVEL,
        "body": HULL,
    }
    work = MountCheck(mount=mount, envelopes={"pose": pose})
    work.show_tilts()
    found = results(shown, "tilt pair taken for pitch and roll")["clinometer", "pose"]["attained"]
    assert found == pytest.approx(np.degrees(roll - np.arcsin(np.sin(roll) * np.cos(pitch))), abs=1e-9)
    work.show_checks()
    assert agreed(shown) >= 2


def test_further_sightings_come_from_a_table(tmp_path: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "inputs").mkdir()
    text = "sensor_1,sensor_2,sensor_3,host_1,host_2,host_3,accuracy\n0,0,1,0,0,1,\n0.6,0.8,0,0.6,0.8,0,5 arcmin\n"
    (tmp_path / "inputs" / "more.csv").write_text(text, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    rows = [{"sensor": "x", "host": "forward"}, {"sensor": "y", "host": "starboard"}]
    plain = {"name": "bay", "host": HULL, "sightings": rows, "accuracy": "1 arcmin"}
    work = AlignmentSurvey(survey=plain, table="more.csv")
    assert len(work.found.residuals) == 4
    np.testing.assert_allclose(np.degrees(work.data["sigma"]) * 60, [1, 1, 1, 5], rtol=0, atol=1e-12)
    (tmp_path / "inputs" / "bad.csv").write_text("sensor_1\n1\n", encoding="utf-8")
    with pytest.raises(TrunnionError, match="no column 'sensor_2'"):
        AlignmentSurvey(survey=plain, table="bad.csv")
