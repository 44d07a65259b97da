"""What README and DEVELOPERS name exists: paths, modules, commands, templates."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from click.testing import CliRunner

from trunnion.cli.main import COMMANDS, group

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def named_paths(text: str) -> list[str]:
    """Words in code marks that look like paths of the repository."""
    words = re.findall(r"`([^`\s]+)`", text)
    return [word for word in words if "/" in word and not word.startswith(("/", "http")) and "…" not in word]


@pytest.mark.parametrize("document", ["README.md", "DEVELOPERS.md"])
def test_paths_exist(document: str) -> None:
    text = (ROOT / document).read_text(encoding="utf-8")
    rooms = ROOT / "src" / "trunnion"
    # Inside a package folder, and inside a workbook: told of, not part of the repository.
    told = ("outputs/sedgewing", "inputs/", "bodies/<content", "templates/")
    missing = [
        path
        for path in named_paths(text)
        if not path.startswith(told)
        and not (ROOT / path.split("::")[0]).exists()
        and not (rooms / path).exists()
        and re.fullmatch(r"[\w.-]+/[\w.-]+", path) is not None
        and not (rooms / path).with_suffix("").exists()
    ]
    assert missing == []


def test_every_command_is_told_of_and_no_other() -> None:
    told = set(re.findall(r"`trunnion ([a-z]+)", README))
    known = {entry.name for entry in COMMANDS}
    assert told <= known
    assert known <= told


@pytest.mark.parametrize("entry", COMMANDS, ids=lambda entry: entry.name)
def test_every_command_has_its_help(entry) -> None:
    done = CliRunner().invoke(group, [entry.name, "--help"])
    assert done.exit_code == 0
    assert "Usage" in done.output


def test_modules_named_for_contributors_exist() -> None:
    for dotted in re.findall(r"`((?:sheet|attitude|envelope|spec|tables|calculations|binding)\.[a-z_.]+)`", DEVELOPERS):
        module = ROOT / "src" / "trunnion" / Path(*dotted.split("."))
        assert module.with_suffix(".py").exists() or module.parent.with_suffix(".py").exists(), dotted


def test_links_lead_somewhere() -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", README + DEVELOPERS):
        assert (ROOT / target).exists(), target
