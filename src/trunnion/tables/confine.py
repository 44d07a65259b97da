"""Run a reader of a binary format in a child process with limits; only arrays and plain JSON come back.

The files come from others and the readers are other people's code: a crash, an endless loop or a decompression bomb
in one must cost a bounded amount of memory and time and end as one error that names the file and the limit.
"""

from __future__ import annotations

import contextlib
import json
import os
import signal
import subprocess
import sys
import tempfile
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from trunnion.errors import Fault, Place, TableError
from trunnion.units import shown

META = "__meta__"
_MIB = 1 << 20


@dataclass(frozen=True)
class Limits:
    """What a reader may use: address space (bytes), processor time (s) and wall time (s)."""

    address_space: int = 2048 * _MIB
    cpu_seconds: float = 60.0
    wall_seconds: float = 60.0

    def __str__(self) -> str:
        space = f"{self.address_space / _MIB:.0f} MiB of address space"
        return f"{space}, {self.cpu_seconds:g} s of processor time, {self.wall_seconds:g} s of wall time"


@dataclass(frozen=True)
class Returned:
    """What a reader gave back: named arrays and a plain JSON object."""

    arrays: dict[str, np.ndarray]
    meta: dict[str, Any]


def read_confined(
    reader: str, path: Path, options: Mapping[str, Any] | None = None, limits: Limits | None = None
) -> Returned:
    """Call `reader` ("module:function") on `path` in a child process under `limits`.

    The function gets (path: str, options: dict) and returns (arrays: dict[str, ndarray], meta: dict). The reader's name
    comes from our own tables, never from a file. Raises TableError naming file and limit when the child crashes,
    runs out of memory or time; naming the missing extra when its library is not installed; and with the reader's own
    words when it refuses the file.
    """
    limits = limits or Limits()
    with tempfile.TemporaryDirectory(prefix="trunnion-read-") as folder:
        job: dict[str, Any] = {
            "reader": reader,
            "path": str(Path(path).resolve()),
            "options": dict(options or {}),
            "result": str(Path(folder) / "result.npz"),
            "refusal": str(Path(folder) / "refusal.json"),
            "address_space": limits.address_space,
            "cpu_seconds": limits.cpu_seconds,
        }
        code, tail = _run_child(job, folder, limits)
        refusal = Path(job["refusal"])
        if refusal.is_file():
            _raise_refusal(json.loads(refusal.read_text("utf-8")), path, limits)
        if code != 0:
            raise _fault(path, _cause_of_death(code, limits), _with_tail(limits, tail))
        return _load_result(Path(job["result"]), path, limits)


def _run_child(job: Mapping[str, Any], folder: str, limits: Limits) -> tuple[int | None, str]:
    """Exit code (None after the wall time) and the last words of the child."""
    environment = dict(os.environ, OMP_NUM_THREADS="1", OPENBLAS_NUM_THREADS="1", MKL_NUM_THREADS="1")
    environment["ARROW_DEFAULT_MEMORY_POOL"] = "system"
    command = [sys.executable, "-P", "-m", "trunnion.tables.confined_child"]
    with (Path(folder) / "words.txt").open("w+b") as words:
        child = subprocess.Popen(
            command,
            stdin=subprocess.PIPE,
            stdout=words,
            stderr=words,
            cwd=folder,
            env=environment,
            start_new_session=True,
        )
        try:
            child.communicate(json.dumps(job).encode(), timeout=limits.wall_seconds)
            code: int | None = child.returncode
        except subprocess.TimeoutExpired:
            _end_group(child)
            code = None
        except BaseException:
            _end_group(child)
            raise
        words.seek(max(0, words.seek(0, os.SEEK_END) - 400))
        return code, words.read().decode("utf-8", "replace").strip()


def _end_group(child: subprocess.Popen[bytes]) -> None:
    """Kill the child and whatever it started, and wait for it."""
    if hasattr(os, "killpg"):
        with contextlib.suppress(ProcessLookupError):
            os.killpg(child.pid, signal.SIGKILL)
    else:
        child.kill()
    child.wait()


def _cause_of_death(code: int | None, limits: Limits) -> str:
    """What the exit code of the child means, in words."""
    if code is None:
        return f"the reader was stopped: it used more than {limits.wall_seconds:g} s of wall time"
    if hasattr(signal, "SIGXCPU") and code == -signal.SIGXCPU:
        return f"the reader was stopped: it used more than {limits.cpu_seconds:g} s of processor time"
    if hasattr(signal, "SIGKILL") and code == -signal.SIGKILL:
        return f"the reader was killed from outside, by its limit of {limits.cpu_seconds:g} s or for want of memory"
    if code < 0:
        return f"the reader crashed ({signal.Signals(-code).name})"
    return f"the reader ended with exit code {code} and no result"


def _with_tail(limits: Limits, tail: str) -> str:
    last = shown(tail.splitlines()[-1], 200) if tail else ""
    words = f"; its last words: {last}" if last else ""
    return f"the file is damaged, hostile or too large for the limits ({limits}), which the statement may raise{words}"


def _raise_refusal(refusal: Mapping[str, str], path: Path, limits: Limits) -> None:
    kind, words = refusal["kind"], shown(refusal["words"], 400)
    if kind == "memory":
        space = limits.address_space / _MIB
        raise _fault(
            path,
            f"the reader was stopped: it asked for more than {space:.0f} MiB of address space",
            "the file is a compression bomb, or needs more: reader memory: 4 GB raises the limit",
        )
    if kind == "missing":
        raise _fault(path, f"reading this file needs the library '{words}'", refusal["remedy"])
    raise _fault(path, words, refusal.get("remedy", ""))


def _load_result(result: Path, path: Path, limits: Limits) -> Returned:
    """Arrays and meta from the child's file, without pickle and within the address-space limit."""
    try:
        with zipfile.ZipFile(result) as archive:
            total = sum(entry.file_size for entry in archive.infolist())
        if total > limits.address_space:
            raise _fault(path, "the reader returned more than its memory limit", str(limits))
        with np.load(result, allow_pickle=False) as stored:
            arrays = {name: stored[name] for name in stored.files}
        meta = json.loads(arrays.pop(META).tobytes().decode("utf-8"))
    except (OSError, ValueError, KeyError, zipfile.BadZipFile) as err:
        raise _fault(path, f"the reader returned no readable result ({type(err).__name__})", str(limits)) from err
    return Returned(arrays, meta)


def _fault(path: Path, cause: str, remedy: str) -> TableError:
    return TableError([Fault(cause, remedy, Place(path))])
