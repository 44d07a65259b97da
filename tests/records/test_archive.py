"""The archive, checked by programs that are not ours, and made the same everywhere."""

from __future__ import annotations

import json
import os
import re
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import bagit
import pytest

from trunnion.cli.exits import ExitCode
from trunnion.records.audit import Verdict, audit

pytestmark = pytest.mark.needs("ssh-keygen")
NAME = "MIN-001-A"


def verdict(path: Path, keys: Path | None = None, revoked: Path | None = None) -> Verdict:
    signers = (keys / "allowed_signers").read_bytes() if keys is not None else None
    return audit(path, signers=signers, revoked=revoked.read_bytes() if revoked else None).verdict


def test_an_archive_audits_as_valid_with_keys_from_outside(archived_once, people_keys, issued_once, capsys) -> None:
    for path in (archived_once / NAME, archived_once / f"{NAME}.zip"):
        code = issued_once.run("audit", path, "--signers", people_keys / "allowed_signers")
        assert (code, capsys.readouterr().out.strip().splitlines()[-1]) == (ExitCode.OK, "valid")


def test_without_keys_from_outside_it_is_never_valid(archived_once, issued_once, capsys) -> None:
    code = issued_once.run("audit", archived_once / f"{NAME}.zip")
    assert code == ExitCode.NOT_VOUCHED
    assert "consistent with the archive's own list; signers not vouched for" in capsys.readouterr().out


def test_bagit_validates_the_bag_as_a_program_of_its_own(archived_once) -> None:
    """bagit-python, `bagit.py --validate`; it reads BagIt 1.0 bags (RFC 8493)."""
    done = subprocess.run([sys.executable, bagit.__file__, "--validate", archived_once / NAME], capture_output=True)
    assert done.returncode == 0, done.stderr.decode()
    bag = bagit.Bag(str(archived_once / NAME))
    bag.validate()
    assert bag.version == "1.0"


def test_rfc_8493_by_hand(archived_once) -> None:
    """RFC 8493, sections 2.1.1 (declaration), 2.1.3 (manifest lines), 2.2.1 (tag manifest), 2.2.2 (Payload-Oxum)."""
    root = archived_once / NAME
    assert (root / "bagit.txt").read_bytes() == b"BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n"
    for name in ("manifest-sha256.txt", "tagmanifest-sha256.txt"):
        lines = (root / name).read_text().splitlines()
        assert all(re.fullmatch(r"[0-9a-f]{64}  \S+", line) for line in lines)
        assert [line.split("  ")[1].startswith("data/") for line in lines] == [name.startswith("manifest")] * len(lines)
    assert not (root / "fetch.txt").exists()
    payload = [path for path in (root / "data").rglob("*") if path.is_file()]
    size = sum(path.stat().st_size for path in payload)
    assert f"Payload-Oxum: {size}.{len(payload)}\n" in (root / "bag-info.txt").read_text()


@pytest.mark.needs("sha256sum")
def test_the_finders_readme_says_what_works(archived_once, people_keys, tmp_path) -> None:
    """Every command of the README is run as it stands there, with the list of keys and nothing of ours."""
    root = archived_once / NAME
    text = (root / "README.txt").read_text()
    commands = [found.replace("\\\n", " ") for found in re.findall(r"\n    ((?:[^\n]*\\\n)*[^\n]+)\n", text)]
    commands = [" ".join(command.split()) for command in commands]
    verifications = [command for command in commands if command.startswith("ssh-keygen")]
    assert len(verifications) == 4
    runnable = [c for c in commands if c.startswith(("ssh-keygen", "sha256sum", "python3"))]
    for command in runnable:
        line = command.replace("KEYS", str(people_keys / "allowed_signers")).replace("python3", sys.executable)
        done = subprocess.run(line, shell=True, cwd=root, capture_output=True)
        assert done.returncode == 0, (line, done.stderr)


def test_the_digest_script_on_its_own_gives_the_signed_digests(archived_once) -> None:
    root = archived_once / NAME
    script = root / "data" / "digest" / "digest.py"
    assert len(script.read_text().splitlines()) <= 40
    bodies = sorted((root / "data" / "package" / "bodies").glob("*.ipynb"))
    done = subprocess.run([sys.executable, "-I", script, *bodies], capture_output=True, check=True, cwd="/")
    told = {line.split()[0] for line in done.stdout.decode().splitlines()}
    for path in (root / "data" / "issued" / "record" / "signatures").glob("*.json"):
        assert {entry["body"] for entry in json.loads(path.read_text())["calculations"]} == told


