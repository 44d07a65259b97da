"""Budgets, surveys, chains and gimbals are spoiled on purpose, and their own checks must report it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.hardware.budgets import Budget
from trunnion.sheet import gimbal_checks, gimbal_host
from trunnion.sheet import mount as mount_sheet
from trunnion.sheet.budget import ErrorBudget
from trunnion.sheet.frame_chain import FrameChainCheck
from trunnion.sheet.gimbal import GimbalTravel
from trunnion.sheet.survey import AlignmentSurvey
from trunnion.spec import load_workbook
from trunnion.spec.plain import plain_part

Disagreeing = Callable[[], list[str]]
ROOT = Path(__file__).parents[2] / "workbooks"


@pytest.fixture(scope="module")
def boat() -> Any:
    """The survey boat's workbook."""
    return load_workbook(ROOT / "brackwater")


@pytest.fixture
def part(boat: Any) -> Callable[[str, str], dict[str, Any]]:
    """`part("gimbal", "leveller")`: a plain part of the survey boat."""
    return lambda kind, name: plain_part(boat, kind, name)


@pytest.fixture
def leveller(part: Callable[[str, str], dict[str, Any]]) -> GimbalTravel:
    """The levelled instrument over its working conditions."""
    return GimbalTravel(
        gimbal=part("gimbal", "leveller"), envelopes={"heavy": part("envelope", "heavy")}, passes={}, sectors={}
    )


@pytest.fixture
def pedestal(part: Callable[[str, str], dict[str, Any]]) -> GimbalTravel:
    """The antenna pedestal with its passes and sectors."""
    return GimbalTravel(
        gimbal=part("gimbal", "pedestal"),
        envelopes={},
        passes={"overhead": part("pass", "overhead")},
        sectors={"wheelhouse": part("sector", "wheelhouse")},
    )


def test_sound_ones_agree(
    part: Callable[[str, str], dict[str, Any]],
    leveller: GimbalTravel,
    pedestal: GimbalTravel,
    shown: list,
    disagreeing: Disagreeing,
) -> None:
    leveller.show_checks()
    pedestal.show_checks()
    AlignmentSurvey(survey=part("survey", "slipway")).show_checks()
    ErrorBudget(budget=part("budget", "beam")).show_checks()
    assert len([item for item in shown if item["kind"] == "check"]) >= 10
    assert disagreeing() == []


def test_a_wrong_sign_of_a_joint_is_reported(
    leveller: GimbalTravel, disagreeing: Disagreeing, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = gimbal_host.levelling_solutions

    def wrong(*given: Any, **also: Any) -> Any:
        found = sound(*given, **also)
        return replace(found, angles=found.angles * [1.0, -1.0])

    monkeypatch.setattr(gimbal_host, "levelling_solutions", wrong)
    leveller.show_checks()
    assert disagreeing() == ["check:leveller:heavy:held"]


def test_solutions_of_a_chain_with_exchanged_axes_are_reported(
    leveller: GimbalTravel, disagreeing: Disagreeing, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = gimbal_checks.pointing_solutions

    def wrong(*given: Any, **also: Any) -> Any:
        found = sound(*given, **also)
        return replace(found, angles=found.angles[..., ::-1])

    monkeypatch.setattr(gimbal_checks, "pointing_solutions", wrong)
    leveller.show_checks()
    assert "check:leveller:solutions" in disagreeing()


def test_a_clearance_claimed_too_large_is_reported(leveller: GimbalTravel, disagreeing: Disagreeing) -> None:
    sound = leveller.host.clearances["heavy"]
    leveller.host.__dict__["clearances"] = {"heavy": replace(sound, least=sound.least + np.radians(0.5))}
    leveller.show_checks()
    assert disagreeing() == ["check:leveller:heavy:clearance"]


def test_a_keyhole_of_the_wrong_limit_is_reported(pedestal: GimbalTravel, disagreeing: Disagreeing) -> None:
    sound = pedestal.sky.keyhole
    assert sound is not None
    pedestal.sky.__dict__["keyhole"] = replace(sound, by_rate=sound.by_rate * 1.01)
    pedestal.show_checks()
    assert disagreeing() == ["check:pedestal:keyhole"]


def test_wrong_rates_and_sector_times_of_a_pass_are_reported(pedestal: GimbalTravel, disagreeing: Disagreeing) -> None:
    sound = pedestal.sky.analyses["overhead"]
    pedestal.sky.__dict__["analyses"] = {"overhead": replace(sound, rates=sound.rates * 0.9)}
    (sector,) = pedestal.sky.sector_results["overhead"]
    pedestal.sky.__dict__["sector_results"] = {"overhead": [replace(sector, seconds=3.0)]}
    pedestal.show_checks()
    assert disagreeing() == ["check:pedestal:overhead:rate", "check:wheelhouse:overhead"]


@pytest.mark.parametrize("spoil", ["transposed", "covariance"])
def test_a_wrong_survey_is_reported(
    spoil: str, part: Callable[[str, str], dict[str, Any]], disagreeing: Disagreeing
) -> None:
    work = AlignmentSurvey(survey=part("survey", "slipway"))
    sound = work.found
    wrong = {"transposed": {"R_bs": sound.R_bs.T}, "covariance": {"covariance": 2.0 * sound.covariance}}[spoil]
    work.__dict__["found"] = replace(sound, **wrong)
    work.show_checks()
    assert disagreeing() == [f"check:slipway:{'fit' if spoil == 'transposed' else 'covariance'}"]


def test_a_budget_that_forgets_a_term_is_reported(
    part: Callable[[str, str], dict[str, Any]], disagreeing: Disagreeing
) -> None:
    work = ErrorBudget(budget=part("budget", "beam"))
    work.budget = Budget(work.budget.axes, work.budget.terms[:-1])
    work.show_checks()
    assert disagreeing() == ["check:beam:elevation", "check:beam:cross elevation"]


def test_a_chain_that_goes_a_link_backwards_is_reported(
    part: Callable[[str, str], dict[str, Any]], disagreeing: Disagreeing
) -> None:
    links = {name: part("link", name) for name in ("sensor-seat", "mast-step")}
    work = FrameChainCheck(links=links, of="mast", relative_to="hull")
    work.show_checks()
    assert disagreeing() == []
    work.__dict__["found"] = replace(work.found, R=np.swapaxes(work.found.R, -1, -2))
    work.show_checks()
    assert disagreeing() == ["check:mast:chain"]


def test_angle_errors_claimed_too_small_are_reported(
    part: Callable[[str, str], dict[str, Any]], disagreeing: Disagreeing
) -> None:
    work = mount_sheet.MountCheck(
        mount={**part("mount", "motion-sensor"), "instruments": ["camera"]},
        envelopes={"heavy": part("envelope", "heavy")},
    )
    sound = work.errors["heavy"]
    assert sound.certified is not None
    work.__dict__["errors"] = {"heavy": replace(sound, certified=0.5 * sound.certified)}
    work.show_checks()
    assert disagreeing() == ["check:motion-sensor:heavy:middle-angle"]
