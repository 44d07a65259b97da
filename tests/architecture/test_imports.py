"""The arrows between the rooms never turn back; plots, files and notebooks stay where they belong."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

SOURCE = Path(__file__).parents[2] / "src" / "trunnion"

FOUNDATION = ("errors", "units", "sources", "glyphs")
ROOMS = (
    "attitude",
    "symbolic",
    "envelope",
    "hardware",
    "crosswalk",
    "tables",
    "spec",
    "figures",
    "sheet",
    "calculations",
    "binding",
    "records",
    "cli",
)
# These three know attitude only, never the symbolic room and never each other.
SIBLINGS = ("envelope", "hardware", "crosswalk")
FILES = sorted(SOURCE.rglob("*.py"))


def room_of(path: Path) -> str:
    """The room a source file lies in, or its own name for the foundation modules."""
    return path.relative_to(SOURCE).parts[0].removesuffix(".py")


def imported_modules(path: Path) -> list[str]:
    """Every absolute module name imported anywhere in the file, lazily or not."""
    found: list[str] = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found += [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            found += [f"{node.module}.{alias.name}" for alias in node.names]
    return found


def imported_rooms(path: Path) -> set[str]:
    """Rooms and foundation modules of the project that the file imports."""
    known = {*ROOMS, *FOUNDATION}
    return {
        parts[1]
        for name in imported_modules(path)
        if (parts := name.split("."))[0] == "trunnion"
        if len(parts) > 1 and parts[1] in known
    }


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(SOURCE)))
def test_a_module_imports_only_from_rooms_above_its_own(path: Path) -> None:
    room = room_of(path)
    if room == "__init__":
        assert imported_rooms(path) == set()
        return
    allowed = {*FOUNDATION} if room in FOUNDATION else {*FOUNDATION, *ROOMS[: ROOMS.index(room) + 1]}
    assert imported_rooms(path) <= allowed


@pytest.mark.parametrize(
    "path",
    [path for path in FILES if room_of(path) in SIBLINGS],
    ids=lambda path: str(path.relative_to(SOURCE)),
)
def test_envelope_hardware_and_crosswalk_know_attitude_only(path: Path) -> None:
    assert imported_rooms(path) <= {*FOUNDATION, "attitude", room_of(path)}


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(SOURCE)))
def test_heavy_libraries_stay_in_their_rooms(path: Path) -> None:
    room = room_of(path)
    roots = {name.split(".")[0] for name in imported_modules(path)}
    if room != "figures":
        assert "matplotlib" not in roots
    if room in ("attitude", "symbolic", *SIBLINGS):
        assert not roots & {"yaml", "click", "rich", "papermill", "nbformat", "IPython"}
    if room == "sheet":
        assert not roots & {"papermill", "nbformat"}


def test_every_folder_is_a_known_room() -> None:
    rooms = {path.name for path in SOURCE.iterdir() if path.is_dir() and (path / "__init__.py").exists()}
    assert rooms == set(ROOMS)
