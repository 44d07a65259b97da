"""Markdown of notebooks and `$…$` prose to neutral blocks. Raw HTML is text, pictures are refused."""

from __future__ import annotations

import re
from collections.abc import Callable
from functools import cache
from typing import TYPE_CHECKING

from trunnion.binding import blocks as b
from trunnion.binding.maths import FormulaError, read_formula

if TYPE_CHECKING:
    from markdown_it import MarkdownIt
    from markdown_it.rules_block import StateBlock
    from markdown_it.rules_inline import StateInline

_ANCHOR = re.compile(r'<a\s+id="((?:eq|fig|tbl|sec):[A-Za-z0-9_.\-]+)"\s*>\s*</a>')
_DOLLARS = re.compile(r"\$\$(.+?)\$\$|\$(?![\s$])((?:[^$\\]|\\.)*?)(?<!\s)\$(?!\d)", re.DOTALL)
Refuse = Callable[[str, str], None]  # (cause, remedy) -> records a fault against the cell


def read_markdown(text: str, refuse: Refuse) -> list[b.Block]:
    """Blocks of a Markdown text. Anchors `<a id="eq:x"></a>` before a `$$` block name that equation."""
    from markdown_it.tree import SyntaxTreeNode

    tree = SyntaxTreeNode(_parser().parse(text))
    return _Reader(refuse).blocks(tree.children)


def read_line(text: str, refuse: Refuse) -> b.Line:
    """A line of plain text in which only `$…$` means something."""
    parts: list[b.Inline] = []
    last = 0
    for match in _DOLLARS.finditer(text):
        parts += b.line(text[last : match.start()].replace("\\$", "$"))
        parts += _formula(match.group(1) or match.group(2), match.group(), refuse)
        last = match.end()
    return (*parts, *b.line(text[last:].replace("\\$", "$")))


def _formula(latex: str, source: str, refuse: Refuse) -> b.Line:
    try:
        return (b.InlineMath(read_formula(latex)),)
    except FormulaError as error:
        refuse(f"formula {source!r}: {error}", error.remedy)
        return (b.Text(source),)


@cache
def _parser() -> MarkdownIt:
    from markdown_it import MarkdownIt

    parser = MarkdownIt("commonmark", {"html": False}).enable(["table", "strikethrough"])
    parser.inline.ruler.before("escape", "dollar_math", _dollar_rule)
    parser.block.ruler.before("fence", "dollar_block", _dollar_block, {"alt": ["paragraph", "blockquote", "list"]})
    return parser


def _dollar_block(state: StateBlock, start: int, end: int, silent: bool) -> bool:
    """`$$` at the start of a line up to the line that ends with `$$`, whatever stands between."""
    first = state.getLines(start, start + 1, state.blkIndent, False).strip()
    if not first.startswith("$$") or (first.count("$$") > 1 and not first.endswith("$$")):
        return False
    last = start
    while last < end and not (state.getLines(start, last + 1, 0, False).strip()[2:].endswith("$$")):
        last += 1
    if last >= end:
        return False
    if not silent:
        token = state.push("dollar_block", "math", 0)
        token.content = state.getLines(start, last + 1, 0, False).strip()[2:-2]
        token.map = [start, last + 1]
        state.line = last + 1
    return True


def _dollar_rule(state: StateInline, silent: bool) -> bool:
    """`$…$` and `$$…$$` inside running text; a dollar before a digit after its end is money, not mathematics."""
    if state.src[state.pos] != "$":
        return False
    match = _DOLLARS.match(state.src, state.pos, state.posMax)
    if match is None:
        return False
    if not silent:
        token = state.push("dollar_math", "math", 0)
        token.content = match.group(1) or match.group(2)
        token.markup = "$$" if match.group(1) else "$"
    state.pos = match.end()
    return True


