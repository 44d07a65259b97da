"""An archived workbook made ready to be loaded: copied to a scratch folder, inputs not held stood in for."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from trunnion.records.reading import wrong_path
from trunnion.spec import load_workbook

WORKBOOK = "data/workbook"


def not_held(results: Mapping[str, Any]) -> list[str]:
    """Inputs that were above the copied size: listed by digest only."""
    return sorted({f["path"] for entry in results["calculations"] for f in entry["inputs"] if f["held"] is None})


def workbook_of(root: Path, results: Mapping[str, Any]) -> Any:
    """The archived spec as a loaded workbook (its folder is gone afterwards; its parts stay)."""
    with copied(root, results) as folder:
        return load_workbook(folder)


@contextmanager
def copied(root: Path, results: Mapping[str, Any]) -> Iterator[Path]:
    """A scratch copy of the archived workbook's folder, with empty files in place of inputs that are not held."""
    with tempfile.TemporaryDirectory(prefix="trunnion-workbook-") as scratch:
        folder = Path(scratch) / "workbook"
        shutil.copytree(root / WORKBOOK, folder)
        for path in not_held(results):
            if not wrong_path(path) and not (folder / path).exists():
                (folder / path).parent.mkdir(parents=True, exist_ok=True)
                (folder / path).touch()
        yield folder
