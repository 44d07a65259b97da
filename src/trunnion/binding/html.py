"""The HTML writer: one file that loads nothing, runs nothing, and reads well on screen and on paper."""

from __future__ import annotations

import base64
import functools
import re
from collections import Counter
from collections.abc import Callable
from html import escape
from pathlib import Path

from trunnion.binding import blocks as b
from trunnion.binding.calculation import unlinked
from trunnion.binding.faces import face_rules, figure_rules
from trunnion.binding.house import House
from trunnion.binding.maths import Formula
from trunnion.binding.maths.mathml import mathml
from trunnion.binding.maths.symbols import styled
from trunnion.binding.package import Verdict
from trunnion.binding.words import Words
from trunnion.glyphs import can_show, visible_text

POLICY = (
    "default-src 'none'; style-src 'unsafe-inline'; img-src data:; font-src data:; base-uri 'none'; form-action 'none'"
)
MARKS = {Verdict.MEETS: "●", Verdict.DOES_NOT_MEET: "✗", Verdict.NOT_SHOWN: "○"}
VERDICT_CLASS = {Verdict.MEETS: "v-meets", Verdict.DOES_NOT_MEET: "v-fails", Verdict.NOT_SHOWN: "v-unshown"}
_MARKED = {"strong": "strong", "emph": "em", "strike": "s", "code": "code"}
_MATHS = re.compile(r"<math.*?</math>", re.DOTALL)
_ANNOTATION = re.compile(r"<annotation.*?</annotation>", re.DOTALL)
_NUMBERED = re.compile(r"\[(U\+[0-9A-F]{4,6})\]")  # characters a figure shows by their code points
_TAGS = re.compile(r"<[^>]*>", re.DOTALL)
_ALWAYS = set(map(chr, range(32, 127))) | set("−–—…·°′″×≥≤±→↑↓●○✗✓■")


def write_html(document: b.NeutralDocument, house: House, missing: Counter[str]) -> str:
    """The whole page as text; `missing` counts characters shown by their code points."""
    writer = _Writer(document, house, Words(document.language), missing)
    body = writer.page()
    maths = _printing(_maths_characters(body))
    text = _printing(_text_characters(body)) | {char for char in maths if not can_show(char, maths=True)}
    style = face_rules(text, maths)
    css = (Path(__file__).with_name("data") / "page.css").read_text("utf-8")
    title = writer.text(f"{document.number} {document.revision}: {document.title}")
    page = "@page{size:" + ("A4" if house.paper == "A4" else "letter") + "}"
    return (
        f'<!DOCTYPE html>\n<html lang="{document.language}">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{POLICY}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{title}</title>\n<style>\n{style}\n{page}\n{css}</style>\n</head>\n{body}\n</html>\n"
    )


def _text_characters(body: str) -> set[str]:
    return set(_TAGS.sub("", _MATHS.sub("", body))) | _ALWAYS


def _maths_characters(body: str) -> set[str]:
    """What the formulas show; letters that browsers set in italics by themselves are wanted in italics."""
    found: set[str] = set()
    for formula in _MATHS.findall(body):
        found |= set(_TAGS.sub("", _ANNOTATION.sub("", formula)))
    if not found:
        return found
    slanted = {styled(char, "it") or char for char in found if char.isascii() and char.isalpha()}
    return found | slanted | set("()[]{}|‖√ˆ˜¯→")


def _printing(chars: set[str]) -> set[str]:
    return {char for char in chars if char.isprintable() or char in "\u00a0\u2009\u202f"}


