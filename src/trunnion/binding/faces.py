"""Fonts inside the HTML page: ready subsets of the vendored fonts, and what a page needs beyond them.

The subsets (`data/faces`) hold what packages nearly always use and are part of the program, so that a page costs no
time for them and has the same bytes everywhere; `python -m trunnion.binding.faces` makes them anew. Rare characters
come in one more small font made for the page.
"""

from __future__ import annotations

import base64
import functools
import io
import logging
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from trunnion.binding.maths import symbols
from trunnion.glyphs import FALLBACK_FACE, FONT_FOLDER, MATHS_FACE, MONO_FACE

FOLDER = Path(__file__).with_name("data") / "faces"
_SIGNS = "–—‘’“”„…·•°′″×÷≥≤≠≈≡±−→←↑↓↔⇒∞√∂∑∈∥⊥∠µ²³⁰¹⁴⁵⁶⁷⁸⁹⁻ⁿ½¼¾§©®€†‡‰\u00a0\u2009\u202f"
LATIN = frozenset(map(chr, [*range(32, 127), *range(0xA0, 0x180), *range(0x391, 0x3CA), *range(0x410, 0x450)])) | set(
    _SIGNS
)
MARKS = frozenset("●○✗✓■□▲△◆◇⚠↺↻")
_PLAIN = frozenset(map(chr, range(32, 127))) | frozenset("°−±×·…′″≥≤≈≠→αβγδεθϑκλμνπρστφϕχψωΓΔΘΛΣΦΨΩ²³\u00a0\u2009")


def _maths_characters() -> frozenset[str]:
    """Signs and letters of the formulas: all signs the reader knows, the alphabets calculations use."""
    found: set[str] = set(map(chr, range(32, 127))) | set("−∗√‖′″‴⁗ˆ˜˙¨¯ˇ˘´˚‾⏞⏟⟶⟵⃛̂̃→\u00a0\u2009")
    tables = (symbols.GREEK, symbols.CAPITALS, symbols.ORDINARY, symbols.BINARY, symbols.RELATION, symbols.INNER)
    for table in (*tables, symbols.BIG, symbols.DELIMITERS, symbols.NEGATED):
        found |= {char for value in table.values() for char in value}
    for variant in ("it", "bf", "bi"):
        found |= set(symbols.STYLES[variant].values())
    found |= set("ℝℤℕℚℂℍℋℒℱ𝒜𝒞𝒟𝒢𝒩𝒪𝒮𝒯𝖳𝖱")
    return frozenset(found)


@dataclass(frozen=True)
class Face:
    """A vendored font, what its ready subset holds, and the CSS it is offered under."""

    name: str
    file: str
    chars: frozenset[str]
    family: str
    weight: int = 400
    style: str = "normal"
    features: tuple[str, ...] = ("kern", "tnum")


FACES = (
    Face("regular", "TrunnionSans-Regular.ttf", LATIN, "TrunnionText"),
    Face("italic", "TrunnionSans-Italic.ttf", LATIN, "TrunnionText", style="italic"),
    Face("semibold", "TrunnionSans-SemiBold.ttf", LATIN, "TrunnionText", weight=600),
    Face("mono", MONO_FACE, LATIN, "TrunnionMono", features=()),
    Face("marks", FALLBACK_FACE, MARKS, "TrunnionSigns", features=()),
)
MATHS = Face("maths", MATHS_FACE, _maths_characters(), "TrunnionMaths", features=("ssty", "dtls"))
FIGURES = {
    "DejaVu Sans": Face("figure-plain", FALLBACK_FACE, _PLAIN, "DejaVu Sans", features=()),
    "Trunnion Sans": Face("figure-house", "TrunnionSans-Regular.ttf", _PLAIN, "Trunnion Sans", features=()),
}


def face_rules(text: Iterable[str], maths: Iterable[str]) -> str:
    """The `@font-face` rules for a page using these characters."""
    signs = frozenset(maths)
    faces = (*FACES, MATHS) if signs else FACES
    rules = [_rule(face, _ready(face)) for face in faces]
    rare = frozenset(text) - (_held(FACES[0]) & _held(FACES[3])) - _held(FACES[4])
    rules += _rare("TrunnionRare", FALLBACK_FACE, rare)
    rules += _rare("TrunnionRareMaths", MATHS_FACE, signs - _held(MATHS))
    return "\n".join(rules)


def figure_rules(svg: str, chars: frozenset[str]) -> str:
    """The `@font-face` rules a picture needs inside itself; "" when it names no font of ours."""
    rules = []
    for family, face in FIGURES.items():
        if family in svg:
            held = chars <= _held(face)
            data = _ready(face) if held else subset_woff(face.file, chars | _held(face), ())
            rules.append(_rule(face, data))
    return "".join(rules)


def _rare(family: str, file: str, chars: frozenset[str]) -> list[str]:
    if not chars:
        return []
    return [_rule(Face("rare", file, chars, family), subset_woff(file, chars, ()))]


def _rule(face: Face, woff: bytes) -> str:
    data = base64.b64encode(woff).decode("ascii")
    return (
        f"@font-face{{font-family:'{face.family}';font-weight:{face.weight};font-style:{face.style};"
        f"src:url(data:font/woff;base64,{data}) format('woff')}}"
    )


@functools.cache
def _ready(face: Face) -> bytes:
    return (FOLDER / f"{face.name}.woff").read_bytes()


@functools.cache
def _held(face: Face) -> frozenset[str]:
    """The characters really in a ready subset (a face may lack some of those wished for)."""
    return frozenset((FOLDER / f"{face.name}.txt").read_text("utf-8").removesuffix("\n"))


@functools.lru_cache(maxsize=64)
def subset_woff(file: str, chars: frozenset[str], features: tuple[str, ...]) -> bytes:
    """A WOFF of one vendored font with these characters only (and the variants mathematics stretches to)."""
    from fontTools import subset

    logging.getLogger("fontTools").setLevel(logging.ERROR)
    options = subset.Options()
    options.flavor = "woff"
    options.hinting = False
    options.notdef_outline = True
    options.recalc_timestamp = False
    options.name_IDs = [0, 13, 14]
    options.layout_features = list(features)
    if not features:
        options.drop_tables += ["GSUB", "GPOS", "GDEF", "kern"]
    font = subset.load_font(str(FONT_FOLDER / file), options)
    subsetter = subset.Subsetter(options)
    subsetter.populate(unicodes=sorted(map(ord, chars)))
    subsetter.subset(font)
    out = io.BytesIO()
    subset.save_font(font, out, options)
    return out.getvalue()


def characters_of(woff: bytes) -> str:
    """The characters a WOFF has, in order."""
    from fontTools.ttLib import TTFont

    return "".join(map(chr, sorted(TTFont(io.BytesIO(woff)).getBestCmap())))


if __name__ == "__main__":
    FOLDER.mkdir(exist_ok=True)
    for face in (*FACES, MATHS, *FIGURES.values()):
        made = subset_woff(face.file, face.chars, face.features)
        (FOLDER / f"{face.name}.woff").write_bytes(made)
        (FOLDER / f"{face.name}.txt").write_text(characters_of(made) + "\n", "utf-8")
