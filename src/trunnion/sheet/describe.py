"""Injected parameters as rows a reviewer reads: name, what is stated, source."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import degrees_text

# What a row shows elsewhere or not at all.
_APART = frozenset({"name", "source", "text"})
_FRAMES = {"reference": "reference frame", "body": "body frame"}  # a frame is often named as its part is


def convention_rows(name: str, plain: Mapping[str, Any]) -> list[dict[str, str]]:
    """Rows of one convention."""
    return [_row(f"convention {name}", plain)]


def region_rows(name: str, plain: Mapping[str, Any]) -> list[dict[str, str]]:
    """Rows of one region."""
    return [_row(f"region {name}", plain)]


def mount_rows(name: str, plain: Mapping[str, Any]) -> list[dict[str, str]]:
    """Rows of one mount."""
    return [_row(f"mount {name}", plain)]


def _row(title: str, plain: Mapping[str, Any]) -> dict[str, str]:
    return {"input": title, "stated": words(plain), "source": str(plain.get("source", "not stated"))}


def words(value: Any) -> str:
    """A plain value in one line: `sequence 3-2-1; about moving axes; zero forward: north, down: down`."""
    if isinstance(value, Mapping):
        kept = [(key, entry) for key, entry in value.items() if key not in _APART]
        return "; ".join(f"{_FRAMES.get(key, key) if _is_frame(entry) else key} {_inner(entry)}" for key, entry in kept)
    return _inner(value)


def _is_frame(value: Any) -> bool:
    return isinstance(value, Mapping) and "axes" in value and "name" in value


def _inner(value: Any) -> str:
    if isinstance(value, Mapping):
        if _is_frame(value):  # its name and axes say all
            return f"{value['name']} ({_inner(value['axes'])})"
        if "sequence" in value and "name" in value:  # a convention stated among the inputs or beside
            return f"{value['name']} ({value['sequence']} about {value.get('about', 'the axes its standard names')})"
        return ", ".join(f"{key}: {_inner(entry)}" for key, entry in value.items() if key not in _APART)
    if isinstance(value, list | tuple):
        return ", ".join(_inner(entry) for entry in value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    text = f"{value:.12g}" if isinstance(value, float) else str(value)
    return f"−{text[1:]}" if text[:1] == "-" and text[1:2].isdigit() else text


def angles_text(convention: Convention, R_rb: NDArray[np.float64]) -> str:
    """The convention's own angles of an attitude, with `(lock)` where only a combination of the outer two exists."""
    found = convention.angles(R_rb)
    texts = [
        f"{name} {degrees_text(float(angle), 3)}"
        for name, angle in zip(convention.angle_names, np.asarray(found.angles), strict=True)
    ]
    return ", ".join(texts) + (" (lock: last turn set to zero)" if bool(found.singular) else "")


def table_lines(name: str, table: Any) -> list[str]:
    """What the reader of a table noticed and handled, and, with counts, the damage the spec accepts."""
    lines = [f"The reader of {name} notes: {'; '.join(table.notes)}."] if table.notes else []
    if table.dropped:
        told = "; ".join(str(trouble) for trouble in table.dropped)
        lines.append(f"The file of {name} is damaged, and the workbook accepts it: {told}.")
    return lines
