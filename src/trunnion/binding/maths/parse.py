"""The reader: LaTeX text to a tree, or a `FormulaError` that names what it would not guess at."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, replace

from trunnion.binding.maths import symbols as s
from trunnion.binding.maths import tree as t
from trunnion.glyphs import can_show, visible_text

_TOKEN = re.compile(r"\\[A-Za-z]+\*?|\\.|[0-9]+(?:\.[0-9]+)?|\.[0-9]+|%[^\n]*\n?|\s+|.", re.DOTALL)
_DISPLAY = {"equation", "equation*", "displaymath", "math"}
_ALIGNED = {"aligned", "align", "align*", "split", "alignedat", "eqnarray", "eqnarray*"}
_GATHERED = {"gathered", "gather", "gather*", "multline", "multline*"}
_MATRICES = {
    "matrix": ("", ""),
    "pmatrix": ("(", ")"),
    "bmatrix": ("[", "]"),
    "Bmatrix": ("{", "}"),
    "vmatrix": ("|", "|"),
    "Vmatrix": ("‖", "‖"),
    "smallmatrix": ("", ""),
}
MAX_DEPTH = 40
_SUBSET = "use fractions, roots, matrices, cases, aligned, accents, alphabets and the usual signs"


class FormulaError(ValueError):
    """A formula that is not typeset; `remedy` says what to write instead."""

    def __init__(self, cause: str, remedy: str = "") -> None:
        super().__init__(cause)
        self.remedy = remedy


@dataclass(frozen=True)
class Formula:
    """A formula read: its tree, its source, and what it says of its own number."""

    tree: t.Row
    latex: str
    tag: str = ""
    label: str = ""
    numbered: bool = True
    missing: tuple[str, ...] = ()  # characters of its words shown by their code points


def read_formula(latex: str) -> Formula:
    """Read one formula (with or without its `$`, `$$`, `\\[` marks); raises `FormulaError`."""
    source = _without_marks(latex)
    missing: Counter[str] = Counter()
    parser = _Parser(source, missing)
    body = parser.whole()
    return Formula(body, source, parser.tag, parser.label, parser.numbered, tuple(sorted(missing.elements())))


def _without_marks(latex: str) -> str:
    text = latex.strip()
    for left, right in (("$$", "$$"), ("\\[", "\\]"), ("\\(", "\\)"), ("$", "$")):
        if text.startswith(left) and text.endswith(right) and len(text) >= len(left) + len(right):
            text = text[len(left) : len(text) - len(right)].strip()
            break
    for word in ("\\displaystyle", "\\textstyle"):
        if text.startswith(word) and not text[len(word) : len(word) + 1].isalpha():
            text = text[len(word) :].strip()
    if not text:
        raise FormulaError("an empty formula", "write the formula or remove its dollar signs")
    return text


class _Parser:
    """Recursive descent over the tokens of one formula."""

    def __init__(self, source: str, missing: Counter[str]) -> None:
        self.missing = missing
        self.tokens: list[str] = _TOKEN.findall(source)
        self.at = 0
        self.depth = 0
        self.variant = ""
        self.tag = ""
        self.label = ""
        self.numbered = True

    # -- tokens ------------------------------------------------------------------------------------------
    def peek(self) -> str:
        """The next token that is neither space nor comment; "" at the end."""
        while self.at < len(self.tokens) and (self.tokens[self.at].isspace() or self.tokens[self.at].startswith("%")):
            self.at += 1
        return self.tokens[self.at] if self.at < len(self.tokens) else ""

    def take(self) -> str:
        token = self.peek()
        if not token:
            raise FormulaError("the formula ends too early", "close the brace, environment or \\left")
        self.at += 1
        return token

    def expect(self, token: str) -> None:
        found = self.peek()
        if found != token:
            raise FormulaError(f"expected {token!r}, found {found or 'the end of the formula'!r}")
        self.at += 1

    def words(self) -> str:
        """The source of a braced group, spaces kept (texts, operator names, environments, tags)."""
        if self.peek() != "{":
            raise FormulaError("braces are missing", "write \\text{…}, \\operatorname{…}, \\begin{…}")
        depth, pieces = 0, []
        for token in self.tokens[self.at :]:
            depth += (token == "{") - (token == "}")
            pieces.append(token)
            self.at += 1
            if depth == 0:
                return "".join(pieces)[1:-1]
        raise FormulaError("the formula ends inside a text", "close the brace")

    # -- rows --------------------------------------------------------------------------------------------
    def whole(self) -> t.Row:
        body = self.row(frozenset())
        if self.peek():
            raise FormulaError(f"{self.peek()!r} without its counterpart")
        return body

    def row(self, stops: frozenset[str]) -> t.Row:
        """Parts up to one of `stops` (not taken), style switches applied to the rest of the group."""
        self.depth += 1
        if self.depth > MAX_DEPTH:
            raise FormulaError(f"nested deeper than {MAX_DEPTH} levels")
        items: list[t.Node] = []
        while (token := self.peek()) and token not in stops:
            if token in ("}", "&", "\\\\", "\\right", "\\end"):
                break
            if token in ("\\displaystyle", "\\textstyle"):
                self.take()
                items.append(t.Styled(self.row(stops), token == "\\displaystyle"))
                break
            node = self.scripted()
            if node is not None:
                items.append(node)
        self.depth -= 1
        return t.Row(tuple(_classed(_joined(items))))

    def scripted(self) -> t.Node | None:
        """One part with the scripts that follow it."""
        base = self.part()
        if base is None:
            return None
        limits = _takes_limits(base)
        while self.peek() in ("\\limits", "\\nolimits"):
            if not isinstance(base, t.Operator) and not (isinstance(base, t.Symbol) and base.kind == "op"):
                break
            limits = self.take() == "\\limits"
        sub: t.Node | None = None
        sup: t.Node | None = None
        while self.peek() in ("_", "^", "'"):
            mark = self.take()
            if mark == "'":
                if sup is not None:
                    raise FormulaError("a prime after a superscript", "write x^{\\prime 2}")
                sup = self.primes()
            elif mark == "_":
                if sub is not None:
                    raise FormulaError("two subscripts on one letter", "put braces round the base")
                sub = self.argument()
            else:
                if sup is not None:
                    raise FormulaError("two superscripts on one letter", "put braces round the base")
                sup = self.argument()
        if sub is None and sup is None:
            return base
        if isinstance(base, t.Accent) and base.name in ("underbrace", "overbrace"):
            return t.Stack(base, above=sup, below=sub)
        return t.Scripts(base, sub, sup, limits)

    def primes(self) -> t.Node:
        count = 1
        while self.peek() == "'":
            self.take()
            count += 1
        marks: list[t.Node] = [t.Symbol("′" * count if count < 2 else {2: "″", 3: "‴"}.get(count, "⁗"))]
        if count > 4:
            raise FormulaError("more than four primes")
        if self.peek() == "^":
            self.take()
            marks.append(self.argument())
        return t.Row(tuple(marks))

    def argument(self) -> t.Row:
        """A braced group, or the next single part."""
        if self.peek() == "{":
            return self.group()
        token = self.peek()
        if token[:1].isdigit() and len(token) > 1:  # \frac12, x^10: one digit only, as LaTeX reads it
            self.tokens[self.at : self.at + 1] = [token[0], token[1:]]
        if token in ("", "}", "&", "\\\\", "_", "^"):
            raise FormulaError("an argument is missing")
        node = self.part()
        return t.Row(tuple(_classed([node])) if node is not None else ())

    def group(self) -> t.Row:
        self.expect("{")
        body = self.row(frozenset())
        self.expect("}")
        return body

    # -- parts -------------------------------------------------------------------------------------------
    def part(self) -> t.Node | None:
        token = self.take()
        if token == "{":
            self.at -= 1
            return _grouped(self.group())
        if token in ("_", "^", "'"):
            self.at -= 1
            return t.Row()
        if token[0] == "\\":
            return self.command(token[1:])
        if token[0].isdigit() or (token[0] == "." and len(token) > 1):
            return t.Number(token, self.variant if self.variant in ("bf", "bi", "sf", "tt", "bsf") else "rm")
        if token == "~":
            return t.Space(0.25)
        if token == "|":
            return t.Symbol("|", "bar")
        if token in s.ASCII:
            return t.Symbol(*s.ASCII[token])
        return self.letter(token)

    def letter(self, char: str) -> t.Node:
        if char in ("#", "$", "&", "}", '"', "`"):
            raise FormulaError(f"a stray {char!r}", f"write \\{char}" if char in "#$&}" else "use \\text{…}")
        if char.isascii() and char.isalpha():
            return self.in_alphabet(char, "it")
        if char in s.GREEK.values():
            return self.in_alphabet(char, "it")
        if char in s.CAPITALS.values():
            return self.in_alphabet(char, "rm")
        for table, kind in ((s.BINARY, "bin"), (s.RELATION, "rel"), (s.ORDINARY, "ord"), (s.INNER, "inner")):
            if char in table.values():
                return t.Symbol(char, kind)
        if char.isalpha() and can_show(char, maths=True):
            return t.Letter(char, "rm")
        raise FormulaError(f"the character {char!r} (U+{ord(char):04X}) in a formula", "use its command")

    def in_alphabet(self, char: str, default: str) -> t.Node:
        variant = self.variant or default
        if s.styled(char, variant) is None:
            raise FormulaError(f"{char!r} in the alphabet {variant!r}", "that alphabet has no such letter")
        return t.Letter(char, variant)

    def command(self, name: str) -> t.Node | None:
        for table, build in (
            (s.GREEK, lambda c: self.in_alphabet(c, "it")),
            (s.CAPITALS, lambda c: self.in_alphabet(c, "rm")),
            (s.BINARY, lambda c: t.Symbol(c, "bin")),
            (s.RELATION, lambda c: t.Symbol(c, "rel")),
            (s.INNER, lambda c: t.Symbol(c, "inner")),
            (s.BIG, lambda c: t.Symbol(c, "op")),
        ):
            if name in table:
                return build(table[name])
        if name in s.ORDINARY:
            char = s.ORDINARY[name]
            bold = s.styled(char, self.variant) if self.variant in ("bf", "bi") and char in "∇∂" else None
            return t.Symbol(bold or char)
        if name in s.DELIMITERS:
            kind = "open" if name in s.OPENING else "close" if name in s.CLOSING else "bar"
            return t.Symbol(s.DELIMITERS[name], kind)
        if name in s.SPACES:
            return t.Space(s.SPACES[name])
        if name in s.FUNCTIONS:
            return t.Operator(name)
        if name in s.LIMIT_FUNCTIONS:
            return t.Operator(s.LIMIT_FUNCTIONS[name], limits=True)
        if name in s.ACCENTS:
            return self.accent(name)
        if name in s.ALPHABETS:
            return self.alphabet(s.ALPHABETS[name])
        if name in s.TEXTS:
            return self.text(s.TEXTS[name])
        return self.construct(name)

    def construct(self, name: str) -> t.Node | None:
        stem = name.rstrip("lrm") if name.rstrip("lrm") in s.SIZES else name
        if stem in s.SIZES:
            side = {"l": "open", "r": "close", "m": "rel"}.get(name[len(stem) :], "ord")
            return t.Sized(self.delimiter(), s.SIZES[stem], side)
        method = _CONSTRUCTS.get(name)
        if method is None:
            cause = f"\\{name} is not in the subset typeset here"
            raise FormulaError(
                cause,
                s.REFUSED.get(name, _SUBSET),
            )
        return method(self)

    def accent(self, name: str) -> t.Node:
        body = self.argument()
        if name == "widetilde":  # browsers do not widen it, and a small one over the middle would mislead
            if len(body.items) != 1 or not isinstance(body.items[0], t.Letter):
                raise FormulaError("\\widetilde over more than one letter", "use \\overline{…}")
            name = "tilde"
        return t.Accent(body, name, s.ACCENTS[name])

    def alphabet(self, variant: str) -> t.Node:
        before, self.variant = self.variant, variant
        body = self.argument()
        self.variant = before
        return body.items[0] if len(body.items) == 1 else body

    def text(self, variant: str) -> t.Node:
        """\\text{…}: spaces kept, `$…$` inside read as mathematics."""
        raw = self.words()
        parts: list[t.Node] = []
        for index, piece in enumerate(re.split(r"(?<!\\)\$", raw)):
            if index % 2:
                parts.append(_Parser(piece, self.missing).whole())
            elif piece:
                parts.append(t.Words(visible_text(_plain_text(piece), self.missing), variant))
        return parts[0] if len(parts) == 1 else t.Row(tuple(parts))

    def delimiter(self) -> str:
        token = self.take()
        if token in ("(", ")", "[", "]", "|", "/", "<", ">"):
            return {"<": "⟨", ">": "⟩"}.get(token, token)
        if token == ".":
            return ""
        if token[0] == "\\" and token[1:] in s.DELIMITERS:
            return s.DELIMITERS[token[1:]]
        raise FormulaError(f"{token!r} is no delimiter")

    # -- constructs --------------------------------------------------------------------------------------
    def fraction(self, style: str = "") -> t.Node:
        over = self.argument()
        return t.Fraction(over, self.argument(), style)

    def binomial(self) -> t.Node:
        over = self.argument()
        return t.Fenced("(", ")", t.Row((t.Fraction(over, self.argument(), "", bar=False),)))

    def root(self) -> t.Node:
        index = None
        if self.peek() == "[":
            self.take()
            index = self.row(frozenset({"]"}))
            self.expect("]")
        return t.Root(self.argument(), index)

    def fenced(self) -> t.Node:
        left = self.delimiter()
        items: list[t.Node] = []
        while True:
            items.extend(self.row(frozenset({"\\middle"})).items)
            if self.peek() != "\\middle":
                break
            self.take()
            items.append(t.Middle(self.delimiter()))
        if self.peek() != "\\right":
            raise FormulaError("\\left without its \\right")
        self.take()
        right = self.delimiter()
        if len(items) == 1 and isinstance(items[0], t.Matrix) and not (items[0].left or items[0].right):
            return replace(items[0], left=left, right=right)
        return t.Fenced(left, right, t.Row(tuple(items)))

    def stacked(self, above: bool) -> t.Node:
        small, base = self.argument(), self.argument()
        return t.Stack(base, above=small if above else None, below=None if above else small)

    def arrow(self, char: str) -> t.Node:
        below = None
        if self.peek() == "[":
            self.take()
            below = self.row(frozenset({"]"}))
            self.expect("]")
        return t.Stack(t.Symbol(char, "rel"), above=self.argument(), below=below, stretch=True)

    def operator(self, limits: bool) -> t.Node:
        name = re.sub(r"\\[,;: ]", " ", self.words()).replace("\\!", "")
        if not re.fullmatch(r"[A-Za-z0-9 .\-]+", name):
            raise FormulaError(f"an operator named {name!r}", "use letters and digits")
        return t.Operator(name, limits)

    def mathop(self) -> t.Node:
        body = self.argument()
        if len(body.items) == 1 and isinstance(body.items[0], t.Letter):
            return t.Operator(body.items[0].text, limits=True)
        raise FormulaError("\\mathop of something other than a word", "use \\operatorname{…}")

    def modulo(self, form: str) -> t.Node:
        if form == "bmod":
            return t.Row((t.Space(2 / 9), t.Operator("mod"), t.Space(2 / 9)))
        inner = (t.Operator("mod"), t.Space(0.1), self.argument())
        if form == "pmod":
            return t.Row((t.Space(1.0), t.Symbol("(", "open"), *inner, t.Symbol(")", "close")))
        return t.Row((t.Space(1.0), *inner))

    def negated(self) -> t.Node:
        node = self.part()
        if isinstance(node, t.Symbol) and node.char in s.NEGATED:
            return t.Symbol(s.NEGATED[node.char], "rel")
        raise FormulaError("\\not before something that has no negated sign", "write it in words")

    def own_tag(self) -> None:
        self.tag = self.words().strip()

    def own_label(self) -> None:
        self.label = self.words().strip()

    def unnumbered(self) -> None:
        self.numbered = False

    # -- environments ------------------------------------------------------------------------------------
    def environment(self) -> t.Node | None:
        name = self.words()
        if name in _DISPLAY:
            body: t.Node = self.row(frozenset())
        elif name in _ALIGNED:
            if name == "alignedat":
                self.words()
            body = t.Matrix(self.cells()[0], aligns="rl", look="aligned")
        elif name in _GATHERED:
            body = t.Matrix(self.cells()[0], aligns="c", look="gathered")
        elif name in ("cases", "dcases"):
            body = t.Matrix(self.cells()[0], left="{", aligns="ll", look="cases")
        elif name in _MATRICES:
            left, right = _MATRICES[name]
            look = "small" if name == "smallmatrix" else "matrix"
            body = t.Matrix(self.cells()[0], left, right, look=look)
        elif name in ("array", "subarray"):
            body = self.array()
        else:
            raise FormulaError(f"the environment {name!r} is not in the subset typeset here")
        self.expect("\\end")
        if (closing := self.words()) != name:
            raise FormulaError(f"\\begin{{{name}}} closed by \\end{{{closing}}}")
        return body

    def array(self) -> t.Node:
        preamble = self.words().replace(" ", "")
        if not re.fullmatch(r"[lcr|]*", preamble):
            raise FormulaError(f"the array columns {preamble!r}", "use l, c, r and |")
        aligns = preamble.replace("|", "")
        rules, column = [], 0
        for char in preamble:
            if char == "|":
                rules.append(column)
            else:
                column += 1
        rows, lines = self.cells()
        if rules and (rules[0] == 0 or rules[-1] == column):
            raise FormulaError("a rule at the edge of an array", "put the array between \\left| and \\right|")
        return t.Matrix(rows, aligns=aligns, column_rules=tuple(rules), row_rules=lines)

    def substack(self) -> t.Node:
        self.expect("{")
        rows = self.cells()[0]
        self.expect("}")
        return t.Matrix(rows, aligns="c", look="substack")

    def cells(self) -> tuple[tuple[tuple[t.Row, ...], ...], tuple[int, ...]]:
        """Rows of cells up to \\end or the closing brace, and the numbers of the rows above which a rule is."""
        rows: list[tuple[t.Row, ...]] = []
        lines: list[int] = []
        while self.peek() not in ("\\end", "}"):
            while self.peek() == "\\hline":
                self.take()
                lines.append(len(rows))
            if self.peek() in ("\\end", "}"):
                break
            row = [self.row(frozenset())]
            while self.peek() == "&":
                self.take()
                row.append(self.row(frozenset()))
            rows.append(tuple(row))
            if self.peek() not in ("\\\\", "\\end", "}"):
                raise FormulaError(f"{self.peek() or 'the end of the formula'!r} inside a table of cells")
            if self.peek() == "\\\\":
                self.take()
                self.row_gap()
        if any(line in (0, len(rows)) for line in lines):
            raise FormulaError("a rule at the edge of an array", "rules go between rows")
        if not rows:
            raise FormulaError("an environment without content")
        return tuple(rows), tuple(lines)

    def row_gap(self) -> None:
        """The optional [2pt] after a line break: a hint for paper, not content; read and let go."""
        rest = "".join(self.tokens[self.at : self.at + 6])
        match = re.match(r"\[-?\d*\.?\d+(pt|em|ex|mm|cm)\]", rest)
        if match:
            taken = 0
            while taken < len(match.group()):
                taken += len(self.take())


_CONSTRUCTS: dict[str, Callable[[_Parser], t.Node | None]] = {
    "frac": lambda p: p.fraction(),
    "dfrac": lambda p: p.fraction("d"),
    "cfrac": lambda p: p.fraction("d"),
    "tfrac": lambda p: p.fraction("t"),
    "binom": lambda p: p.binomial(),
    "sqrt": lambda p: p.root(),
    "left": lambda p: p.fenced(),
    "begin": lambda p: p.environment(),
    "overset": lambda p: p.stacked(above=True),
    "stackrel": lambda p: p.stacked(above=True),
    "underset": lambda p: p.stacked(above=False),
    "xrightarrow": lambda p: p.arrow("→"),
    "xleftarrow": lambda p: p.arrow("←"),
    "operatorname": lambda p: p.operator(limits=False),
    "operatorname*": lambda p: p.operator(limits=True),
    "mathop": lambda p: p.mathop(),
    "bmod": lambda p: p.modulo("bmod"),
    "pmod": lambda p: p.modulo("pmod"),
    "mod": lambda p: p.modulo("mod"),
    "not": lambda p: p.negated(),
    "substack": lambda p: p.substack(),
    "boxed": lambda p: t.Boxed(p.argument()),
    "phantom": lambda p: t.Phantom(p.argument()),
    "hphantom": lambda p: t.Phantom(p.argument(), height=False),
    "vphantom": lambda p: t.Phantom(p.argument(), width=False),
    "tag": lambda p: p.own_tag(),
    "label": lambda p: p.own_label(),
    "nonumber": lambda p: p.unnumbered(),
    "notag": lambda p: p.unnumbered(),
}


def _plain_text(text: str) -> str:
    plain = re.sub(r"\\([%&#_$ {},])", r"\1", text).replace("~", "\u00a0").replace("\\,", "\u2009")
    if "\\" in plain or "{" in plain or "}" in plain:
        raise FormulaError(f"a command inside \\text{{{text}}}", "close the text first")
    return plain


def _grouped(body: t.Row) -> t.Node:
    return body.items[0] if len(body.items) == 1 and not isinstance(body.items[0], t.Symbol) else body


def _takes_limits(node: t.Node) -> bool:
    if isinstance(node, t.Operator):
        return node.limits
    return isinstance(node, t.Symbol) and node.kind == "op" and node.char not in s.INTEGRALS


def _joined(items: list[t.Node]) -> list[t.Node]:
    """Neighbouring upright letters (and digits after them) become one word: \\mathrm{atan2}."""
    out: list[t.Node] = []
    for node in items:
        last = out[-1] if out else None
        whole = isinstance(last, t.Letter) and last.variant in ("rm", "wit", "sf", "tt")
        if whole and isinstance(node, t.Letter) and node.variant == last.variant:  # type: ignore[union-attr]
            out[-1] = t.Letter(last.text + node.text, node.variant)  # type: ignore[union-attr]
        else:
            out.append(node)
    return out


def kind_of(node: t.Node) -> str:
    """The TeX class of a part, for spacing."""
    if isinstance(node, t.Symbol | t.Sized):
        return node.kind
    if isinstance(node, t.Scripts | t.Stack | t.Accent):
        base = node.body if isinstance(node, t.Accent) else node.base
        return kind_of(base.items[0]) if isinstance(base, t.Row) and len(base.items) == 1 else kind_of(base)
    if isinstance(node, t.Operator):
        return "op"
    if isinstance(node, t.Fenced):
        return "inner"
    if isinstance(node, t.Middle):
        return "rel"
    return "space" if isinstance(node, t.Space) else "ord"


def _classed(items: list[t.Node]) -> list[t.Node]:
    """Signs made ordinary where they have nothing on their left or right, bars made to open and close."""
    out: list[t.Node] = []
    before, opened = "start", 0
    for node in items:
        kind = kind_of(node)
        if kind == "bar" and isinstance(node, t.Symbol):
            opens = before in ("start", "bin", "rel", "open", "punct", "op")
            kind = "open" if opens else "close" if opened else "ord"
            opened += (kind == "open") - (kind == "close")
            node = t.Symbol(node.char, kind)
        elif kind == "bar" and isinstance(node, t.Scripts):
            opened -= opened > 0
            node, kind = replace(node, base=t.Symbol(node.base.char, "close")), "close"  # type: ignore[attr-defined]
        elif kind == "bin" and before in ("start", "bin", "rel", "open", "punct", "op"):
            node, kind = _with_kind(node, "ord"), "ord"
        if kind in ("rel", "close", "punct") and before == "bin":
            place = max(i for i, n in enumerate(out) if not isinstance(n, t.Space))
            out[place] = _with_kind(out[place], "ord")
        out.append(node)
        before = before if kind == "space" else kind
    if before == "bin":
        place = max(i for i, n in enumerate(out) if not isinstance(n, t.Space))
        out[place] = _with_kind(out[place], "ord")
    return out


def _with_kind(node: t.Node, kind: str) -> t.Node:
    if isinstance(node, t.Symbol):
        return t.Symbol(node.char, kind)
    if isinstance(node, t.Scripts):
        return replace(node, base=_with_kind(node.base, kind))
    return node
