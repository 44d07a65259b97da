"""The typst writer: every character escaped or spelled in Unicode, every grouping a function call.

Nothing of a formula's text can act as typst code: ASCII punctuation is always escaped, upright words are
quoted strings, and letters are written as characters of the mathematical alphabets.
"""

from __future__ import annotations

import re
from collections.abc import Callable

from trunnion.binding.maths import tree as t
from trunnion.binding.maths.mathml import align_of
from trunnion.binding.maths.parse import Formula, kind_of
from trunnion.binding.maths.symbols import BINARY, INTEGRALS, RELATION, styled

_ACCENTS = {
    "hat": 0x302,
    "widehat": 0x302,
    "tilde": 0x303,
    "widetilde": 0x303,
    "dot": 0x307,
    "ddot": 0x308,
    "dddot": 0x20DB,
    "vec": 0x20D7,
    "bar": 0x304,
    "check": 0x30C,
    "breve": 0x306,
    "acute": 0x301,
    "grave": 0x300,
    "mathring": 0x30A,
    "overrightarrow": 0x20D7,
    "overleftarrow": 0x20D6,
    "overleftrightarrow": 0x20E1,
}
_LINES = {"overline": "overline", "underline": "underline", "overbrace": "overbrace", "underbrace": "underbrace"}
# signs whose class typst derives differently from TeX; written with their class
_CLASSES = {"ord": "normal", "open": "opening", "close": "closing", "rel": "relation", "bin": "binary"}
_EXPLICIT = set("|‖/:!?∘□△⋆★∙↑↓↗↘✓°⊤⊥¬−+±∓∗⋅")
_SPACED = set(BINARY.values()) | set(RELATION.values()) | set("=<>")
_WORD_STYLES = {"bf": "bold", "wit": "italic", "sf": "sans", "tt": "mono"}


def typst_maths(formula: Formula) -> str:
    """The content of a typst equation (without its dollar signs)."""
    return _row(formula.tree)


def quoted(text: str) -> str:
    """A typst string literal."""
    body = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + re.sub(r"[\x00-\x1f\x7f]", lambda m: f"\\u{{{ord(m.group()):x}}}", body) + '"'


def _joined(parts: list[str]) -> str:
    """Parts side by side; a blank only where two names or numbers would run together."""
    out = ""
    for part in parts:
        if part and out and (out[-1].isalnum() and part[0].isalnum()):
            out += " "
        out += part
    return out


def _char(char: str) -> str:
    """One sign, spelled so that it stands for itself: brackets of all kinds, the root sign and others act in typst."""
    if char.isalnum():
        return char
    return "\\" + char if char.isascii() else "".join(f"\\u{{{ord(c):x}}}" for c in char)


def _row(row: t.Row) -> str:
    return _joined([_node(node) for node in row.items])


def _node(node: t.Node) -> str:
    return _WRITERS[type(node)](node)


def _group(node: t.Node) -> str:
    """An argument of a call: never empty, so that argument positions stay."""
    return _node(node) or '""'


def _letter(node: t.Letter) -> str:
    if node.variant == "rm":
        return quoted(node.text)
    return _joined(list(styled(node.text, node.variant) or node.text))


def _number(node: t.Number) -> str:
    if node.variant == "rm":
        return node.text if node.text[0] != "." else quoted(node.text)
    return _joined([styled(c, node.variant) or _char(c) for c in node.text])


def _symbol(node: t.Symbol) -> str:
    spaced = node.kind == "ord" and node.char in _SPACED
    if node.kind in _CLASSES and (spaced or node.char in _EXPLICIT):
        return f'class("{_CLASSES[node.kind]}", {_char(node.char)})'
    if node.char in "()[]{}⟨⟩⌊⌋⌈⌉" and node.kind not in ("open", "close"):
        return f'class("normal", {_char(node.char)})'
    return _char(node.char)


def _operator(node: t.Operator) -> str:
    name = quoted(node.text.replace(" ", "\u2009"))
    return f"op({name}, limits: #true)" if node.limits else f"op({name})"


def _scripts(node: t.Scripts) -> str:
    base = _group(node.base)
    if isinstance(node.base, t.Symbol) and node.base.kind == "op":
        wants = node.base.char not in INTEGRALS
        if node.limits and not wants:
            base = f"limits({base})"
        elif wants and not node.limits:
            base = f"scripts({base})"
    parts = [base]
    if node.sup is not None:
        parts.append(f"t: {_group(node.sup)}")
    if node.sub is not None:
        parts.append(f"b: {_group(node.sub)}")
    return f"attach({', '.join(parts)})"


def _fraction(node: t.Fraction) -> str:
    over, under = _group(node.over), _group(node.under)
    inside = f"frac({over}, {under})" if node.bar else f"mat(delim: #none, {over}; {under})"
    return {"": inside, "d": f"display({inside})", "t": f"inline({inside})"}[node.style]


def _root(node: t.Root) -> str:
    body = _group(node.body)
    return f"sqrt({body})" if node.index is None else f"root({_group(node.index)}, {body})"


