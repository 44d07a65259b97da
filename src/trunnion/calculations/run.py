"""Running calculations side by side, in worker processes with one BLAS thread each.

The process that calls `run` loads no notebook library: it hands out jobs and listens. A calculation that fails, a
kernel or a worker that dies, costs that calculation only. When `run` is interrupted, workers and kernels end before
it returns; finished notebooks stay.
"""

from __future__ import annotations

import contextlib
import json
import os
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from queue import Empty, SimpleQueue
from typing import Any

ONE_THREAD = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "BLIS_NUM_THREADS",
    "VECLIB_MAXIMUM_THREADS",
    "NUMEXPR_NUM_THREADS",
)
MOST_JOBS = 4
_PATIENCE = 5.0  # seconds a worker gets to end its kernel and itself


@dataclass(frozen=True)
class Job:
    """One calculation to run: its template filled with `parameters`, in `folder`, stored as `body`."""

    calculation: str
    template: Path
    parameters: Mapping[str, Any]
    folder: Path
    body: Path
    failed: Path
    not_held: Mapping[str, Path] = field(default_factory=dict)  # inputs read where they lie: name to file
    name: str = ""  # what it is called in progress and outcomes, where not by its calculation

    @property
    def label(self) -> str:
        """What the job is called."""
        return self.name or self.calculation

    def line(self) -> bytes:
        """The job as a worker reads it."""
        fields = {**self.__dict__, "parameters": dict(self.parameters), "not_held": dict(self.not_held)}
        text = json.dumps(fields, default=lambda path: str(path.absolute()), allow_nan=False)
        return text.encode("utf-8") + b"\n"


@dataclass(frozen=True)
class Progress:
    """Where a calculation is: cell `cell` of `of` (from 0), or over (`state` done or failed), after `elapsed` s; `note`
    is what a long cell tells of itself."""

    calculation: str
    state: str
    cell: int = 0
    of: int = 0
    elapsed: float = 0.0
    note: str = ""


@dataclass(frozen=True)
class Outcome:
    """How a calculation ended: digest and checksum of its body, or the error, the cell it came from, and where the
    notebook was kept."""

    calculation: str
    done: bool
    digest: str = ""
    sha256: str = ""
    error: str = ""
    cell: int | None = None
    of: int = 0
    source: str = ""
    kept: str | None = None


def default_jobs() -> int:
    """Kernels side by side when nobody says: one a usable processor, at most MOST_JOBS."""
    usable = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    return max(1, min(usable, MOST_JOBS))


def run(
    jobs: Iterable[Job], *, workers: int | None = None, tell: Callable[[Progress], None] | None = None
) -> dict[str, Outcome]:
    """Run all jobs, `workers` at a time; outcomes by the jobs' labels. `tell` is called from this thread."""
    pending = list(jobs)
    crew = _Crew(pending, min(workers or default_jobs(), len(pending)))
    outcomes: dict[str, Outcome] = {}
    try:
        crew.start()
        while len(outcomes) < len(pending):
            event = crew.next_event()
            if isinstance(event, Progress):
                if tell is not None:
                    tell(event)
            else:
                outcomes[event[0]] = event[1]
    finally:
        crew.end()
    return outcomes


class _Crew:
    """The worker processes, each with a thread that hands it jobs and passes on what it says."""

    def __init__(self, jobs: list[Job], size: int) -> None:
        self._jobs: SimpleQueue[Job] = SimpleQueue()
        for job in jobs:
            self._jobs.put(job)
        self._events: SimpleQueue[Progress | tuple[str, Outcome]] = SimpleQueue()
        self._threads = [threading.Thread(target=self._work, daemon=True) for _ in range(size)]
        self._workers: set[_Worker] = set()
        self._ending = False
        self._scratch = tempfile.TemporaryDirectory(prefix="trunnion-run-")

    def start(self) -> None:
        for thread in self._threads:
            thread.start()

    def next_event(self) -> Progress | tuple[str, Outcome]:
        return self._events.get()

    def end(self) -> None:
        """End workers and kernels; returns when they are gone."""
        self._ending = True
        for worker in list(self._workers):
            worker.end()
        for thread in self._threads:
            thread.join(_PATIENCE)
        self._scratch.cleanup()

    def _work(self) -> None:
        worker: _Worker | None = None
        while not self._ending:
            try:
                job = self._jobs.get_nowait()
            except Empty:
                break
            if worker is None or not worker.alive:
                worker = _Worker(Path(self._scratch.name))
                self._workers.add(worker)
            self._one(worker, job)
        if worker is not None:
            worker.end()

    def _one(self, worker: _Worker, job: Job) -> None:
        began = time.monotonic()

        def progress(state: str, cell: int = 0, of: int = 0, note: str = "") -> None:
            self._events.put(Progress(job.label, state, cell, of, time.monotonic() - began, note))

        progress("started")
        outcome = worker.run(job, lambda event: progress("running", event["cell"], event["of"], event["note"]))
        progress("done" if outcome.done else "failed", outcome.cell or 0, outcome.of)
        self._events.put((job.label, outcome))


class _Worker:
    """One worker process."""

    def __init__(self, scratch: Path) -> None:
        self._errors = tempfile.TemporaryFile(dir=scratch)  # noqa: SIM115 - lives as long as the worker
        self._process = subprocess.Popen(
            [sys.executable, "-P", "-m", "trunnion.calculations.worker"],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=self._errors,
            env=worker_environment(scratch),
            start_new_session=True,
        )

    @property
    def alive(self) -> bool:
        return self._process.poll() is None

    def run(self, job: Job, cell: Callable[[dict[str, Any]], None]) -> Outcome:
        """Run one job to its outcome; a worker that dies is one."""
        try:
            self._process.stdin.write(job.line())  # type: ignore[union-attr]
            self._process.stdin.flush()  # type: ignore[union-attr]
        except OSError:
            return self._lost(job)
        at: dict[str, Any] = {"cell": 0, "of": 0}
        for line in self._process.stdout:  # type: ignore[union-attr]
            event = json.loads(line)
            if event["event"] == "cell":
                at = event
                cell({**at, "note": ""})
                continue
            if event["event"] == "note":
                cell({**at, "note": event["text"]})
                continue
            kept = {name: value for name, value in event.items() if name in Outcome.__dataclass_fields__}
            return Outcome(done=event["event"] == "done", **kept)
        return self._lost(job)

    def end(self) -> None:
        """Close its input, upon which it ends its kernel and itself; insist if it does not."""
        with contextlib.suppress(OSError):
            self._process.stdin.close()  # type: ignore[union-attr]
        try:
            self._process.wait(_PATIENCE)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()

    def _lost(self, job: Job) -> Outcome:
        with contextlib.suppress(subprocess.TimeoutExpired):
            self._process.wait(_PATIENCE)
        self._errors.seek(0)
        last = self._errors.read().decode("utf-8", "replace").strip().split("\n")[-1]
        code = self._process.poll()
        return Outcome(
            job.calculation, False, error=f"the worker process ended (code {code}){': ' + last if last else ''}"
        )


def worker_environment(scratch: Path) -> dict[str, str]:
    """The environment of workers and kernels: one BLAS thread, an empty IPython profile, a fixed hash seed."""
    fixed = dict.fromkeys(ONE_THREAD, "1")
    return {**os.environ, **fixed, "IPYTHONDIR": str(scratch / "ipython"), "PYTHONHASHSEED": "0"}
