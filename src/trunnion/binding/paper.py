"""Sizes on paper: where long words may break, how wide columns are, which tables stay whole, how large pictures are."""

from __future__ import annotations

import functools
import re
from dataclasses import replace

from trunnion.binding import blocks as b
from trunnion.binding.calculation import plain
from trunnion.glyphs import FONT_FOLDER, TEXT_FACES

TEXT_WIDTH_MM, LARGEST_HEIGHT_MM = 160.0, 190.0
TABLE_SIZE, SMALLEST = 8.5, 6.5  # pt

_LONG_WORD = re.compile(r"[^\s\u00a0]{14,}")
VERY_LONG_WORD = re.compile(r"\S{80,}")


def breakable(text: str) -> str:
    """Long words get invisible places to break: after their own stops, and in runs that have none."""

    def split(match: re.Match[str]) -> str:
        word = re.sub(r"(?<=[./_:;,])(?=[^\s./_:;,\d])", "\u200b", match.group())
        return re.sub(r"[^\u200b]{23,}", lambda m: chopped(m.group(), 12), word)

    return _LONG_WORD.sub(split, text)


def chopped(word: str, every: int) -> str:
    """A word with an invisible place to break after every so many letters."""
    return "\u200b".join(word[i : i + every] for i in range(0, len(word), every))


def columns_of(block: b.Table) -> tuple[str, float]:
    """Column widths and letter size: as wide as needed when all fits, else shares that hold every word whole."""
    longest, words = _measured(block)
    if block.widths:
        return _given(block.widths, words), TABLE_SIZE
    per_em = TABLE_SIZE * 0.3528
    room = (TEXT_WIDTH_MM - 2.9 * len(longest)) / per_em  # in em, cell insets taken off
    if sum(longest) <= room:
        return "auto, " * len(longest), TABLE_SIZE
    needed = sum(words)
    size = TABLE_SIZE if needed <= room else max(SMALLEST, round(TABLE_SIZE * room / needed, 1))
    spare = max(0.0, room - needed)
    wishes = [min(long, 40.0) - min(word, 40.0) + 0.01 for long, word in zip(longest, words, strict=True)]
    gap = 2.9 / per_em
    shares = [word + gap + spare * wish / sum(wishes) for word, wish in zip(words, wishes, strict=True)]
    return "".join(f"{share:.3f}fr, " for share in shares), size


def unbroken(block: b.Table) -> b.Table:
    """Short cells of columns set to the right are numbers with their units: they stay on one line."""

    def whole(cell: b.Line) -> b.Line:
        if len(plain(cell)) > 26:
            return cell
        return tuple(b.Text(part.text.replace(" ", "\u00a0")) if isinstance(part, b.Text) else part for part in cell)

    align = block.align or ""
    rows = tuple(
        tuple(whole(cell) if side == "r" else cell for side, cell in zip(align, row, strict=True)) for row in block.rows
    )
    return replace(block, rows=rows) if "r" in align else block


def narrowed(block: b.Table) -> list[b.Table]:
    """A table too wide for legible letters, as several below each other, each with the first column again."""
    words = _measured(block)[1]
    count = len(words)
    gap = 2.9 / (SMALLEST * 0.3528)
    room = TEXT_WIDTH_MM / (SMALLEST * 0.3528)
    if block.widths or count < 3 or sum(words) + gap * count <= room:
        return [block]
    widest = max(words[1:]) + gap
    each = max(1, int((room - words[0] - gap) / widest))
    each = -(-(count - 1) // -(-(count - 1) // each))  # as many parts as that needs, of like size
    groups = [list(range(start, min(start + each, count))) for start in range(1, count, each)]
    return [_withcolumns_of(block, [0, *group], first=index == 0) for index, group in enumerate(groups)]


def _withcolumns_of(block: b.Table, columns: list[int], *, first: bool) -> b.Table:
    return replace(
        block,
        headers=tuple(block.headers[c] for c in columns),
        rows=tuple(tuple(row[c] for c in columns) for row in block.rows),
        align="".join(block.align[c] for c in columns) if block.align else "",
        row_anchors=block.row_anchors if first else (),
    )


def _given(widths: tuple[float, ...], words: list[float]) -> str:
    """Stated shares of the line, columns that could not hold their longest word widened at the others' cost."""
    total = TEXT_WIDTH_MM / sum(widths)
    least = [word * TABLE_SIZE * 0.3528 + 3.2 for word in words]
    wished = [width * total for width in widths]
    short = sum(max(0.0, need - wish) for need, wish in zip(least, wished, strict=True))
    spare = sum(max(0.0, wish - need) for need, wish in zip(least, wished, strict=True))
    given = min(1.0, short / spare) if spare else 0.0
    shares = [need if wish < need else wish - given * (wish - need) for need, wish in zip(least, wished, strict=True)]
    return "".join(f"{share:.2f}fr, " for share in shares)


def _measured(block: b.Table) -> tuple[list[float], list[float]]:
    """Of each column the longest cell and the longest unbreakable word, in em."""
    longest, words = [1.0] * len(block.headers), [1.0] * len(block.headers)
    for row in (block.headers, *block.rows):
        for column, cell in enumerate(row):
            text = re.sub(r"\\[A-Za-z]+|[{}\\^_]", "", plain(cell))
            longest[column] = max([longest[column], *(width_in_em(line) for line in text.split("\n"))])
            pieces = re.split("[ \\n]", breakable(text).replace("\u200b", " "))
            words[column] = max([words[column], *(width_in_em(piece) for piece in pieces)])
    return longest, words


@functools.cache
def _advances() -> dict[str, float]:
    """The width of each letter of the text face in em, digits all alike as in tables."""
    from fontTools.ttLib import TTFont

    font = TTFont(FONT_FOLDER / TEXT_FACES[2], lazy=True)
    metrics, unit = font["hmtx"].metrics, font["head"].unitsPerEm
    widths = {chr(code): metrics[name][0] / unit for code, name in font.getBestCmap().items()}
    return widths | dict.fromkeys("0123456789", max(widths[digit] for digit in "0123456789"))


def width_in_em(text: str) -> float:
    """The width of a text in em, set semibold (no narrower than what will be printed)."""
    widths = _advances()
    return sum(widths.get(char, 0.7) for char in text)


def kept_whole(block: b.Table) -> bool:
    """Whether a table is kept on one page."""
    return len(block.rows) <= 12 and sum(len(plain(cell)) for row in block.rows for cell in row) <= 1200


@functools.lru_cache(maxsize=256)
def _size_of(data: bytes, media: str) -> tuple[float, float] | None:
    """Width and height of a picture in points, where it states them."""
    if media == "image/png":
        return int.from_bytes(data[16:20], "big") * 0.75, int.from_bytes(data[20:24], "big") * 0.75
    head = data[:4000].decode("utf-8", "replace")
    match = re.search(r"viewBox=[\"']\s*[-\d.]+[\s,]+[-\d.]+[\s,]+([\d.]+)[\s,]+([\d.]+)", head)
    return (float(match.group(1)), float(match.group(2))) if match else None


def image_size(block: b.Figure) -> str:
    """The typst width of a picture: its own, or less where it would leave the text or the page."""
    size = _size_of(block.data, block.media)
    if size is None or not all(size):
        return ", width: 100%"
    width, height = size[0] * 0.3528, size[1] * 0.3528
    factor = min(1.0, TEXT_WIDTH_MM / width, LARGEST_HEIGHT_MM / height)
    return f", width: {width * factor:.2f}mm"
