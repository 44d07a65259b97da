"""The MathML writer: MathML Core elements only, every space explicit after TeX's table.

Browsers derive spacing from an operator's place in its row and differ; so each operator is written without
space of its own and the writer puts the spaces (TeXbook, chapter 18, table of spacing between atoms).
"""

from __future__ import annotations

from collections.abc import Callable
from html import escape

from trunnion.binding.maths import tree as t
from trunnion.binding.maths.parse import Formula, kind_of
from trunnion.binding.maths.symbols import INTEGRALS, styled
from trunnion.glyphs import visible_text

_ACCENTS = {
    "hat": "ˆ",
    "widehat": "\u0302",
    "tilde": "˜",
    "widetilde": "\u0303",
    "dot": "˙",
    "ddot": "¨",
    "dddot": "⃛",
    "vec": "→",
    "bar": "¯",
    "check": "ˇ",
    "breve": "˘",
    "acute": "´",
    "grave": "`",
    "mathring": "˚",
    "overline": "‾",
    "underline": "_",
    "overrightarrow": "→",
    "overleftarrow": "←",
    "overleftrightarrow": "↔",
    "overbrace": "⏞",
    "underbrace": "⏟",
}
_LONG_ARROWS = {"→": "⟶", "←": "⟵"}
_PRIMES = set("′″‴⁗")
_FLAT = (t.Row, t.Letter, t.Number, t.Symbol, t.Operator, t.Space, t.Words, t.Sized)
_THIN, _MEDIUM, _THICK = 1 / 6, 2 / 9, 5 / 18
# (left, right) -> (space in em, kept in scripts)
_SPACING: dict[tuple[str, str], tuple[float, bool]] = {}
for _left, _right, _em, _kept in (
    ("ord close inner", "op", _THIN, True),
    ("op", "ord op", _THIN, True),
    ("ord close inner", "bin", _MEDIUM, False),
    ("bin", "ord op open inner", _MEDIUM, False),
    ("ord op close inner", "rel", _THICK, False),
    ("rel", "ord op open inner", _THICK, False),
    ("ord close inner", "inner", _THIN, False),
    ("inner", "ord open punct", _THIN, False),
    ("punct", "ord op rel open close punct inner", _THIN, False),
):
    for _a in _left.split():
        for _b in _right.split():
            _SPACING[_a, _b] = (_em, _kept)


def mathml(formula: Formula, *, display: bool) -> str:
    """One `<math>` element, with the LaTeX source as its annotation (for copying and screen readers)."""
    body = _row(formula.tree, script=False)
    block = ' display="block"' if display else ""
    source = escape(visible_text(formula.latex), quote=False)
    return (
        f'<math xmlns="http://www.w3.org/1998/Math/MathML"{block}><semantics>{_single(body)}'
        f'<annotation encoding="application/x-tex">{source}</annotation></semantics></math>'
    )


def _single(body: str) -> str:
    return f"<mrow>{body}</mrow>"


def _gap(left: str, right: str, script: bool) -> str:
    em, kept = _SPACING.get((left, right), (0.0, True))
    return f'<mspace width="{em:.4f}em"/>' if em and (kept or not script) else ""


def _row(row: t.Row, script: bool) -> str:
    out, before = [], "start"
    for node in row.items:
        kind = kind_of(node)
        if kind != "space":
            out.append(_gap(before, kind, script))
            before = kind
        out.append(_node(node, script))
    return "".join(out)


def _group(node: t.Node, script: bool) -> str:
    return _single(_node(node, script)) if isinstance(node, t.Row) else _node(node, script)


def _mo(char: str, *, grows: bool = False, extra: str = "") -> str:
    stretch = "true" if grows else "false"
    return f'<mo stretchy="{stretch}" lspace="0" rspace="0"{extra}>{escape(char)}</mo>'


def _node(node: t.Node, script: bool) -> str:
    writer = _WRITERS[type(node)]
    return writer(node, script)


