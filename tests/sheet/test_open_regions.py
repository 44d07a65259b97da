"""Regions without a closed form, directions that move and constants on both sides, through their sheets."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.envelope.constrained import Constrained
from trunnion.errors import AttitudeError, CalculationError, TableError
from trunnion.sheet import clearance as clearance_sheet
from trunnion.sheet import sweep as sweep_sheet
from trunnion.sheet import zero as zero_sheet
from trunnion.sheet.clearance import DirectionClearance
from trunnion.sheet.sweep import EnvelopeSweep
from trunnion.sheet.zero import ZeroAttitude

LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
OBLIQUITY_DEG = 23.439291111  # IAU 2006, 84381.406 arcsec (Capitaine et al. 2003; value from memory)


def stated(sequence: str) -> dict[str, Any]:
    return {
        "name": sequence,
        "reference": LOCAL,
        "body": BODY,
        "sequence": sequence,
        "about": "moving axes",
        "angles": ["first", "second", "third"],
        "maps": "body to reference",
    }


def cone(axis: str, around: str, half: str, **more: Any) -> dict[str, Any]:
    shape = {"axis": axis, "around": around, "half angle": half, "roll": "any"}
    return {"cone": shape, "reference": LOCAL, "body": BODY, **more}


BOX = {
    "convention": stated("3-2-1"),
    "box": {"first": "any", "second": ["-20 deg", "25 deg"], "third": ["-45 deg", "45 deg"]},
}
REGIONS = {
    "imaging": cone("down", "down", "15 deg", also=[{"axis": "starboard", "around": "east", "half angle": "60 deg"}]),
    "surveyed": {
        **BOX,
        "also": [{"axis": "forward", "around": "north", "half angle": "40 deg"}],
        "dispersion": "1 deg",
    },
    "nodding": cone(
        "forward", "north", "10 deg", **{"dispersion about": {"axes of": "body", "limits": {"starboard": "3 deg"}}}
    ),
    "rolled": {
        **cone("forward", "up", "40 deg"),
        "cone": {
            "axis": "forward",
            "around": "up",
            "between": ["20 deg", "40 deg"],
            "roll": {"zero": "down", "range": ["-30 deg", "60 deg"]},
        },
    },
    "stand": {"poses": [{"forward": "up", "starboard": "east"}], "ball": "2 deg", "reference": LOCAL, "body": BODY},
}
REGIONS["day"] = {"phases": {"rolled": REGIONS["rolled"], "stand": REGIONS["stand"]}, "dispersion": "1 deg"}


@pytest.mark.parametrize("name", REGIONS)
def test_scipy_finds_the_same_in_each_kind_of_region(name: str, shown: list, disagreeing: Any) -> None:
    work = EnvelopeSweep(conventions={"3-1-2": stated("3-1-2")}, envelopes={name: REGIONS[name]})
    work.show_margins()
    work.show_shares()
    work.show_checks()
    assert len([item for item in shown if item["kind"] == "check"]) == 2
    assert disagreeing() == []


def test_a_constraint_left_out_is_reported(disagreeing: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    sound = sweep_sheet.lock_margin

    def forgetful(region: Any, convention: Any) -> Any:
        return sound(region.region if isinstance(region, Constrained) else region, convention)

    monkeypatch.setattr(sweep_sheet, "lock_margin", forgetful)
    level = [{"axis": "down", "around": "down", "half angle": "30 deg"}]  # 2-1-3 locks where down lies along east
    narrow = cone("forward", "north", "10 deg", also=level)
    EnvelopeSweep(conventions={"2-1-3": stated("2-1-3")}, envelopes={"narrow": narrow}).show_checks()
    assert disagreeing() == ["check:2-1-3:narrow:search"]


@pytest.fixture
def sun(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """A year of the Sun along the ecliptic, equatorial components, in inputs/."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "inputs").mkdir()
    day = np.arange(0.0, 366.0, 5.0)
    longitude = np.radians(360.0 * day / 365.0)
    tilt = np.radians(OBLIQUITY_DEG)
    x, y, z = np.cos(longitude), np.sin(longitude) * np.cos(tilt), np.sin(longitude) * np.sin(tilt)
    write(tmp_path / "inputs" / "sun.csv", "t,x,y,z", [1000.0 + day, x, y, z])
    return {
        "table": "sun.csv",
        "columns": {"time": {"column": "t", "unit": "s"}, "direction": ["x", "y", "z"]},
    }


def write(path: Path, header: str, columns: list[Any]) -> None:
    np.savetxt(path, np.stack(columns, axis=1), delimiter=",", header=header, comments="", fmt="%.17g")


def test_the_sun_keeps_within_the_obliquity_of_the_equator(shown: list, sun: dict, disagreeing: Any) -> None:
    """An axis held along the pole sees the Sun between 90 deg less and 90 deg more than the obliquity (any year)."""
    held = cone("down", "down", "0 deg")
    work = DirectionClearance(
        directions={"pole": {"body": "down", "reference": sun}}, reference=LOCAL, body=BODY, envelopes={"held": held}
    )
    work.show_inputs()
    work.show_assumptions()
    work.show_clearances()
    work.show_checks()
    least, largest = [item for item in shown if item["kind"] == "result"]
    # Rows five days apart: chords of great circles stay on the ecliptic, whose turning point lies between rows.
    assert least["lo"] <= 90.0 - OBLIQUITY_DEG <= least["hi"] + 0.01
    assert largest["lo"] - 0.01 <= 90.0 + OBLIQUITY_DEG <= largest["hi"]
    assert disagreeing() == []


