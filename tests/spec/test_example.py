"""The documented example loads, and its plain parts become the objects they describe."""

from __future__ import annotations

import json
import math
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from trunnion.envelope import regions
from trunnion.spec import Workbook, load_workbook
from trunnion.spec.build import convention_from_plain, frame_from_plain, mount_from_plain, region_from_plain
from trunnion.spec.plain import plain_part

HERE = Path(__file__).parent


@pytest.fixture(scope="module")
def workbook() -> Workbook:
    return load_workbook(HERE / "example.yaml")


def plain(workbook, kind, name):
    """A plain part after a trip through JSON, as a notebook gets it."""
    return json.loads(json.dumps(plain_part(workbook, kind, name)))


def test_the_example_has_its_parts(workbook):
    assert workbook.document.number == "SW-ATT-010"
    assert workbook.names("conventions") == ["ordinary", "wing-last", "nose-lowered"]
    assert workbook.names("requirements") == ["ATT-04"]
    assert workbook.part("requirements", "ATT-04").at_least.value == math.radians(20)
    assert workbook.part("calculations", "C02").parameters == {
        "envelopes": ["hover", "transition", "cruise", "flown"],
        "conventions": "all",
    }
    assert workbook.max_copied_size == 50e6


def test_every_value_knows_its_place(workbook):
    place = workbook.place("requirements.ATT-04.at least")
    line = workbook.text.splitlines()[place.line - 1]
    assert line[place.column - 1 :].startswith("20 deg")
    assert place.key == "requirements.ATT-04.at least"


def test_conventions_become_what_they_say(workbook):
    """Nose lowered by the body-side turn: the last turn's axis lies 40 deg below the nose (plain trigonometry)."""
    lowered = convention_from_plain(plain(workbook, "convention", "nose-lowered"))
    u, v = lowered.lock_axes
    np.testing.assert_allclose(u, [0, 0, 1], atol=1e-15)
    np.testing.assert_allclose(v, [math.cos(math.radians(40)), 0, math.sin(math.radians(40))], atol=1e-15)
    assert convention_from_plain(plain(workbook, "convention", "wing-last")).sequence.value == "3-1-2"


def test_the_unit_on_end_points_where_it_says(workbook):
    mount = mount_from_plain(plain(workbook, "mount", "inertial-unit"))
    np.testing.assert_array_equal(mount.R_bs @ [1, 0, 0], [0, 0, -1])  # its x axis points up
    np.testing.assert_array_equal(mount.R_bs @ [0, 0, 1], [1, 0, 0])  # its z axis points forward
    assert mount.tolerance.total == math.radians(0.5)
    assert mount.angles_as.reference.axes == ("north", "east", "down")


def test_envelopes_become_regions(workbook):
    """Cone and boxes need no file; the table is opened by the caller, who sees its whole statement."""
    seen = []

    def open_table(statement):
        seen.append(statement)
        return SimpleNamespace(times=np.array([0.0, 1.0]), quaternions=np.array([[1.0, 0, 0, 0], [1.0, 0, 0, 0]]))

    made = {
        name: region_from_plain(plain(workbook, "envelope", name), open_table=open_table)
        for name in workbook.names("envelopes")
    }
    assert isinstance(made["hover"], regions.Cone)
    assert made["hover"].farthest == math.radians(10)
    np.testing.assert_array_equal(made["hover"].reference_axis, [0, 0, -1])
    assert made["transition"].ranges[1] == (0.0, math.pi / 2)
    assert made["cruise"].ranges[2] == (math.radians(-45), math.radians(45))
    assert made["flown"].attitude_error == math.radians(1)
    assert seen[0]["reference"] == "local"
    assert seen[0]["body"] == "body"


def test_plain_parts_leave_out_what_no_number_depends_on(workbook):
    assert "text" not in json.dumps(plain(workbook, "convention", "ordinary"))
    assert frame_from_plain(plain(workbook, "frame", "local")).axes == ("north", "east", "down")


def test_trial_values_change_the_value_and_its_place(workbook):
    trial = load_workbook(HERE / "example.yaml", [("requirements.ATT-04.at least", "25 deg")])
    assert trial.requirements[0].at_least.text == "25 deg"
    assert "--set" in str(trial.place("requirements.ATT-04.at least"))
    assert workbook.requirements[0].at_least.text == "20 deg"
