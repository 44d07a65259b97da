"""A process killed before or after each operation of its writes: the former state or the new one, never between.

The kill is injected at the hook of the one module all writes go through, before each operation and at the next one;
nothing of the writer runs afterwards. Real loss of power is not tested.
"""

from __future__ import annotations

import contextlib
import os
import shutil
import signal
from collections.abc import Callable
from pathlib import Path

import pytest

from trunnion.calculations import writes
from trunnion.calculations.baselines import issued_revisions
from trunnion.records.audit import Verdict, audit
from trunnion.records.casework import case_of, stored_results
from trunnion.records.findings import add, stored
from trunnion.records.rules import State, judge
from trunnion.spec import load_workbook

pytestmark = pytest.mark.needs("ssh-keygen")


class _Killed(BaseException):
    """Stands for a process killed at this moment."""


def operations(action: Callable[[], object], monkeypatch: pytest.MonkeyPatch) -> int:
    """How many operations an undisturbed action takes."""
    seen: list[str] = []
    monkeypatch.setattr(writes, "before_step", lambda name, path: seen.append(name))
    action()
    monkeypatch.setattr(writes, "before_step", None)
    return len(seen)


def some(total: int, count: Callable[[int], int]) -> list[int]:
    """The operations at which to kill: each in the full run, a spread and the last ones otherwise."""
    wanted = total if count(total) == total else 4
    return sorted({*(number * total // wanted for number in range(wanted)), *range(max(0, total - 3), total)})


def killed_at(number: int, action: Callable[[], object], monkeypatch: pytest.MonkeyPatch, place: Path) -> bool:
    """Kill at one operation, if it comes to that; says whether it did.

    The lock is then a dead process's, which the next one takes over: here, it is removed.
    """
    left = [number]

    def kill(name: str, path: Path) -> None:
        left[0] -= 1
        if left[0] < 0:
            raise _Killed

    monkeypatch.setattr(writes, "before_step", kill)
    with contextlib.suppress(_Killed):
        action()
    monkeypatch.setattr(writes, "before_step", None)
    for lock in place.rglob("lock.json"):
        lock.unlink()
    return left[0] < 0


def signed_state(workbook: Path) -> set[State]:
    loaded = load_workbook(workbook)
    standing = judge(case_of(loaded, stored_results(loaded)))
    return {mark.state for (_, role), mark in standing.marks.items() if role == "prepared"}


def test_sign(desk, monkeypatch) -> None:
    folder = desk.workbook / "records" / "signatures"
    number = 0
    while killed_at(number, lambda: desk.sign("prepared"), monkeypatch, desk.workbook.parent):
        assert signed_state(desk.workbook) in ({State.NOT_SIGNED}, {State.SIGNED}), number
        assert desk.sign("prepared") == 0
        assert signed_state(desk.workbook) == {State.SIGNED}
        shutil.rmtree(folder)
        number += 1
    assert number >= 8, "signature and statement, four operations each"


@pytest.mark.parametrize("number", [0, 3, 5, 7])
def test_sign_killed_by_the_system(desk, number: int) -> None:
    """A real SIGKILL, from inside, at one operation; the next process takes the dead one's lock over."""
    left = [number]

    def kill(name: str, path: Path) -> None:
        left[0] -= "signatures" in str(path)
        if left[0] < 0:
            os.kill(os.getpid(), signal.SIGKILL)

    child = os.fork()
    if child == 0:
        writes.before_step = kill
        desk.sign("prepared")
        os._exit(0)
    assert os.WTERMSIG(os.waitpid(child, 0)[1]) == signal.SIGKILL
    assert signed_state(desk.workbook) == {State.SIGNED if number == 7 else State.NOT_SIGNED}
    assert desk.sign("prepared") == 0
    assert signed_state(desk.workbook) == {State.SIGNED}


def test_finding(desk, monkeypatch) -> None:
    def act() -> object:
        return add(load_workbook(desk.workbook), against="C01", text="Why?", by="c1", time="2031-05-28T08:00:00Z")

    total = operations(act, monkeypatch)
    for number in range(total):
        before = len(stored(desk.workbook))
        assert killed_at(number, act, monkeypatch, desk.workbook.parent)
        assert len(stored(desk.workbook)) in (before, before + 1)


def test_issue(desk, monkeypatch, count) -> None:
    desk.sign_all()
    assert desk.run("bind", desk.workbook, "--no-pdf") == 0
    whole = shutil.copytree(desk.workbook.parent, desk.workbook.parent.parent / "whole")
    total = operations(desk.issue, monkeypatch)
    for number in some(total, count):
        shutil.rmtree(desk.workbook.parent)
        shutil.copytree(whole, desk.workbook.parent)
        killed_at(number, desk.issue, monkeypatch, desk.workbook.parent)
        issued = issued_revisions(desk.workbook)
        assert issued in ([], ["A"])
        assert desk.run("status", desk.workbook) == 0
    if not issued:
        assert desk.issue() == 0


def test_archive(issued, tmp_path, monkeypatch, count) -> None:
    into = tmp_path / "made"

    def act() -> object:
        assert issued.run("archive", issued.workbook, "--key", issued.keys / "a1", "--into", into) == 0
        return None

    total = operations(act, monkeypatch)
    kept = issued.workbook / "records" / "archived"
    for number in some(total, count):
        shutil.rmtree(into)
        shutil.rmtree(kept, ignore_errors=True)
        killed_at(number, act, monkeypatch, tmp_path)
        found = [path for path in into.iterdir() if not path.name.startswith(".")] if into.is_dir() else []
        for path in found:
            verdict = audit(path, signers=issued.signers.read_bytes()).verdict
            assert verdict is Verdict.VALID, (number, path)
        act()
        assert audit(into / "MIN-001-A.zip", signers=issued.signers.read_bytes()).verdict is Verdict.VALID


def test_a_tree_is_whole_or_absent(tmp_path, monkeypatch) -> None:
    files = {"a.txt": b"1", "deep/b.txt": b"2"}
    target = tmp_path / "tree"
    total = operations(lambda: writes.write_tree(target, files), monkeypatch)
    for number in range(total):
        shutil.rmtree(target, ignore_errors=True)
        killed_at(number, lambda: writes.write_tree(target, files), monkeypatch, tmp_path)
        assert not target.exists() or sorted(p.name for p in target.rglob("*.txt")) == ["a.txt", "b.txt"]
        writes.sweep(tmp_path)
        assert [path.name for path in tmp_path.iterdir()] in ([], ["tree"])
