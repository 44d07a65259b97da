"""Kernels: the running interpreter, nothing of the user's, none left behind."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pytest

from trunnion.calculations.run import Job, run

MIME = "application/vnd.trunnion.item+json"


def notebook(*sources: str) -> dict:
    cells = [{"cell_type": "code", "id": f"c{i}", "metadata": {}, "source": s, "execution_count": None, "outputs": []}
             for i, s in enumerate(("value = None", *sources))]  # fmt: skip
    cells[0]["metadata"] = {"tags": ["parameters"]}
    spec = {"name": "kernel-of-somebody-else", "display_name": "x", "language": "python"}
    return {"nbformat": 4, "nbformat_minor": 5, "metadata": {"kernelspec": spec}, "cells": cells}


RECORD = "from trunnion import sheet\nsheet.finding('f', str(shown), against='C01')"


@pytest.fixture
def go(tmp_path: Path) -> Callable[..., tuple]:
    """Run one notebook of the given cells; returns its outcome and what it said in the finding `shown`."""

    def one(*sources: str, value: object = 1):
        template = tmp_path / "t.ipynb"
        template.write_text(json.dumps(notebook(*sources, RECORD)))
        body = tmp_path / "body.ipynb"
        job = Job("C01", template, {"value": value}, tmp_path, body, tmp_path / "t.FAILED.ipynb")
        outcome = run([job], workers=1)["C01"]
        if not outcome.done:
            return outcome, None
        cells = json.loads(body.read_text())["cells"]
        return outcome, cells[-1]["outputs"][0]["data"][MIME]["text"]

    return one


def test_the_kernel_is_the_running_interpreter_whatever_is_registered(go, tmp_path, monkeypatch) -> None:
    kernels = tmp_path / "data" / "kernels" / "python3"
    kernels.mkdir(parents=True)
    (kernels / "kernel.json").write_text(
        json.dumps({"argv": ["/nonexistent/python"], "display_name": "x", "language": "python"})
    )
    monkeypatch.setenv("JUPYTER_PATH", str(tmp_path / "data"))
    outcome, shown = go("import sys; shown = sys.executable")
    assert outcome.done, outcome.error
    assert shown == sys.executable


def test_a_users_start_up_files_play_no_part(go, tmp_path, monkeypatch) -> None:
    startup = tmp_path / "ipython" / "profile_default" / "startup"
    startup.mkdir(parents=True)
    (startup / "10.py").write_text("intruder = True")
    monkeypatch.setenv("IPYTHONDIR", str(tmp_path / "ipython"))
    assert go("shown = 'intruder' in globals()")[1] == "False"


def test_one_blas_thread_and_the_revision_folder_as_working_folder(go, tmp_path) -> None:
    cell = "import os; shown = [os.environ['OPENBLAS_NUM_THREADS'], os.environ['OMP_NUM_THREADS'], os.getcwd()]"
    assert go(cell)[1] == str(["1", "1", str(tmp_path)])


def test_parameters_arrive_as_plain_values(go) -> None:
    value = {"a": [1, 2.5, "x'y\"z", None, True], "long": ["some text that fills a line"] * 8, "umlaut": "äöü → °"}
    assert go("shown = value", value=value)[1] == str(value)


def test_the_error_of_a_library_call_is_quoted_without_its_class_path(go, tmp_path) -> None:
    outcome, _ = go("from trunnion import sheet", "sheet.input_path('../secret')")
    assert not outcome.done
    assert (outcome.cell, outcome.source) == (3, "sheet.input_path('../secret')")
    assert "is not the name of an input file" in outcome.error
    assert Path(outcome.kept).name == "t.FAILED.ipynb"


SCRIPT = """
import sys
from pathlib import Path
from trunnion.calculations.run import Job, run
here = Path(sys.argv[1])
template = here / "slow.ipynb"
jobs = [Job(f"C{i}", template, {"value": i}, here, here / f"{i}.ipynb", here / f"{i}.F.ipynb") for i in (1, 2)]
run(jobs, workers=2)
"""


@pytest.fixture
def slow(tmp_path: Path) -> Path:
    cell = "import os, pathlib, time\npathlib.Path(f'pid-{value}').write_text(str(os.getpid()))\ntime.sleep(60)"
    (tmp_path / "slow.ipynb").write_text(json.dumps(notebook(cell)))
    return tmp_path


def _gone(pid: int, patience: float = 10.0) -> bool:
    """Whether a process ends; a zombie nobody has collected yet counts as ended."""
    end = time.monotonic() + patience
    while time.monotonic() < end:
        try:
            os.kill(pid, 0)
            if (
                Path(f"/proc/{pid}/stat").exists()
                and Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] == "Z"
            ):
                return True
        except (ProcessLookupError, FileNotFoundError):
            return True
        time.sleep(0.05)
    return False


@pytest.mark.skipif(os.name == "nt", reason="signals of Unix")
@pytest.mark.parametrize("sent", [signal.SIGINT, signal.SIGTERM, signal.SIGKILL])
def test_no_kernel_outlives_the_run_however_it_ends(slow: Path, sent: int) -> None:
    process = subprocess.Popen([sys.executable, "-c", SCRIPT, str(slow)], stderr=subprocess.DEVNULL)
    pids = []
    end = time.monotonic() + 60
    while len(pids) < 2 and time.monotonic() < end:
        pids = [int(p.read_text()) for p in slow.glob("pid-*") if p.read_text()]
        time.sleep(0.05)
    assert len(pids) == 2
    process.send_signal(sent)
    process.wait(20)
    assert all(_gone(pid) for pid in pids)
    assert not list(slow.glob("[12].ipynb"))


def test_a_home_that_cannot_be_written_changes_no_body(go, tmp_path, monkeypatch) -> None:
    """Kernels need no home: sockets, profile and matplotlib's cache lie elsewhere, and leave no trace in the body."""
    cell = (
        "from trunnion.figures import charts\n"
        "svg = charts.varied_value([0, 1], {'a': ([0, 1], [0, 1])}, x_label='x', y_label='y')\n"
        "shown = len(svg)"
    )
    assert go(cell)[0].done
    first = (tmp_path / "body.ipynb").read_bytes()
    monkeypatch.setenv("HOME", "/proc/none")
    monkeypatch.delenv("XDG_CACHE_HOME", raising=False)
    monkeypatch.delenv("XDG_CONFIG_HOME", raising=False)
    outcome, _ = go(cell)
    assert outcome.done, outcome.error
    assert (tmp_path / "body.ipynb").read_bytes() == first


def test_an_error_is_told_fit_for_people(go, tmp_path) -> None:
    """No control characters, no path of the machine, no more than a screen; the notebook keeps all of it."""
    outcome, _ = go(f"raise ValueError('\x1b[31mred {tmp_path}/inputs/log.ulg ' + 'x' * 5000)")
    assert not outcome.done
    assert "\x1b" not in outcome.error + outcome.source
    assert str(tmp_path) not in outcome.error
    assert "inputs/log.ulg" in outcome.error
    assert len(outcome.error) < 1300
    assert "x" * 5000 in (tmp_path / "t.FAILED.ipynb").read_text()
