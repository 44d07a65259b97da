"""What a change in the example workbook puts out of date, told from content keys alone; nothing is run."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from trunnion.calculations.plan import plan
from trunnion.spec import load_workbook

SEDGEWING = Path(__file__).parents[2] / "workbooks" / "sedgewing"


@pytest.fixture
def sedgewing(tmp_path: Path) -> Path:
    return Path(shutil.copytree(SEDGEWING, tmp_path / "sedgewing"))


def keys_of(workbook: Path) -> dict[str, str]:
    return {entry.id: entry.key for entry in plan(load_workbook(workbook))}


@pytest.mark.parametrize(
    ("old", "new", "stale"),
    [
        ("axes: {x: up, y: starboard, z: forward}", "axes: {x: up, y: port, z: aft}", {"C03"}),
        ("bank: [-45 deg, 45 deg]", "bank: [-50 deg, 50 deg]", {"C02", "C03", "C04"}),
        ("half angle: 10 deg", "half angle: 12 deg", {"C02", "C03", "C04"}),
        ("{about: starboard, angle: 40 deg}", "{about: starboard, angle: 35 deg}", {"C02"}),
        ("at least: 20 deg", "at least: 25 deg", set()),
        ("title: Attitude convention", "title: Convention", set()),
        ("name: Maren Oakhollow", "name: M. Oakhollow", set()),
        ("text: The angles used on board", "text: Angles used on board", set()),
        ("because: It keeps", "because: It holds", set()),
        ("workbook: 1\n", "workbook: 1  # a comment\n", set()),
    ],
)
def test_a_change_puts_exactly_what_depends_on_it_out_of_date(sedgewing: Path, edit, old, new, stale) -> None:
    before = keys_of(sedgewing)
    edit(sedgewing / "workbook.yaml", old, new)
    after = keys_of(sedgewing)
    assert {name for name in before if before[name] != after[name]} == stale


def test_a_recorded_flight_touches_only_what_reads_it(sedgewing: Path) -> None:
    before = keys_of(sedgewing)
    data = sedgewing / "data" / "transition.csv"
    data.write_bytes(data.read_bytes() + b"\n")
    after = keys_of(sedgewing)
    assert {name for name in before if before[name] != after[name]} == {"C02"}


def test_a_file_that_is_only_touched_or_moved_in_time_changes_nothing(sedgewing: Path) -> None:
    import os

    before = keys_of(sedgewing)
    os.utime(sedgewing / "data" / "transition.csv", (0, 0))
    os.utime(sedgewing / "workbook.yaml", (2**31, 2**31))
    assert keys_of(sedgewing) == before
