"""The statement page as a workbook states a convention: its standard, north, origins and lever arms."""

from __future__ import annotations

from typing import Any

from trunnion.sheet.convention_page import page_drawing, stated_page
from trunnion.sheet.parameters import convention

LOCAL = {
    "name": "local",
    "axes": ["north", "east", "down"],
    "north": {"magnetic": "WMM2025", "date": "2031-01-01"},
    "carried": "along",
    "origin": "the mast foot",
}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"], "lever arm": "0.4 m aft"}
STANDARD = {"name": "ship", "reference": LOCAL, "body": BODY, "as": "ISO 1151-1", "maps": "body to reference"}


def said(plain: dict[str, Any], title: str) -> str:
    (part,) = [part for part in stated_page(plain).parts if part.title == title]
    return " ".join(part.paragraphs)


def test_frames_are_told_with_north_origin_and_lever_arm() -> None:
    text = said(STANDARD, "Frames")
    assert "North is magnetic, by WMM2025 for 2031-01-01. It travels along. Its origin is the mast foot" in text
    assert "Its lever arm is 0.4 m aft (carried as text: only attitude is computed)." in text
    assert "Trunnion computes attitude only" in text


def test_what_a_named_standard_fixed_is_printed() -> None:
    text = said(STANDARD, "Taken from a standard")
    for sentence in (
        "The workbook names ISO 1151-1.",
        "The order of the turns: 3-2-1 about moving axes.",
        "The names of the angles: azimuth, inclination and bank.",
        "The sense of each angle: by the right-hand rule about its axis.",
        "The ranges: azimuth −180° … 180°",
        "from memory",  # how much of the standard was read is never left out
    ):
        assert sentence in text


def test_what_the_workbook_states_itself_is_not_told_as_the_standards() -> None:
    text = said({**STANDARD, "angles": ["heading", "pitch", "roll"]}, "Taken from a standard")
    assert "The names of the angles" not in text
    assert "The order of the turns" in text


def test_no_standard_no_part() -> None:
    own = {key: value for key, value in STANDARD.items() if key != "as"}
    own |= {"sequence": "3-2-1", "about": "moving axes", "angles": ["a", "b", "c"], "positive": "by axis"}
    assert "Taken from a standard" not in [part.title for part in stated_page(own).parts]


def test_the_drawing_has_its_words() -> None:
    svg, alt, caption = page_drawing(stated_page(STANDARD), convention(STANDARD), columns=4)
    assert svg.lstrip().startswith("<")
    assert "after azimuth 40°" in alt
    assert "body at zero and after each turn of ship" in caption
