"""What the readers of packet logs (MAVLink, DataFlash) share: named fields over time, and what broke on the way."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from trunnion.tables.columns import Columns
from trunnion.tables.delimited import wanted_columns
from trunnion.tables.files import file_error
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import SHOWN_ROWS, Trouble


@dataclass
class Damage:
    """Places (byte offsets) where a packet log can't be read, by reason, and the bytes passed over."""

    places: dict[str, list[int]] = field(default_factory=dict)
    skipped: int = 0

    def add(self, reason: str, offset: int, skipped: int = 0) -> None:
        """Note one place."""
        self.places.setdefault(reason, []).append(offset)
        self.skipped += skipped

    def troubles(self) -> list[Trouble]:
        """One Trouble a reason, with count and first places."""
        found = []
        for reason, places in self.places.items():
            listed = ", ".join(map(str, places[:SHOWN_ROWS])) + (", …" if len(places) > SHOWN_ROWS else "")
            text = f"{reason}: {len(places)} times, at byte {listed}"
            found.append(Trouble("damaged log", text, len(places)))
        if self.skipped:
            found.append(Trouble("damaged log", f"{self.skipped} bytes can't be read as messages", 1))
        return found


def columns_of_fields(samples: NDArray[np.void], name: str, statement: TableStatement, path: Path) -> Columns:
    """The stated fields of structured samples, time first. Raises TableError naming a field that is missing."""
    known = samples.dtype.names or ()
    wanted = wanted_columns(statement)
    for column in wanted:
        if column not in known:
            raise file_error(path, f"message '{name}' has no field '{column}'", nearest_hint(column, known, 24))
    values = [np.asarray(samples[column], dtype=float) for column in wanted[1:]]
    return Columns(np.ascontiguousarray(samples[wanted[0]]), values)
