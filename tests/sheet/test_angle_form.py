"""Numbers that are no sequence, through the calls the template's cells make: published check of angle-form."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from trunnion.sheet.angle_form import AngleForm

CASE = json.loads((Path(__file__).parents[1] / "published" / "OCE-1203" / "case.json").read_text())
HALF_LAST_DIGIT = 0.5e-4  # deg; the case holds four decimals

LOCAL = {"name": "local", "axes": ["east", "north", "up"], "north": "true", "carried": "along"}
SHIP = {"name": "ship", "axes": ["starboard", "forward", "up"], "lever arm": "2 m below the waterline"}
SEQUENCE = {
    "name": "pitch then roll",
    "reference": LOCAL,
    "body": SHIP,
    "sequence": "3-1-2",
    "about": "moving axes",
    "angles": ["heading", "pitch", "roll"],
    "positive": {"heading": "against axis", "pitch": "by axis", "roll": "by axis"},
    "maps": "body to reference",
}
SEA = {
    "name": "sea",
    "convention": SEQUENCE,
    "box": {"heading": "any", "pitch": ["-20 deg", "20 deg"], "roll": ["-40 deg", "40 deg"]},
}
POINTING = {"pole": "up", "azimuth from": "north", "azimuths grow": "clockwise", "boresight": "forward", "mark": "up"}


def tilts(*types: str) -> dict[str, Any]:
    """Bow up and port side up positive."""
    return {
        "tilts": ["forward", "port"],
        "types": list(types),
        "upright": "up",
        "up": "up",
        "heading from": "north",
        "headings grow": "clockwise",
        "angles": ["heading", "pitch", "roll"],
    }


FORMS = {
    "strapped": tilts("sine", "sine"),
    "pendulums": tilts("tangent", "tangent"),
    "roll outside": tilts("sine", "tangent"),
    "pitch outside": tilts("tangent", "sine"),
    "dish": {**POINTING, "roll": "left-handed", "angles": ["azimuth", "elevation", "polarization"]},
    "other hand": {**POINTING, "roll": "right-handed", "azimuths grow": "counterclockwise", "angles": ["a", "e", "p"]},
    "pointer": {**POINTING, "roll": "free", "angles": ["azimuth", "elevation", "roll"]},
    "vector": {"rotation vector": ["x", "y", "z"], "maps": "body to reference"},
    "vector of the inverse": {"rotation vector": ["x", "y", "z"], "maps": "reference to body"},
}


def work(name: str) -> AngleForm:
    form = {"name": name, "reference": LOCAL, "body": SHIP, **FORMS[name]}
    return AngleForm(form=form, convention=SEQUENCE, envelopes={"sea": SEA})


def test_published_check_of_angle_form() -> None:
    # dankelley/oce 1203 (2017): pitch of the matrix = atan(tan(tilt 1) cos(tilt 2)); roll is the second tilt itself
    walk = work("pendulums").walk
    reading = np.radians([0.0, CASE["first_tilt_deg"], CASE["second_tilt_deg"]])
    _, pitch, roll = np.degrees(walk.angles(reading)[0])
    assert pitch == pytest.approx(CASE["matrix_pitch_deg"], abs=HALF_LAST_DIGIT)
    assert roll == pytest.approx(CASE["second_tilt_deg"], abs=1e-12)


@pytest.mark.parametrize("name", FORMS)
def test_every_cell_shows_and_every_check_agrees(name: str, shown: list, disagreeing: Any) -> None:
    sheet = work(name)
    parts = "inputs assumptions statement formulas table back amplification margins checks results"
    for part in parts.split():
        getattr(sheet, f"show_{part}")()
    assert disagreeing() == []
    assert sum(item["kind"] == "check" for item in shown) == 2
    assert "2 m below the waterline" in str(shown)


def test_tilts_taken_for_angles_are_off_where_both_are_large(shown: list) -> None:
    # sin(roll of the sequence) = sin(tilt) / cos(pitch): 30 and 30 deg of tilt are 30 and 35.2644 deg of turns
    walk = work("strapped").walk
    values = np.radians([0.0, 30.0, 30.0])
    pitch, roll = np.degrees(walk.angles(values)[0])[1:]
    # the sequence takes pitch first here, so that the pitch of the sequence is the one that grows
    assert {round(float(pitch), 4), round(float(roll), 4)} == {
        30.0,
        round(np.degrees(np.arcsin(0.5 / np.cos(np.pi / 6))), 4),
    }
    assert np.degrees(walk.taken_for_angles(values)) > 4.0


def test_margin_of_strapped_tilts_over_a_box(shown: list) -> None:
    # the upright axis of a box of pitch and roll stands at asin(cos 20 cos 40) = 46.0418 deg at its corner
    work("strapped").show_margins()
    (result,) = [item for item in shown if item["kind"] == "result"]
    assert result["lo"] == pytest.approx(
        np.degrees(np.arcsin(np.cos(np.radians(20)) * np.cos(np.radians(40)))), abs=1e-9
    )
    assert result["basis"] == "certified bound"
