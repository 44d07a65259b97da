"""The one way files come into being: whole under their final name, or not at all.

Temporary file in the same folder, written, flushed to the disk, renamed over the final name, folder flushed.
A process killed at any moment leaves the former file or the new one; leftovers bear the name `.NAME.tmp-PID`
and are swept by the next run that holds the lock. Real loss of power is not tested.
"""

from __future__ import annotations

import errno
import json
import os
import shutil
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from trunnion.errors import StoreError

TEMPORARY = ".tmp-"

before_step: Callable[[str, Path], None] | None = None
"""For tests: called before each operation (`write`, `sync`, `rename`, `sync folder`) with the final path."""


def write_bytes(path: Path, content: bytes) -> None:
    """Write `content` as `path`, whole or not at all. StoreError says why it can't be done."""
    temporary = path.with_name(f".{path.name}{TEMPORARY}{os.getpid()}")
    try:
        _step("write", path)
        with temporary.open("wb") as stream:
            stream.write(content)
            _step("sync", path)
            stream.flush()
            os.fsync(stream.fileno())
        _step("rename", path)
        temporary.replace(path)
        _step("sync folder", path)
        sync_folder(path.parent)
    except OSError as err:
        temporary.unlink(missing_ok=True)
        raise store_error(err, path) from err


def write_tree(folder: Path, files: Mapping[str, bytes]) -> None:
    """Write a new folder with files by relative path, whole or not at all: under a temporary name, then renamed."""
    temporary = folder.with_name(f".{folder.name}{TEMPORARY}{os.getpid()}")
    shutil.rmtree(temporary, ignore_errors=True)
    try:
        for name, content in files.items():
            path = temporary / name
            path.parent.mkdir(parents=True, exist_ok=True)
            _step("write", path)
            with path.open("wb") as stream:
                stream.write(content)
                stream.flush()
                os.fsync(stream.fileno())
        for inner in sorted({(temporary / name).parent for name in files}):
            sync_folder(inner)
        _step("rename", folder)
        temporary.rename(folder)
        _step("sync folder", folder)
        sync_folder(folder.parent)
    except OSError as err:
        shutil.rmtree(temporary, ignore_errors=True)
        raise store_error(err, folder) from err


def write_text(path: Path, text: str) -> None:
    """Write UTF-8 text, whole or not at all."""
    write_bytes(path, text.encode("utf-8"))


def write_json(path: Path, value: Any) -> None:
    """Write JSON with sorted keys, indented so that differences read well."""
    write_text(path, json.dumps(value, indent=1, sort_keys=True, ensure_ascii=False, allow_nan=False) + "\n")


def write_if_changed(path: Path, content: bytes) -> bool:
    """Write only where the file differs from `content`; says whether it wrote."""
    try:
        if path.read_bytes() == content:
            return False
    except OSError:
        pass
    write_bytes(path, content)
    return True


def make_folder(path: Path) -> Path:
    """Make a folder and those above it; StoreError says why it can't be done."""
    try:
        path.mkdir(parents=True, exist_ok=True)
    except OSError as err:
        raise store_error(err, path) from err
    return path


def remove(path: Path) -> None:
    """Remove a file if it is there."""
    try:
        path.unlink(missing_ok=True)
    except OSError as err:
        raise store_error(err, path) from err


def sweep(folder: Path) -> None:
    """Remove what a killed process left half-written in `folder` (the caller holds the lock)."""
    for leftover in folder.glob(f".*{TEMPORARY}*"):
        if leftover.is_dir() and not leftover.is_symlink():
            shutil.rmtree(leftover, ignore_errors=True)
        else:
            remove(leftover)


def sync_folder(folder: Path) -> None:
    """Flush a folder's entries to the disk, where the system can."""
    if os.name == "nt":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    except OSError as err:
        if err.errno not in (errno.EINVAL, errno.ENOTSUP):
            raise
    finally:
        os.close(handle)


_ELSEWHERE = "choose another folder (compute takes --output DIR)"
_WRITE_CAUSES = {
    errno.EACCES: ("is not writable", f"{_ELSEWHERE}, or make this one writable"),
    errno.EPERM: ("is not writable", f"{_ELSEWHERE}, or make this one writable"),
    errno.ENOENT: ("can't be made there", _ELSEWHERE),
    errno.EROFS: ("lies on a read-only disk", _ELSEWHERE),
    errno.ENOSPC: ("can't be written: the disk is full", f"make room, or {_ELSEWHERE}"),
    errno.EDQUOT: ("can't be written: the disk quota is used up", f"make room, or {_ELSEWHERE}"),
    errno.ENOTDIR: ("lies below something that is a file", _ELSEWHERE),
    errno.EEXIST: ("is a file where a folder is needed", _ELSEWHERE),
    errno.ENAMETOOLONG: ("has too long a name", "shorten ids and file names"),
}


def store_error(err: OSError, path: Path) -> StoreError:
    """The error of an output that can't be written, in the engineer's words."""
    cause, remedy = _WRITE_CAUSES.get(err.errno or 0, (f"can't be written ({err.strerror or err})", _ELSEWHERE))
    return StoreError(f"{path} {cause}", remedy=remedy)


def _step(name: str, path: Path) -> None:
    if before_step is not None:
        before_step(name, path)
