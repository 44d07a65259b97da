"""What a template's cells show, collected without a kernel, and the example workbook's plain parameters."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from trunnion.sheet import display
from trunnion.sheet.items import Item
from trunnion.spec import load_workbook
from trunnion.spec.plain import plain_part

SEDGEWING = Path(__file__).parents[2] / "workbooks" / "sedgewing"


@pytest.fixture
def shown(monkeypatch: pytest.MonkeyPatch) -> list[dict[str, Any]]:
    """Payloads of everything shown from now on, in order."""
    payloads: list[dict[str, Any]] = []

    def keep(item: Item) -> None:
        payloads.append(item.payload)

    monkeypatch.setattr(display, "show", keep)
    return payloads


@pytest.fixture(scope="session")
def sedgewing_workbook() -> Any:
    """The example workbook, loaded once."""
    return load_workbook(SEDGEWING)


@pytest.fixture
def plain(sedgewing_workbook: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., dict[str, Any]]:
    """`plain("envelope", "hover", …)`: injected parameters by name, tables copied to inputs/ of the working folder."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "inputs").mkdir()

    def parts(kind: str, *names: str) -> dict[str, Any]:
        found = {name: plain_part(sedgewing_workbook, kind, name) for name in names}
        for part in found.values():
            if "table" in part:
                content = (SEDGEWING / part["table"]).read_bytes()
                held = f"{hashlib.sha256(content).hexdigest()[:12]}-table.csv"
                (tmp_path / "inputs" / held).write_bytes(content)
                part["table"] = held
        return found

    return parts


@pytest.fixture
def disagreeing(shown: list[dict[str, Any]]) -> Callable[[], list[str]]:
    """Ids of the checks shown so far that do not agree."""
    return lambda: [item["id"] for item in shown if item["kind"] == "check" and not item["agrees"]]
