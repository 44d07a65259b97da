"""The miniature workbook: two calculations with tiny templates of its own."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from trunnion.calculations import keys
from trunnion.calculations.compute import Computed, compute
from trunnion.spec import load_workbook

MINIATURE = Path(__file__).parent / "miniature"


@pytest.fixture(scope="session", autouse=True)
def steady_surroundings() -> Iterator[None]:
    """One look at the source files a session: an editor saving one while tests run must not decide them."""
    seen = keys.surroundings()
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(keys, "surroundings", lambda package=None: seen)
        yield


@pytest.fixture
def miniature(tmp_path: Path) -> Path:
    """A copy of the miniature workbook with an outputs folder beside it."""
    (tmp_path / "outputs").mkdir()
    return Path(shutil.copytree(MINIATURE, tmp_path / "miniature"))


@pytest.fixture(scope="session")
def computed_once(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The parent folder of a computed miniature; copy it, do not write into it."""
    folder = tmp_path_factory.mktemp("computed")
    (folder / "outputs").mkdir()
    shutil.copytree(MINIATURE, folder / "miniature")
    compute(load_workbook(folder / "miniature"), allow_local=True)
    return folder


@pytest.fixture
def computed(computed_once: Path, tmp_path: Path) -> Path:
    """A copy of the computed miniature workbook (its outputs lie in `outputs/` beside it)."""
    shutil.copytree(computed_once, tmp_path, dirs_exist_ok=True)
    return tmp_path / "miniature"


@pytest.fixture
def run() -> Callable[..., Computed]:
    """Load and compute a workbook, its own templates allowed."""

    def go(workbook: Path, **options: Any) -> Computed:
        return compute(load_workbook(workbook), **{"allow_local": True, **options})

    return go


@pytest.fixture
def edit() -> Callable[[Path, str, str], None]:
    """Replace a text in a file; it must be there."""

    def replace(path: Path, old: str, new: str) -> None:
        text = path.read_text(encoding="utf-8")
        assert old in text, f"{old!r} is not in {path}"
        path.write_text(text.replace(old, new), encoding="utf-8")

    return replace


@pytest.fixture
def set_cell() -> Callable[[Path, int, str], None]:
    """Replace the source of one cell of a notebook."""

    def replace(path: Path, index: int, source: str) -> None:
        notebook = json.loads(path.read_text(encoding="utf-8"))
        notebook["cells"][index]["source"] = source
        path.write_text(json.dumps(notebook), encoding="utf-8")

    return replace
