"""Which characters the vendored fonts can show, and how the others are shown: `[U+6F22]`.

One policy for PDF, HTML and figures: a character that no vendored font has, a control or formatting character
(direction overrides, zero-width joiners), or a private-use one is printed as its code point in brackets, so that
nothing is lost, nothing is replaced by a box, and nothing hidden changes how a line reads.
"""

from __future__ import annotations

import json
import re
import unicodedata
from collections import Counter
from collections.abc import Iterable
from functools import cache
from pathlib import Path

FONT_FOLDER = Path(__file__).with_name("fonts")
TEXT_FACES = ("TrunnionSans-Regular.ttf", "TrunnionSans-Italic.ttf", "TrunnionSans-SemiBold.ttf")
MATHS_FACE = "STIXTwoMath-Regular.ttf"
MONO_FACE = "TrunnionMono-Regular.ttf"
FALLBACK_FACE = "DejaVuSans.ttf"
TEXT_FAMILY = "Trunnion Sans"
MONO_FAMILY = "Trunnion Mono"
MATHS_FAMILY = "STIX Two Math"
FALLBACK_FAMILY = "DejaVu Sans"


def visible_text(text: str, missing: Counter[str] | None = None, *, maths: bool = False) -> str:
    """`text` with every character that cannot be shown written as `[U+XXXX]`; line feeds and tabs stay.

    `missing` counts what was replaced ("U+6F22" -> how often). `maths` asks for the mathematics font.
    Composed forms are used (NFC), so that letters with accents find their glyphs.
    """

    def show(match: re.Match[str]) -> str:
        code = f"U+{ord(match.group()):04X}"
        if missing is not None:
            missing[code] += 1
        return f"[{code}]"

    if text.isascii() and text.isprintable():
        return text
    plain = unicodedata.normalize("NFC", text.replace("\r\n", "\n").replace("\r", "\n"))
    return _hidden("maths" if maths else "text").sub(show, plain)


def can_show(char: str, *, maths: bool = False) -> bool:
    """Whether one character is printed as itself."""
    return _hidden("maths" if maths else "text").match(char) is None


@cache
def _hidden(kind: str) -> re.Pattern[str]:
    ranges = json.loads((FONT_FOLDER / "coverage.json").read_text("ascii"))[kind]
    inside = "".join(f"\\U{low:08x}-\\U{high:08x}" for low, high in ranges)
    return re.compile(f"[^\n\t{inside}]")


def _faces(names: Iterable[str]) -> list[set[int]]:
    from fontTools.ttLib import TTFont

    return [set(TTFont(FONT_FOLDER / name, lazy=True).getBestCmap()) for name in names]


def _ranges(codes: Iterable[int]) -> list[list[int]]:
    out: list[list[int]] = []
    for code in sorted(codes):
        if unicodedata.category(chr(code)) in ("Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"):
            continue
        if out and out[-1][1] == code - 1:
            out[-1][1] = code
        else:
            out.append([code, code])
    return out


def read_coverage() -> dict[str, list[list[int]]]:
    """The ranges of characters the fonts have, read from the fonts themselves (needs fontTools)."""
    text = set.intersection(*_faces(TEXT_FACES))
    mono, maths, fallback = _faces((MONO_FACE, MATHS_FACE, FALLBACK_FACE))
    return {"text": _ranges((text | fallback) & (mono | fallback)), "maths": _ranges(maths)}


if __name__ == "__main__":
    lines = json.dumps(read_coverage()).replace("]], ", "]],\n")
    (FONT_FOLDER / "coverage.json").write_text(lines + "\n", "ascii")
