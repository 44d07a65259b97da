# ruff: noqa: E402 - threads are pinned before numpy is loaded
"""Margins of a quaternion table against twelve calls of scipy's Rotation.as_euler, one core, one run.

Run: python tests/benchmarks/bench_margins.py [rows]
Figures asked for: least margins of all nine entries at least 40 x, margins of every row at least 8 x.
Threads are pinned to one before numpy is loaded. OPENBLAS_CORETYPE is printed, not changed: nothing timed here calls
BLAS (elementwise numpy on our side, compiled loops on scipy's), so the kernel it selects cannot help either side.
"""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable

for _variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_variable] = "1"

import numpy as np
import scipy
from scipy.spatial.transform import Rotation

from trunnion.attitude.margins import entry_margins_from_quaternions, least_entry_margins
from trunnion.attitude.sequences import Sequence

ASKED_LEAST, ASKED_EVERY = 40.0, 8.0


def best_of(repeats: int, task: Callable[[], object]) -> float:
    """Shortest of several timings in seconds."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        task()
        times.append(time.perf_counter() - start)
    return min(times)


def main(rows: int = 2_000_000) -> int:
    """Print the table of ratios; 0 when both figures are reached."""
    if hasattr(os, "sched_setaffinity"):
        os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
    rotations = Rotation.random(rows, random_state=20)
    q = np.roll(rotations.as_quat(), 1, axis=1)
    single = q.astype(np.float32).astype(float)  # rows off unit length by 1e-8, as float32 logs have them
    out = np.zeros((rows, 3, 3))
    baseline = best_of(2, lambda: [rotations.as_euler(sequence.name) for sequence in Sequence])
    cases = [
        ("least of nine entries over the table", lambda: least_entry_margins(q), ASKED_LEAST),
        ("nine entries of every row", lambda: entry_margins_from_quaternions(q, out=out), ASKED_EVERY),
        ("least, rows rescaled to unit length", lambda: least_entry_margins(single), None),
        ("every row, rescaled to unit length", lambda: entry_margins_from_quaternions(single, out=out), None),
    ]
    print(f"{rows} quaternions, one core; numpy {np.__version__}, scipy {scipy.__version__}")
    print(f"OPENBLAS_CORETYPE={os.environ.get('OPENBLAS_CORETYPE', 'not set')} (no BLAS call is timed)")
    print(f"baseline, 12 x Rotation.as_euler: {baseline:.3f} s")
    reached = True
    for name, task, asked in cases:
        seconds = best_of(5, task)
        ratio = baseline / seconds
        note = "" if asked is None else f"  asked {asked:g} x"
        reached &= asked is None or ratio >= asked
        print(f"{name:40s} {1e3 * seconds:8.1f} ms {rows / seconds / 1e6:7.1f} M rows/s {ratio:7.1f} x{note}")
    return 0 if reached else 1


if __name__ == "__main__":
    sys.exit(main(*(int(text) for text in sys.argv[1:])))
