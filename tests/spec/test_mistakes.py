"""One file a mistake: the loader says exactly what stands beside it, once, and points at the value.

Each `NNN-….yaml` is a whole workbook with one mistake; its first line names the kind of fault, and a line `# set: …`
gives a trial value. The `.txt` beside it holds the whole expected message, the line pointed at and a caret.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from trunnion.errors import SpecError
from trunnion.spec import load_workbook
from trunnion.spec.kinds import KINDS
from trunnion.spec.tree import LARGEST_FILE, MOST_VALUES

HERE = Path(__file__).parent
FILES = sorted((HERE / "mistakes").glob("*.yaml"))

#: Kinds whose file would be huge or cannot be a file; their tests make the input themselves.
MADE = {"file-too-large", "too-many-values", "file-missing", "file-unreadable"}


def text_of(file: Path) -> str:
    return file.read_bytes().decode("utf-8", errors="replace")


def kind_of(file: Path) -> str:
    return re.match(r"# mistake: (\S+)", text_of(file))[1]


def faults_of(path, overrides=()):
    with pytest.raises(SpecError) as caught:
        load_workbook(path, overrides)
    return caught.value.faults


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_a_mistake_is_said_once_and_in_full(file, report):
    text = text_of(file)
    trial = re.search(r"^# set: (.*?)=(.*)$", text, re.MULTILINE)
    faults = faults_of(file, [(trial[1], trial[2])] if trial else ())
    assert len(faults) == 1, "\n".join(map(str, faults))
    assert report(faults[0], text) == file.with_suffix(".txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_the_message_is_of_the_kind_the_file_names(file):
    """The expected text matches the templates of its kind, and of no other kind with fixed words of its own."""
    said = file.with_suffix(".txt").read_text(encoding="utf-8")
    assert matches(kind_of(file), said)


def matches(kind: str, said: str) -> bool:
    pattern = re.escape(KINDS[kind].cause) + r"\n    " + re.escape(KINDS[kind].remedy)
    pattern = re.sub(r"\\\{\\\{|\\\}\\\}", lambda m: re.escape(m[0].replace("\\", "")[0]), pattern)
    return re.search(re.sub(r"\\\{.*?\\\}", ".*?", pattern) + "$", said, re.MULTILINE) is not None


def test_every_kind_of_fault_has_a_file():
    """Nothing the loader can say goes unshown: the registry of kinds is closed, and each kind is met by a file."""
    assert {kind_of(file) for file in FILES} | MADE == set(KINDS)


def test_no_two_kinds_share_cause_and_remedy():
    templates = [(kind.cause, kind.remedy) for kind in KINDS.values()]
    assert len(set(templates)) == len(templates)
    causes = [kind.cause for kind in KINDS.values() if kind.cause != "{why}"]
    assert len(set(causes)) == len(causes)


def test_every_fault_in_a_file_has_line_and_column():
    for file in FILES:
        if "# set:" not in text_of(file):
            assert re.match(rf"{re.escape(file.name)}:\d+:\d+: ", file.with_suffix(".txt").read_text())


def test_every_kind_used_in_the_code_is_registered_and_every_registered_one_is_used():
    source = HERE.parents[1] / "src" / "trunnion" / "spec"
    code = "\n".join(f.read_text() for f in source.rglob("*.py") if f.name != "kinds.py")
    used = set(re.findall(r'(?:\bnote|\bfault|refuse|Refused)\(\s*"([a-z0-9-]+)"', code))
    assert used <= set(KINDS)
    assert {kind for kind in KINDS if f'"{kind}"' not in code} == set()


def test_all_faults_of_a_file_come_at_once(tmp_path):
    """Five mistakes of five kinds in five places: five messages, in the order of the file."""
    text = (HERE / "example.yaml").read_text()
    for right, wrong in (
        ("revision: B", "revison: B"),
        ("north: true, ", ""),
        ("half angle: 10 deg", "half angle: 10"),
        ("bank: [-45 deg, 45 deg]", "bank: [45 deg, -45 deg]"),
        ("rests on: [C02]", "rests on: [C20]"),
    ):
        assert right in text
        text = text.replace(right, wrong, 1)
    (tmp_path / "data").mkdir()
    (tmp_path / "data" / "transition.csv").write_text("t_s,qw,qx,qy,qz\n")
    (tmp_path / "workbook.yaml").write_text(text)
    faults = faults_of(tmp_path)
    assert len(faults) == 5
    lines = [fault.place.line for fault in faults]
    assert lines == sorted(lines)


def test_a_file_too_large_is_not_read_further(tmp_path):
    (tmp_path / "workbook.yaml").write_bytes(b"# " + b"x" * LARGEST_FILE)
    (fault,) = faults_of(tmp_path)
    assert fault.cause == "the file has more than 5,000,000 bytes"
    assert fault.remedy == "move data into tables beside it"


def test_too_many_values_stop_the_reading_there(tmp_path):
    (tmp_path / "workbook.yaml").write_text("list:\n" + "- a\n" * (MOST_VALUES + 1))
    (fault,) = faults_of(tmp_path)
    assert fault.cause == "the file holds more than 100,000 values"
    assert fault.remedy == "move long lists into a table beside the file"
    assert (fault.place.line, fault.place.column) == (MOST_VALUES - 1, 3)


def test_a_missing_workbook_says_what_was_looked_for(tmp_path):
    (fault,) = faults_of(tmp_path)
    assert str(fault) == (
        f"{tmp_path}: there is no file workbook.yaml in this folder\n"
        "    give the path of a workbook folder or of its workbook.yaml"
    )
    (fault,) = faults_of(tmp_path / "nowhere")
    assert fault.cause == "there is no such file or folder"


def test_an_unreadable_file_says_why(tmp_path, monkeypatch):
    file = tmp_path / "workbook.yaml"
    file.write_text("workbook: 1\n")

    def refuse(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    (fault,) = faults_of(file)
    assert fault.cause == "the file cannot be read: Permission denied"
    assert fault.remedy == "check its permissions and that it is a plain file"


def test_a_link_that_leads_out_is_refused(tmp_path):
    text = (HERE / "example.yaml").read_text()
    outside = tmp_path / "outside.csv"
    outside.write_text("t_s,qw,qx,qy,qz\n")
    inside = tmp_path / "book"
    (inside / "data").mkdir(parents=True)
    (inside / "data" / "transition.csv").symlink_to(outside)
    (inside / "workbook.yaml").write_text(text)
    (fault,) = faults_of(inside)
    assert fault.cause == "'data/transition.csv' leaves the workbook: a link leads out of it"
