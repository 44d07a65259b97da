"""One process at a time in a revision folder: a lock that names its owner and does not outlive it.

The owner is told by process id and by the moment that process started, in the kernel's own count since boot together
with the boot's id: a process id used again, a changed clock or a restarted machine is never taken for the owner.
"""

from __future__ import annotations

import contextlib
import getpass
import json
import os
import platform
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.errors import StoreError


@contextmanager
def hold_lock(path: Path) -> Iterator[None]:
    """Hold the lock file `path`; StoreError names the owner when a living process holds it."""
    me = _myself()
    with _guard(path):
        owner = _read(path)
        if owner is not None and _lives(owner):
            raise StoreError(
                f"{path.parent} is in use by {_owner_text(owner)}",
                remedy=f"wait until it is done; if you are sure it is gone, remove {path}",
            )
        writes.write_json(path, me)
    try:
        yield
    finally:
        if _read(path) == me:
            writes.remove(path)


def process_start(pid: int) -> str | None:
    """When a process started, as text comparable on this machine; None if there is no such process."""
    if sys.platform == "linux":
        try:
            stat = Path(f"/proc/{pid}/stat").read_text(encoding="utf-8", errors="replace")
            boot = Path("/proc/sys/kernel/random/boot_id").read_text(encoding="ascii").strip()
        except OSError:
            return None
        fields = stat.rpartition(")")[2].split()
        return None if fields[0] in "ZX" else f"{boot}:{fields[19]}"
    import psutil

    try:
        return f"{psutil.Process(pid).create_time():.2f}"
    except psutil.Error:
        return None


def _myself() -> dict[str, Any]:
    try:
        user = getpass.getuser()
    except (KeyError, OSError):
        user = str(os.getuid()) if hasattr(os, "getuid") else "unknown"
    return {"pid": os.getpid(), "started": process_start(os.getpid()), "host": platform.node(), "user": user}


def _read(path: Path) -> dict[str, Any] | None:
    try:
        owner = json.loads(path.read_bytes())
    except (OSError, ValueError):
        return None
    return owner if isinstance(owner, dict) else None


def _lives(owner: dict[str, Any]) -> bool:
    """Whether the owner still runs. On another machine nobody can tell from here: it counts as living."""
    if owner.get("host") != platform.node():
        return True
    pid = owner.get("pid")
    return isinstance(pid, int) and pid > 0 and process_start(pid) == owner.get("started") is not None


def _owner_text(owner: dict[str, Any]) -> str:
    return f"process {owner.get('pid')} of {owner.get('user')} on {owner.get('host')}"


@contextmanager
def _guard(path: Path) -> Iterator[None]:
    """Make looking and taking one step: a system lock on a file beside, released by the system at death."""
    try:
        import fcntl
    except ImportError:  # Windows: the step is short, and nobody else is harmed by losing it
        yield
        return
    try:
        stream = path.with_name(f".{path.name}.guard").open("a")
    except OSError as err:
        raise writes.store_error(err, path) from err
    with stream:
        with contextlib.suppress(OSError):  # a file system without such locks
            fcntl.flock(stream, fcntl.LOCK_EX)
        yield
