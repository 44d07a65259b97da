"""The regions of a calculation, with what the readers of their tables noticed."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from trunnion.envelope.regions import Region
from trunnion.sheet import display, parameters
from trunnion.sheet.describe import table_lines


class Regions(dict[str, Region]):
    """Regions by name, built from injected parameters; their tables are kept for what was odd about them."""

    def __init__(self, envelopes: Mapping[str, Any]) -> None:
        self.tables: dict[str, list[Any]] = {name: [] for name in envelopes}
        super().__init__({name: parameters.region(plain, self.tables[name]) for name, plain in envelopes.items()})

    def tell(self) -> None:
        """Say what was accepted or noticed while the tables were read; gaps and the like are findings."""
        lines = [line for name, read in self.tables.items() for table in read for line in table_lines(name, table)]
        if lines:
            display.statement("tables", lines)
        for name, read in self.tables.items():
            for number, trouble in enumerate((t for table in read for t in table.findings), start=1):
                display.finding(f"{name}-{number}", f"{name}: {trouble}.", against=f"input {name}")
