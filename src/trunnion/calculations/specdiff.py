"""What differs between two specs, by key path, and what only words say."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations.reasons import differences, value_text
from trunnion.errors import TrunnionError

_LISTED = ("people", "sources", "requirements", "deviations", "assumptions", "decisions", "calculations")


@dataclass(frozen=True)
class SpecChange:
    """One place where the spec differs: its key path and old and new value as plain JSON."""

    path: str
    old: Any
    new: Any

    @property
    def section(self) -> str:
        """`requirements`, `envelopes`, … ."""
        return self.path.partition(".")[0]

    @property
    def text(self) -> str:
        """The change in one line."""
        return f"{self.path}: {value_text(self.old)} → {value_text(self.new)}"

    def plain(self) -> dict[str, Any]:
        """The change as JSON."""
        return {"path": self.path, "old": self.old, "new": self.new}


def spec_changes(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[SpecChange]:
    """Differences of two specs as plain trees; parts with ids are compared by id, not by place."""
    return [SpecChange(*change) for change in differences(_by_id(old), _by_id(new))]


def plain_spec(path: Path, overrides: tuple[tuple[str, str], ...] = ()) -> dict[str, Any]:
    """A spec file as a plain tree (its data files need not be there); empty if it can't be read any more."""
    from trunnion.spec import load_workbook

    try:
        return plain_workbook(load_workbook(path, overrides, check_files=False))
    except TrunnionError:
        return {}


def plain_workbook(workbook: Any) -> dict[str, Any]:
    """A loaded workbook's spec as a plain tree, texts included."""
    return plain_tree(workbook.tree)


def plain_tree(node: Any) -> Any:
    """The plain values of a spec tree; numbers as typed."""
    if node.is_mapping:
        return {key: plain_tree(child) for key, child in node.value.items()}
    if node.is_list:
        return [plain_tree(child) for child in node.value]
    value = node.value
    raw = getattr(value, "raw", None)
    return raw if raw is not None else value


def _by_id(spec: Mapping[str, Any]) -> dict[str, Any]:
    made = dict(spec)
    for section in _LISTED:
        listed = made.get(section)
        if isinstance(listed, list):
            made[section] = {str(entry.get("id", index)): entry for index, entry in enumerate(listed, 1)}
    return made
