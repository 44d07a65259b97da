"""Items: plain payloads beside readable forms, and nothing JSON can't carry."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from trunnion.attitude.basis import Basis
from trunnion.errors import CalculationError
from trunnion.sheet import items


def result(**changes):
    fields = {"quantity": "lock margin", "of": "a", "over": "b", "lo": 1.0, "hi": 2.0, "unit": "deg", "basis": "exact"}
    return items.result_item(**{**fields, **changes})


def test_numpy_numbers_become_plain_json() -> None:
    witness = {"matrix": np.eye(3), "where": "hover", "time": np.float64(1.5)}
    payload = result(lo=np.float64(1), hi=np.float32(2), attained=np.float64(1), witness=witness).payload
    assert json.loads(json.dumps(payload)) == payload
    assert payload["witness"]["matrix"][0] == [1.0, 0.0, 0.0]
    assert type(payload["lo"]) is float


@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf])
@pytest.mark.parametrize("field", ["lo", "hi", "attained"])
def test_nan_and_infinity_are_refused(field: str, bad: float) -> None:
    with pytest.raises(CalculationError, match=f"{field} is"):
        result(**{field: bad})


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"basis": "certain"}, "basis 'certain' is not one"),
        ({"lo": 3.0}, "lower bound 3.0 above upper bound 2.0"),
        ({"lo": None, "hi": None}, "neither bound nor attained"),
        ({"attained": 0.5}, "contradicts its bounds"),
        ({"attained": 2.1}, "contradicts its bounds"),
        ({"unit": None}, "needs its unit"),
        ({"witness": {"at": object()}}, "JSON does not know"),
    ],
)
def test_a_result_that_is_none_is_refused(changes, message) -> None:
    with pytest.raises(CalculationError, match=message):
        result(**changes)


def test_a_basis_may_be_given_as_itself() -> None:
    assert result(basis=Basis.CERTIFIED).payload["basis"] == "certified bound"


def test_agreement_is_computed_and_never_passed() -> None:
    good = items.check_item("chk:x", "x", ours=1.0, theirs=1.0 + 1e-12, tolerance=1e-9, unit="deg", library="scipy")
    bad = items.check_item("chk:x", "x", ours=1.0, theirs=1.1, tolerance=1e-9, unit="deg", library="scipy")
    assert good.payload["agrees"] is True
    assert bad.payload["agrees"] is False
    assert "DOES NOT AGREE" in bad.readable["text/plain"]
    with pytest.raises(CalculationError):
        items.check_item("chk:x", "x", ours=math.nan, theirs=1.0, tolerance=1e-9, unit="deg", library="scipy")


def test_a_table_shows_its_bars_and_must_be_a_rectangle() -> None:
    item = items.table_item("tbl:a", ["x", "y"], [["a|b", 1]], caption="c", align="lr")
    assert "| a\\|b | 1 |" in item.readable["text/markdown"]
    assert item.payload["rows"] == [["a|b", "1"]]
    with pytest.raises(CalculationError, match="row 1 has not the 2 cells"):
        items.table_item("tbl:a", ["x", "y"], [["a"]], caption="c")


@pytest.mark.parametrize("identity", ["a", "eq:", "fig:a"])
def test_ids_say_their_kind(identity: str) -> None:
    with pytest.raises(CalculationError, match="is no id of this kind"):
        items.equation_item(identity, "x")


def test_markup_in_a_text_is_shown_literally() -> None:
    item = items.finding_item("f1", "<b>*x*</b>", against="C01")
    assert item.readable["text/markdown"] == "Finding against C01: \\<b\\>\\*x\\*\\</b\\>"


def test_a_figure_is_svg() -> None:
    with pytest.raises(CalculationError, match="not an SVG"):
        items.figure_item("fig:a", "PNG", caption="c", alt="a")
    bundle = items.figure_item("fig:a", "<svg/>", caption="c", alt="a").bundle()
    assert set(bundle) == {"image/svg+xml", "text/plain", items.MIME}
