"""Links inside the package: resolved to anchors, told what they point at, refused when they point nowhere."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from trunnion.binding import blocks as b
from trunnion.binding.calculation import Registry
from trunnion.errors import Fault, Place

Change = Callable[[b.Line], b.Line]


def resolve(part: b.Part, registry: Registry) -> b.Part:
    """`part` with every link resolved, first inside its own calculation, then in the whole package."""

    def change(line: b.Line) -> b.Line:
        return tuple(_resolved(piece, part, registry, change) for piece in line)

    blocks = tuple(b.mapped(block, lambda block: with_lines(block, change)) for block in part.blocks)
    return replace(part, blocks=blocks)


def _resolved(piece: b.Inline, part: b.Part, registry: Registry, change: Change) -> b.Inline:
    if isinstance(piece, b.Marked):
        return replace(piece, parts=change(piece.parts))
    if not isinstance(piece, b.Link):
        return piece
    for anchor in (f"{part.calculation}/{piece.target}", piece.target, f"req/{piece.target}"):
        label = registry.labels.get(anchor)
        if label is None:
            continue
        words = change(piece.parts) or b.line(label)
        if piece.target.startswith(("eq:", "fig:", "tbl:")) or ("/" in piece.target and ":" in piece.target):
            words = words if label in _plain(words) else (*words, *b.line(f" ({label})"))
        return replace(piece, target=anchor, parts=words)
    name = part.calculation or part.title
    registry.faults.append(
        Fault(f"a link to #{piece.target}, which is nowhere in the package", "check the id", Place(name))
    )
    return piece


def _plain(parts: b.Line) -> str:
    return "".join(p.text for p in parts if isinstance(p, b.Text))


def with_lines(block: b.Block, change: Change) -> b.Block:
    """A block with `change` applied to each of its own lines (not to blocks inside it)."""
    if isinstance(block, b.Heading | b.Paragraph):
        return replace(block, parts=change(block.parts))
    if isinstance(block, b.Equation | b.Figure):
        return replace(block, caption=change(block.caption))
    if isinstance(block, b.Grid):
        return replace(block, rows=tuple((name, change(value)) for name, value in block.rows))
    if isinstance(block, b.Table):
        return replace(
            block,
            headers=tuple(change(cell) for cell in block.headers),
            rows=tuple(tuple(change(cell) for cell in row) for row in block.rows),
            caption=change(block.caption),
            notes=tuple(change(note) for note in block.notes),
        )
    return block
