"""The typst writer: the neutral document as PDF/A-3a and PDF/UA-1, notebook bodies attached as source.

All texts reach typst as string literals, all formulas escaped (`maths.typst_maths`); nothing of a package can act
as typst code, and the compiler sees a folder of its own and no system fonts.
"""

from __future__ import annotations

import datetime
import re
import tempfile
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from typing import Any

from trunnion.binding import blocks as b
from trunnion.binding.calculation import plain
from trunnion.binding.house import PAPERS, House
from trunnion.binding.maths import Formula
from trunnion.binding.maths.typst_maths import quoted, typst_maths
from trunnion.binding.package import Verdict
from trunnion.binding.paper import (
    TEXT_WIDTH_MM,
    VERY_LONG_WORD,
    breakable,
    chopped,
    columns_of,
    image_size,
    kept_whole,
    narrowed,
    unbroken,
    width_in_em,
)
from trunnion.binding.words import Words
from trunnion.errors import BindingError, Fault, Place
from trunnion.glyphs import FONT_FOLDER, visible_text

STANDARDS: list[Any] = ["a-3a", "ua-1"]
LEAST_SCALE = 0.7
HEAD_WIDTH = TEXT_WIDTH_MM / (8.0 * 0.3528) - 1.5  # em of the head of a page, gap taken off
_TEMPLATE = "trunnion.typ"
_BADGES = {Verdict.MEETS: "meets", Verdict.DOES_NOT_MEET: "fails", Verdict.NOT_SHOWN: "unshown"}
_MARKED = {"strong": "strong", "emph": "emph", "strike": "strike", "code": "code", "quiet": "quiet", "hash": "hash"}
_MARKED |= {"value": "value"}
_SIDES = {"l": "left", "r": "right", "c": "center"}
Scaled = tuple[tuple[str, str, float], ...]


def write_pdf(document: b.NeutralDocument, house: House) -> tuple[bytes, int, Scaled]:
    """The PDF, its number of pages, and which formulas were made smaller (calculation, cell, factor).

    Raises `BindingError` naming the cell of each formula that would have to shrink below `LEAST_SCALE`.
    """
    import typst

    writer = _Writer(document, house, Words(document.language))
    source = writer.source()
    with tempfile.TemporaryDirectory(prefix="trunnion-") as name:
        folder = Path(name)
        for path, content in writer.files.items():
            (folder / path).write_bytes(content)
        (folder / _TEMPLATE).write_bytes((Path(__file__).with_name("data") / _TEMPLATE).read_bytes())
        (folder / "main.typ").write_text(source, "utf-8")
        compiler = typst.Compiler(
            str(folder / "main.typ"), root=str(folder), font_paths=[str(FONT_FOLDER)], ignore_system_fonts=True
        )
        try:
            pdf = compiler.compile(format="pdf", pdf_standards=STANDARDS, timestamp=writer.timestamp)
            found = compiler.query("<made-smaller>", field="value") if "display-maths" in source else "[]"
        except typst.TypstError as error:
            raise BindingError([writer.fault(str(error.message), str(error.diagnostic))]) from error
    if not isinstance(pdf, bytes):
        raise BindingError([Fault("the PDF writer gave no file", "report this as an error of the program")])
    return pdf, _pages(pdf), _scaled(found)


def _scaled(found: Any) -> Scaled:
    import json

    rows = json.loads(found) if isinstance(found, str) else found
    scaled = tuple((str(row[0]), str(row[1]), round(float(row[2]), 3)) for row in rows)
    faults = [
        Fault(
            f"a formula would be printed at {factor:.2f} of its size; below {LEAST_SCALE} it is unreadable",
            "use short symbols (c_θ, s_θ), name common parts, or break the line",
            Place(calculation, key=cell),
        )
        for calculation, cell, factor in scaled
        if factor < LEAST_SCALE
    ]
    if faults:
        raise BindingError(faults)
    return scaled


def _pages(pdf: bytes) -> int:
    """The page count the root of the page tree states."""
    counts = [int(n) for n in re.findall(rb"/Type\s*/Pages\b[^>]*?/Count\s+(\d+)", pdf)]
    counts += [int(n) for n in re.findall(rb"/Count\s+(\d+)[^>]*?/Type\s*/Pages\b", pdf)]
    return max(counts, default=0)


