"""The content digest of a body, and the normal form in which bodies are stored.

Digest: SHA-256 of UTF-8 JSON (sorted keys, no spaces, non-ASCII characters as they are) of the list of
cells; per cell its type, tags (as ordered), source, and outputs. Of an output: its type and MIME data,
stream name and text, or error name, value and traceback. Not of it: execution counts, times, cell ids, all
other metadata. Multi-line text counts joined (JSON MIME types as they are). DEVELOPERS.md states the same
rule; change both or neither.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Any

from trunnion.calculations.notebooks import INJECTED_TAG, joined, tags

_NOISE = (
    "Matplotlib is building the font cache",
    "Matplotlib created a temporary cache directory",
    "mkdir -p failed for path",
)


def content_digest(notebook: Mapping[str, Any]) -> str:
    """The SHA-256 of what the notebook says, in hexadecimal."""
    cells = [_cell(cell) for cell in notebook["cells"]]
    return sha256_json(cells)


def sha256_json(value: Any) -> str:
    """SHA-256 of the compact, key-sorted UTF-8 JSON form of a plain value."""
    text = json.dumps(value, sort_keys=True, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return sha256(text.encode("utf-8"))


def sha256(content: bytes) -> str:
    """SHA-256 in hexadecimal."""
    return hashlib.sha256(content).hexdigest()


def normalised(notebook: Mapping[str, Any], calculation: str) -> dict[str, Any]:
    """An executed notebook as it is stored: no times, no paths, no random ids.

    Every execution-time metadata entry is dropped, the injected cell gets an id derived from the calculation
    id, and execution counts are numbered from 1 in order.
    """
    cells, count = [], 0
    for cell in notebook["cells"]:
        kept = {**cell, "metadata": _without(cell.get("metadata", {}), "papermill", "execution")}
        if cell["cell_type"] == "code":
            count += 1
            kept["execution_count"] = count if cell.get("execution_count") is not None else None
            kept["outputs"] = _stored_outputs(cell["outputs"], kept["execution_count"])
        if INJECTED_TAG in tags(cell):
            kept["id"] = injected_id(calculation)
        cells.append(kept)
    metadata = _without(notebook.get("metadata", {}), "papermill", "widgets")
    return {**notebook, "metadata": metadata, "cells": cells}


def injected_id(calculation: str) -> str:
    """The id of the injected cell: derived from the calculation's id, within nbformat's 64 characters."""
    return f"parameters-{sha256(calculation.encode('utf-8'))[:16]}"


def _cell(cell: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "type": cell["cell_type"],
        "tags": tags(cell),
        "source": joined(cell.get("source", "")),
        "outputs": [_output(output) for output in cell.get("outputs", [])],
    }


def _output(output: Mapping[str, Any]) -> dict[str, Any]:
    kept: dict[str, Any] = {"type": output["output_type"]}
    if "data" in output:
        kept["data"] = {mime: _mime(mime, value) for mime, value in output["data"].items()}
    for name in ("name", "ename", "evalue", "traceback"):
        if name in output:
            kept[name] = output[name]
    if "text" in output:
        kept["text"] = joined(output["text"])
    return kept


def _mime(mime: str, value: Any) -> Any:
    return value if mime.endswith("json") or not isinstance(value, list) else joined(value)


def _without_noise(output: Mapping[str, Any]) -> dict[str, Any] | None:
    """An output without what matplotlib says about its own cache folder, once a machine; None if nothing is left."""
    kept = dict(output)
    if kept["output_type"] == "stream" and kept["name"] == "stderr":
        lines = joined(kept["text"]).splitlines(keepends=True)
        kept["text"] = "".join(line for line in lines if not any(noise in line for noise in _NOISE))
        return kept if kept["text"].strip() else None
    return kept


def _stored_outputs(outputs: list[dict[str, Any]], count: int | None) -> list[dict[str, Any]]:
    """Outputs with the new count; neighbouring pieces of one stream (split by chance of timing) are joined."""
    stored: list[dict[str, Any]] = []
    for kept in filter(None, map(_without_noise, outputs)):
        if "execution_count" in kept:
            kept["execution_count"] = count
        last = stored[-1] if stored else {}
        if kept["output_type"] == "stream" and last.get("name") == kept["name"] and "text" in last:
            last["text"] = joined(last["text"]) + joined(kept["text"])
        else:
            stored.append(kept)
    return stored


def _without(metadata: Mapping[str, Any], *names: str) -> dict[str, Any]:
    return {name: value for name, value in metadata.items() if name not in names}
