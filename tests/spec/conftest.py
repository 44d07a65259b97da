"""What the tests of the spec share."""

from __future__ import annotations

from pathlib import Path

import pytest

from trunnion.errors import Fault

MISTAKES = Path(__file__).parent / "mistakes"


def _report(fault: Fault, text: str) -> str:
    """A fault as printed (file name only), with the line it points at and a caret under the place."""
    file = Path(str(fault.place.file)).name
    said = str(fault).replace(str(fault.place.file), file, 1)
    if fault.place.line is None or "--set" in file:
        return f"{said}\n"
    line = text.split("\n")[fault.place.line - 1]
    return f"{said}\n\n{line}\n{' ' * (fault.place.column - 1)}^\n"


@pytest.fixture(scope="session")
def report():
    """The function that turns a fault into the text kept beside each mistakes file."""
    return _report


@pytest.fixture(scope="session")
def mistakes_folder() -> Path:
    """The folder of the mistakes files."""
    return MISTAKES
