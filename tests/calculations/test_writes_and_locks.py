"""Files are whole or absent, and one process at a time writes a revision."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from trunnion.calculations import writes
from trunnion.calculations.locks import hold_lock, process_start
from trunnion.errors import StoreError

STEPS = ("write", "sync", "rename", "sync folder")


class _Killed(BaseException):
    """Stands for a process killed at this moment: nothing of the writer runs after it."""


@pytest.mark.parametrize("step", STEPS)
@pytest.mark.parametrize("former", [None, b"former"])
def test_a_kill_before_each_operation_leaves_the_former_or_the_new_state(tmp_path, monkeypatch, step, former) -> None:
    path = tmp_path / "file.json"
    if former is not None:
        path.write_bytes(former)

    def kill(name: str, _: Path) -> None:
        if name == step:
            raise _Killed

    monkeypatch.setattr(writes, "before_step", kill)
    with pytest.raises(_Killed):
        writes.write_bytes(path, b"new")
    found = path.read_bytes() if path.exists() else None
    assert found in (former, b"new")
    monkeypatch.setattr(writes, "before_step", None)
    writes.sweep(tmp_path)
    assert [entry.name for entry in tmp_path.iterdir()] == (["file.json"] if found is not None else [])


def test_an_unwritable_folder_is_told_with_a_remedy(tmp_path: Path) -> None:
    (tmp_path / "plain").write_text("a file")
    with pytest.raises(StoreError, match="--output DIR"):
        writes.make_folder(tmp_path / "plain" / "below")


@pytest.mark.parametrize(("code", "words"), [(28, "the disk is full"), (30, "read-only"), (13, "not writable")])
def test_errors_of_the_system_are_put_in_words(code: int, words: str, tmp_path: Path) -> None:
    assert words in str(writes.store_error(OSError(code, os.strerror(code)), tmp_path))


def test_a_living_owner_is_shown(tmp_path: Path) -> None:
    lock = tmp_path / "lock.json"
    with hold_lock(lock), pytest.raises(StoreError, match=rf"in use by process {os.getpid()} of "), hold_lock(lock):
        pass
    assert not lock.exists()


def test_the_lock_of_a_dead_process_is_taken_over(tmp_path: Path) -> None:
    lock = tmp_path / "lock.json"
    script = (
        "import os, sys; from pathlib import Path; from trunnion.calculations.locks import hold_lock\n"
        "with hold_lock(Path(sys.argv[1])): os._exit(0)"
    )
    subprocess.run([sys.executable, "-c", script, str(lock)], check=True)
    assert lock.exists()
    with hold_lock(lock):
        assert json.loads(lock.read_text())["pid"] == os.getpid()


def test_a_process_id_used_again_is_not_the_owner(tmp_path: Path) -> None:
    lock = tmp_path / "lock.json"
    with hold_lock(lock):
        owner = json.loads(lock.read_text())
    lock.write_text(json.dumps({**owner, "started": "another boot:1"}))
    with hold_lock(lock):
        pass


def test_an_owner_on_another_machine_counts_as_living(tmp_path: Path) -> None:
    lock = tmp_path / "lock.json"
    lock.write_text(json.dumps({"pid": 1, "started": "x", "host": "elsewhere", "user": "ada"}))
    with pytest.raises(StoreError, match=r"process 1 of ada on elsewhere[\s\S]*remove .*lock.json"), hold_lock(lock):
        pass


def test_a_torn_lock_is_no_lock(tmp_path: Path) -> None:
    lock = tmp_path / "lock.json"
    lock.write_text('{"pid"')
    with hold_lock(lock):
        pass


def test_start_of_a_process_that_is_not_there() -> None:
    assert process_start(os.getpid()) is not None
    assert process_start(2**22 + 1) is None
