"""The nearest known name to a wrong one."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from trunnion.units import shown


def nearest_hint(name: str, known: Iterable[str], most: int = 12) -> str:
    """`did you mean 'x'?` and the known names, cut after `most`."""
    names = [shown(str(other)) for other in known]
    close = difflib.get_close_matches(name, names, n=1, cutoff=0.5)
    listed = ", ".join(names[:most]) + (f", … ({len(names)} in all)" if len(names) > most else "")
    question = f"did you mean '{close[0]}'? " if close else ""
    return f"{question}there are: {listed}" if names else f"{question}there are none"
