"""Sheets: a body with generated cells around it, made without a kernel.

The generated cells bear the tag `trunnion-sheet`; without them the sheet is the body again, byte for byte. They show
title block, requirements with limits and verdicts, and sign-off, none of which the body knows.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from trunnion.calculations.digest import sha256
from trunnion.calculations.notebooks import SHEET_TAG, Notebook, canonical_bytes, tags


@dataclass(frozen=True)
class SheetText:
    """What the generated cells say: rows of the title block, of the requirements and of the sign-off."""

    calculation: str
    title_rows: Sequence[tuple[str, str]]
    requirement_rows: Sequence[Sequence[str]] = ()
    signature_rows: Sequence[Sequence[str]] = ()
    warnings: Sequence[str] = ()


REQUIREMENT_HEADINGS = ("requirement", "asks", "candidate", "result", "basis", "verdict")
SIGNATURE_HEADINGS = ("", "name", "date", "state")


def sheet_of(body: Mapping[str, Any], text: SheetText) -> Notebook:
    """The sheet of a body."""
    head = [_cell(text, "title", _title_text(text))]
    if text.requirement_rows:
        words = "## Requirements addressed\n\n" + _table(REQUIREMENT_HEADINGS, text.requirement_rows)
        head.append(_cell(text, "requirements", words))
    rows = text.signature_rows or [("prepared", "", "", "not signed")]
    tail = [_cell(text, "sign-off", "## Sign-off\n\n" + _table(SIGNATURE_HEADINGS, rows))]
    return {**body, "cells": [*head, *body["cells"], *tail]}


def body_of(sheet: Mapping[str, Any]) -> Notebook:
    """The body of a sheet: everything that does not bear the tag."""
    return {**sheet, "cells": [cell for cell in sheet["cells"] if SHEET_TAG not in tags(cell)]}


def body_bytes_of(sheet: Mapping[str, Any]) -> bytes:
    """The stored bytes of a sheet's body."""
    return canonical_bytes(body_of(sheet))


def _title_text(text: SheetText) -> str:
    warnings = "".join(f"\n\n> **{plain_markdown(line)}**" for line in text.warnings)
    rows = [(f"**{plain_markdown(name)}**", plain_markdown(value)) for name, value in text.title_rows]
    return _raw_table(("", ""), rows) + warnings


def _cell(text: SheetText, part: str, source: str) -> dict[str, Any]:
    identity = f"sheet-{part}-{sha256(text.calculation.encode('utf-8'))[:12]}"
    return {"cell_type": "markdown", "id": identity, "metadata": {"tags": [SHEET_TAG]}, "source": source}


def _table(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    return _raw_table(headings, [[plain_markdown(cell) for cell in row] for row in rows])


def _raw_table(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    lines = [headings, ["---"] * len(headings), *rows]
    return "\n".join("| " + " | ".join(line) + " |" for line in lines)


def plain_markdown(text: str) -> str:
    """Text from the spec as Markdown that shows it literally: no markup, no mathematics, no HTML."""
    safe = "".join(f"\\{sign}" if sign in "\\`*_{}[]()#+!|<>$~" else sign for sign in text)
    return " ".join(safe.split())
