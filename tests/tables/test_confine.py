"""A reader that crashes, loops, sleeps, allocates or answers nonsense costs its limit and one message."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest

from trunnion.errors import TableError
from trunnion.tables.confine import Limits, read_confined

READER = """
import os, time
import numpy as np

def fine(path, options):
    return {"a": np.arange(options["n"])}, {"words": "well"}

def crash(path, options):
    os.abort()

def loop(path, options):
    while True:
        pass

def sleep(path, options):
    time.sleep(60)

def allocate(path, options):
    held = []
    while True:
        held.append(np.ones(1 << 22))

def quit_early(path, options):
    os._exit(7)

def objects(path, options):
    return {"a": np.array([{"evil": 1}], dtype=object)}, {}

def nest(path, options):
    return nest(path, options)

def fail(path, options):
    raise KeyError("no such message")

def fill_disk(path, options):
    with open("big", "wb") as handle:
        while True:
            handle.write(bytes(1 << 24))

def chatter(path, options):
    print("nonsense", flush=True)
    return {}, {}
"""


@pytest.fixture
def call(tmp_path, monkeypatch):
    """Run one of the hostile readers under small limits."""
    (tmp_path / "hostile_reader.py").write_text(READER)
    monkeypatch.setenv("PYTHONPATH", str(tmp_path))
    victim = tmp_path / "victim.bin"
    victim.write_bytes(b"x")

    def run(name, options=None, *, wall=20.0, cpu=20.0, space=512 << 20):
        limits = Limits(address_space=space, cpu_seconds=cpu, wall_seconds=wall)
        return read_confined(f"hostile_reader:{name}", victim, options, limits)

    return run


def test_arrays_and_meta_come_back(call):
    returned = call("fine", {"n": 5})
    np.testing.assert_array_equal(returned.arrays["a"], np.arange(5))
    assert returned.meta == {"words": "well"}
    assert call("chatter").arrays == {}


@pytest.mark.parametrize(
    ("name", "limits", "words"),
    [
        ("crash", {}, r"the reader crashed \(SIGABRT\)"),
        ("loop", {"cpu": 1}, "more than 1 s of processor time"),
        ("sleep", {"wall": 1.5}, "more than 1.5 s of wall time"),
        ("allocate", {}, "more than 512 MiB of address space"),
        ("quit_early", {}, "exit code 7"),
        ("objects", {}, "objects instead of numbers"),
        ("nest", {}, "nests its own definitions without end"),
        ("fail", {}, "the reader refuses the file: KeyError"),
        ("fill_disk", {"space": 256 << 20}, "refuses|crashed"),
    ],
)
def test_each_limit_ends_in_one_message_that_names_the_file(call, name, limits, words):
    with pytest.raises(TableError, match=words) as caught:
        call(name, **limits)
    assert "victim.bin" in str(caught.value)
    assert len(caught.value.faults) == 1


def test_a_file_beside_the_data_never_runs(call, tmp_path, monkeypatch):
    """A numpy.py in the working folder must not shadow the library in the child."""
    trap = tmp_path / "work"
    trap.mkdir()
    (trap / "numpy.py").write_text("raise SystemExit('ran a file of the data folder')")
    monkeypatch.chdir(trap)
    assert call("fine", {"n": 2}).meta == {"words": "well"}


def test_importing_the_room_loads_no_heavy_library():
    """Commands that read no table must not pay for the libraries that do."""
    program = "import sys, trunnion.tables; print([name for name in sys.modules if '.' not in name])"
    loaded = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout
    for library in ("pyarrow", "scipy", "sympy", "pyulog", "rosbags", "mcap", "h5py", "pandas", "matplotlib"):
        assert f"'{library}'" not in loaded