def _letter(node: t.Letter, script: bool) -> str:
    if node.variant == "it" and node.text.isascii():
        return f"<mi>{node.text}</mi>"
    text = escape(styled(node.text, node.variant) or node.text)
    upright = ' mathvariant="normal"' if len(text) == 1 else ""
    return f"<mi{upright}>{text}</mi>"


def _number(node: t.Number, script: bool) -> str:
    return f"<mn>{''.join(styled(c, node.variant) or c for c in node.text)}</mn>"


def _symbol(node: t.Symbol, script: bool) -> str:
    if node.kind == "op":
        side = ' movablelimits="true"' if node.char not in INTEGRALS else ""
        return f'<mo largeop="true" lspace="0" rspace="0"{side}>{node.char}</mo>'
    if node.kind == "ord" and node.char not in "|‖/.":
        return f'<mi mathvariant="normal">{escape(node.char)}</mi>' if node.char.isalpha() else _mo(node.char)
    return _mo(node.char)


def _operator(node: t.Operator, script: bool) -> str:
    name = escape(node.text).replace(" ", "\u2009")
    return _mo(name, extra=' movablelimits="true"') if node.limits else f"<mi>{name}</mi>"


def _scripts(node: t.Scripts, script: bool) -> str:
    if _is_prime(node.sup):  # the sign is raised by itself; as a superscript it would be small and too high
        rest = t.Scripts(node.base, node.sub) if node.sub is not None else node.base
        return _single(_node(rest, script) + _node(node.sup, script))  # type: ignore[arg-type]
    base = _group(node.base, script) or "<mrow></mrow>"
    parts = [_group(part, True) for part in (node.sub, node.sup) if part is not None]
    both = node.sub is not None and node.sup is not None
    stem = "munderover" if both else "munder" if node.sub is not None else "mover"
    side = "msubsup" if both else "msub" if node.sub is not None else "msup"
    name = stem if node.limits else side
    return f"<{name}>{base}{''.join(parts)}</{name}>"


def _is_prime(node: t.Node | None) -> bool:
    signs = node.items if isinstance(node, t.Row) else ()
    return len(signs) == 1 and isinstance(signs[0], t.Symbol) and signs[0].char in _PRIMES


def _flat(node: t.Node) -> bool:
    """Whether plain delimiters are tall enough (what TeX's \\left and \\right would choose)."""
    if isinstance(node, t.Scripts):
        return not node.limits and all(_flat(p) for p in (node.base, node.sub, node.sup) if p is not None)
    if isinstance(node, t.Accent):
        return not node.wide and _flat(node.body)
    if isinstance(node, t.Fenced):
        return _flat(node.body)
    if isinstance(node, t.Row):
        return all(_flat(item) for item in node.items)
    return isinstance(node, _FLAT) and not (isinstance(node, t.Symbol) and node.kind == "op")


def _fraction(node: t.Fraction, script: bool) -> str:
    line = "" if node.bar else ' linethickness="0"'
    inside = f"<mfrac{line}>{_group(node.over, script)}{_group(node.under, script)}</mfrac>"
    if not node.style:
        return inside
    display = "true" if node.style == "d" else "false"
    return f'<mstyle displaystyle="{display}" scriptlevel="0">{inside}</mstyle>'


def _root(node: t.Root, script: bool) -> str:
    if node.index is None:
        return f"<msqrt>{_group(node.body, script)}</msqrt>"
    return f"<mroot>{_group(node.body, script)}{_group(node.index, True)}</mroot>"


def _accent(node: t.Accent, script: bool) -> str:
    below = node.name.startswith("under")
    tag = "munder" if below else "mover"
    kind = ' accentunder="true"' if below else ' accent="true"'
    char = _ACCENTS[node.name]
    return f"<{tag}{kind}>{_group(node.body, script)}{_mo(char, grows=node.wide)}</{tag}>"


