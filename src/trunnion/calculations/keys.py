"""Content keys: what a calculation's body depends on, and nothing else.

The parts are kept beside the key, so that "out of date because" can name what changed, with old and new
value. Titles, limits, texts, revisions, file times and clocks are no part of it.
"""

from __future__ import annotations

import importlib.metadata
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

from trunnion.calculations.digest import sha256, sha256_json
from trunnion.calculations.templates import Template

SCHEMA = 1
LIBRARIES = ("numpy", "scipy", "sympy", "matplotlib")
ROOMS = ("attitude", "symbolic", "envelope", "hardware", "crosswalk", "tables", "spec", "figures", "sheet")
FOUNDATION = ("errors.py", "units.py", "sources.py", "glyphs.py")


@dataclass(frozen=True)
class Surroundings:
    """What all calculations of one program share: source digests of the importable rooms, Python, libraries."""

    code: Mapping[str, str]
    python: str
    libraries: Mapping[str, str]

    @property
    def code_digest(self) -> str:
        """One digest over all source files."""
        return sha256_json(dict(self.code))


def key_parts(
    calculation: str,
    template: Template,
    parameters: Mapping[str, Any],
    inputs: Mapping[str, str],
    surroundings: Surroundings,
) -> dict[str, Any]:
    """Everything the body depends on, as plain JSON.

    `inputs` maps the file names the notebook reads to the SHA-256 of their bytes. The calculation's id takes
    part because the injected cell's id is derived from it: two calculations never share a body.
    """
    return {
        "schema": SCHEMA,
        "calculation": calculation,
        "template": {"name": template.name, "cells": template.cells_digest, "local": template.local},
        "parameters": dict(parameters),
        "inputs": dict(inputs),
        "code": surroundings.code_digest,
        "python": surroundings.python,
        "libraries": dict(surroundings.libraries),
    }


def content_key(parts: Mapping[str, Any]) -> str:
    """The content key: SHA-256 of the parts."""
    return sha256_json(dict(parts))


def surroundings(package: Path | None = None) -> Surroundings:
    """The surroundings of the running program (or of another copy of the package, for tests)."""
    folder = package or Path(__file__).parents[1]
    return Surroundings(
        code=source_digests(folder),
        python=f"{sys.version_info.major}.{sys.version_info.minor}",
        libraries={name: _version(name) for name in LIBRARIES},
    )


def source_digests(package: Path) -> dict[str, str]:
    """SHA-256 of every file of the rooms a notebook can import, by its path inside the package."""
    files = [package / name for name in FOUNDATION if (package / name).is_file()]
    for room in ROOMS:
        files += [path for path in (package / room).rglob("*") if path.is_file() and _is_source(path)]
    return {path.relative_to(package).as_posix(): sha256(path.read_bytes()) for path in sorted(files)}


def _is_source(path: Path) -> bool:
    return path.suffix not in (".pyc", ".pyo") and "__pycache__" not in path.parts and not path.name.startswith(".")


@cache
def _version(library: str) -> str:
    try:
        return importlib.metadata.version(library)
    except importlib.metadata.PackageNotFoundError:
        return "not installed"
