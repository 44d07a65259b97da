"""Sharing work out: among the processors of this machine, or among the workers of a cluster someone else runs.

The work is one pure function applied to many parts. Who does it changes nothing of the answer, so it is no parameter
of a calculation: the address of a cluster's scheduler and the file in which progress is told come from outside, as
environment variables.
"""

from __future__ import annotations

import hashlib
import importlib
import multiprocessing
import os
import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from functools import cache, partial
from pathlib import Path
from typing import Any

from trunnion.errors import CalculationError

SCHEDULER_VARIABLE = "TRUNNION_SCHEDULER"
PROGRESS_VARIABLE = "TRUNNION_PROGRESS"
RETRIES = 3
_PATIENCE = 20.0  # seconds to wait for a scheduler
_ROOMS = ("attitude", "envelope", "tables", "spec", "sheet")

Mapper = Callable[[Callable[[Any], Any], Sequence[Any]], Iterable[Any]]


@contextmanager
def shared(parts: int) -> Iterator[Mapper]:
    """A mapper for that many parts: a cluster's if an address is set, else this machine's processes."""
    address = os.environ.get(SCHEDULER_VARIABLE)
    if address:
        with _cluster(address) as mapper:
            yield mapper
        return
    processes = min(usable_processors(), parts)
    if processes < 2:
        yield map
        return
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(processes, mp_context=context, initializer=_end_with_parent) as pool:
        yield partial(_pool_results, pool)


def set_scheduler(address: str | None) -> None:
    """Name the scheduler for calculations started from here on (None: leave it as it is)."""
    if address is not None:
        os.environ[SCHEDULER_VARIABLE] = address


def usable_processors() -> int:
    """Processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def tell_progress(done: int, of: int, what: str) -> None:
    """Tell how far the work is, where whoever started this calculation looks for it."""
    path = os.environ.get(PROGRESS_VARIABLE)
    if path:
        Path(path).write_text(f"{done} of {of} {what}", encoding="utf-8")


def _pool_results(pool: ProcessPoolExecutor, function: Callable[[Any], Any], parts: Sequence[Any]) -> Iterator[Any]:
    try:
        yield from pool.map(function, parts)
    except BrokenProcessPool as err:
        raise CalculationError(
            "a process that was reading runs was killed", remedy="most likely for want of memory; run again with less"
        ) from err


def _end_with_parent() -> None:
    """On Linux the system ends this process when the one that started it is killed."""
    if sys.platform == "linux":
        import ctypes
        import signal

        pr_set_pdeathsig = 1
        ctypes.CDLL(None, use_errno=True).prctl(pr_set_pdeathsig, signal.SIGKILL)


@contextmanager
def _cluster(address: str) -> Iterator[Mapper]:
    """A mapper that hands the parts to a cluster; lost work is done again by the cluster itself."""
    try:
        distributed = importlib.import_module("distributed")
    except ImportError as err:
        raise CalculationError(
            "a scheduler is named, but the library 'distributed' is not installed",
            remedy="install it with: pip install 'trunnion[cluster]', or leave the scheduler out",
        ) from err
    try:
        client = distributed.Client(address, timeout=_PATIENCE, set_as_default=False)
    except (OSError, ValueError) as err:
        raise CalculationError(
            f"no scheduler answers at '{address}'", remedy="give its address as in tcp://host:8786"
        ) from err
    with client:
        yield partial(_cluster_results, client)


def _cluster_results(client: Any, function: Callable[[Any], Any], parts: Sequence[Any]) -> Iterator[Any]:
    """Results in order; the same call of the same program is one task, however often it has to be done again."""
    futures = client.map(partial(_checked, function=function, program=program_digest()), parts, retries=RETRIES)
    for future in futures:
        yield future.result()


def _checked(part: Any, *, function: Callable[[Any], Any], program: str) -> Any:
    """The function of a part, if this worker runs the very program that asks."""
    if program_digest() != program:
        raise CalculationError(
            "a worker of the cluster runs another version of Trunnion or of its libraries",
            remedy="install the same versions on every worker",
        )
    return function(part)


@cache
def program_digest() -> str:
    """SHA-256 over the source files that take part and the versions of the libraries they stand on."""
    package = Path(__file__).parents[1]
    found = hashlib.sha256()
    for path in sorted(path for room in _ROOMS for path in (package / room).rglob("*.py")):
        found.update(path.relative_to(package).as_posix().encode() + b"\0" + path.read_bytes() + b"\0")
    for library in ("numpy", "scipy", "pyarrow"):
        found.update(f"{library} {importlib.import_module(library).__version__}\n".encode())
    return found.hexdigest()
