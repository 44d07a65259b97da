"""Fixtures of the binding tests: the invented material as a module."""

from __future__ import annotations

import importlib.util
from pathlib import Path
from types import ModuleType

import pytest


@pytest.fixture(scope="session")
def material() -> ModuleType:
    """The module `material.py` beside this file."""
    path = Path(__file__).with_name("material.py")
    spec = importlib.util.spec_from_file_location("binding_material", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def formulas() -> dict[str, list[str]]:
    """The formula collection: what must be typeset, and what must be refused by name."""
    import json

    return json.loads(Path(__file__).with_name("formulas.json").read_text("utf-8"))
