"""Notebooks as plain JSON: reading, canonical bytes, tags. Nothing here loads nbformat.

Bodies and sheets are written in one canonical form (sorted keys, indent 1, UTF-8, one newline at the end),
so that a notebook read and written again is the same bytes.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from trunnion.errors import StoreError, TemplateError
from trunnion.sheet.items import MIME

Notebook = dict[str, Any]
PARAMETERS_TAG = "parameters"
INJECTED_TAG = "injected-parameters"
SHEET_TAG = "trunnion-sheet"


def canonical_bytes(notebook: Mapping[str, Any]) -> bytes:
    """The one byte form of a notebook."""
    return (json.dumps(notebook, indent=1, sort_keys=True, ensure_ascii=False) + "\n").encode("utf-8")


def read_notebook(path: Path, *, error: type[TemplateError] | type[StoreError] = StoreError) -> Notebook:
    """Read a version 4 notebook as JSON, cell sources and outputs joined to plain text."""
    try:
        notebook = json.loads(path.read_bytes())
    except OSError as err:
        raise error(f"{path} can't be read ({err.strerror})", remedy="look at its rights") from err
    except ValueError as err:
        raise error(f"{path} is no notebook: {err}", remedy="open it in Jupyter and save it again") from err
    if not _is_notebook(notebook):
        raise error(f"{path} is no version 4 notebook", remedy="open it in Jupyter and save it as nbformat 4")
    for cell in notebook["cells"]:
        cell["source"] = joined(cell.get("source", ""))
        cell.setdefault("metadata", {})
    return notebook


def joined(text: str | list[str]) -> str:
    """Multi-line text as nbformat allows it: a string or a list of lines."""
    return text if isinstance(text, str) else "".join(text)


def tags(cell: Mapping[str, Any]) -> list[str]:
    """The tags of a cell."""
    return list(cell.get("metadata", {}).get("tags", []))


def tagged(notebook: Mapping[str, Any], tag: str) -> Iterator[tuple[int, dict[str, Any]]]:
    """Cells that bear a tag, with their index."""
    return ((index, cell) for index, cell in enumerate(notebook["cells"]) if tag in tags(cell))


def items(notebook: Mapping[str, Any]) -> Iterator[tuple[dict[str, Any], dict[str, Any]]]:
    """Every recorded item in order, as (payload, cell); cells added by the sheet record nothing."""
    for cell in notebook["cells"]:
        if SHEET_TAG in tags(cell):
            continue
        for output in cell.get("outputs", []):
            payload = output.get("data", {}).get(MIME)
            if isinstance(payload, dict):
                yield payload, cell


def _is_notebook(value: Any) -> bool:
    return (
        isinstance(value, dict)
        and value.get("nbformat") == 4
        and isinstance(value.get("cells"), list)
        and all(isinstance(cell, dict) and "cell_type" in cell for cell in value["cells"])
    )
