"""What people wait for: a run again, a moved limit, a turned mount, eight cold notebooks, and memory.

Baselines in the same run: Python's own start for the short commands; `papermill.execute_notebook`, one notebook after
another in its default setting, for the eight. Run: python tests/benchmarks/bench_compute.py [quick]
"""

from __future__ import annotations

import shutil
import statistics
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable
from pathlib import Path

REPOSITORY = Path(__file__).parents[2]
SEDGEWING = REPOSITORY / "workbooks" / "sedgewing"
PROGRAM = [sys.executable, "-c", "from trunnion.cli.main import run; run()"]

RUN_AGAIN_S = 1.0  # beyond Python's start
LIMIT_MOVED_S = 2.0
EIGHT_RATIO = 0.70
MEMORY_GIB = 2.0


def elapsed(action: Callable[[], object]) -> float:
    """Wall time of an action (s)."""
    began = time.perf_counter()
    action()
    return time.perf_counter() - began


def command(*arguments: str) -> subprocess.CompletedProcess[str]:
    """Run a trunnion command as a program of its own."""
    return subprocess.run([*PROGRAM, *arguments], capture_output=True, text=True, check=False)


def python_start() -> float:
    """Start and end of a bare interpreter (s), the least of five."""
    return min(elapsed(lambda: subprocess.run([sys.executable, "-c", ""], check=True)) for _ in range(5))


def edited(workbook: Path, old: str, new: str) -> None:
    """Replace a text of the spec."""
    spec = workbook / "workbook.yaml"
    text = spec.read_text(encoding="utf-8")
    assert old in text, old
    spec.write_text(text.replace(old, new), encoding="utf-8")


def short_commands(workbook: Path) -> list[str]:
    """Help, read-back, a run with nothing changed, a moved limit, a turned mount."""
    start = python_start()
    lines = [f"Python start {start:.2f} s"]
    helped = min(elapsed(lambda: command("--help")) for _ in range(5))
    lines.append(f"--help {helped:.2f} s (asked 0.3)")
    said = min(elapsed(lambda: command("readback", str(workbook))) for _ in range(3))
    lines.append(f"readback {said:.2f} s (asked 1)")
    again = min(elapsed(lambda: command("compute", str(workbook), "--quiet")) for _ in range(3))
    lines.append(f"nothing changed: {again - start:.2f} s beyond Python's start (asked {RUN_AGAIN_S})")
    edited(workbook, "at least: 60 deg", "at least: 70 deg")
    arguments = ("compute", str(workbook), "--quiet", "--no-pdf")
    lines.append(f"limit moved, results and HTML: {elapsed(lambda: command(*arguments)):.2f} s (asked {LIMIT_MOVED_S})")
    edited(workbook, "axes: {x: up, y: starboard, z: forward}", "axes: {x: up, y: port, z: aft}")
    done = command("compute", str(workbook), "--no-pdf")
    ran = sorted({line.split()[0] for line in done.stderr.splitlines() if " done after " in line})
    lines.append(f"mount turned: ran {', '.join(ran)} (asked C03 only)")
    return lines


def eight_jobs(folder: Path) -> list:
    """Eight jobs from the example's calculations."""
    from trunnion.calculations.plan import plan
    from trunnion.calculations.run import Job
    from trunnion.spec import load_workbook

    planned = plan(load_workbook(SEDGEWING))
    (folder / "inputs").mkdir(exist_ok=True)
    jobs = []
    for index in range(8):
        entry = planned[index % len(planned)]
        for file in entry.inputs.values():
            (folder / "inputs" / file.held).write_bytes(file.content or b"")
        name = f"{index}-{entry.id}"
        body, failed = folder / f"{name}.ipynb", folder / f"{name}.FAILED.ipynb"
        jobs.append(Job(name, entry.template.path, entry.parameters, folder, body, failed))
    return jobs


def plain_papermill(jobs: list) -> None:
    """The baseline: papermill as it comes, one after another."""
    script = (
        "import json, sys, papermill\n"
        "for template, output, parameters, folder in json.load(sys.stdin):\n"
        "    papermill.execute_notebook(template, output, parameters, cwd=folder, progress_bar=False,"
        " kernel_name='python3')\n"
    )
    import json

    rows = [[str(j.template), str(j.body), dict(j.parameters), str(j.folder)] for j in jobs]
    subprocess.run([sys.executable, "-c", script], input=json.dumps(rows), text=True, check=True, capture_output=True)


def ours(folder: Path) -> float:
    """Eight notebooks in two worker processes (s)."""
    from trunnion.calculations.run import run

    jobs = eight_jobs(folder)
    began = time.perf_counter()
    outcomes = run(jobs, workers=2)
    took = time.perf_counter() - began
    assert all(outcome.done for outcome in outcomes.values()), outcomes
    return took


def theirs(folder: Path) -> float:
    """Eight notebooks by papermill as it comes (s)."""
    jobs = eight_jobs(folder)
    return elapsed(lambda: plain_papermill(jobs))


def eight_notebooks(rounds: int) -> str:
    """Two workers against plain papermill, interleaved; medians."""
    times: dict[str, list[float]] = {"ours": [], "theirs": []}
    for _ in range(rounds):
        for name, measure in (("theirs", theirs), ("ours", ours)):
            with tempfile.TemporaryDirectory() as folder:
                times[name].append(measure(Path(folder)))
    mine, plain = statistics.median(times["ours"]), statistics.median(times["theirs"])
    return (
        f"eight notebooks: two workers {mine:.1f} s, plain papermill {plain:.1f} s, "
        f"ratio {mine / plain:.2f} (asked {EIGHT_RATIO}, aim 0.55)"
    )


def full_run_memory(workbook: Path) -> str:
    """The most memory program, workers and kernels hold together in a full run (resident, summed)."""
    import psutil

    process = subprocess.Popen([*PROGRAM, "compute", str(workbook), "--quiet"], stdout=subprocess.DEVNULL)
    most = 0
    done = threading.Event()
    while process.poll() is None:
        try:
            tree = [psutil.Process(process.pid), *psutil.Process(process.pid).children(recursive=True)]
            most = max(most, sum(member.memory_info().rss for member in tree))
        except psutil.Error:
            pass
        done.wait(0.05)
    return f"memory of a full run: {most / 2**30:.2f} GiB (asked {MEMORY_GIB})"


def main() -> None:
    """Measure and print."""
    quick = "quick" in sys.argv[1:]
    with tempfile.TemporaryDirectory() as scratch:
        (Path(scratch) / "outputs").mkdir()
        workbook = Path(shutil.copytree(SEDGEWING, Path(scratch) / "sedgewing"))
        print(full_run_memory(workbook))
        print("\n".join(short_commands(workbook)))
    print(eight_notebooks(1 if quick else 3))


if __name__ == "__main__":
    main()
