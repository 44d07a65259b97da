"""The sounding rocket end to end: figures that can be checked by hand.

By hand: counted from the pad the angles lock with the nose level, so that a cone of a deg about straight up leaves
90 - a; counted from level flight they lock on the pad. The same holds for the platform: its innermost axis points east.
"""

from __future__ import annotations

import pytest

NANODEGREE = 1e-9


def test_it_computes_to_exit_code_zero_with_a_package(emberstaff) -> None:
    assert emberstaff.code == 0, emberstaff.screen
    assert {calculation["state"] for calculation in emberstaff.results["calculations"]} == {"computed"}
    assert (emberstaff.folder / "package.html").stat().st_size > 10_000
    assert (emberstaff.folder / "package.pdf").read_bytes().startswith(b"%PDF")


def test_every_independent_check_agrees(emberstaff) -> None:
    checks = [check for calculation in emberstaff.results["calculations"] for check in calculation["checks"]]
    assert len(checks) > 40
    assert all(check["agrees"] for check in checks)


@pytest.mark.parametrize(("region", "cone"), [("tower", 3.0), ("boost", 20.0), ("coast", 40.0)])
def test_margins_counted_from_the_pad_are_ninety_degrees_less_the_cone(emberstaff, region: str, cone: float) -> None:
    for quantity, of in (("lock margin", "pad"), ("gimbal clearance", "platform")):
        found = emberstaff.result(quantity, of, region)
        assert found["lo"] == pytest.approx(90.0 - cone, abs=NANODEGREE)
        assert found["basis"] == "certified bound"
    assert emberstaff.result("lock margin", "aircraft", region)["hi"] == pytest.approx(0.0, abs=NANODEGREE)


def test_counted_from_level_flight_the_requirement_is_not_met(emberstaff) -> None:
    rows = {row["name"]: row["verdict"] for row in emberstaff.requirement("EM-01")["candidates"]}
    assert rows["aircraft"] == "does not meet"
    assert rows["pad"] == "meets"


def test_the_star_camera_is_off_its_drawing_by_what_was_planted(emberstaff) -> None:
    # planted: 0.031 deg about forward (the boresight), -0.084 about starboard, 0.052 about down, one small turn
    boresight = emberstaff.result("boresight error", "star-camera", None)["hi"]
    clocking = emberstaff.result("clocking error", "star-camera", None)["hi"]
    assert boresight == pytest.approx((0.084**2 + 0.052**2) ** 0.5, abs=1e-4)
    assert clocking == pytest.approx(0.031, abs=1e-4)


def test_the_fourth_axis_keeps_the_platform_away_from_lock(emberstaff) -> None:
    assert emberstaff.result("gimbal clearance", "platform-four", "tip-over")["attained"] > 30.0
