"""Showing items in a notebook: what a template calls. IPython is imported only when something is shown."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from trunnion.sheet import items
from trunnion.sheet.items import Item


def show(item: Item) -> None:
    """Show an item as the output of the running cell, its record beside the readable form."""
    from IPython.display import display

    display(item.bundle(), raw=True)


def record(result: Item | Mapping[str, Any] | None = None, /, **fields: Any) -> None:
    """Record one result (see `items.result_item`): an item, a mapping of its fields, or the fields."""
    if isinstance(result, Item):
        show(result)
    else:
        show(items.result_item(**{**(result or {}), **fields}))


def equation(identity: str, latex: str, caption: str = "") -> None:
    """Show a displayed equation (`identity` as `eq:…`)."""
    show(items.equation_item(identity, latex, caption))


def table(identity: str, headers: Sequence[str], rows: Sequence[Sequence[Any]], **options: Any) -> None:
    """Show a table (`identity` as `tbl:…`; caption, align and notes as in `items.table_item`)."""
    show(items.table_item(identity, headers, rows, **options))


def figure(identity: str, svg: str, *, caption: str, alt: str) -> None:
    """Show a picture given as SVG text (`identity` as `fig:…`)."""
    show(items.figure_item(identity, svg, caption=caption, alt=alt))


def statement(identity: str, paragraphs: Sequence[str] | str, *, title: str = "") -> None:
    """Show prose written by the library."""
    show(items.statement_item(identity, paragraphs, title=title))


def check(identity: str, what: str, **fields: Any) -> None:
    """Show an independent check (see `items.check_item`); whether both agree is computed, never passed."""
    show(items.check_item(identity, what, **fields))


def inputs(rows: Sequence[Mapping[str, Any]]) -> None:
    """Show the inputs of the calculation with their sources."""
    show(items.inputs_item(rows))


def finding(identity: str, text: str, *, against: str) -> None:
    """Show something held against a calculation, a requirement or an input."""
    show(items.finding_item(identity, text, against=against))


def assumption(identity: str, text: str, *, status: str = "open") -> None:
    """Show an assumption and its status."""
    show(items.assumption_item(identity, text, status=status))