def _stack(node: t.Stack, script: bool) -> str:
    base = _group(node.base, script)
    if node.stretch and isinstance(node.base, t.Symbol):
        base = _mo(_LONG_ARROWS[node.base.char])  # browsers do not widen an arrow that is the base
    pad = '<mspace width="0.35em"/>' if node.stretch else ""
    parts = [_single(pad + _node(p, True) + pad) for p in (node.below, node.above) if p is not None]
    tag = "munderover" if len(parts) == 2 else "munder" if node.below is not None else "mover"
    return f"<{tag}>{base}{''.join(parts)}</{tag}>"


def _fenced(node: t.Fenced, script: bool) -> str:
    tall = not _flat(node.body)
    left = _mo(node.left, grows=tall, extra=' fence="true" form="prefix"') if node.left else ""
    right = _mo(node.right, grows=tall, extra=' fence="true" form="postfix"') if node.right else ""
    return _single(left + _row(node.body, script) + right)


def _middle(node: t.Middle, script: bool) -> str:
    return _mo(node.char, grows=True, extra=' fence="true"')


def _sized(node: t.Sized, script: bool) -> str:
    return _mo(node.char, grows=True, extra=f' minsize="{node.factor}em" maxsize="{node.factor}em"')


def _matrix(node: t.Matrix, script: bool) -> str:
    columns = max(len(row) for row in node.rows)
    rows = []
    for r, row in enumerate(node.rows):
        cells = [_cell(node, r, c, row[c] if c < len(row) else t.Row()) for c in range(columns)]
        rows.append(f"<mtr>{''.join(cells)}</mtr>")
    display = ' displaystyle="true"' if node.look in ("aligned", "gathered") else ""
    table = f'<mtable class="m-{node.look}"{display}>{"".join(rows)}</mtable>'
    if node.look == "small":
        table = f'<mstyle scriptlevel="+1">{table}</mstyle>'
    if not (node.left or node.right):
        return table
    left = _mo(node.left, grows=True, extra=' fence="true" form="prefix"') if node.left else ""
    right = _mo(node.right, grows=True, extra=' fence="true" form="postfix"') if node.right else ""
    return _single(left + table + right)


def align_of(node: t.Matrix, column: int) -> str:
    """l, r or c of a column; `aligns` repeats (aligned: rlrl…), a plain matrix is centred."""
    return node.aligns[column % len(node.aligns)] if node.aligns else "c"


def _cell(node: t.Matrix, r: int, c: int, body: t.Row) -> str:
    classes = ["m-" + align_of(node, c)]
    if c in node.column_rules:
        classes.append("m-v")
    if r in node.row_rules:
        classes.append("m-h")
    lead = ""
    if node.look == "aligned" and c % 2 and body.items:
        lead = _gap("ord", kind_of(body.items[0]), False)
    tail = ""
    if node.look == "aligned" and not c % 2 and body.items:
        tail = _gap(kind_of(body.items[-1]), "ord", False) if kind_of(body.items[-1]) in ("rel", "bin") else ""
    return f'<mtd class="{" ".join(classes)}">{lead}{_row(body, False)}{tail}</mtd>'


def _space(node: t.Space, script: bool) -> str:
    return f'<mspace width="{node.em:.4f}em"/>'


def _words(node: t.Words, script: bool) -> str:
    text = escape(node.text.replace(" ", "\u00a0"))
    style = {"bf": ' class="m-bold"', "wit": ' class="m-slant"', "tt": ' class="m-mono"'}.get(node.variant, "")
    return f"<mtext{style}>{text}</mtext>"


def _phantom(node: t.Phantom, script: bool) -> str:
    inside = f"<mphantom>{_group(node.body, script)}</mphantom>"
    if node.width and node.height:
        return inside
    size = 'height="0" depth="0"' if node.width else 'width="0"'
    return f"<mpadded {size}>{inside}</mpadded>"


def _styled(node: t.Styled, script: bool) -> str:
    display = "true" if node.display else "false"
    return f'<mstyle displaystyle="{display}" scriptlevel="0">{_node(node.body, False)}</mstyle>'


def _boxed(node: t.Boxed, script: bool) -> str:
    return f'<mrow class="m-box">{_node(node.body, script)}</mrow>'


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
