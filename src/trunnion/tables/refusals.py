"""How a reader inside the confined child says no: words for the person, and the remedy."""

from __future__ import annotations


class Refused(ValueError):
    """The file cannot be read; carried to the parent process, which raises TableError from it."""

    def __init__(self, cause: str, remedy: str = "", kind: str = "refused") -> None:
        super().__init__(cause)
        self.remedy = remedy
        self.kind = kind


def missing_library(library: str, extra: str) -> Refused:
    """The refusal for an optional library that is not installed."""
    return Refused(library, f"install it with: pip install 'trunnion[{extra}]'", kind="missing")