def _accent(node: t.Accent) -> str:
    body = _group(node.body)
    if node.name in _LINES:
        return f"{_LINES[node.name]}({body})"
    return f"accent({body}, \\u{{{_ACCENTS[node.name]:x}}})"


def _stack(node: t.Stack) -> str:
    if isinstance(node.base, t.Accent) and node.base.name in ("underbrace", "overbrace"):
        note = node.below if node.base.name == "underbrace" else node.above
        if note is not None:
            return f"{node.base.name}({_group(node.base.body)}, {_group(note)})"
    base = f"stretch({_group(node.base)}, size: #(100% + .6em))" if node.stretch else _group(node.base)
    parts = [f"limits({base})"]
    if node.above is not None:
        parts.append(f"t: {_group(node.above)}")
    if node.below is not None:
        parts.append(f"b: {_group(node.below)}")
    inside = f"attach({', '.join(parts)})"
    kind = _CLASSES.get(kind_of(node.base.items[0] if _lone(node.base) else node.base))  # type: ignore[attr-defined]
    return f'class("{kind}", {inside})' if kind in ("relation", "binary") else inside


def _lone(node: t.Node) -> bool:
    return isinstance(node, t.Row) and len(node.items) == 1


def _fenced(node: t.Fenced) -> str:
    if _lone(node.body) and isinstance(node.body.items[0], t.Fraction) and not node.body.items[0].bar:
        inner = node.body.items[0]
        return f"binom({_group(inner.over)}, {_group(inner.under)})"
    left = _char(node.left) if node.left else ""
    right = _char(node.right) if node.right else ""
    return f"lr({_joined([left, _row(node.body), right])})"


def _middle(node: t.Middle) -> str:
    return f"mid({_char(node.char)})"


def _sized(node: t.Sized) -> str:
    kind = _CLASSES.get(node.kind, "normal")
    return f'class("{kind}", lr(size: #{node.factor}em, {_char(node.char)}))'


def _matrix(node: t.Matrix) -> str:
    columns = max(len(row) for row in node.rows)
    rows = []
    for row in node.rows:
        cells = [_cell(node, c, row[c] if c < len(row) else t.Row()) for c in range(columns)]
        rows.append(", ".join(cells))
    left = quoted(node.left) if node.left else "none"
    right = quoted(node.right) if node.right else "none"
    options = [f"delim: #({left}, {right})" if node.left or node.right else "delim: #none"]
    options += _GAPS[node.look]
    if node.column_rules or node.row_rules:
        vline = "".join(f"{n}, " for n in node.column_rules)
        hline = "".join(f"{n}, " for n in node.row_rules)
        options.append(f"augment: #(vline: ({vline}), hline: ({hline}), stroke: .05em)")
    table = f"mat({', '.join(options)}, {'; '.join(rows)})"
    return f"script({table})" if node.look == "small" else table


_GAPS = {
    "matrix": ["column-gap: #1em", "row-gap: #.45em"],
    "small": ["column-gap: #.6em", "row-gap: #.3em"],
    "cases": ["column-gap: #1em", "row-gap: #.5em"],
    "aligned": ["column-gap: #0em", "row-gap: #.7em"],
    "gathered": ["row-gap: #.7em"],
    "substack": ["row-gap: #.25em"],
}


def _cell(node: t.Matrix, column: int, body: t.Row) -> str:
    content = _row(body)
    align = align_of(node, column)
    if node.look == "aligned" and body.items:
        first, last = kind_of(body.items[0]), kind_of(body.items[-1])
        if column % 2 and first in ("rel", "bin"):
            content = '""' + content if first == "rel" else content
        if not column % 2 and last == "rel":
            content += '""'
        if column and column % 2 == 0:
            content = "#h(2em)" + content
    if node.look in ("aligned", "gathered") and content:
        content = f"display({content})"
    content = content or '""'
    return {"l": f"&{content}", "r": f"{content}&", "c": content}[align]


def _space(node: t.Space) -> str:
    return f"#h({node.em:.4f}em)"


def _words(node: t.Words) -> str:
    text = quoted(node.text.replace(" ", "\u00a0"))
    style = _WORD_STYLES.get(node.variant)
    return f"{style}({text})" if style else text


def _phantom(node: t.Phantom) -> str:
    return f"tphantom({_group(node.body)}, width: #{str(node.width).lower()}, height: #{str(node.height).lower()})"


def _styled(node: t.Styled) -> str:
    return f"{'display' if node.display else 'inline'}({_group(node.body)})"


def _boxed(node: t.Boxed) -> str:
    return f"tboxed({_group(node.body)})"


_WRITERS: dict[type, Callable[..., str]] = {
    t.Row: _row,
    t.Letter: _letter,
    t.Number: _number,
    t.Symbol: _symbol,
    t.Operator: _operator,
    t.Scripts: _scripts,
    t.Fraction: _fraction,
    t.Root: _root,
    t.Accent: _accent,
    t.Stack: _stack,
    t.Fenced: _fenced,
    t.Middle: _middle,
    t.Sized: _sized,
    t.Matrix: _matrix,
    t.Space: _space,
    t.Words: _words,
    t.Phantom: _phantom,
    t.Styled: _styled,
    t.Boxed: _boxed,
}
