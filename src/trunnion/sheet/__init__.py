"""What a template may call besides the numerical rooms: parameters, inputs, recorded items.

Names are looked up when first used, so that reading records never loads symbols, pictures or solvers.
"""

from __future__ import annotations

import importlib
from typing import Any

_MODULE_OF = {
    "assumption": "display",
    "check": "display",
    "equation": "display",
    "figure": "display",
    "finding": "display",
    "inputs": "display",
    "record": "display",
    "show": "display",
    "statement": "display",
    "table": "display",
    "input_path": "parameters",
}

__all__ = sorted(_MODULE_OF)


def __getattr__(name: str) -> Any:
    """Load the module a public name lives in."""
    if name not in _MODULE_OF:
        raise AttributeError(f"trunnion.sheet has no '{name}'; it has {', '.join(sorted(_MODULE_OF))}")
    return getattr(importlib.import_module(f"trunnion.sheet.{_MODULE_OF[name]}"), name)


def __dir__() -> list[str]:
    """The public names."""
    return sorted(_MODULE_OF)
