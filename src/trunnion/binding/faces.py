"""Fonts inside the HTML page: only the glyphs it uses, as WOFF, under names of our own."""

from __future__ import annotations

import base64
import functools
import io
import logging
from collections.abc import Iterable
from dataclasses import dataclass

from trunnion.glyphs import FALLBACK_FACE, FONT_FOLDER, MATHS_FACE, MONO_FACE


@dataclass(frozen=True)
class Face:
    """A font file and the CSS it is offered under."""

    file: str
    family: str
    weight: int = 400
    style: str = "normal"


REGULAR = Face("TrunnionSans-Regular.ttf", "TrunnionText")
ITALIC = Face("TrunnionSans-Italic.ttf", "TrunnionText", style="italic")
SEMIBOLD = Face("TrunnionSans-SemiBold.ttf", "TrunnionText", weight=600)
MONO = Face(MONO_FACE, "TrunnionMono")
MATHS = Face(MATHS_FACE, "TrunnionMaths")
FALLBACK = Face(FALLBACK_FACE, "TrunnionSigns")


def face_rules(text: Iterable[str], maths: Iterable[str]) -> str:
    """The `@font-face` rules for a page using these characters."""
    chars = frozenset(text)
    rules = [_rule(face, chars) for face in (REGULAR, ITALIC, SEMIBOLD, MONO)]
    rest = chars - _characters(REGULAR.file)
    if rest:
        rules.append(_rule(FALLBACK, rest))
    signs = frozenset(maths)
    if signs:
        rules.append(_rule(MATHS, signs))
    return "\n".join(rules)


def _rule(face: Face, chars: frozenset[str]) -> str:
    data = base64.b64encode(subset_woff(face.file, chars)).decode("ascii")
    return (
        f"@font-face{{font-family:{face.family};font-weight:{face.weight};font-style:{face.style};"
        f"src:url(data:font/woff;base64,{data}) format('woff')}}"
    )


@functools.cache
def _characters(file: str) -> frozenset[str]:
    from fontTools.ttLib import TTFont

    return frozenset(map(chr, TTFont(FONT_FOLDER / file, lazy=True).getBestCmap()))


@functools.lru_cache(maxsize=32)
def subset_woff(file: str, chars: frozenset[str]) -> bytes:
    """A WOFF of one vendored font with these characters only (and the variants mathematics stretches to)."""
    from fontTools import subset

    logging.getLogger("fontTools").setLevel(logging.ERROR)
    options = subset.Options()
    options.flavor = "woff"
    options.hinting = False
    options.notdef_outline = True
    options.recalc_timestamp = False
    options.name_IDs = [0, 13, 14]
    options.layout_features = ["ssty", "dtls"] if file == MATHS_FACE else ["kern", "tnum", "mark", "mkmk", "ccmp"]
    font = subset.load_font(str(FONT_FOLDER / file), options)
    subsetter = subset.Subsetter(options)
    subsetter.populate(unicodes=sorted(map(ord, chars)))
    subsetter.subset(font)
    out = io.BytesIO()
    subset.save_font(font, out, options)
    return out.getvalue()
