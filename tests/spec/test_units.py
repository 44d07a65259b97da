"""Quantities read and printed; sizes from published definitions."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from trunnion.errors import UnitError
from trunnion.units import (
    CEILING,
    EXAMPLES,
    FLOOR,
    KINDS,
    LIMIT_SLACK_DEG,
    UNITS,
    format_angle,
    format_number,
    format_quantity,
    parse_quantity,
)

ONE_ROUNDING = 2.3e-16  # relative


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("180 deg", math.pi),  # exact: no factor of its own
        ("-90deg", -math.pi / 2),
        ("1 rad", 1.0),
        ("1 mrad", 1e-3),
        ("60 arcmin", math.radians(1)),
        ("3600 arcsec", math.radians(1)),
        ("1 turn", 2 * math.pi),
        ("1e-3 rad", 1e-3),
        (".5 deg", math.radians(0.5)),
        ("60 rpm", 2 * math.pi),  # one turn a second
        ("3600 deg/h", math.radians(1)),
        ("2 deg/s^2", math.radians(2)),
        ("20 ms", 0.02),
        ("1 h", 3600.0),
        ("1 g", 9.80665),  # 3rd CGPM (1901): standard acceleration, exact
        ("50 %", 0.5),
        ("5 times", 5.0),
        ("2 MB", 2e6),
    ],
)
def test_sizes(text, value):
    assert parse_quantity(text).value == pytest.approx(value, rel=ONE_ROUNDING)


def test_every_unit_goes_there_and_back():
    for unit in UNITS.values():
        assert unit.from_inside(unit.to_inside(12.5)) == pytest.approx(12.5, rel=4 * ONE_ROUNDING)


def test_every_kind_has_an_example_of_its_own():
    assert {parse_quantity(text).kind for text in EXAMPLES.values()} == set(KINDS) == set(EXAMPLES)


@pytest.mark.parametrize(
    ("text", "kind", "says"),
    [
        ("10", "angle", r"10 has no unit\n    add the unit \(deg, rad,"),
        ("10 degrees", "angle", r"'degrees' is not a known unit\n    write 10 deg$"),
        ("10 °", "angle", "write 10 deg"),
        ("10 DEG", "angle", "write 10 deg"),
        ("120 dps", "angular rate", r"write 120 deg/s$"),
        ("5 s", "angle", r"'5 s' is a time, and an angle is meant here\n    give it in deg,"),
        ("ten deg", "angle", r"'ten deg' is not a number with a unit\n    write it as in 10 deg"),
        ("1e999 deg", "angle", "too large"),
        ("3 furlong", None, "not a known unit"),
        ("", "time", "as in 20 ms"),
    ],
)
def test_what_is_refused_says_what_to_write(text, kind, says):
    with pytest.raises(UnitError, match=says):
        parse_quantity(text, kind=kind)


def test_printed_bounds_are_never_better_than_what_was_found():
    """The example of the verdict rule: a floor of 21.3961 deg prints as 21.39."""
    assert format_angle(math.radians(21.3961), toward=FLOOR) == "21.39 deg"
    assert format_angle(math.radians(21.3961), toward=CEILING) == "21.40 deg"
    assert format_angle(math.radians(-21.3961), toward=FLOOR) == "-21.40 deg"
    assert format_angle(0.5, unit="rad", digits=3) == "0.500 rad"


@given(st.integers(0, 18000))
def test_a_whole_number_of_hundredths_survives_the_way_through_radians(hundredths):
    """20 deg comes back from radians as 19.999999999999996; it is still printed as 20.00, floor or ceiling."""
    text = format_number(hundredths / 100, digits=2)
    assert format_angle(math.radians(hundredths / 100), toward=FLOOR) == f"{text} deg"
    assert format_angle(math.radians(hundredths / 100), toward=CEILING) == f"{text} deg"


@given(st.floats(-400, 400), st.integers(0, 6))
def test_directed_rounding_against_exact_fractions(value, digits):
    """Fractions as judge: the printed floor is at most the value plus the slack, and less than one step below."""
    floor = Fraction(format_number(value, digits=digits, toward=FLOOR, slack=LIMIT_SLACK_DEG))
    ceiling = Fraction(format_number(value, digits=digits, toward=CEILING, slack=LIMIT_SLACK_DEG))
    step, slack = Fraction(1, 10**digits), Fraction(LIMIT_SLACK_DEG)
    assert -step < floor - Fraction(value) <= slack
    assert -slack <= ceiling - Fraction(value) < step


def test_no_negative_zero_and_no_nonsense():
    assert format_number(-0.001, digits=2) == "0.00"
    assert format_number(float("nan"), digits=2) == "not a number"
    assert format_quantity(0.0123, "time", "ms", digits=1) == "12.3 ms"
