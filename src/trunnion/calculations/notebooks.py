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
    except RecursionError as err:
        raise error(f"{path} is nested too deeply to be a notebook", remedy="take it from version control") from err
    if not is_notebook(notebook):
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
            data = output.get("data")
            payload = data.get(MIME) if isinstance(data, dict) else None
            if isinstance(payload, dict):
                yield payload, cell


def is_notebook(value: Any) -> bool:
    """Whether a JSON value has the shape of a version 4 notebook, as far as reading records relies on it."""
    return (
        isinstance(value, dict)
        and value.get("nbformat") == 4
        and isinstance(value.get("cells"), list)
        and isinstance(value.get("metadata", {}), dict)
        and all(_is_cell(cell) for cell in value["cells"])
    )


def _is_cell(cell: Any) -> bool:
    """Whether a cell has the shape the rest relies on; nbformat's own schema is applied where cells are made."""
    if not isinstance(cell, dict) or not isinstance(cell.get("cell_type"), str):
        return False
    source, metadata, outputs = cell.get("source", ""), cell.get("metadata", {}), cell.get("outputs", [])
    tags = metadata.get("tags", []) if isinstance(metadata, dict) else None
    return (
        _is_text(source)
        and isinstance(tags, list)
        and all(isinstance(tag, str) for tag in tags)
        and isinstance(outputs, list)
        and all(isinstance(o, dict) and isinstance(o.get("output_type"), str) and _is_output(o) for o in outputs)
    )


def _is_output(output: dict[str, Any]) -> bool:
    data = output.get("data", {})
    if not isinstance(data, dict) or not isinstance(output.get("name", ""), str):
        return False
    shown = [value for mime, value in data.items() if not mime.endswith("json")]
    return all(_is_text(text) for text in (output.get("text", ""), *shown))


def _is_text(value: Any) -> bool:
    return isinstance(value, str) or (isinstance(value, list) and all(isinstance(line, str) for line in value))
