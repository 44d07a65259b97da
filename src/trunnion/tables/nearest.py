"""The nearest known name to a wrong one."""

from __future__ import annotations

import difflib
from collections.abc import Iterable


def nearest_hint(name: str, known: Iterable[str], shown: int = 12) -> str:
    """`did you mean 'x'?` and the known names, cut after `shown`."""
    names = [str(other) for other in known]
    close = difflib.get_close_matches(name, names, n=1, cutoff=0.5)
    listed = ", ".join(names[:shown]) + (f", … ({len(names)} in all)" if len(names) > shown else "")
    question = f"did you mean '{close[0]}'? " if close else ""
    return f"{question}there are: {listed}" if names else f"{question}there are none"
