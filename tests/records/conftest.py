"""The miniature workbook with three people and their keys, computed once, signed and issued through the program."""

from __future__ import annotations

import shutil
import subprocess
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from trunnion.calculations import keys
from trunnion.calculations.compute import compute
from trunnion.cli.main import outcome
from trunnion.spec import load_workbook

MINIATURE = Path(__file__).parents[1] / "calculations" / "miniature"
DAY = "2031-05-28"
PEOPLE = """people:
  - {id: p1, name: Ada Mill, signs as: [prepared]}
  - {id: c1, name: Bo Carr, signs as: [checked]}
  - {id: a1, name: Cy Dunn, signs as: [approved]}

sources:
  - {id: SYS, title: System specification, number: S-1, edition: "1"}
"""
ROLES = {"p1": "prepared", "c1": "checked", "a1": "approved"}
TIMES = {"prepared": f"{DAY}T08:00:00Z", "checked": f"{DAY}T09:00:00Z", "approved": f"{DAY}T10:00:00Z"}


@pytest.fixture(scope="session", autouse=True)
def steady_surroundings() -> Iterator[None]:
    """One look at the source files a session: an editor saving one while tests run must not decide them."""
    seen = keys.surroundings()
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(keys, "surroundings", lambda package=None: seen)
        yield


@dataclass(frozen=True)
class Desk:
    """A workbook, the keys of its people, and the program."""

    workbook: Path
    keys: Path

    @property
    def outputs(self) -> Path:
        return self.workbook.parent / "outputs" / self.workbook.name

    @property
    def signers(self) -> Path:
        return self.keys / "allowed_signers"

    def run(self, *arguments: Any) -> int:
        return int(outcome([str(argument) for argument in arguments]))

    def sign(self, role: str, *more: Any, key: str | None = None) -> int:
        person = next(person for person, own in ROLES.items() if own == role)
        extra = ("--method", "review of inputs and results", "--reference", "CR-1") if role == "checked" else ()
        time = () if "--time" in more else ("--time", TIMES[role])
        if "--unchanged" in more:
            extra = ()
        return self.run("sign", self.workbook, "--as", role, "--key", self.keys / (key or person), *extra, *time, *more)

    def sign_all(self) -> None:
        for role in TIMES:
            assert self.sign(role) == 0

    def issue(self, day: str = DAY, *, pdf: bool = False) -> int:
        return self.run("issue", self.workbook, *([] if pdf else ["--no-pdf"]), "--date", day)

    def edit(self, old: str, new: str, name: str = "workbook.yaml") -> None:
        path = self.workbook / name
        text = path.read_text(encoding="utf-8")
        assert old in text, f"{old!r} is not in {path}"
        path.write_text(text.replace(old, new), encoding="utf-8")


@pytest.fixture(scope="session")
def make_key() -> Callable[..., Path]:
    """Make a key pair without a passphrase."""

    def make(path: Path, kind: str = "ed25519", *more: str) -> Path:
        subprocess.run(
            ["ssh-keygen", "-q", "-t", kind, "-N", "", "-C", "", "-f", str(path), *more],
            check=True,
            capture_output=True,
        )
        return path

    return make


@pytest.fixture(scope="session")
def people_keys(tmp_path_factory: pytest.TempPathFactory, make_key) -> Path:
    """A folder with a key for each person and the list of them; one more key, `stranger`, that is not listed."""
    folder = tmp_path_factory.mktemp("keys")
    lines = []
    for person, role in ROLES.items():
        make_key(folder / person)
        more = ",archived@trunnion" if person == "a1" else ""
        public = (folder / f"{person}.pub").read_text().strip()
        lines.append(f'{person} namespaces="{role}@trunnion{more}" {public}\n')
    make_key(folder / "stranger")
    (folder / "allowed_signers").write_text("".join(lines))
    return folder


@pytest.fixture(scope="session")
def computed_once(tmp_path_factory: pytest.TempPathFactory, people_keys: Path) -> Path:
    """The parent folder of the computed workbook; copy it, do not write into it."""
    folder = tmp_path_factory.mktemp("desk")
    (folder / "outputs").mkdir()
    workbook = Path(shutil.copytree(MINIATURE, folder / "miniature"))
    spec = workbook / "workbook.yaml"
    text = spec.read_text(encoding="utf-8")
    text = text.replace("people:\n  - {id: p1, name: Ada Mill, signs as: [prepared]}\n", PEOPLE)
    text = text.replace("lock.,", "lock., source: SYS 1,").replace("small.,", "small., source: SYS 2,")
    text = text.replace("level: {convention", "level: {source: SYS 3, convention")
    spec.write_text(text, encoding="utf-8")
    (workbook / "records").mkdir()
    shutil.copy(people_keys / "allowed_signers", workbook / "records" / "allowed_signers")
    compute(load_workbook(workbook), allow_local=True)
    return folder


@pytest.fixture
def desk(computed_once: Path, tmp_path: Path, people_keys: Path) -> Desk:
    """A copy of the computed workbook, nothing signed."""
    shutil.copytree(computed_once, tmp_path, dirs_exist_ok=True)
    return Desk(tmp_path / "miniature", people_keys)


@pytest.fixture(scope="session")
def issued_once(computed_once: Path, tmp_path_factory: pytest.TempPathFactory, people_keys: Path) -> Desk:
    """The workbook signed by all three and issued; copy it, do not write into it."""
    folder = tmp_path_factory.mktemp("issued")
    shutil.copytree(computed_once, folder, dirs_exist_ok=True)
    made = Desk(folder / "miniature", people_keys)
    made.sign_all()
    assert made.issue(pdf=True) == 0
    return made


@pytest.fixture
def issued(issued_once: Desk, tmp_path: Path) -> Desk:
    """A copy of the issued workbook."""
    shutil.copytree(issued_once.workbook.parent, tmp_path, dirs_exist_ok=True)
    return Desk(tmp_path / "miniature", issued_once.keys)


@pytest.fixture(scope="session")
def archived_once(issued_once: Desk, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder with the archive of the issued workbook, folder and zip; copy it, do not write into it."""
    folder = tmp_path_factory.mktemp("archive")
    assert issued_once.run("archive", issued_once.workbook, "--key", issued_once.keys / "a1", "--into", folder) == 0
    return folder


@pytest.fixture
def bag_folder(archived_once: Path, tmp_path: Path) -> Path:
    """A copy of the archive's folder to be tampered with."""
    return Path(shutil.copytree(archived_once / "MIN-001-A", tmp_path / "MIN-001-A"))
