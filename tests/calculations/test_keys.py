"""The content key: each part flipped in turn puts exactly the right calculations out of date."""

from __future__ import annotations

import copy
import shutil
from dataclasses import replace
from pathlib import Path

import pytest

import trunnion
from trunnion.calculations import templates
from trunnion.calculations.keys import FOUNDATION, ROOMS, content_key, key_parts, source_digests, surroundings
from trunnion.calculations.reasons import ReasonKind, reasons

MINIATURE = Path(__file__).parent / "miniature"


@pytest.fixture
def parts():
    template = templates.find("tiny-margin", MINIATURE)
    around = surroundings()
    return key_parts("C01", template, {"steepest": "25 deg"}, {"0123456789ab-a.csv": "0" * 64}, around)


FLIPS = {
    "calculation": lambda p: p.update(calculation="C02"),
    "template text": lambda p: p["template"].update(cells="1" * 64),
    "local flag": lambda p: p["template"].update(local=False),
    "parameter": lambda p: p["parameters"].update(steepest="26 deg"),
    "input": lambda p: p["inputs"].update({"0123456789ab-a.csv": "2" * 64}),
    "code": lambda p: p.update(code="3" * 64),
    "python": lambda p: p.update(python="3.99"),
    **{
        name: lambda p, name=name: p["libraries"].update({name: "0"})
        for name in ("numpy", "scipy", "sympy", "matplotlib")
    },
}


@pytest.mark.parametrize("flip", FLIPS.values(), ids=FLIPS)
def test_every_part_changes_the_key(parts, flip) -> None:
    other = copy.deepcopy(parts)
    flip(other)
    assert content_key(other) != content_key(parts)


@pytest.mark.parametrize(
    ("name", "kind", "what"),
    [
        ("template text", ReasonKind.TEMPLATE, "tiny-margin"),
        ("parameter", ReasonKind.PARAMETER, "steepest"),
        ("input", ReasonKind.INPUT, "a.csv"),
        ("code", ReasonKind.CODE, "of the numerical rooms"),
        ("python", ReasonKind.PYTHON, "version"),
        ("scipy", ReasonKind.LIBRARY, "scipy"),
    ],
)
def test_each_reason_names_what_changed_with_old_and_new(parts, name, kind, what) -> None:
    other = copy.deepcopy(parts)
    FLIPS[name](other)
    (reason,) = reasons(parts, other)
    assert (reason.kind, reason.what) == (kind, what)
    assert reason.old != reason.new
    assert reason.old is not None
    assert what in reason.text
    assert reasons(parts, copy.deepcopy(parts)) == []


def test_changed_source_files_are_named(parts) -> None:
    before, after = {"attitude/a.py": "1", "units.py": "2"}, {"attitude/a.py": "9", "units.py": "2"}
    around = surroundings()
    template = templates.find("tiny-margin", MINIATURE)
    old = key_parts("C01", template, {}, {}, replace(around, code=before))
    new = key_parts("C01", template, {}, {}, replace(around, code=after))
    (reason,) = reasons(old, new, old_code=before, new_code=after)
    assert (reason.what, reason.old, reason.new) == ("attitude/a.py", "1", "9")


@pytest.fixture
def package(tmp_path: Path) -> Path:
    source = Path(trunnion.__file__).parent
    return Path(shutil.copytree(source, tmp_path / "trunnion", ignore=shutil.ignore_patterns("__pycache__")))


def test_editing_any_importable_room_changes_the_sources(package: Path) -> None:
    former = source_digests(package)
    edited = [package / name for name in FOUNDATION if (package / name).exists()]
    edited += [next((package / room).rglob("*.py")) for room in ROOMS]
    for path in edited:
        path.write_text(path.read_text(encoding="utf-8") + "\n# edited\n", encoding="utf-8")
        now = source_digests(package)
        assert {name for name in now if now[name] != former[name]} == {path.relative_to(package).as_posix()}
        former = now


@pytest.mark.parametrize("room", ["calculations", "binding", "records", "cli"])
def test_editing_a_room_no_notebook_imports_changes_nothing(package: Path, room: str) -> None:
    former = source_digests(package)
    for path in (package / room).rglob("*.py"):
        path.write_text(path.read_text(encoding="utf-8") + "\n# edited\n", encoding="utf-8")
    assert source_digests(package) == former
