"""`house.yaml`, fixed words, fonts and the character policy."""

from __future__ import annotations

import ast
import io
import re
from dataclasses import replace
from pathlib import Path

import pytest
from fontTools.ttLib import TTFont

from trunnion import glyphs
from trunnion.binding import faces
from trunnion.binding.bind import bind
from trunnion.binding.house import House, load_house
from trunnion.binding.words import _GERMAN, Words
from trunnion.errors import BindingError

GOOD = """\
house: 1
organization: Sedge Werke
paper: Letter
language: de
logo: logo.svg
classes: [OPEN, INTERNAL]
title block:
  - {key: contract, label: Contract}
"""
SVG = '<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 30 10"><rect width="30" height="10"/></svg>'


def house_file(folder: Path, text: str) -> Path:
    (folder / "logo.svg").write_text(SVG)
    path = folder / "house.yaml"
    path.write_text(text, "utf-8")
    return path


def test_a_house_file_is_read(tmp_path):
    house = load_house(house_file(tmp_path, GOOD))
    assert (house.organization, house.paper, house.language) == ("Sedge Werke", "Letter", "de")
    assert house.classes == ("OPEN", "INTERNAL")
    assert house.fields == (("contract", "Contract"),)
    assert house.logo is not None


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ("house: 2", "house files start with `house: 1`"),
        ("papper: A4", "did you mean 'paper'?"),
        ("paper: A5", "use one of A4, Letter"),
        ("language: fr", "use one of en, de"),
        ("organization: 7", "organization is not a text"),
        ("classes: OPEN", "classes is not a list of texts"),
        ("title block: [{key: a}]", "a title-block field needs key and label"),
        ("logo: ../logo.svg", "lies outside the house file's folder"),
        ("logo: none.svg", "cannot be read"),
        ("logo: house.yaml", "it is no SVG"),
        (": :", "is not YAML"),
    ],
)
def test_mistakes_in_a_house_file_are_named(tmp_path, change, words):
    key = change.split(":")[0]
    lines = [line for line in ("house: 1", "paper: A4") if line.split(":")[0] != key]
    with pytest.raises(BindingError, match=re.escape(words)):
        load_house(house_file(tmp_path, "\n".join([*lines, change]) + "\n"))


def test_a_class_the_house_does_not_know_is_refused(material, tmp_path):
    house = House(classes=("INTERNAL",), source="house.yaml")
    with pytest.raises(BindingError, match="the document class 'OPEN' is not one of the house's"):
        bind(material.package(), tmp_path, pdf=False, house=house)


def test_logo_and_fields_stand_on_the_cover(material, tmp_path):
    house = load_house(house_file(tmp_path, GOOD))
    document = replace(material.package().document, extra={"contract": "V-7"})
    html = bind(material.package(document=document), tmp_path, house=house).html.read_text("utf-8")
    assert 'alt="Sedge Werke"' in html
    assert "V-7" in html


def test_every_fixed_word_the_binder_asks_for_is_translated():
    """All literal phrases given to `words(...)`, `w(...)` or `heads(...)` in the room, read from its source."""
    room = Path(faces.__file__).parent
    asked = set()
    for path in room.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.Call):
                name = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
                if name in ("words", "w", "heads"):
                    asked |= {a.value for a in node.args if isinstance(a, ast.Constant) and isinstance(a.value, str)}
    assert len(asked) > 60
    assert asked <= set(_GERMAN), asked - set(_GERMAN)


def test_unknown_languages_are_refused():
    with pytest.raises(BindingError, match="no fixed words in 'xx'"):
        Words("xx")


def test_licences_of_all_fonts_lie_beside_them_and_allow_embedding():
    """fsType 0: installable embedding (OpenType specification, table OS/2)."""
    for path in glyphs.FONT_FOLDER.glob("*.ttf"):
        font = TTFont(path, lazy=True)
        assert font["OS/2"].fsType == 0
        stem = path.stem.split("-")[0]
        licences = [p for p in glyphs.FONT_FOLDER.glob("*-LICENSE.txt") if stem in p.name]
        assert len(licences) == 1, path.name
        if stem != "DejaVuSans":
            assert "SIL Open Font License, Version 1.1" in str(font["name"].getDebugName(13))
            assert "SIL OPEN FONT LICENSE Version 1.1" in licences[0].read_text("utf-8")
        if stem.startswith("Trunnion"):  # the licence reserves the name of the original for unmodified copies
            assert "Plex" not in str(font["name"].getDebugName(1))


def test_the_coverage_list_is_that_of_the_fonts():
    import json

    assert json.loads((glyphs.FONT_FOLDER / "coverage.json").read_text()) == glyphs.read_coverage()


def test_ready_subsets_have_what_their_lists_say():
    for face in (*faces.FACES, faces.MATHS, *faces.FIGURES.values()):
        data = (faces.FOLDER / f"{face.name}.woff").read_bytes()
        held = (faces.FOLDER / f"{face.name}.txt").read_text("utf-8").removesuffix("\n")
        assert held == faces.characters_of(data)
        source = set(map(chr, TTFont(glyphs.FONT_FOLDER / face.file, lazy=True).getBestCmap()))
        assert face.chars & source <= set(held)
    assert "MATH" in TTFont(io.BytesIO((faces.FOLDER / "maths.woff").read_bytes()))


def test_the_first_mathematics_font_draws_what_markup_leaves_out():
    # MathML Core, "Radicals" (W3C; from memory): <msqrt> takes its sign from the first available font, unnamed in text.
    assert set("√()[]{}|‖") <= set((faces.FOLDER / "maths.txt").read_text("utf-8"))


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("plain words", "plain words"),
        ("lock margin ≥ 45.00° × 2", "lock margin ≥ 45.00° × 2"),
        ("漢", "[U+6F22]"),
        ("a\x07b", "a[U+0007]b"),
        ("\u202eabc", "[U+202E]abc"),
        ("x\u200dy\ufeff", "x[U+200D]y[U+FEFF]"),
        ("e\u0301", "é"),
        ("line\r\nline\ttab", "line\nline\ttab"),
        ("\ue000", "[U+E000]"),
        ("\U0001f680", "[U+1F680]"),
    ],
)
def test_characters_are_shown_or_numbered(text, shown):
    assert glyphs.visible_text(text) == shown


def test_line_separators_and_other_spaces_that_could_hide_are_numbered():
    for char in "\u2028\u2029\u00ad\u200b\u2060":
        assert glyphs.visible_text(char) == f"[U+{ord(char):04X}]"
