"""The tree of a formula. Classes are TeX's: ord, op, bin, rel, open, close, punct, inner."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Node:
    """Any part of a formula."""


@dataclass(frozen=True)
class Row(Node):
    """Parts side by side."""

    items: tuple[Node, ...] = ()


@dataclass(frozen=True)
class Letter(Node):
    """Letters in one alphabet: one letter when italic, a whole word when upright. `text` is plain Unicode."""

    text: str
    variant: str = "it"


@dataclass(frozen=True)
class Number(Node):
    """Digits with an optional decimal point."""

    text: str
    variant: str = "rm"


@dataclass(frozen=True)
class Symbol(Node):
    """One operator, relation, delimiter or other sign, with its TeX class."""

    char: str
    kind: str = "ord"


@dataclass(frozen=True)
class Operator(Node):
    """A named operator (sin, max); `limits` puts its scripts below and above in display style."""

    text: str
    limits: bool = False


@dataclass(frozen=True)
class Scripts(Node):
    """A base with subscript and superscript; `limits` stacks them."""

    base: Node
    sub: Node | None = None
    sup: Node | None = None
    limits: bool = False


@dataclass(frozen=True)
class Fraction(Node):
    """A fraction; style "" as its surroundings, "d" display, "t" text; `bar=False` for binomials' inside."""

    over: Node
    under: Node
    style: str = ""
    bar: bool = True


@dataclass(frozen=True)
class Root(Node):
    """A square root, or a root with an index."""

    body: Node
    index: Node | None = None


@dataclass(frozen=True)
class Accent(Node):
    """An accent or a line, brace or arrow above or below; `wide` ones stretch."""

    body: Node
    name: str
    wide: bool = False


@dataclass(frozen=True)
class Stack(Node):
    """Something set small above and/or below a base; `stretch` widens the base (an arrow) to fit."""

    base: Node
    above: Node | None = None
    below: Node | None = None
    stretch: bool = False


@dataclass(frozen=True)
class Fenced(Node):
    """Delimiters that grow with the body; "" for an invisible one; `Middle` parts inside grow too."""

    left: str
    right: str
    body: Row


@dataclass(frozen=True)
class Middle(Node):
    """A growing bar inside a `Fenced`."""

    char: str


@dataclass(frozen=True)
class Sized(Node):
    """A delimiter of a fixed size, as a factor of the letter height."""

    char: str
    factor: float
    kind: str = "ord"


@dataclass(frozen=True)
class Matrix(Node):
    """Cells in rows. `look`: matrix, cases, aligned, gathered, substack. Rules are column and row numbers."""

    rows: tuple[tuple[Row, ...], ...]
    left: str = ""
    right: str = ""
    aligns: str = ""
    look: str = "matrix"
    column_rules: tuple[int, ...] = ()
    row_rules: tuple[int, ...] = ()


@dataclass(frozen=True)
class Space(Node):
    """A space of so many em (may be negative)."""

    em: float


@dataclass(frozen=True)
class Words(Node):
    """Text inside a formula."""

    text: str
    variant: str = "rm"


@dataclass(frozen=True)
class Phantom(Node):
    """Room without ink."""

    body: Node
    width: bool = True
    height: bool = True


@dataclass(frozen=True)
class Styled(Node):
    """The rest of a group in display or text style."""

    body: Node
    display: bool


@dataclass(frozen=True)
class Boxed(Node):
    """A frame round a formula."""

    body: Node