def run_table(tmp_path: Path) -> dict[str, Any]:
    q = np.roll(Rotation.from_rotvec(np.outer(np.linspace(0.0, 2.0, 60), [0.1, 0.3, 1.0])).as_quat(), 1, axis=1)
    write(tmp_path / "inputs" / "run.csv", "t,w,x,y,z", [1100.0 + np.arange(60.0), *q.T])
    return {
        "table": "run.csv",
        "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": ["w", "x", "y", "z"]},
        "scalar": "first",
        "maps": "body to local",
        "reference": "local",
        "body": "body",
        "between samples": "slerp",
        "attitude error": "0.5 deg",
    }


def same_time(run: dict[str, Any], sun: dict[str, Any]) -> DirectionClearance:
    pair = {"body": "starboard", "reference": sun, "at": "same time"}
    return DirectionClearance(directions={"panel": pair}, reference=LOCAL, body=BODY, envelopes={"run": run})


def test_same_time_reads_both_clocks_alike(shown: list, sun: dict, tmp_path: Path, disagreeing: Any) -> None:
    work = same_time(run_table(tmp_path), sun)
    work.show_clearances()
    work.show_checks()
    assert len([item for item in shown if item["kind"] == "check"]) == 3
    assert disagreeing() == []


def test_clocks_set_apart_are_reported(
    sun: dict, tmp_path: Path, disagreeing: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    work = same_time(run_table(tmp_path), sun)
    sound = clearance_sheet.clearance_along

    def late(track: Any, body: Any, directions: Any) -> Any:
        shifted = clearance_sheet.Directions(directions.times + 40.0, directions.directions)
        return sound(track, body, shifted)

    monkeypatch.setattr(clearance_sheet, "clearance_along", late)
    work.show_checks()
    assert disagreeing() != []


@pytest.mark.parametrize(
    ("change", "error", "said"),
    [
        ({"reference": "sun"}, AttitudeError, "sun"),
        ({"at": "noon"}, CalculationError, "'noon' is no time"),
        ({"towards": "up"}, CalculationError, "knows no 'towards'"),
        ({"body": [0.0, 0.0, 0.0]}, CalculationError, "is no direction"),
        ({"reference": {"table": "sun.csv"}}, TableError, "its time column with unit"),
    ],
)
def test_directions_that_say_too_little(change: dict, error: type, said: str, sun: dict) -> None:
    pair = {"body": "starboard", "reference": sun, **change}
    with pytest.raises(error, match=said):
        DirectionClearance(directions={"panel": pair}, reference=LOCAL, body=BODY, envelopes={})


def test_a_row_without_a_direction_is_named(sun: dict) -> None:
    write(Path("inputs/sun.csv"), "t,x,y,z", [np.arange(3.0), np.array([1.0, 0.0, 1.0]), np.zeros(3), np.zeros(3)])
    with pytest.raises(TableError, match="row 2 holds no direction"):
        DirectionClearance(
            directions={"panel": {"body": "down", "reference": sun}}, reference=LOCAL, body=BODY, envelopes={}
        )


def test_same_time_needs_a_table_of_attitudes(sun: dict) -> None:
    work = same_time(cone("down", "down", "5 deg"), sun)
    with pytest.raises(CalculationError, match="no table of attitudes"):
        work.show_clearances()


POSE = {"poses": [{"forward": "up", "starboard": "east"}], "reference": LOCAL, "body": BODY}


def both_sides() -> ZeroAttitude:
    return ZeroAttitude(convention=stated("3-2-1"), envelopes={"stand": POSE}, both_sides=True)


def test_constants_on_both_sides_show_their_gap(shown: list, disagreeing: Any) -> None:
    work = both_sides()
    work.show_both_sides()
    work.show_checks()
    work.show_results()
    (found,) = [item for item in shown if item["kind"] == "result"]
    assert found["over"] == "both sides"
    assert found["lo"] <= 90.0 <= found["hi"] + 1e-9  # one pose can always stand at a right angle to lock
    assert found["hi"] - found["lo"] <= 0.1 + 1e-9
    assert disagreeing() == []


def test_a_wrong_constant_on_one_side_is_reported(disagreeing: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    work = both_sides()
    good = work.both.convention
    sound = zero_sheet.lock_margin
    monkeypatch.setattr(
        zero_sheet,
        "lock_margin",
        lambda region, convention: sound(region, work.convention if convention is good else convention),
    )
    work.show_checks()
    assert "check:both:stand:search" in disagreeing()


def test_no_answer_to_both_sides() -> None:
    with pytest.raises(CalculationError, match="'perhaps' is no answer"):
        ZeroAttitude(convention=stated("3-2-1"), envelopes={"stand": REGIONS["stand"]}, both_sides="perhaps")
