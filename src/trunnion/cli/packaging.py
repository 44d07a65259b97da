"""The package of a computed workbook, filled for the binder."""

from __future__ import annotations

from typing import Any

from trunnion.calculations.compute import Computed


def bind_package(computed: Computed, *, pdf: bool) -> Any:
    """Bind the package of a computed workbook into its revision folder."""
    return None
