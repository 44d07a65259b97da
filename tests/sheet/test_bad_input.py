"""What is wrong with a region or a table, from the words of the spec to the message or the finding."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.errors import TrunnionError
from trunnion.sheet.sweep import EnvelopeSweep
from trunnion.spec import load_workbook
from trunnion.spec.plain import plain_part

SPEC = """\
workbook: 1
document: {number: T-1, title: Trial, revision: A}
sources:
  - {id: LOG, title: Invented logs, edition: 1}
frames:
  local: {axes: [north, east, down], north: true, carried: along}
  body: {axes: [forward, starboard, down]}
conventions:
  ordinary: {reference: local, body: body, sequence: 3-2-1, about: moving axes, angles: [heading, elevation, bank],
    maps: body to reference}
envelopes:
  tried:
    ENVELOPE
calculations:
  - {id: C01, template: envelope-sweep, conventions: all, envelopes: [tried]}
"""
TABLE = (
    "{table: inputs/t.csv, columns: {time: {column: t, unit: s}, quaternion: [w, x, y, z]}, scalar: first, "
    "maps: body to local, source: LOG 1, "
)
SOUND = [
    [0.0, 1.0, 0.0, 0.0, 0.0],
    [1.0, 0.999, 0.0, 0.0, np.sqrt(1 - 0.999**2)],
    [2.0, 0.99, 0.0, 0.0, np.sqrt(1 - 0.99**2)],
]


@pytest.fixture
def sweep_of(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Any:
    """`sweep_of(envelope, rows)`: the sweep of a workbook with that envelope, its table beside the notebook."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "inputs").mkdir()

    def made(envelope: str, rows: list[list[float]] | None = None) -> EnvelopeSweep:
        if rows is not None:
            lines = ["t,w,x,y,z", *(",".join(repr(float(value)) for value in row) for row in rows)]
            (tmp_path / "inputs" / "t.csv").write_text("\n".join(lines) + "\n")
        (tmp_path / "workbook.yaml").write_text(SPEC.replace("ENVELOPE", envelope))
        workbook = load_workbook(tmp_path)
        plain = plain_part(workbook, "envelopes", "tried")
        if "table" in plain:
            plain["table"] = "t.csv"
        parts = {"ordinary": plain_part(workbook, "conventions", "ordinary")}
        return EnvelopeSweep(conventions=parts, envelopes={"tried": plain})

    return made


@pytest.mark.parametrize(
    ("envelope", "said"),
    [
        (
            "{convention: ordinary, box: {heading: any, elevation: [25 deg, -20 deg], bank: 0 deg}}",
            "runs from 25 deg down",
        ),
        ("{cone: {axis: forward, around: up, between: [20 deg, 10 deg], roll: any}}", "runs from 20 deg down"),
        ("{cone: {axis: forward, around: up, half angle: 10 deg, roll: any}, dispersion: 91 deg}", "more than 90 deg"),
        ("{poses: []}", "no poses are listed"),
        (TABLE + "between samples: rate limited}", "none is stated"),
    ],
)
def test_regions_that_are_none(envelope: str, said: str, sweep_of: Any) -> None:
    with pytest.raises(TrunnionError, match=said):
        sweep_of(envelope, SOUND)


def row(time: float, angle_deg: float, sign: float = 1.0) -> list[float]:
    half = np.radians(angle_deg) / 2
    return [time, sign * np.cos(half), 0.0, 0.0, sign * np.sin(half)]


@pytest.mark.parametrize(
    ("rows", "said"),
    [
        ([row(0, 0), row(2, 1), row(1, 2)], "(?i)time"),
        ([row(0, 0), row(0, 1)], "(?i)time"),
        ([row(0, 0), [1.0, 2.0, 0.0, 0.0, 0.0]], "(?i)length|norm|unit"),
        ([row(0, 0), [1.0, float("nan"), 0.0, 0.0, 1.0]], "(?i)row 2|nan|number"),
        ([row(1e17, 0), row(1e17 + 1.0, 1)], "(?i)time|resol|same"),
    ],
)
def test_rows_that_are_none(rows: list, said: str, sweep_of: Any) -> None:
    with pytest.raises(TrunnionError, match=said):
        sweep_of(TABLE + "between samples: slerp}", rows)


def test_a_rate_that_the_rows_contradict(sweep_of: Any) -> None:
    rows = [row(0, 0), row(1, 5), row(2, 25)]
    with pytest.raises(TrunnionError, match="between rows 2 and 3 the body turns faster than the stated maximum"):
        sweep_of(TABLE + "between samples: rate limited, max body rate: 10 deg/s}", rows)


def test_gaps_half_turns_and_signs_are_said(sweep_of: Any, shown: list) -> None:
    rows = [row(0, 0), row(1, 5, -1.0), row(9, 10), row(10, 187)]
    work = sweep_of(TABLE + "between samples: slerp, max gap: 2 s}", rows)
    work.show_assumptions()
    texts = [item["text"] for item in shown if item["kind"] == "finding"]
    assert [text for text in texts if "rows 2 and 3 are 8 apart" in text]
    assert [text for text in texts if "between rows 3 and 4 the body turns nearly half a turn" in text]
    assert not [item for item in shown if item["kind"] == "finding" and "sign" in item["text"]]


def test_a_box_that_locks_its_own_convention_is_a_finding(sweep_of: Any, shown: list) -> None:
    work = sweep_of("{convention: ordinary, box: {heading: any, elevation: [60 deg, 90 deg], bank: [-5 deg, 5 deg]}}")
    work.show_assumptions()
    assert [item for item in shown if item["kind"] == "finding" and "did you mean a cone?" in item["text"]]
