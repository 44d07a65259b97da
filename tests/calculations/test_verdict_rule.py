"""The verdict rule: each basis against each basis asked for, each case, ties included.

The expected table is written out from the rule as it stands in the project's words: at least L with lo >= L - 1e-9 on
a sufficient basis meets; an attained value below L - 1e-9 does not meet; otherwise not shown.
"""

from __future__ import annotations

import pytest

from trunnion.attitude.basis import Basis
from trunnion.calculations.verdicts import (
    SLACK,
    Bounds,
    Comparison,
    Verdict,
    bound_text,
    judge,
    sufficient,
    together,
)

MEETS, FAILS, OPEN = Verdict.MEETS, Verdict.DOES_NOT_MEET, Verdict.NOT_SHOWN
E, C, S, M = Basis.EXACT, Basis.CERTIFIED, Basis.SAMPLED, Basis.MEASURED
LIMIT = 20.0

# have -> asked for which it suffices
SUFFICES = {E: {E, C, S}, C: {C, S}, S: {S}, M: {M}}

# lo, attained, verdict on a sufficient basis, verdict on an insufficient one
CASES = [
    ("above", 21.0, 21.5, MEETS, OPEN),
    ("above, nothing attained", 21.0, None, MEETS, OPEN),
    ("tie", 20.0, 20.0, MEETS, OPEN),
    ("tie within the slack", 20.0 - 0.9e-9, 20.0 - 0.9e-9, MEETS, OPEN),
    ("bound just beyond the slack", 20.0 - 1.1e-9, 20.0, OPEN, OPEN),
    ("both just beyond the slack", 20.0 - 1.1e-9, 20.0 - 1.1e-9, FAILS, FAILS),
    ("bound below, witness above", 18.0, 22.0, OPEN, OPEN),
    ("bound below, witness at the limit", 18.0, 20.0, OPEN, OPEN),
    ("bound below, no witness", 18.0, None, OPEN, OPEN),
    ("no bound, witness above", None, 22.0, OPEN, OPEN),
    ("witness below", 18.0, 19.0, FAILS, FAILS),
    ("no bound, witness below", None, 19.0, FAILS, FAILS),
]


@pytest.mark.parametrize("have", list(Basis))
@pytest.mark.parametrize("asked", list(Basis))
@pytest.mark.parametrize(("lo", "attained", "enough", "short"), [c[1:] for c in CASES], ids=[c[0] for c in CASES])
def test_each_basis_and_case_at_least_and_mirrored(have, asked, lo, attained, enough, short) -> None:
    expected = enough if asked in SUFFICES[have] else short
    assert judge(Bounds(lo, 90.0, attained, have), Comparison.AT_LEAST, LIMIT, asked) is expected

    def turned(value):
        return None if value is None else -value

    mirrored = Bounds(-90.0, turned(lo), turned(attained), have)
    assert judge(mirrored, Comparison.AT_MOST, -LIMIT, asked) is expected


@pytest.mark.parametrize("have", list(Basis))
@pytest.mark.parametrize("asked", list(Basis))
def test_order_of_bases(have, asked) -> None:
    assert sufficient(have, asked) is (asked in SUFFICES[have])


def test_the_slack_is_one_named_number() -> None:
    assert SLACK == 1e-9


def test_one_failure_fails_all_and_one_gap_leaves_all_open() -> None:
    assert together([MEETS, MEETS]) is MEETS
    assert together([MEETS, OPEN]) is OPEN
    assert together([MEETS, OPEN, FAILS]) is FAILS
    assert together([]) is OPEN


@pytest.mark.parametrize(
    ("value", "comparison", "text"),
    [
        (21.3961, Comparison.AT_LEAST, "21.39°"),
        (21.3961, Comparison.AT_MOST, "21.40°"),
        (44.999999999999993, Comparison.AT_LEAST, "45.00°"),
        (45.000000000000007, Comparison.AT_MOST, "45.00°"),
        (44.99999, Comparison.AT_LEAST, "44.99°"),
        (-0.001, Comparison.AT_LEAST, "−0.01°"),
    ],
)
def test_printed_bounds_are_rounded_to_the_unsafe_side(value, comparison, text) -> None:
    assert bound_text(Bounds(value, value, None, C), comparison, "deg") == text