class _Writer:
    """Writes parts, blocks and lines; one method a kind."""

    def __init__(self, document: b.NeutralDocument, house: House, words: Words, missing: Counter[str]) -> None:
        self.document, self.house, self.words, self.missing = document, house, words, missing
        self.figures: list[tuple[str, str]] = []
        self.tables: list[tuple[str, str]] = []
        self.anonymous = 0
        self.inside = ""

    def text(self, text: str) -> str:
        """Words with nothing in them that could be markup, unseen characters made visible."""
        return escape(visible_text(text, self.missing), quote=True)

    # -- the page ----------------------------------------------------------------------------------------
    def page(self) -> str:
        w = self.words
        sections = "\n".join(self.part(part) for part in self.document.parts)
        has_matrix = any(part.anchor == "requirements" for part in self.document.parts)
        skip = f'<a class="skip" href="#content">{w("Skip to the content")}</a>'
        if has_matrix:
            skip += f'<a class="skip" href="#requirements">{w("Skip to the requirements")}</a>'
        lists = self.listing()
        return (
            f'<body>\n{skip}\n<header class="top"><p><strong>{self.text(self.document.number)}</strong> '
            f"{w('Rev.')} {self.text(self.document.revision)} · {self.text(self.document.date)} · "
            f"{self.text(w.known(self.document.status))}</p>"
            f'<label class="switch"><input type="checkbox" id="flip"> {w("Switch light and dark")}</label></header>\n'
            f'<div class="frame">\n<nav aria-label="{w("Contents")}">{self.navigation()}</nav>\n'
            f'<main id="content" tabindex="-1">\n{sections.replace(_LISTS, lists)}\n</main>\n</div>\n'
            f"<footer><p>{self.text(self.footer())}</p></footer>\n</body>"
        )

    def footer(self) -> str:
        state = next((part.state for part in self.document.parts if part.look == "cover"), "")
        parts = [self.document.organization, self.document.number, state, self.document.classification]
        return " · ".join(part for part in parts if part)

    def navigation(self) -> str:
        rows = []
        for part in self.document.parts:
            if part.look in ("contents", "paper"):
                continue
            number = f'<span class="n">{self.text(part.number)}</span> ' if part.number else ""
            rows.append(f'<li><a href="#{self.id(part.anchor)}">{number}{self.text(part.title)}</a></li>')
        return f"<ul>{''.join(rows)}</ul>"

    def listing(self) -> str:
        """The lists of figures and tables, known when everything else is written."""
        out = []
        for title, found in (("Figures", self.figures), ("Tables", self.tables)):
            if found:
                rows = "".join(f'<li><a href="#{anchor}">{words}</a></li>' for anchor, words in found)
                head = f"<summary>{self.words(title)} ({len(found)})</summary>"
                out.append(f'<details class="lists">{head}<ul class="list">{rows}</ul></details>')
        return "".join(out)

    @staticmethod
    def id(anchor: str) -> str:
        return escape(anchor, quote=True)

    def part(self, part: b.Part) -> str:
        if part.look == "paper" or part.anchor == "contents":
            return ""  # code stands folded where it belongs; contents are the navigation
        if part.look == "contents":
            title = f'<h2 id="h-lists">{self.text(part.title)}</h2>'
            return f'<section id="lists" aria-labelledby="h-lists">{title}{_LISTS}</section>'
        level = 1 if part.look == "cover" else 2
        number = f'<span class="n">{self.text(part.number)}</span> ' if part.number else ""
        kind = f"<p class='kind'>{self.words('Calculation package')}</p>" if part.look == "cover" else ""
        kind = f"<p class='kind'>{self.words('Appendix')}</p>" if part.number.isalpha() else kind
        kind = self.logo() + kind if part.look == "cover" else kind
        anchor = self.id(part.anchor)
        head = f'{kind}<h{level} id="h-{anchor}">{number}{self.text(part.title)}</h{level}>'
        self.inside = part.anchor
        blocks = "\n".join(self.block(block) for block in part.blocks)
        look = f' class="{part.look or ("calculation" if part.calculation else "part")}"'
        return f'<section id="{anchor}"{look} aria-labelledby="h-{anchor}">\n{head}\n{blocks}\n</section>'

    def logo(self) -> str:
        if self.house.logo is None:
            return ""
        media, data = self.house.logo
        words = self.text(self.house.organization or "logo")
        return f'<img class="logo" alt="{words}" src="{_data_uri(media, data)}">'

    def maths(self, formula: Formula, *, display: bool) -> str:
        self.missing.update(formula.missing)
        return mathml(formula, display=display)

    # -- lines -------------------------------------------------------------------------------------------
    def line(self, parts: b.Line) -> str:
        return "".join(self.inline(part) for part in parts)

    def inline(self, part: b.Inline) -> str:
        if isinstance(part, b.Text):
            return self.text(part.text)
        if isinstance(part, b.InlineMath):
            return self.maths(part.formula, display=False)
        if isinstance(part, b.Break):
            return "<br>"
        if isinstance(part, b.Badge):
            return self.badge(part)
        if isinstance(part, b.Link):
            return f'<a href="#{self.id(part.target)}">{self.line(part.parts)}</a>'
        if isinstance(part, b.Marked):
            inside = self.line(part.parts)
            tag = _MARKED.get(part.how)
            return f"<{tag}>{inside}</{tag}>" if tag else f'<span class="{part.how}">{inside}</span>'
        raise TypeError(f"no HTML for {type(part).__name__}")

    def badge(self, badge: b.Badge) -> str:
        quiet = " quiet" if badge.quiet else ""
        mark = f'<span aria-hidden="true">{MARKS[badge.verdict]}</span> {self.words.verdict(badge.verdict)}'
        return f'<span class="badge {VERDICT_CLASS[badge.verdict]}{quiet}">{mark}</span>'

    # -- blocks ------------------------------------------------------------------------------------------
    def block(self, block: b.Block) -> str:
        return _BLOCKS[type(block)](self, block)

    def blocks(self, found: tuple[b.Block, ...]) -> str:
        return "".join(self.block(block) for block in found)

    def heading(self, block: b.Heading) -> str:
        level = min(block.level + (0 if self.inside == "cover" else 1), 6)
        anchor = f' id="{self.id(block.anchor)}"' if block.anchor else ""
        return f"<h{level}{anchor}>{self.line(block.parts)}</h{level}>"

    def paragraph(self, block: b.Paragraph) -> str:
        look = f' class="{block.look}"' if block.look else ""
        return f"<p{look}>{self.line(block.parts)}</p>"

    def items(self, block: b.Items) -> str:
        tag, start = ("ul", "") if block.start is None else ("ol", f' start="{block.start}"')
        rows = "".join(f"<li>{self.blocks(item)}</li>" for item in block.items)
        return f"<{tag}{start}>{rows}</{tag}>"

    def quote(self, block: b.Quote) -> str:
        return f"<blockquote>{self.blocks(block.blocks)}</blockquote>"

    def code(self, block: b.Code) -> str:
        text = f'<pre tabindex="0"><code>{self.text(block.text)}</code></pre>'
        if not block.folded:
            return text
        title = f"{self.words('Code of cell')} {self.text(block.title)}"
        return f"<details><summary>{title}</summary>{text}</details>"

    def equation(self, block: b.Equation) -> str:
        anchor = f' id="{self.id(block.anchor)}"' if block.anchor else ""
        shown = block.formula.tag or block.number
        number = f'<span class="eqn">({self.text(shown)})</span>' if shown else ""
        caption = f'<p class="eqc">{self.line(block.caption)}</p>' if block.caption else ""
        body = self.maths(block.formula, display=True)
        return f'<div class="equation"{anchor}><div class="eqb" tabindex="0">{body}</div>{number}</div>{caption}'

    def table(self, block: b.Table) -> str:
        anchor = self.id(block.anchor) or self.next_anchor("t")
        caption = ""
        if block.caption or block.number:
            number = f"<b>{self.words('Table')} {self.text(block.number)}</b> " if block.number else ""
            caption = f"<caption>{number}{self.line(block.caption)}</caption>"
            if block.number:
                words = f"{self.words('Table')} {self.text(block.number)}: {self.line(unlinked(block.caption))}"
                self.tables.append((anchor, words))
        align = block.align or "l" * len(block.headers)
        heads = "".join(
            f'<th scope="col" class="a-{a}">{self.line(cell)}</th>'
            for a, cell in zip(align, block.headers, strict=True)
        )
        rows = "".join(self.row(block, index, align) for index in range(len(block.rows)))
        notes = "".join(f'<p class="notes">{self.line(note)}</p>' for note in block.notes)
        filters = self.filters() if block.look == "matrix" else ""
        look = f" {block.look}" if block.look else ""
        return (
            f'<div class="table{look}" id="{anchor}">{filters}<div class="scroll" tabindex="0"><table>{caption}'
            f"<thead><tr>{heads}</tr></thead><tbody>{rows}</tbody></table></div>{notes}</div>"
        )

    def row(self, block: b.Table, index: int, align: str) -> str:
        anchor = block.row_anchors[index] if block.row_anchors else ""
        attributes = f' id="{self.id(anchor)}"' if anchor else ""
        classes = block.row_classes[index] if block.row_classes else ""
        attributes += f' class="{classes}"' if classes else ""
        cells = []
        for column, (side, cell) in enumerate(zip(align, block.rows[index], strict=True)):
            inside = self.line(cell)
            if column == 0 and block.look in ("matrix", "results", "checks"):
                cells.append(f'<th scope="row" class="a-{side}">{inside}</th>')
            else:
                cells.append(f'<td class="a-{side}">{inside}</td>')
        return f"<tr{attributes}>{''.join(cells)}</tr>"

    def filters(self) -> str:
        boxes = []
        for verdict in Verdict:
            words = f"{MARKS[verdict]} {self.words.verdict(verdict)}"
            boxes.append(f'<label><input type="checkbox" id="f-{VERDICT_CLASS[verdict]}" checked> {words}</label>')
        boxes.append(f'<label><input type="checkbox" id="f-counting"> {self.words("only rows that count")}</label>')
        return f'<fieldset class="filter"><legend>{self.words("Show")}</legend>{"".join(boxes)}</fieldset>'

    def next_anchor(self, kind: str) -> str:
        self.anonymous += 1
        return f"{kind}-{self.anonymous}"

    def figure(self, block: b.Figure) -> str:
        anchor = self.id(block.anchor) or self.next_anchor("f")
        number = ""
        if block.number:
            number = f"<b>{self.words('Figure')} {self.text(block.number)}</b> "
            words = self.line(unlinked(block.caption)) or self.text(block.alt)
            self.figures.append((anchor, f"{self.words('Figure')} {self.text(block.number)}: {words}"))
        data = block.data
        if block.media == "image/svg+xml":
            self.missing.update(_NUMBERED.findall(data.decode("utf-8")))
            data = _with_font(data)
        picture = f'<img alt="{self.text(block.alt)}" src="{_data_uri(block.media, data)}">'
        enlarge, back = self.words("Enlarge"), self.words("Back to the page")
        return (
            f'<figure id="{anchor}"><div class="zoom" id="zoom-{anchor}">'
            f'<a class="in" href="#zoom-{anchor}" title="{enlarge}">{picture}</a>'
            f'<a class="out" href="#{anchor}">{back}</a></div>'
            f"<figcaption>{number}{self.line(block.caption)}</figcaption></figure>"
        )

    def grid(self, block: b.Grid) -> str:
        rows = "".join(
            f"<div><dt>{self.text(name)}</dt><dd>{self.line(value)}</dd></div>" for name, value in block.rows
        )
        return f'<dl class="grid c{block.columns}">{rows}</dl>'

    def sign_off(self, block: b.SignOff) -> str:
        w = self.words
        heads = "".join(f'<th scope="col">{w(h)}</th>' for h in ("Does", "Name", "Date", "State", "Note"))
        rows = "".join(
            "<tr>" + "".join(f"<td>{self.text(cell) or '&nbsp;'}</td>" for cell in row) + "</tr>" for row in block.rows
        )
        return (
            f'<div class="table signoff"><div class="scroll" tabindex="0"><table><thead><tr>{heads}</tr></thead>'
            f"<tbody>{rows}</tbody></table></div></div>"
        )

    def callout(self, block: b.Callout) -> str:
        title = self.text(block.title)
        return (
            f'<aside class="callout {block.look}" aria-label="{title}"><p class="title">{title}</p>'
            f"{self.blocks(block.blocks)}</aside>"
        )

    def contents(self, block: b.Contents) -> str:
        return ""


_LISTS = "<!--lists-->"
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


def _data_uri(media: str, data: bytes) -> str:
    return f"data:{media};base64,{base64.b64encode(data).decode('ascii')}"


@functools.lru_cache(maxsize=256)
def _with_font(svg: bytes) -> bytes:
    """An SVG whose text finds its font: a picture cannot use the fonts of the page, so it carries its own."""
    text = svg.decode("utf-8")
    if "<text" not in text:
        return svg
    chars = frozenset(c for c in re.sub(r"<[^>]*>|&#?\w+;", "", text) if c.isprintable()) | frozenset("&<>")
    rules = figure_rules(text, chars)
    if not rules:
        return svg
    return re.sub(r"(<svg\b[^>]*>)", lambda m: f"{m.group(1)}<style>{rules}</style>", text, count=1).encode("utf-8")
