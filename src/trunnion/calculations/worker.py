"""A worker process: runs one calculation after another, in a kernel each, for the process that started it.

It reads one job a line (JSON) from its input and writes one event a line: `cell`, then `done` or `failed`. When its
input ends (the parent is gone, or wants it gone) it ends its kernel and itself, whatever it is doing. A finished
notebook appears under its final name only after it was checked against the notebook schema.
"""

from __future__ import annotations

import json
import os
import shutil
import sys
import tempfile
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from queue import SimpleQueue
from typing import IO, Any

from trunnion.calculations.digest import content_digest, normalised, sha256
from trunnion.calculations.notebooks import canonical_bytes
from trunnion.calculations.writes import write_bytes
from trunnion.errors import TrunnionError
from trunnion.sheet.items import MIME
from trunnion.sheet.parameters import INPUTS_VARIABLE
from trunnion.sheet.sharing import PROGRESS_VARIABLE

_QUOTED_LINES = 12
_LONGEST_ERROR = 1200  # characters: a screen
_LOOK_EVERY = 0.5  # seconds between two looks at how far a cell is
_MARKER = "papermill-error-cell-tag"  # cells papermill adds to a notebook that failed
_current: Any = None  # the evidence of the running notebook, for the thread that watches the input


def main() -> None:
    """Serve jobs until the input ends."""
    events = os.fdopen(os.dup(1), "w", encoding="utf-8", buffering=1)
    os.dup2(2, 1)  # whatever else prints must not disturb the events
    jobs: SimpleQueue[dict[str, Any]] = SimpleQueue()
    threading.Thread(target=_watch_input, args=(sys.stdin.buffer, jobs), daemon=True).start()
    while True:
        _serve(jobs.get(), events)


def _watch_input(stream: IO[bytes], jobs: SimpleQueue[dict[str, Any]]) -> None:
    for line in stream:
        jobs.put(json.loads(line))
    if _current is not None:
        _current.kill_kernel()
    shutil.rmtree(_scratch(), ignore_errors=True)
    os._exit(0)


def _scratch() -> Path:
    """The scratch folder of the run, removed when it ends, however it ends."""
    return Path(os.environ["IPYTHONDIR"]).parent


def _serve(job: dict[str, Any], events: IO[str]) -> None:
    def tell(event: str, **fields: Any) -> None:
        events.write(json.dumps({"event": event, "calculation": job["calculation"], **fields}) + "\n")

    try:
        with _followed(lambda text: tell("note", text=text)):
            fields = _run(job, lambda cell, of: tell("cell", cell=cell, of=of))
        tell("done", **fields)
    except Exception as err:
        tell("failed", **_failure(job, err))


@contextmanager
def _followed(tell: Callable[[str], None]) -> Iterator[None]:
    """Pass on what a long cell tells of its progress; it stays out of the notebook."""
    with tempfile.TemporaryDirectory(prefix="progress-", dir=_scratch()) as folder:
        path, ended = Path(folder) / "told", threading.Event()

        def follow() -> None:
            last = ""
            while not ended.wait(_LOOK_EVERY):
                text = path.read_text(encoding="utf-8") if path.exists() else ""
                if text and text != last:
                    tell(text)
                    last = text

        thread = threading.Thread(target=follow, daemon=True)
        os.environ[PROGRESS_VARIABLE] = str(path)
        thread.start()
        try:
            yield
        finally:
            ended.set()
            thread.join()
            del os.environ[PROGRESS_VARIABLE]


def _run(job: dict[str, Any], started: Any) -> dict[str, Any]:
    """Run one job to its stored body; returns digest and checksum."""
    global _current
    import nbformat

    from trunnion.calculations import launching

    _current = launching.Evidence(started)
    node = _prepared(nbformat.read(job["template"], as_version=4))
    with _inputs_elsewhere(job["not_held"]):
        executed = launching.execute(node, job["parameters"], Path(job["folder"]), _current)
    body = normalised(_plain(executed), job["calculation"])
    nbformat.validate(nbformat.from_dict(body))
    _require_records(body)
    content = canonical_bytes(body)
    write_bytes(Path(job["body"]), content)
    return {"digest": content_digest(body), "sha256": sha256(content)}


