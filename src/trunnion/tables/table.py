"""What reading a table gives: attitudes over time, and everything noticed on the way."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import Fault, Place
from trunnion.tables.statements import TableStatement

SHOWN_ROWS = 5  # how many row numbers a report names; the count is always whole


@dataclass(frozen=True)
class Trouble:
    """One kind of thing wrong with a table: what, how often, and the first few rows (1-based data rows)."""

    kind: str
    text: str
    count: int
    rows: tuple[int, ...] = ()
    remedy: str = ""

    def __str__(self) -> str:
        if not self.rows:
            return self.text
        listed = ", ".join(str(row) for row in self.rows)
        more = f", … ({self.count} in all)" if self.count > len(self.rows) else ""
        return f"{'row' if self.count == 1 else 'rows'} {listed}{more}: {self.text}"

    def fault(self, path: Path | str, line: int | None = None) -> Fault:
        """The same as a fault of the file."""
        return Fault(str(self), self.remedy, Place(path, line))


def trouble_at(kind: str, text: str, bad: NDArray[np.bool_], remedy: str = "", first_row: int = 1) -> Trouble | None:
    """A Trouble from a mask over the rows, or None when no row is bad."""
    count = int(np.count_nonzero(bad))
    if count == 0:
        return None
    rows = tuple(int(row) + first_row for row in np.flatnonzero(bad)[:SHOWN_ROWS])
    return Trouble(kind, text, count, rows, remedy)


@dataclass(frozen=True, eq=False)
class AttitudeTable:
    """Attitudes over time, body to reference.

    times (N,) s, strictly increasing, counted from `origin` (s on the file's own clock); quaternions (N, 4), scalar
    first, Hamilton, unit, of the map R_rb (body components to reference components), signs continuous from row to row.
    `rows` (N,) are the 1-based data rows of the file they came from. `findings` are things to answer (gaps), `dropped`
    what was left out because the statement accepts damage, `notes` what was noticed and handled (sign flips, wraps).
    `body_rates` (N, 3) rad/s is the angular velocity of the body relative to the reference in body components, where
    the file holds it.
    """

    statement: TableStatement
    path: Path
    sha256: str
    times: NDArray[np.float64]
    quaternions: NDArray[np.float64]
    rows: NDArray[np.int64]
    origin: float = 0.0
    notes: tuple[str, ...] = ()
    findings: tuple[Trouble, ...] = ()
    dropped: tuple[Trouble, ...] = ()
    body_rates: NDArray[np.float64] | None = None

    def __len__(self) -> int:
        return len(self.times)

    def with_notes(self, *notes: str) -> AttitudeTable:
        """The same table with more notes."""
        return replace(self, notes=(*self.notes, *notes))
