"""The loader against anything: it loads or says what is wrong; it neither crashes nor hangs."""

from __future__ import annotations

import contextlib
import copy
import json
import os
from pathlib import Path

import yaml
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from trunnion.errors import SpecError, TrunnionError
from trunnion.spec import Workbook, load_workbook
from trunnion.spec.build import convention_from_plain, mount_from_plain
from trunnion.spec.load import load_text
from trunnion.spec.plain import plain_part

HERE = Path(__file__).parent
TEXT = (HERE / "full.yaml").read_text()
TREE = yaml.load(TEXT, Loader=yaml.BaseLoader)  # every scalar as text

FULL = os.environ.get("TRUNNION_FULL") == "1"
COUNTED = settings(
    max_examples=600 if FULL else 60, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True
)


def read(text: str | bytes) -> Workbook | None:
    """The workbook, or None when its faults are said properly."""
    data = text if isinstance(text, bytes) else text.encode("utf-8", errors="surrogatepass")
    try:
        workbook = load_text(data, HERE / "full.yaml", check_files=False)
    except SpecError as error:
        faults = error.faults
    else:
        build_everything(workbook)
        return workbook
    assert faults
    for fault in faults:
        assert fault.cause
        assert fault.remedy
        assert fault.place.line is None or fault.place.line >= 1
    return None


def build_everything(workbook: Workbook) -> None:
    """What has been found sound can be written out, sent through JSON and built."""
    for name in workbook.conventions:
        convention_from_plain(json.loads(json.dumps(plain_part(workbook, "convention", name))))
    for name in workbook.mounts:
        mount_from_plain(json.loads(json.dumps(plain_part(workbook, "mount", name))))
    for name in workbook.envelopes:
        json.dumps(plain_part(workbook, "envelope", name), allow_nan=False)


def positions(tree, path=()):
    """All places of a tree."""
    yield path
    inner = tree.items() if isinstance(tree, dict) else enumerate(tree) if isinstance(tree, list) else ()
    for step, value in inner:
        yield from positions(value, (*path, step))


DATES = {"2031-01-01", "2031-02-02", "2031-05-01", "2031-12-31"}
PLACES = list(positions(TREE))[1:]
WORDS = sorted({str(step) for path in PLACES for step in path} | {"any", "up", "x", "-x", "by axis", "3-1-3", "0 deg"})
scalars = st.one_of(
    st.sampled_from(WORDS),
    st.sampled_from(
        ["10 deg", "-400 deg", "1e-300 deg", "5 s", "deg", "NO", "010", "12:30", ".inf", "~", "", "1_0", "é"]
    ),
    st.text(max_size=20),
    st.integers(-3, 400).map(str),
    st.floats(allow_nan=False, allow_infinity=False).map(repr),
)
values = st.recursive(
    scalars,
    lambda inner: st.one_of(st.lists(inner, max_size=4), st.dictionaries(st.sampled_from(WORDS), inner, max_size=4)),
    max_leaves=8,
)


def put(tree, path, value, how):
    """The tree with the place changed: replaced, removed, or its key renamed."""
    made = copy.deepcopy(tree)
    owner = made
    for step in path[:-1]:
        owner = owner[step]
    last = path[-1]
    if how == "remove":
        del owner[last]
    elif how == "rename" and isinstance(owner, dict):
        owner[str(value)[:70]] = owner.pop(last)
    else:
        owner[last] = value
    return made


def as_yaml(value) -> str:
    """Flow YAML with plain scalars where they can be plain."""
    if isinstance(value, dict):
        return "{" + ", ".join(f"{quoted(str(k))}: {as_yaml(v)}" for k, v in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(as_yaml(item) for item in value) + "]"
    return quoted(value)


def quoted(text: str) -> str:
    """Plain where the text may stand plain, else in quotes; numbers stay numbers."""
    if text in DATES:
        return json.dumps(text)
    begins = text[:1].isalnum() or (text[:1] == "-" and text[1:2].isdigit())
    simple = begins and text.strip() == text and all(c.isalnum() or c in " ./_-%" for c in text)
    return text if simple else json.dumps(text)


def as_document(tree) -> str:
    return "".join(f"{quoted(str(key))}: {as_yaml(value)}\n" for key, value in tree.items())


changes = st.lists(
    st.tuples(st.sampled_from(PLACES), values, st.sampled_from(["put", "put", "remove", "rename"])),
    min_size=1,
    max_size=3,
)


def check_changes(picked):
    tree = TREE
    for path, value, how in picked:
        try:
            tree = put(tree, path, value, how)
        except (KeyError, IndexError, TypeError):
            continue  # an earlier change took the place away
    read(as_document(tree))


def check_cut(start, length, filler):
    read(TEXT[:start] + filler + TEXT[start + length :])


cuts = (st.integers(0, len(TEXT)), st.integers(0, 60), st.text(alphabet="{}[]:,-#&*!|>'\"%@` \n\tax01", max_size=8))


def test_the_unchanged_tree_loads():
    """The fuzzing starts from something that is right."""
    assert read(TEXT) is not None
    assert read(as_document(TREE)) is not None


@given(changes)
@COUNTED
def test_any_value_in_any_place(picked):
    check_changes(picked)


@given(*cuts)
@COUNTED
def test_any_cut_in_the_text(start, length, filler):
    check_cut(start, length, filler)


@given(st.one_of(st.binary(max_size=400), st.text(max_size=300).map(lambda t: t.encode("utf-8", "surrogatepass"))))
@COUNTED
def test_any_bytes(data):
    read(data)


@given(st.sampled_from(WORDS), st.sampled_from(WORDS), st.text(max_size=30))
@COUNTED
def test_any_trial_value(one, two, text):
    with contextlib.suppress(TrunnionError):
        load_workbook(HERE / "full.yaml", [(f"{one}.{two}", text)], check_files=False)