@contextmanager
def _inputs_elsewhere(files: dict[str, str]) -> Iterator[None]:
    """Make inputs that are not copied readable by name, for this run only."""
    os.environ.pop(INPUTS_VARIABLE, None)
    if not files:
        yield
        return
    with tempfile.TemporaryDirectory(prefix="inputs-", dir=_scratch()) as folder:
        for name, origin in files.items():
            try:
                os.symlink(origin, Path(folder) / name)
            except OSError:  # no links here: a copy for the time of the run
                shutil.copyfile(origin, Path(folder) / name)
        os.environ[INPUTS_VARIABLE] = folder
        yield
    os.environ.pop(INPUTS_VARIABLE, None)


def _prepared(node: Any) -> Any:
    """A template ready to run: format 4.5, every cell with a lasting id, the kernel named."""
    node.nbformat_minor = max(5, node.nbformat_minor)
    for index, cell in enumerate(node.cells):
        cell.setdefault("id", f"cell-{index}")
    node.metadata["kernelspec"] = {
        "name": "python3",
        "display_name": "Python 3 (ipykernel)",
        "language": "python",
    }
    return node


def _plain(node: Any) -> dict[str, Any]:
    return json.loads(json.dumps(node, allow_nan=False))


def _require_records(body: dict[str, Any]) -> None:
    """An executed calculation records something; a notebook that shows nothing is no evidence."""
    for cell in body["cells"]:
        if any(MIME in output.get("data", {}) for output in cell.get("outputs", [])):
            return
    raise TrunnionError("the notebook ran and recorded nothing", remedy="end it with sheet.record(…)")


def _failure(job: dict[str, Any], err: Exception) -> dict[str, Any]:
    """Keep the notebook as far as it came, under a name that says so, and tell cell and error."""
    evidence = _current
    notebook = getattr(evidence, "notebook", None)
    cell = getattr(err, "cell_index", None)
    number = evidence.cell if cell is None and evidence is not None else cell
    fields: dict[str, Any] = {
        "error": _for_people(_error_text(err), job["folder"]),
        "cell": number,
        "source": "",
        "kept": None,
    }
    if notebook is None:
        return fields
    notebook.cells = [cell for cell in notebook.cells if _MARKER not in cell.metadata.get("tags", [])]
    fields["of"] = len(notebook.cells)
    if number is not None and number < len(notebook.cells):
        fields["source"] = _for_people(_quoted(notebook.cells[number].source), job["folder"])
    try:
        write_bytes(Path(job["failed"]), canonical_bytes(normalised(_plain(notebook), job["calculation"])))
        fields["kept"] = job["failed"]
    except (TrunnionError, ValueError) as second:
        fields["error"] += f" (and the failed notebook could not be kept: {second})"
    return fields


def _for_people(text: str, folder: str) -> str:
    """An error or a cell for screen and package: no control characters, files named from the folder, one screen."""
    text = text.replace(f"{folder}{os.sep}", "")
    text = "".join(sign for sign in text if sign in "\n\t" or sign.isprintable())
    return text if len(text) <= _LONGEST_ERROR else f"{text[:_LONGEST_ERROR]} … ({len(text)} characters)"


def _error_text(err: Exception) -> str:
    name = getattr(err, "ename", type(err).__name__)
    if type(err).__name__ == "DeadKernelError":
        return "the kernel died (killed, out of memory, or a crash in compiled code)"
    value = str(getattr(err, "evalue", err)).strip()
    if isinstance(err, TrunnionError):
        return value
    return f"{name}: {value}" if value else str(name)


def _quoted(source: str) -> str:
    lines = source.rstrip().split("\n")
    return "\n".join(lines[:_QUOTED_LINES] + (["…"] if len(lines) > _QUOTED_LINES else []))


if __name__ == "__main__":
    main()
