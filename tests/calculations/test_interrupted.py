"""Runs that are killed: nothing half-written is taken for finished, no kernel stays, the next run ends as usual."""

from __future__ import annotations

import contextlib
import hashlib
import os
import random
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

SCRIPT = """
import sys
from pathlib import Path
from trunnion.calculations import keys
from trunnion.calculations.compute import compute
from trunnion.spec import load_workbook
import json
seen = keys.Surroundings(*json.loads(Path(sys.argv[2]).read_text()))
keys.surroundings = lambda package=None: seen
compute(load_workbook(Path(sys.argv[1])), allow_local=True, workers=2)
"""


def state_of(folder: Path) -> dict[str, str]:
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and path.name != ".lock.json.guard"
    }


def kernels_of(marker: str) -> list[int]:
    """Processes of this run that are still there, told by an entry in their environment."""
    found = []
    for entry in Path("/proc").iterdir():
        if entry.name.isdecimal():
            with contextlib.suppress(OSError):
                if marker.encode() in (entry / "environ").read_bytes():
                    found.append(int(entry.name))
    return found


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="looks into /proc")
def test_killed_at_random_moments_the_next_run_ends_as_an_undisturbed_one(
    miniature: Path, tmp_path: Path, count
) -> None:
    """SIGKILL at `count(20)` moments of a run; then the end state is that of a run nobody disturbed."""
    import json

    from trunnion.calculations import keys

    steady = tmp_path / "surroundings.json"
    seen = keys.surroundings()
    steady.write_text(json.dumps([dict(seen.code), seen.python, dict(seen.libraries)]))
    outputs = miniature.parent / "outputs"
    command = [sys.executable, "-c", SCRIPT, str(miniature), str(steady)]
    began = time.monotonic()
    subprocess.run(command, check=True)
    length = time.monotonic() - began
    undisturbed = state_of(outputs)
    moments = random.Random(20310528)
    for number in range(count(20)):
        shutil.rmtree(outputs)
        outputs.mkdir()
        marker = f"TRUNNION_TEST_RUN={os.getpid()}-{number}"
        name, _, value = marker.partition("=")
        process = subprocess.Popen(command, env={**os.environ, name: value})
        with contextlib.suppress(subprocess.TimeoutExpired):
            process.wait(moments.uniform(0.2, length * 1.1))
        process.send_signal(signal.SIGKILL)
        process.wait()
        end = time.monotonic() + 15
        while kernels_of(marker) and time.monotonic() < end:
            time.sleep(0.1)
        assert kernels_of(marker) == []
        for body in outputs.glob("miniature/A/bodies/*.ipynb"):
            relative = body.relative_to(outputs).as_posix()
            assert hashlib.sha256(body.read_bytes()).hexdigest() == undisturbed[relative]
        subprocess.run(command, check=True)
        assert state_of(outputs) == undisturbed


def test_two_processes_at_once_do_not_mix(miniature: Path) -> None:
    """The second one is told who is at work, and the first ends as usual."""
    command = [sys.executable, "-c", "from trunnion.cli.main import run; run()"]
    arguments = ["compute", str(miniature), "--allow-local-templates", "--no-pdf", "--quiet"]
    first = subprocess.Popen([*command, *arguments])
    lock = miniature.parent / "outputs" / "miniature" / "A" / "lock.json"
    end = time.monotonic() + 30
    while not lock.exists() and time.monotonic() < end:
        time.sleep(0.02)
    second = subprocess.run([*command, *arguments], capture_output=True, text=True, check=False)
    assert second.returncode == 2
    assert f"is in use by process {first.pid} of " in second.stderr
    assert first.wait(60) == 0
