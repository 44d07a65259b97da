"""Each template's numbers against something published, through the very calls its cells make.

* published check of envelope-sweep
* published check of convention-derivation
* published check of sensor-mount-check
* published check of convention-crosswalk
* published check of zero-attitude
* published check of onboard-threshold
* published check of switched-conventions
* published check of direction-clearance
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from trunnion.errors import CalculationError
from trunnion.sheet.clearance import DirectionClearance
from trunnion.sheet.crosswalk import ConventionCrosswalk
from trunnion.sheet.derivation import ConventionDerivation
from trunnion.sheet.mount import MountCheck
from trunnion.sheet.onboard import OnboardThreshold
from trunnion.sheet.sweep import EnvelopeSweep
from trunnion.sheet.switching import SwitchedConventions
from trunnion.sheet.zero import ZeroAttitude

LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
SITE = {"name": "site", "axes": ["east", "north", "up"], "north": "true", "carried": "along"}
HULL = {"name": "hull", "axes": ["forward", "port", "up"]}


def stated(name: str, sequence: str, reference: dict = LOCAL, body: dict = BODY) -> dict[str, Any]:
    """A plain convention as a spec states it."""
    return {
        "name": name,
        "reference": reference,
        "body": body,
        "sequence": sequence,
        "about": "moving axes",
        "angles": ["first", "second", "third"],
        "positive": "by axis",
        "maps": "body to reference",
    }


def pose(name: str, quaternion: list[float]) -> dict[str, Any]:
    """A region of one listed attitude, quaternion scalar first."""
    return {
        "name": name,
        "poses": [{"quaternion": quaternion, "scalar": "first", "maps": "body to local"}],
        "reference": LOCAL,
        "body": BODY,
    }


def results(shown: list[dict[str, Any]], quantity: str) -> dict[tuple[str, str], dict[str, Any]]:
    """Recorded results of one quantity by (of, over)."""
    return {
        (item["of"], item["over"]): item for item in shown if item["kind"] == "result" and item["quantity"] == quantity
    }


def test_published_check_of_envelope_sweep(shown: list) -> None:
    # PX4/PX4-Autopilot 26599 (2026): quaternion (-0.50009, -0.49912, 0.50071, -0.50009), 0.0933 deg from straight
    # down, where yaw-pitch-roll prints roll -77.8 and yaw 167.7; read yaw-roll-pitch the same attitude is regular.
    # RobotLocomotion/drake 14114 (2020): pitch -89.9803 deg, printed as forbidden within 0.458371 deg = asin(0.008).
    q = np.array([-0.50009, -0.49912, 0.50071, -0.50009])
    half = np.radians(-89.9803) / 2
    sweep = EnvelopeSweep(
        conventions={"ordinary": stated("ordinary", "3-2-1"), "wing last": stated("wing last", "3-1-2")},
        envelopes={
            "hanging": pose("hanging", list(q / np.linalg.norm(q))),
            "solver": pose("solver", [float(np.cos(half)), 0.0, float(np.sin(half)), 0.0]),
        },
    )
    sweep.show_margins()
    found = results(shown, "lock margin")
    assert found["ordinary", "hanging"]["lo"] == pytest.approx(0.0933, abs=1e-4)
    assert found["wing last", "hanging"]["lo"] > 89.0
    assert found["ordinary", "solver"]["lo"] == pytest.approx(90.0 - 89.9803, abs=1e-9)
    assert 1 / np.sin(np.radians(found["ordinary", "solver"]["lo"])) == pytest.approx(2908.4, abs=1.0)
    sweep.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")


def test_published_check_of_convention_derivation(shown: list) -> None:
    # kornia PR 3993 (for issue 3950), review text: with roll pinned to zero, yaw carries yaw - roll at pitch +90 deg
    # and yaw + roll at -90 deg; (roll, pitch, yaw) = (0.1, +-pi/2, 0.2) gives yaw 0.1 and 0.3.
    work = ConventionDerivation(convention=stated("ordinary", "3-2-1"))
    for number, pitch, yaw in ((0, np.pi / 2, 0.1), (1, -np.pi / 2, 0.3)):
        matrix = work.convention.matrix([0.2, pitch, 0.1])
        assert work.derivation.combination(number, matrix) == pytest.approx(yaw, abs=1e-12)
    # Diebel 2006, eq. 290 as public code cites it: roll = atan2(r23, r33), pitch = -asin(r13), yaw = atan2(r12, r11)
    # of the matrix that takes world to body (ours transposed).
    angles = np.array([0.3, 0.5, -0.7])
    r = work.convention.matrix(angles).T
    diebel = [np.arctan2(r[0, 1], r[0, 0]), -np.arcsin(r[0, 2]), np.arctan2(r[1, 2], r[2, 2])]
    assert np.allclose(work.derivation.angles(r.T), diebel, rtol=0, atol=1e-14)
    work.show_rates()
    assert {item["lo"] for item in results(shown, "rank of the rate matrix at lock").values()} == {2}


def test_published_check_of_sensor_mount_check(shown: list) -> None:
    # rosflight/rosflight_firmware 148 (2017): on an upside-down board z and y change sign together and x stays; Proton
    # launcher, commission report of 2013: angular rate sensors turned by 180 deg about x read (+, -, -).
    check = MountCheck(
        mount={
            "name": "board",
            "host": BODY,
            "axes": {"x": "forward", "y": "port", "z": "up"},
            "accelerometer": "specific force",
            "instruments": ["accelerometer", "gyro"],
        },
        envelopes={},
    )
    gyro = check.table.expected.gyro
    assert gyro is not None
    assert np.array_equal(np.sign(np.diag(gyro)).astype(int), [1, -1, -1])
    assert check.matrix_check.properness.determinant == pytest.approx(1.0)
    check.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")


def test_published_check_of_convention_crosswalk(shown: list) -> None:
    # naval-group/LOTUSim 32 (2026): a spawn heading of 30 deg in an east-north-up world is 60 deg in north-east-down
    # (the report got -30). REP-103 fixes the frames: x forward, y left, z up; yaw 0 = east, counter-clockwise.
    walk = ConventionCrosswalk(
        first=stated("site", "3-2-1", SITE, HULL), second=stated("ordinary", "3-2-1"), envelopes={}
    )
    for enu, ned in ((30.0, 60.0), (0.0, 90.0), (90.0, 0.0), (-120.0, -150.0)):
        angles, _ = walk.walk.angles(np.radians([enu, 0.0, 0.0]))
        assert np.degrees(angles[0]) == pytest.approx(ned, abs=1e-9)
    walk.show_map()
    lines = [line for item in shown if item["kind"] == "statement" for line in item["paragraphs"]]
    assert any("90° − first of site" in line for line in lines)
    walk.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")


def test_every_shown_item_of_the_cross_walk_can_be_shown(shown: list, plain: Callable[..., dict[str, Any]]) -> None:
    parts = plain("convention", "ordinary", "wing-last")
    walk = ConventionCrosswalk(
        first=parts["ordinary"], second=parts["wing-last"], envelopes=plain("envelope", "hover", "cruise")
    )
    for name in ("inputs", "assumptions", "statements", "frames", "map", "table", "rates", "amplification", "probes"):
        getattr(walk, f"show_{name}")()
    walk.show_checks()
    walk.show_results()
    bounds = results(shown, "error amplification")
    # With the wing at 45 deg from the vertical at worst and the nose anywhere: sqrt(2 / (1 - cos 45 deg)).
    assert bounds["ordinary to wing-last", "cruise"]["hi"] <= np.sqrt(2 / (1 - np.cos(np.radians(45.0)))) + 1e-9


def carried_to(*directions: str) -> dict[str, Any]:
    """Listed poses whose body z axis (down) lies along each of these reference directions."""
    across = {"north": "east", "east": "down", "down": "north"}
    return {
        "name": "poses",
        "poses": [{"down": direction, "forward": across[direction]} for direction in directions],
        "reference": LOCAL,
        "body": BODY,
    }


def test_published_check_of_zero_attitude(shown: list) -> None:
    # The line farthest from three perpendicular ones makes arccos(1/sqrt 3) = 54.7356 deg with each (the angle between
    # a cube's diagonal and its edges; any solid geometry text), and a cone of 30 deg leaves 60 deg to its own axis's
    # perpendicular.
    three = ZeroAttitude(
        convention=stated("last about down", "1-2-3"), envelopes={"poses": carried_to("north", "east", "down")}
    )
    three.show_free()
    best = results(shown, "lock margin with best zero")["last about down", "reference side"]
    assert best["lo"] == pytest.approx(54.735610317, abs=1e-8)
    assert best["hi"] == pytest.approx(54.735610317, abs=1e-8)
    three.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")
    shown.clear()
    cone = {
        "name": "cone",
        "cone": {"axis": "down", "around": "down", "half angle": "30 deg", "roll": "any"},
        "reference": LOCAL,
        "body": BODY,
    }
    ZeroAttitude(convention=stated("last about down", "1-2-3"), envelopes={"cone": cone}).show_free()
    best = results(shown, "lock margin with best zero")["last about down", "reference side"]
    assert best["lo"] == pytest.approx(60.0, abs=0.01)
    assert best["hi"] == pytest.approx(60.0, abs=0.01)


def test_published_check_of_onboard_threshold(shown: list) -> None:
    # RobotLocomotion/drake 14114 (2020): |cos pitch| < 0.008 is refused, printed there as 0.458371 deg; about seven
    # binary digits of an outer angle are lost at that distance (its source, value from memory).
    from trunnion.attitude.onboard import ExtractionForm, Precision, consequences

    (row,) = consequences(ExtractionForm.TWO_ARCTANGENTS, Precision.DOUBLE, [np.radians(0.458371)])
    assert np.sin(row.threshold) == pytest.approx(0.008, abs=1e-8)
    assert row.bits_lost == pytest.approx(7.0, abs=0.05)
    work = OnboardThreshold(
        convention=stated("ordinary", "3-2-1"), precision="float64", extraction="residual form", accuracy="0.001 deg"
    )
    for name in ("inputs", "assumptions", "errors", "thresholds", "consequences", "residual_form", "checks", "results"):
        getattr(work, f"show_{name}")()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")
    assert results(shown, "margin for the lock branch")["ordinary", "float64, residual form"]["hi"] == 0.0


def test_words_that_are_no_precision_are_refused() -> None:
    with pytest.raises(CalculationError, match="float32, float64"):
        OnboardThreshold(
            convention=stated("ordinary", "3-2-1"), precision="single", extraction="residual form", accuracy="1 deg"
        )


ANYWHERE = {
    "name": "anywhere",
    "cone": {"axis": "forward", "around": "north", "half angle": "180 deg", "roll": "any"},
    "reference": LOCAL,
    "body": BODY,
}


def test_published_check_of_switched_conventions(shown: list) -> None:
    # Two sequences that share their first axis and differ in the last (3-2-1 with 3-1-2) can both be no nearer to
    # lock than two perpendicular lines to a third: 45 deg. Three perpendicular ones leave arccos(1/sqrt 3), that is
    # 54.7356 deg, the angle between a cube's diagonal and its edges (any text of solid geometry).
    conventions = {
        "nose last": stated("nose last", "3-2-1"),
        "wing last": stated("wing last", "3-1-2"),
        "belly last": stated("belly last", "3-1-3"),
    }
    work = SwitchedConventions(
        conventions=conventions,
        envelopes={"anywhere": ANYWHERE},
        threshold="20 deg",
        max_body_rate="100 deg/s",
        attitude_error="0 deg",
    )
    work.show_sets()
    found = results(shown, "switched lock margin")
    pair = found["nose last with wing last", None]
    assert pair["lo"] <= 45.0 <= pair["hi"]
    assert pair["hi"] - pair["lo"] < 0.11
    triple = found["nose last with wing last with belly last", None]
    assert triple["lo"] <= 54.735610317 <= triple["hi"]
    work.show_rule()
    (dwell,) = [
        item
        for item in shown
        if item["kind"] == "result" and item["of"] == "nose last with wing last" and item["unit"] == "s"
    ]
    assert dwell["lo"] == pytest.approx((45.0 - 20.0) / 100.0, abs=2e-3)
    work.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")


def test_published_check_of_direction_clearance(shown: list) -> None:
    # zivid/zivid-ros 108 (2024): the printed camera-to-base matrix holds the optical axis 3.3538 deg from straight
    # down. It is printed with seven digits, so the nearest rotation is used.
    printed = np.array(
        [
            [-0.003973591, 0.9993435, 0.03601083],
            [0.9989207, 0.005633254, -0.04610426],
            [-0.04627685, 0.03578877, -0.9982873],
        ]
    )
    U, _, Vt = np.linalg.svd(printed)
    camera = (U @ Vt).tolist()
    base = {"name": "base", "axes": ["north", "west", "up"], "north": "true", "carried": "fixed at a point"}
    optics = {"name": "optics", "axes": ["right", "down", "forward"]}
    work = DirectionClearance(
        directions={"optical axis": {"body": "forward", "reference": "down"}},
        reference=base,
        body=optics,
        envelopes={
            "hand": {
                "name": "hand",
                "poses": [{"matrix": camera, "maps": "optics to base"}],
                "reference": base,
                "body": optics,
            }
        },
    )
    work.show_clearances()
    found = results(shown, "least direction clearance")["optical axis", "hand"]
    assert found["lo"] == pytest.approx(3.3538, abs=2e-4)
    work.show_checks()
    assert all(item["agrees"] for item in shown if item["kind"] == "check")
