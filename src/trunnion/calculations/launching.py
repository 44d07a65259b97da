"""Papermill as Trunnion drives it: the running interpreter as kernel, progress, no saves between cells.

Only workers import this module. Two optional imports of papermill's dependencies are kept out: `rfc3987_syntax`
compiles a grammar for about a second when jupyter is installed (it checks a schema format notebooks do not use), and
`black`, where present, would format the injected cell, so that bodies would depend on what else is installed.
"""

from __future__ import annotations

import contextlib
import os
import pprint
import shutil
import signal
import sys
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]
sys.modules.setdefault("black", None)  # type: ignore[arg-type]

import papermill  # noqa: E402 - after the two lines above, for the reasons given there
from jupyter_client.kernelspec import KernelSpec  # noqa: E402
from jupyter_client.manager import AsyncKernelManager  # noqa: E402
from papermill.engines import NBClientEngine, NotebookExecutionManager, papermill_engines  # noqa: E402
from papermill.translators import PythonTranslator, papermill_translators  # noqa: E402

ENGINE = "trunnion"
KERNEL = "python3"
LONGEST_SOCKET_PATH = 90  # Unix socket paths end at about 104 bytes; jupyter appends up to 9

CellStarted = Callable[[int, int], None]


class Evidence:
    """What is at hand while a notebook runs: the notebook so far, the cell it is in, and its kernel."""

    def __init__(self, started: CellStarted) -> None:
        self.started = started
        self.sockets: Path | None = None
        self.notebook: Any = None
        self.cell: int | None = None  # none yet: the kernel has not started
        self.manager: AsyncKernelManager | None = None

    def kill_kernel(self) -> None:
        """End the kernel and what it started, at once, and remove the sockets."""
        provisioner = getattr(self.manager, "provisioner", None)
        pid = getattr(provisioner, "pid", None)
        if pid is None:
            return
        with contextlib.suppress(OSError):
            if hasattr(os, "killpg"):
                os.killpg(pid, signal.SIGKILL)
            else:
                os.kill(pid, signal.SIGTERM)
        if self.sockets is not None:
            shutil.rmtree(self.sockets, ignore_errors=True)


class OwnInterpreter(AsyncKernelManager):
    """Starts the kernel from the interpreter that runs Trunnion, whatever kernels are registered for the user."""

    @property
    def kernel_spec(self) -> KernelSpec:
        """The kernel specification; no registered one is looked up."""
        argv = [sys.executable, "-P", "-m", "trunnion.calculations.kernel", "-f", "{connection_file}"]
        return KernelSpec(argv=argv, name=KERNEL, display_name="Python 3 (ipykernel)", language="python")


class _Progress(NotebookExecutionManager):
    """Papermill's bookkeeping without its saves (it writes the whole notebook twice a cell)."""

    evidence: Evidence

    def save(self, **kwargs: Any) -> None:
        """Nothing is written before the notebook is finished and checked."""

    def autosave_cell(self) -> None:
        """Nothing is written before the notebook is finished and checked."""

    def cell_start(self, cell: Any, cell_index: int | None = None, **kwargs: Any) -> None:
        """Tell where the run is."""
        self.evidence.cell = cell_index or 0
        self.evidence.started(cell_index or 0, len(self.nb.cells))
        super().cell_start(cell, cell_index, **kwargs)


class _Engine(NBClientEngine):
    """Papermill's own engine with the progress above and the running interpreter as kernel."""

    @classmethod
    def execute_notebook(cls, nb: Any, kernel_name: str, evidence: Evidence, **kwargs: Any) -> Any:
        """Run all cells; the notebook stays within reach of `evidence` whatever happens."""
        evidence.notebook = nb
        book = _Progress(nb, progress_bar=False)
        book.evidence = evidence
        book.notebook_start()

        class Manager(OwnInterpreter):
            def __init__(self, **options: Any) -> None:
                super().__init__(**options)
                _talk_through(self, evidence.sockets)
                evidence.manager = self

        for unused in ("output_path", "progress_bar", "log_output", "autosave_cell_every"):
            kwargs.pop(unused, None)
        cls.execute_managed_notebook(book, kernel_name, kernel_manager_class=Manager, **kwargs)
        book.notebook_complete()
        return book.nb


class _PlainPython(PythonTranslator):
    """The injected cell, laid out so that a person can read it; the same on every machine."""

    @classmethod
    def codify(cls, parameters: Mapping[str, Any], comment: str = "Parameters") -> str:
        """One assignment a parameter, as Python literals."""
        lines = [f"# {comment}"]
        lines += [f"{name} = {_literal(value, len(name) + 3)}" for name, value in parameters.items()]
        return "\n".join(lines) + "\n"


papermill_engines.register(ENGINE, _Engine)
papermill_translators.register("python", _PlainPython)


def execute(notebook: Any, parameters: Mapping[str, Any], folder: Path, evidence: Evidence) -> Any:
    """Fill and run a notebook node in `folder` in a fresh kernel; returns it with outputs.

    Raises papermill's and nbclient's own errors; `evidence` keeps the notebook as far as it came.
    """
    with tempfile.TemporaryDirectory(prefix="trunnion-") as sockets:
        evidence.sockets = Path(sockets)
        return papermill.execute_notebook(
            notebook,
            None,
            parameters=dict(parameters),
            engine_name=ENGINE,
            kernel_name=KERNEL,
            language="python",
            progress_bar=False,
            cwd=folder,
            start_timeout=120,
            evidence=evidence,
            shutdown_kernel="immediate",
        )


def _talk_through(manager: AsyncKernelManager, folder: Path | None) -> None:
    """Where kernel and worker talk: sockets in a folder of our own, or TCP where such sockets can't be."""
    if folder is None:
        return
    manager.connection_file = str(folder / "k.json")
    if sys.platform != "win32" and len(str(folder)) < LONGEST_SOCKET_PATH:
        manager.transport = "ipc"


def _literal(value: Any, column: int) -> str:
    text = repr(value)
    if column + len(text) <= 100:
        return text
    laid_out = pprint.pformat(value, width=96, sort_dicts=False)
    return laid_out.replace("\n", "\n" + " " * column) if "\n" in laid_out else laid_out
