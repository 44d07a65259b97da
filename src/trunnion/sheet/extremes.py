"""Recording a certified extreme of an angle: its two-sided bound, the value reached, and where."""

from __future__ import annotations

from typing import Any

import numpy as np

from trunnion.envelope import Extreme
from trunnion.sheet import display


def record_extreme(extreme: Extreme, *, reached: bool = True, **fields: Any) -> None:
    """Record the bounds (deg) of `extreme` (rad) and its witness; `fields` as in `items.result_item`.

    reached: False where the witness stands for the place alone and its value is not to be claimed as attained.
    """
    witness = extreme.witness
    display.record(
        lo=float(np.degrees(extreme.lo)),
        hi=float(np.degrees(extreme.hi)),
        unit="deg",
        basis=extreme.basis,
        attained=float(np.degrees(witness.value)) if witness is not None and reached else None,
        witness=None if witness is None else {"matrix": witness.matrix, "where": witness.where, "time": witness.time},
        **fields,
    )