class _Reader:
    """Walks a Markdown syntax tree."""

    def __init__(self, refuse: Refuse) -> None:
        self.refuse = refuse
        self.anchor = ""

    def blocks(self, nodes: list) -> list[b.Block]:
        out: list[b.Block] = []
        for node in nodes:
            out += self.block(node)
        return out

    def block(self, node) -> list[b.Block]:  # type: ignore[no-untyped-def]
        kind = node.type
        if kind == "paragraph":
            return self.paragraph(node.children[0])
        if kind == "heading":
            return [b.Heading(int(node.tag[1]), self.line(node.children[0]))]
        if kind in ("bullet_list", "ordered_list"):
            items = tuple(tuple(self.blocks(item.children)) for item in node.children)
            start = int(node.attrs.get("start", 1)) if kind == "ordered_list" else None
            return [b.Items(items, start)]
        if kind == "blockquote":
            return [b.Quote(tuple(self.blocks(node.children)))]
        if kind in ("fence", "code_block"):
            return [b.Code(node.content.rstrip("\n"), node.info.strip() if kind == "fence" else "")]
        if kind == "dollar_block":
            return self.equation(node.content)
        if kind == "table":
            return [self.table(node)]
        if kind == "hr":
            return []
        self.refuse(f"Markdown of the kind {kind!r}", "use headings, text, lists, tables and formulas")
        return []

    def paragraph(self, inline) -> list[b.Block]:  # type: ignore[no-untyped-def]
        """Text, with displayed formulas taken out to stand on lines of their own."""
        out: list[b.Block] = []
        run: list[b.Inline] = []

        def flush() -> None:
            text = tuple(_trimmed(run))
            if text:
                out.append(b.Paragraph(text))
            run.clear()

        for node in inline.children:
            if node.type == "dollar_math" and node.markup == "$$":
                flush()
                out += self.equation(node.content)
            else:
                run += self.inline(node)
        flush()
        return out

    def equation(self, latex: str) -> list[b.Block]:
        anchor, self.anchor = self.anchor, ""
        try:
            formula = read_formula(latex)
        except FormulaError as error:
            self.refuse(f"formula {latex.strip()!r}: {error}", error.remedy)
            return []
        return [b.Equation(formula, anchor or formula.label)]

    def line(self, inline) -> b.Line:  # type: ignore[no-untyped-def]
        parts: list[b.Inline] = []
        for node in inline.children:
            parts += self.inline(node)
        return tuple(parts)

    def inline(self, node) -> b.Line:  # type: ignore[no-untyped-def]
        kind = node.type
        if kind == "text":
            return self.words(node.content)
        if kind in ("softbreak", "hardbreak"):
            return (b.Break(),) if kind == "hardbreak" else b.line(" ")
        if kind == "code_inline":
            return (b.Marked("code", b.line(node.content)),)
        if kind in ("strong", "em", "s"):
            how = {"strong": "strong", "em": "emph", "s": "strike"}[kind]
            return (b.Marked(how, self.line(node)),)
        if kind == "dollar_math":
            return _formula(node.content, f"{node.markup}{node.content}{node.markup}", self.refuse)
        if kind == "link":
            return self.link(node)
        if kind == "image":
            self.refuse("a picture in a Markdown cell", "make it a figure in a code cell, with caption and words")
            return ()
        self.refuse(f"Markdown of the kind {kind!r}", "use plain text")
        return ()

    def words(self, text: str) -> b.Line:
        """Plain words; the empty anchors that JupyterLab hides are kept for the next equation."""
        for match in _ANCHOR.finditer(text):
            self.anchor = match.group(1)
        if "$$" in text or re.search(r"\$[^$]*\\[A-Za-z]+", text):
            self.refuse(f"dollar signs that do not pair in {text.strip()[:60]!r}", "close the formula, or write \\$")
        return b.line(_ANCHOR.sub("", text))

    def link(self, node) -> b.Line:  # type: ignore[no-untyped-def]
        target, parts = str(node.attrs.get("href", "")), self.line(node)
        if target.startswith("#"):
            return (b.Link(target[1:], parts),)
        shown = "".join(part.text for part in parts if isinstance(part, b.Text))
        return parts if shown == target else (*parts, *b.line(f" ({target})"))

    def table(self, node) -> b.Block:  # type: ignore[no-untyped-def]
        head, *body = node.children
        cells = [[self.line(c.children[0]) for c in row.children] for row in head.children]
        rows = [tuple(self.line(c.children[0]) for c in row.children) for part in body for row in part.children]
        styles = [str(c.attrs.get("style", "")) for c in head.children[0].children]
        align = "".join("r" if "right" in s else "c" if "center" in s else "l" for s in styles)
        return b.Table(tuple(cells[0]), tuple(rows), align)


def _trimmed(run: list[b.Inline]) -> list[b.Inline]:
    """Without blanks and breaks at the ends."""
    parts = list(run)
    while parts and _blank(parts[0]):
        parts.pop(0)
    while parts and _blank(parts[-1]):
        parts.pop()
    return parts


def _blank(part: b.Inline) -> bool:
    return isinstance(part, b.Break) or (isinstance(part, b.Text) and not part.text.strip())


__all__ = ["Refuse", "read_line", "read_markdown"]