def test_the_usual_contents_are_there_item_by_item(archived_once) -> None:
    """Contents of a controlled calculation (ASME NQA-1, Requirement 3; list and wording from memory)."""
    root = archived_once / NAME / "data"
    text = (root / "CONTENTS.md").read_text()
    assert "written from memory" in text
    for item in ("purpose", "method", "assumptions", "design inputs", "references", "results", "conclusion",
                 "preparer, checker, approver", "method of the check", "revision history", "subject"):  # fmt: skip
        assert item in text
    named = {name for name in re.findall(r"`([a-z]+/[\w./<>*-]*)`", text) if "<" not in name}
    for name in named:
        assert list(root.glob(name.rstrip("/"))) or name == "templates/", name


def test_the_archive_is_the_same_bytes_elsewhere(issued_once, archived_once, tmp_path) -> None:
    """Another folder, time zone and locale; signatures as kept, no key at hand."""
    shutil.copytree(issued_once.workbook.parent, tmp_path / "else where")
    workbook = tmp_path / "else where" / "miniature"
    environment = {**os.environ, "TZ": "Pacific/Kiritimati", "LC_ALL": "tr_TR.UTF-8", "LANG": "tr_TR.UTF-8"}
    script = "from trunnion.cli.main import run; import sys; run(sys.argv[1:])"
    command = [sys.executable, "-c", script, "archive", workbook, "--into", tmp_path / "made"]
    subprocess.run(command, check=True, env=environment, capture_output=True, cwd=tmp_path)
    assert (tmp_path / "made" / f"{NAME}.zip").read_bytes() == (archived_once / f"{NAME}.zip").read_bytes()


def test_the_zip_holds_the_folder_with_fixed_dates_and_modes(archived_once, tmp_path) -> None:
    with zipfile.ZipFile(archived_once / f"{NAME}.zip") as archive:
        assert {entry.date_time for entry in archive.infolist()} == {(2031, 5, 28, 0, 0, 0)}
        assert {entry.external_attr >> 16 for entry in archive.infolist()} == {0o100644}
        archive.extractall(tmp_path)
    same = {p.relative_to(tmp_path): p.read_bytes() for p in (tmp_path / NAME).rglob("*") if p.is_file()}
    there = archived_once / NAME
    assert same == {p.relative_to(archived_once): p.read_bytes() for p in there.rglob("*") if p.is_file()}


def test_only_an_issued_revision_is_archived(desk, capsys) -> None:
    assert desk.run("archive", desk.workbook, "--key", desk.keys / "a1") == 2
    assert "revision A is not issued" in capsys.readouterr().err


def test_only_a_key_listed_for_it_archives(issued, capsys, tmp_path) -> None:
    shutil.rmtree(issued.workbook / "records" / "archived", ignore_errors=True)
    assert issued.run("archive", issued.workbook, "--key", issued.keys / "c1", "--into", tmp_path / "x") == 2
    assert 'namespaces="archived@trunnion"' in capsys.readouterr().err


def test_an_altered_issue_is_not_archived(issued, capsys, tmp_path) -> None:
    path = issued.workbook / "issued" / "A" / "record" / "findings.json"
    path.write_text("[ ]")
    assert issued.run("archive", issued.workbook, "--key", issued.keys / "a1", "--into", tmp_path / "x") == 2
    assert "findings.json is changed" in capsys.readouterr().err


def test_a_revoked_key_makes_the_archive_not_valid(archived_once, people_keys) -> None:
    assert verdict(archived_once / NAME, people_keys, people_keys / "c1.pub") is Verdict.NOT_VALID


def test_without_ssh_keygen_it_is_valid_by_the_fallback(archived_once, people_keys, monkeypatch) -> None:
    monkeypatch.setattr(shutil, "which", lambda name: None)
    assert verdict(archived_once / NAME, people_keys) is Verdict.VALID


def test_a_withdrawn_revision_is_said_to_be(archived_once, issued_once, people_keys, tmp_path, capsys) -> None:
    copy = Path(shutil.copy(archived_once / f"{NAME}.zip", tmp_path))
    refused = issued_once.run("withdraw", copy, "--reason", "x", "--key", people_keys / "c1")
    assert refused == 2, "a checker does not withdraw"
    assert issued_once.run("withdraw", copy, "--reason", "Old edition", "--key", people_keys / "a1") == 0
    renamed = copy.rename(tmp_path / "another name.zip")
    capsys.readouterr()
    code = issued_once.run("audit", renamed, "--signers", people_keys / "allowed_signers")
    assert (code, "Old edition" in capsys.readouterr().out) == (ExitCode.WITHDRAWN, True)
    notice = next(tmp_path.glob("*.withdrawn.json"))
    notice.write_text(notice.read_text().replace("Old edition", "Nothing"))
    assert verdict(renamed, people_keys) is Verdict.VALID, "a notice that does not verify withdraws nothing, but shows"
    assert issued_once.run("audit", renamed, "--signers", people_keys / "allowed_signers") == 0
    assert "this notice is not good" in capsys.readouterr().out