class _Writer:
    """Writes typst source; pictures and attachments are collected as files beside it."""

    def __init__(self, document: b.NeutralDocument, house: House, words: Words) -> None:
        self.document, self.house, self.words = document, house, words
        self.files: dict[str, bytes] = {}
        self.missing: Counter[str] = Counter()  # counted in HTML, where every text stands once
        self.lines: list[str] = []
        self.inside = ""  # the part being written, where its sections are bookmarks only and not listed in the contents
        try:
            self.date = datetime.date.fromisoformat(document.date)
        except ValueError as error:
            fault = Fault(f"the document date {document.date!r}", "write it as 2026-03-14", Place(key="document"))
            raise BindingError([fault]) from error
        noon = datetime.datetime.combine(self.date, datetime.time(12), datetime.UTC)
        self.timestamp = int(noon.timestamp())

    def fault(self, message: str, diagnostic: str) -> Fault:
        """A compiler message, traced to the calculation it arose in where the source says so."""
        match = re.search(r"main\.typ:(\d+)", diagnostic)
        where = ""
        if match:
            before = self.lines[: int(match.group(1))]
            where = next((line[3:] for line in reversed(before) if line.startswith("// ")), "")
        return Fault(f"the PDF cannot be made: {message}", "report this as an error of the program", Place(key=where))

    # -- the document ------------------------------------------------------------------------------------
    def source(self) -> str:
        doc, d = self.document, self.date
        author = ", ".join(self.text(name) for name in doc.authors if name)
        author = f"({author},)" if author else "()"
        head = [
            f'#import "{_TEMPLATE}": *',
            f"#show: package.with(paper: {quoted(PAPERS[self.house.paper])}, lang: {quoted(doc.language)},",
            f"  title: {self.text(f'{doc.number} {doc.revision}: {doc.title}')}, author: {author},",
            f"  date: datetime(year: {d.year}, month: {d.month}, day: {d.day}), keywords: ({self.text(doc.number)},))",
        ]
        body = [self.run(run) for run in _runs(doc.parts)]
        self.lines = "\n".join([*head, *self.attachments(), *body]).split("\n")
        return "\n".join(self.lines) + "\n"

    def attachments(self) -> list[str]:
        out = []
        for index, found in enumerate(self.document.attachments):
            path = f"attached-{index}"
            self.files[path] = found.data
            kind = f'relationship: "source", mime-type: {quoted(found.media)}'
            content = f"read({quoted(path)}, encoding: none)"
            words = f"description: {self.text(found.description)}"
            out.append(f"#pdf.attach({quoted(found.name)}, {content}, {kind}, {words})")
        return out

    def text(self, text: str) -> str:
        """A string literal; unseen characters made visible, very long words given places to break."""
        return quoted(breakable(visible_text(text, self.missing)))

    def run(self, parts: list[b.Part]) -> str:
        """Parts that share pages, with the head and foot of those pages."""
        doc, w, first = self.document, self.words, parts[0]
        known = f"{doc.number} · {w('Rev.')} {doc.revision} · {doc.date}"
        left = self.text(known)
        cover = doc.organization if first.look == "cover" else doc.title
        right = self.text(first.calculation or _clipped(cover, HEAD_WIDTH - width_in_em(known)))
        foot, mark = self.text(first.state), self.text(doc.classification)
        sheet = f"{self.text(w('Sheet'))}, {self.text(w('of'))}"
        body = "\n".join(self.part(part, flows=index > 0) for index, part in enumerate(parts))
        return f"#running({left}, {right}, {foot}, {mark}, {sheet})[\n{body}\n]"

    def part(self, part: b.Part, *, flows: bool) -> str:
        self.inside = "" if part.anchor.partition("-")[0] in ("decisions", "standing", "statements") else part.anchor
        anchor, title = quoted(part.anchor), self.text(part.title)
        if part.look == "cover":
            head = f"#cover-head({self.text(self.words('Calculation package'))}, {title}, {anchor}, {self.logo()})"
        elif part.look == "contents":
            gap = "#v(11mm, weak: true)\n" if flows else ""
            head = f"{gap}#[#heading(level: 1, outlined: false)[#{title}]#label({anchor})]"
        else:
            kicker = self.text(self.words("Appendix")) if part.number.isalpha() else "none"
            head = f"#part-head({kicker}, {self.text(part.number)}, {title}, {anchor}, flows: {str(flows).lower()})"
        blocks = self.joined(part.blocks)
        where = re.sub(r"[^ -~]", "?", part.title)  # a comment: nothing in it may end its line
        return f"// {where}\n{head}\n{blocks}"

    def logo(self) -> str:
        if self.house.logo is None:
            return "none"
        media, data = self.house.logo
        path = "logo.svg" if media == "image/svg+xml" else "logo.png"
        self.files[path] = data
        return f"image({quoted(path)}, height: 14mm, alt: {self.text(self.house.organization or 'logo')})"

    # -- lines -------------------------------------------------------------------------------------------
    def line(self, parts: b.Line) -> str:
        """Markup: each part starts with #, so that nothing can join to a call."""
        return "".join(self.inline(part) for part in parts)

    def content(self, parts: b.Line) -> str:
        return f"[{self.line(parts)}]"

    def inline(self, part: b.Inline) -> str:
        if isinstance(part, b.Text):
            return f"#{self.text(part.text)}" if part.text else ""
        if isinstance(part, b.InlineMath):
            return f"#line-maths({self.alt(part.formula)}, ${typst_maths(part.formula)}$.body);"
        if isinstance(part, b.Break):
            return "#linebreak();"
        if isinstance(part, b.Badge):
            word = self.text(self.words.verdict(part.verdict))
            return f"#badge({quoted(_BADGES[part.verdict])}, {word}, quiet: {str(part.quiet).lower()});"
        if isinstance(part, b.Link):
            page = f"#at({quoted(part.target)}, {self.text(self.words('p.'))});" if part.page else ""
            return f"#goes({quoted(part.target)}, {self.content(part.parts)});{page}"
        if isinstance(part, b.Marked):
            name = _MARKED.get(part.how)
            if part.how == "value" and len(plain(part.parts)) <= 26:
                name = "whole-value"
            return f"#{name}{self.content(part.parts)};" if name else self.line(part.parts)
        raise TypeError(f"no typst for {type(part).__name__}")

    def alt(self, formula: Formula) -> str:
        return quoted(visible_text(formula.latex))

    # -- blocks ------------------------------------------------------------------------------------------
    def block(self, block: b.Block) -> str:
        return _BLOCKS[type(block)](self, block)

    def blocks(self, found: tuple[b.Block, ...]) -> str:
        return f"[{self.joined(found)}]"

    def joined(self, found: tuple[b.Block, ...]) -> str:
        """Blocks one after another; statements and short lines stay with the formula or table they speak of."""
        seen = [block for block in found if not (isinstance(block, b.Code) and block.folded)]
        out = []
        for block, after in zip(seen, [*seen, None][1:], strict=True):
            shown = isinstance(after, b.Equation | b.Figure) or (isinstance(after, b.Table) and kept_whole(after))
            if shown and isinstance(block, b.Callout):
                out.append(self.callout(block, keeps=True))
            elif shown and isinstance(block, b.Paragraph) and len(plain(block.parts)) <= 240:
                out.append(f"#block(sticky: true)[{self.paragraph(block)}]")
            else:
                out.append(self.block(block))
        return "\n".join(out)

    def heading(self, block: b.Heading) -> str:
        name = f"#label({quoted(block.anchor)})" if block.anchor else ""
        outlined = "true" if block.level <= 2 and not self.inside else "false"
        options = f"level: {block.level}, outlined: {outlined}, bookmarked: true"
        return f"#[#heading({options}){self.content(block.parts)}{name}]"

    def paragraph(self, block: b.Paragraph) -> str:
        if block.look == "note":
            return f"#par(quiet{self.content(block.parts)})"
        if block.look == "lead":
            return f"#par(text(size: 10.5pt){self.content(block.parts)})"
        return f"#par{self.content(block.parts)}"

    def items(self, block: b.Items) -> str:
        items = ", ".join(self.blocks(item) for item in block.items)
        return f"#list({items})" if block.start is None else f"#enum(start: {block.start}, {items})"

    def quote(self, block: b.Quote) -> str:
        return f"#quoted({self.blocks(block.blocks)})"

    def code(self, block: b.Code) -> str:
        if block.folded:
            return ""  # stands in the appendix
        title = self.text(block.title) if block.title else "none"
        shown = VERY_LONG_WORD.sub(lambda m: chopped(m.group(), 40), visible_text(block.text, self.missing))
        return f"#listing({title}, raw({quoted(shown)}, block: true))"

    def equation(self, block: b.Equation) -> str:
        name = quoted(block.anchor) if block.anchor else "none"
        shown = block.formula.tag or block.number
        number = self.text(shown) if shown else "none"
        caption = self.content(block.caption) if block.caption else "none"
        where = f"({quoted(block.calculation)}, {quoted(block.cell)})"
        body = f"${typst_maths(block.formula)}$.body"
        return f"#display-maths({name}, {number}, {self.alt(block.formula)}, {caption}, {where}, {body})"

    def table(self, block: b.Table) -> str:
        block = unbroken(block)
        whole = str(kept_whole(block)).lower()
        made = " + v(0.6em, weak: true) + ".join(self.data_table(part, whole) for part in narrowed(block))
        if not (block.caption or block.number):
            return f"#({made})"
        name = quoted(block.anchor) if block.anchor else "none"
        notes = "".join(f"{self.content(note)}, " for note in block.notes)
        caption = self.caption("Table", block.number, block.caption)
        return f"#captioned({name}, {caption}, {made}, ({notes}), whole: {whole})"

    def data_table(self, block: b.Table, whole: str) -> str:
        """The table itself, without caption; anchors of rows stand in their first cells."""
        columns, size = columns_of(block)
        align = ", ".join(_SIDES[side] for side in block.align or "l" * len(block.headers))
        heads = ", ".join(self.content(cell) for cell in block.headers)
        cells = []
        for index, row in enumerate(block.rows):
            anchor = block.row_anchors[index] if block.row_anchors else ""
            for column, cell in enumerate(row):
                lead = f"#here-is({quoted(anchor)});" if anchor and column == 0 else ""
                cells.append(f"[{lead}{self.line(cell)}]")
        idle = "".join(f"{i}, " for i, name in enumerate(block.row_classes) if "idle" in name)
        solid = str(all(len(plain(cell)) <= 600 for row in block.rows for cell in row)).lower()
        options = f"idle: ({idle}), size: {size}pt, whole: {whole}, solid: {solid}"
        return f"data-table(({columns}), ({align},), ({heads},), ({', '.join(cells)},), {options})"

    def caption(self, word: str, number: str, parts: b.Line) -> str:
        lead = f"#strong[#{self.text(f'{self.words(word)} {number}')}];#h(0.6em);" if number else ""
        return f"[{lead}{self.line(parts)}]"

    def figure(self, block: b.Figure) -> str:
        path = f"picture-{len(self.files)}." + ("svg" if block.media == "image/svg+xml" else "png")
        same = next((name for name, data in self.files.items() if data == block.data), None)
        self.files[same or path] = block.data
        alt = quoted(visible_text(block.alt))
        made = f"image({quoted(same or path)}, alt: {alt}{image_size(block)})"
        if not block.number:
            return f"#shown-again({self.content(block.caption)}, {made})"
        name = quoted(block.anchor) if block.anchor else "none"
        return f"#picture({name}, {self.caption('Figure', block.number, block.caption)}, {made})"

    def grid(self, block: b.Grid) -> str:
        rows = []
        for name, value in block.rows:
            wide = any(isinstance(part, b.Marked) and part.how == "hash" for part in value)
            rows.append(f"({self.text(name)}, {self.content(value)}, {str(wide).lower()})")
        return f"#facts({block.columns}, ({', '.join(rows)},))"

    def sign_off(self, block: b.SignOff) -> str:
        heads = tuple(b.line(self.words(h)) for h in ("Does", "Name", "Date", "State", "Note"))
        rows = tuple(tuple(b.line(cell) for cell in row) for row in block.rows)
        return self.table(b.Table(heads, rows, "lllll", widths=(2, 3, 2, 3, 3)))

    def callout(self, block: b.Callout, *, keeps: bool = False) -> str:
        title = self.text(block.title) if block.title else "none"
        sticky = str(keeps).lower()
        return f"#callout({quoted(block.look)}, {title}, {self.blocks(block.blocks)}, keeps: {sticky})"

    def contents(self, block: b.Contents) -> str:
        if block.of == "sections":
            return "#outline(title: none, depth: 2)"
        kind, title = ("image", "Figures") if block.of == "figures" else ("table", "Tables")
        return (
            f"#heading(level: 2, outlined: false)[#{self.text(self.words(title))}]\n"
            f"#outline(title: none, target: figure.where(kind: {kind}))"
        )


_BLOCKS: dict[type, Callable[..., str]] = {
    b.Heading: _Writer.heading,
    b.Paragraph: _Writer.paragraph,
    b.Items: _Writer.items,
    b.Quote: _Writer.quote,
    b.Code: _Writer.code,
    b.Equation: _Writer.equation,
    b.Table: _Writer.table,
    b.Figure: _Writer.figure,
    b.Grid: _Writer.grid,
    b.SignOff: _Writer.sign_off,
    b.Callout: _Writer.callout,
    b.Contents: _Writer.contents,
}


def _runs(parts: list[b.Part]) -> list[list[b.Part]]:
    """Parts in runs of pages: those that flow join the part before."""
    out: list[list[b.Part]] = []
    for part in parts:
        if part.flows and out and not out[-1][-1].calculation:
            out[-1].append(part)
        else:
            out.append([part])
    return out


def _clipped(title: str, room: float) -> str:
    """A title as far as it fits into `room` em."""
    if width_in_em(title) <= room:
        return title
    while title and width_in_em(title) > room - 1.0:
        title = title[:-1]
    return title.rstrip() + "…" if title else ""
