"""Results and bodies that come from others: any bytes and any JSON end in a value or in one error of ours."""

from __future__ import annotations

import contextlib
import copy
import json
import tempfile
from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from trunnion.calculations.compare import change_rows, compare_results
from trunnion.calculations.notebooks import read_notebook
from trunnion.calculations.results import recorded
from trunnion.calculations.results_file import read_results, require_results
from trunnion.calculations.sheets import body_of
from trunnion.errors import TrunnionError
from trunnion.sheet.items import MIME

json_values = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=6), inner, max_size=4),
    max_leaves=12,
)

RESULT = {
    "id": "res:a", "kind": "result", "schema": 1, "quantity": "lock margin", "of": "a", "over": "h", "lo": 1.0,
    "hi": 2.0, "attained": 1.5, "basis": "exact", "unit": "deg", "witness": None, "note": "",
}  # fmt: skip
RESULTS = {
    "schema": 1,
    "document": {"number": "X", "revision": "A"},
    "calculations": [
        {"id": "C01", "template": "t", "key": "k", "digest": "d", "state": "computed", "checks": [{}],
         "findings": [{"id": "f", "text": "t"}], "results": [RESULT], "figures": [{"id": "fig:a", "sha256": "0"}],
         "inputs": [{"path": "p", "sha256": "0", "held": None, "size": 1}]}
    ],
    "requirements": [
        {"id": "R1", "of": "D1", "comparison": "at least", "limit": "1 deg", "verdict": "meets",
         "candidates": [{"name": "a", "counts": True, "verdict": "meets"}]}
    ],
    "decisions": [{"id": "D1", "chosen": "a", "over": ["a"], "rests_on": ["C01"]}],
}  # fmt: skip
CHECK = {"kind": "check", "id": "c", "agrees": True}
FIGURE = {MIME: {"kind": "figure", "id": "fig:a"}, "image/svg+xml": "<svg/>"}
OUTPUTS = [{"output_type": "display_data", "data": data} for data in ({MIME: RESULT}, {MIME: CHECK}, FIGURE)]
BODY = {
    "nbformat": 4, "nbformat_minor": 5, "metadata": {},
    "cells": [{"cell_type": "code", "source": "x", "metadata": {"tags": ["t"]}, "outputs": OUTPUTS}],
}  # fmt: skip


def places(value, path=()):
    """Every place in a JSON value."""
    yield path
    entries = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, entry in entries:
        yield from places(entry, (*path, key))


@st.composite
def spoiled(draw, original):
    """A copy of a JSON value with one place replaced by anything, or taken away."""
    made = copy.deepcopy(original)
    path = draw(st.sampled_from([place for place in places(original) if place]))
    owner = made
    for step in path[:-1]:
        owner = owner[step]
    if draw(st.booleans()):
        owner[path[-1]] = draw(json_values)
    else:
        del owner[path[-1]]
    return made


@settings(deadline=None, max_examples=300)
@given(spoiled(RESULTS) | json_values)
def test_any_results_are_compared_or_refused(value) -> None:
    try:
        good = require_results(value, "results.json")
        change_rows(compare_results(good, RESULTS, "a", "b"))
        change_rows(compare_results(RESULTS, good, "a", "b"))
    except TrunnionError:
        pass


@settings(deadline=None, max_examples=300)
@given(spoiled(BODY) | json_values)
def test_any_body_is_recorded_or_refused(value) -> None:
    try:
        recorded("C01", value)
        body_of(value)
    except TrunnionError:
        pass


@settings(deadline=None, max_examples=100, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.binary(max_size=200) | st.integers(1, 5000).map(lambda depth: b"[" * depth) | json_values.map(
    lambda value: json.dumps(value).encode()))  # fmt: skip
def test_any_bytes_are_read_or_refused(content: bytes) -> None:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "file.json"
        path.write_bytes(content)
        for read in (read_results, read_notebook):
            with contextlib.suppress(TrunnionError):
                read(path)


def test_the_originals_are_good() -> None:
    assert require_results(RESULTS, "results.json") is RESULTS
    assert len(recorded("C01", BODY).results) == 1
