"""Containers and files made to harm: refused with a reason, in bounded time and memory."""

from __future__ import annotations

import contextlib
import json
import os
import stat
import struct
import tracemalloc
import zipfile
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as some

from trunnion.cli.exits import ExitCode
from trunnion.errors import TrunnionError
from trunnion.records import bag, reading
from trunnion.records.armour import parse_signature
from trunnion.records.audit import Verdict, audit
from trunnion.records.casework import read_findings
from trunnion.records.contents import contents
from trunnion.records.find import find
from trunnion.records.keylist import parse_keys
from trunnion.records.reading import opened
from trunnion.records.statements import parse

MEMORY = 64_000_000  # bytes the reader may allocate while it refuses; the limits in reading.py are of unpacked bytes
_QUICK = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])


def made(path: Path, *entries: tuple[str | zipfile.ZipInfo, bytes], method: int = zipfile.ZIP_STORED) -> Path:
    with zipfile.ZipFile(path, "w", method) as archive:
        for name, content in entries:
            archive.writestr(name, content)
    return path


def refused(path: Path) -> str:
    """The reason for which the reader refuses, having allocated little and written nothing outside."""
    tracemalloc.start()
    try:
        with pytest.raises(TrunnionError) as caught, opened(path):
            pass
        assert tracemalloc.get_traced_memory()[1] < MEMORY
    finally:
        tracemalloc.stop()
    assert caught.value.fault.remedy
    return caught.value.fault.cause


@pytest.mark.parametrize(("name", "reason"), [
    ("../evil.txt", "leads elsewhere"), ("a/../../evil.txt", "leads elsewhere"), ("/etc/evil", "absolute path"),
    ("C:/evil", "absolute path"), ("a\\..\\evil", "signs that do not belong"), ("a/./b", "leads elsewhere"),
    ("a//b", "leads elsewhere"), ("a/b\x01", "signs that do not belong"), ("a/b\nc", "signs that do not belong"),
    ("a/b.", "not every system"), ("a/b:stream", "not every system"), ("a/" + "x" * 600, "too long"),
    ("/".join("abcdefghijklmnopqrstuvwxyz"), "too long"), ("", "leads elsewhere"),
])  # fmt: skip
def test_paths_that_lead_elsewhere_are_refused(tmp_path, name: str, reason: str) -> None:
    entry = zipfile.ZipInfo("placeholder")
    entry.filename = entry.orig_filename = name
    assert reason in refused(made(tmp_path / "x.zip", (entry, b"evil")))
    assert not (tmp_path / "evil.txt").exists()


def test_links_and_devices_are_refused(tmp_path) -> None:
    for kind in (stat.S_IFLNK, stat.S_IFCHR, stat.S_IFIFO):
        entry = zipfile.ZipInfo("a/link")
        entry.create_system = 3
        entry.external_attr = (kind | 0o777) << 16
        assert "link or a device" in refused(made(tmp_path / "x.zip", (entry, b"/etc/passwd")))


def test_links_in_a_folder_are_refused(tmp_path) -> None:
    (tmp_path / "bag").mkdir()
    os.symlink("/etc/passwd", tmp_path / "bag" / "link")
    assert "link or a device" in refused(tmp_path / "bag")
    (tmp_path / "second").mkdir()
    os.mkfifo(tmp_path / "second" / "pipe")
    assert "link or a device" in refused(tmp_path / "second")


@pytest.mark.parametrize(
    ("first", "second"), [("a/B.txt", "a/b.TXT"), ("a/b", "a/b"), ("a/é", "a/e\u0301"), ("a/x", "A/X")]
)
@pytest.mark.filterwarnings("ignore:Duplicate name")
def test_names_that_meet_are_refused(tmp_path, first: str, second: str) -> None:
    assert "only in case" in refused(made(tmp_path / "x.zip", (first, b"1"), (second, b"2")))


def test_names_that_are_not_utf_8_are_refused(tmp_path) -> None:
    path = made(tmp_path / "x.zip", ("a/xx", b"1"))
    path.write_bytes(path.read_bytes().replace(b"a/xx", b"a/\xff\xfe"))
    assert "not UTF-8" in refused(path)


def test_a_zip_bomb_is_refused_by_what_it_says_and_by_what_it_does(tmp_path) -> None:
    big = made(tmp_path / "x.zip", ("a/zeros", bytes(120_000_000)), method=zipfile.ZIP_DEFLATED)
    assert "unpacks to more than" in refused(big)
    content = big.read_bytes()
    lying = content.replace(struct.pack("<I", 120_000_000), struct.pack("<I", 1000))
    (tmp_path / "y.zip").write_bytes(lying)
    assert "damaged" in refused(tmp_path / "y.zip") or "larger than it says" in refused(tmp_path / "y.zip")


def test_huge_counts_are_refused_before_they_are_read(tmp_path) -> None:
    path = made(tmp_path / "x.zip", ("a/b", b"1"))
    content = bytearray(path.read_bytes())
    content[-22 + 10 : -22 + 12] = struct.pack("<H", 60_000)
    path.write_bytes(bytes(content))
    assert "too many files" in refused(path)
    content[-22 + 10 : -22 + 12] = struct.pack("<H", 1)
    content[-22 + 12 : -22 + 16] = struct.pack("<I", 4_000_000_000)
    path.write_bytes(bytes(content))
    assert "too many files" in refused(path)


