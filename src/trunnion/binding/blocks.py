"""The neutral document: what both writers (HTML and typst) are given. Texts here are plain and unescaped."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

from trunnion.binding.maths import Formula
from trunnion.binding.package import Verdict

# ---- inside a line ---------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Inline:
    """Anything inside a line."""


@dataclass(frozen=True)
class Text(Inline):
    """Plain words."""

    text: str


@dataclass(frozen=True)
class Marked(Inline):
    """Words in another face: strong, emph, strike, code, quiet, id (selectable in one click)."""

    how: str
    parts: tuple[Inline, ...]


@dataclass(frozen=True)
class InlineMath(Inline):
    """A formula inside a line."""

    formula: Formula


@dataclass(frozen=True)
class Link(Inline):
    """A link inside the package; `target` is an anchor. Links to elsewhere are printed, never followed."""

    target: str
    parts: tuple[Inline, ...]
    page: bool = False  # print the page number of the target (PDF)


@dataclass(frozen=True)
class Break(Inline):
    """A line break."""


@dataclass(frozen=True)
class Badge(Inline):
    """A verdict, by word and shape."""

    verdict: Verdict
    quiet: bool = False  # of a candidate that does not count


Line = tuple[Inline, ...]


def line(*parts: str | Inline) -> Line:
    """A line from words and inline parts; empty words are dropped."""
    return tuple(Text(part) if isinstance(part, str) else part for part in parts if part != "")


# ---- blocks ----------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Block:
    """Anything that stands on lines of its own."""


@dataclass(frozen=True)
class Heading(Block):
    """A heading. Level 1 opens a part of the package, 2 a section, 3 and 4 lie inside calculations."""

    level: int
    parts: Line
    anchor: str = ""
    number: str = ""


@dataclass(frozen=True)
class Paragraph(Block):
    """Running text; `look` is "" or "lead", "note", "caution"."""

    parts: Line
    look: str = ""


@dataclass(frozen=True)
class Items(Block):
    """A list; `start` numbers it, None makes it bulleted."""

    items: tuple[tuple[Block, ...], ...]
    start: int | None = None


@dataclass(frozen=True)
class Quote(Block):
    """Quoted blocks."""

    blocks: tuple[Block, ...]


@dataclass(frozen=True)
class Code(Block):
    """Literal text; `folded` puts it behind a fold in HTML. `title` names it."""

    text: str
    language: str = ""
    title: str = ""
    folded: bool = False


@dataclass(frozen=True)
class Equation(Block):
    """A displayed formula; `number` as printed ("C02.4") or "" for none."""

    formula: Formula
    anchor: str = ""
    number: str = ""
    caption: Line = ()
    cell: str = ""
    calculation: str = ""


@dataclass(frozen=True)
class Table(Block):
    """A table with a head. `widths` are relative (0: as wide as its content); rows may have ids and classes."""

    headers: tuple[Line, ...]
    rows: tuple[tuple[Line, ...], ...]
    align: str = ""
    caption: Line = ()
    anchor: str = ""
    number: str = ""
    notes: tuple[Line, ...] = ()
    widths: tuple[float, ...] = ()
    row_anchors: tuple[str, ...] = ()
    row_classes: tuple[str, ...] = ()
    look: str = ""  # "" | "matrix" (the requirement matrix, with its filter in HTML)


@dataclass(frozen=True)
class Figure(Block):
    """A picture: SVG text or PNG bytes."""

    media: str  # "image/svg+xml" | "image/png"
    data: bytes
    alt: str
    caption: Line = ()
    anchor: str = ""
    number: str = ""


@dataclass(frozen=True)
class Grid(Block):
    """Names and values in a ruled box (title blocks); not a table of data."""

    rows: tuple[tuple[str, Line], ...]
    columns: int = 1


@dataclass(frozen=True)
class SignOff(Block):
    """The signature table: does, name, date, state, note."""

    rows: tuple[tuple[str, str, str, str, str], ...]
    anchor: str = ""


@dataclass(frozen=True)
class Callout(Block):
    """A box that must be seen: look "caution", "failed", "note"."""

    look: str
    title: str
    blocks: tuple[Block, ...]


@dataclass(frozen=True)
class ResultRow(Block):
    """One recorded result; neighbours become one table when the package is composed."""

    anchor: str
    quantity: str
    of: str
    over: str
    value: str
    basis: str
    where: str = ""


@dataclass(frozen=True)
class CheckRow(Block):
    """One independent check; neighbours become one table when the package is composed."""

    anchor: str
    what: str
    ours: str
    theirs: str
    difference: str
    tolerance: str
    library: str
    agrees: bool


def mapped(block: Block, change: Callable[[Block], Block]) -> Block:
    """`change` applied to a block and to all blocks inside it, inner ones first."""
    if isinstance(block, Items):
        block = replace(block, items=tuple(tuple(mapped(x, change) for x in item) for item in block.items))
    elif isinstance(block, Quote | Callout):
        block = replace(block, blocks=tuple(mapped(x, change) for x in block.blocks))
    return change(block)


@dataclass(frozen=True)
class Contents(Block):
    """A list of contents ("sections"), figures or tables, made by the writers."""

    of: str


@dataclass(frozen=True)
class Part:
    """One part of the package; calculations are parts of their own so that their pages can name them."""

    anchor: str
    title: str
    blocks: tuple[Block, ...]
    number: str = ""  # printed before the title ("C02" or "A")
    calculation: str = ""
    state: str = ""  # signature state printed on its pages
    look: str = ""  # "cover" for the first page, "contents" for lists, "paper" for what HTML shows elsewhere
    flows: bool = False  # on paper, follows the part before on the same page


@dataclass(frozen=True)
class Attachment:
    """A file carried inside the PDF."""

    name: str
    data: bytes
    description: str
    media: str = "application/x-ipynb+json"


@dataclass
class NeutralDocument:
    """The package, ready for a writer."""

    title: str
    number: str
    revision: str
    date: str
    status: str
    language: str
    parts: list[Part] = field(default_factory=list)
    attachments: list[Attachment] = field(default_factory=list)
    authors: tuple[str, ...] = ()
    organization: str = ""
    classification: str = ""
