"""A new workbook: a commented spec that computes as it stands, with a small data file."""

from __future__ import annotations

from pathlib import Path

from trunnion.calculations import writes
from trunnion.errors import StoreError

_FILES = ("data/slope.csv", "workbook.yaml")  # the spec last: without it the folder is no workbook


def start(folder: Path) -> Path:
    """Write a new workbook into `folder` (new, or empty); returns its spec. StoreError if something is there."""
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise StoreError(f"{folder} is not empty", remedy="name a new folder: nothing is ever overwritten")
    origin = Path(__file__).parent / "starter"
    for name in _FILES:
        writes.make_folder((folder / name).parent)
        writes.write_bytes(folder / name, (origin / name).read_bytes())
    return folder / "workbook.yaml"