def test_too_many_files_are_refused(tmp_path, monkeypatch) -> None:
    monkeypatch.setattr(reading, "MOST_FILES", 10)
    path = made(tmp_path / "x.zip", *((f"a/{number}", b"") for number in range(11)))
    assert "too many files" in refused(path)


@pytest.mark.parametrize(
    "spoil", ["truncated", "empty", "no zip", "encrypted", "two folders", "a file alone", "odd method"]
)
def test_other_containers_that_are_none(tmp_path, spoil: str) -> None:
    path = made(tmp_path / "x.zip", ("a/b", b"1" * 1000), ("a/c", b"2" * 1000))
    content = path.read_bytes()
    if spoil == "truncated":
        path.write_bytes(content[: len(content) // 2])
    elif spoil == "empty":
        path.write_bytes(b"")
    elif spoil == "no zip":
        path.write_bytes(b"%PDF-1.7 no zip at all" * 100)
    elif spoil == "encrypted":
        flags = content.rfind(b"PK\x01\x02") + 8
        path.write_bytes(content[:flags] + b"\x01" + content[flags + 1 :])
    elif spoil == "two folders":
        made(path, ("a/b", b"1"), ("c/d", b"2"))
    elif spoil == "a file alone":
        made(path, ("b", b"1"))
    else:
        made(path, ("a/b", b"1" * 1000), method=zipfile.ZIP_LZMA)
    assert refused(path)


def test_an_audit_of_such_a_thing_is_not_valid_and_no_crash(tmp_path, capsys) -> None:
    from trunnion.cli.main import outcome

    made(tmp_path / "x.zip", ("../evil", b"1"))
    assert outcome(["audit", str(tmp_path / "x.zip")]) == ExitCode.NOT_MET
    assert outcome(["audit", str(tmp_path / "nowhere")]) == ExitCode.NOT_MET
    assert "there is no archive" in capsys.readouterr().out
    assert [name for name, _ in find(tmp_path, ["x"]).unread] == ["x.zip"]


@pytest.mark.parametrize("content", [
    b"[" * 100_000, b"{}", b"[]", b"null", b'{"calculations": 3}', b'{"calculations": [{"id": 1}]}', b"\xff\xfe",
    b"1e999",
    b'{"document": {"number": "x", "revision": "A"}, "calculations": [], "requirements": [], "decisions": []}',
])  # fmt: skip
def test_results_that_are_none_make_an_archive_not_valid(tmp_path, content: bytes) -> None:
    """Whole bags around files that are not what they should be: a row that fails, never a crash."""
    record = [f"issued/record/{name}" for name in ("record.json", "findings.json", "allowed_signers")]
    names = ["issued/results.json", "issued/digests.json", "package/results.json", "workbook/workbook.yaml", *record]
    files = bag.make(dict.fromkeys(names, content), [("Bagging-Date", "2031-05-28")], {"README.txt": b"words"})
    (tmp_path / "x.zip").write_bytes(bag.zipped("x", {**files, bag.SIGNATURE: content}, "2031-05-28"))
    assert audit(tmp_path / "x.zip").verdict is Verdict.NOT_VALID
    find(tmp_path, ["x"])


@_QUICK
@given(some.binary(max_size=400))
def test_any_bytes_read_as_an_archive_end_in_a_reason(tmp_path, content: bytes) -> None:
    path = tmp_path / "x.zip"
    for tail in (b"", b"PK\x05\x06" + bytes(18)):
        path.write_bytes(content + tail)
        with pytest.raises(TrunnionError), opened(path):
            pass


_JSON = some.recursive(
    some.none() | some.booleans() | some.integers() | some.floats() | some.text(max_size=8),
    lambda inner: some.lists(inner, max_size=4) | some.dictionaries(
        some.sampled_from(["id", "calculations", "requirements", "decisions", "results", "checks", "findings", "state",
                           "digest", "inputs", "candidates", "parts", "schema", "kind", "document", "role", "person",
                           "time", "number", "revision", "deviation", "reason"]) | some.text(max_size=4),
        inner, max_size=6),
    max_leaves=30,
)  # fmt: skip


@_QUICK
@given(_JSON)
def test_any_json_read_as_results_statement_or_findings_ends_in_a_value_or_one_error(value) -> None:
    content = json.dumps(value).encode()
    for reader in (lambda: contents(value), lambda: parse(content), lambda: read_findings(content)):
        with contextlib.suppress(TrunnionError):
            reader()


@_QUICK
@given(some.binary(max_size=300) | some.text(max_size=200).map(lambda text: text.encode("utf-8", "replace")))
def test_any_bytes_read_as_keys_or_signature_end_in_a_value_or_one_error(content: bytes) -> None:
    parse_keys(content)
    parse_keys(b'c1 namespaces="x" ssh-ed25519 ' + content)
    with pytest.raises(TrunnionError):
        parse_signature(content)
    with pytest.raises(TrunnionError):
        parse_signature(b"-----BEGIN SSH SIGNATURE-----\nU1NIU0lH\n" + content + b"-----END SSH SIGNATURE-----\n")


def test_the_folder_reader_counts_too(tmp_path, monkeypatch) -> None:
    monkeypatch.setattr(reading, "MOST_FILES", 3)
    for number in range(5):
        (tmp_path / f"{number}").write_bytes(b"")
    assert "more than 3 files" in refused(tmp_path)


def test_what_is_opened_is_gone_afterwards(tmp_path) -> None:
    made(tmp_path / "x.zip", ("a/b", b"1"))
    with opened(tmp_path / "x.zip") as root:
        assert (root / "b").read_bytes() == b"1"
    assert not root.exists()
