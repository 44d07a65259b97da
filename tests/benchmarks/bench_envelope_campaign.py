"""A campaign from Parquet: two processes against one, and the peak memory of a process.

    python tests/benchmarks/bench_envelope_campaign.py [rows] [folder]

Wanted for 100,000,000 rows: two processes at least 1.6 times as fast as one, at most 1 GiB a process. The default is a
tenth of that; files are written once into a temporary folder (5 columns of doubles) and removed. Each process has one
BLAS thread, as in the program itself: two processes whose libraries each start two threads wait for one another.
"""

from __future__ import annotations

import multiprocessing
import os
import resource
import sys
import tempfile
import time
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.campaign import Chunk, Part, Plan, reduce_campaign

RUNS = 8
GROUP = 500_000
COLUMNS = ("t", "w", "x", "y", "z")


def write_runs(folder: Path, rows: int) -> list[Part]:
    """Eight files of smooth tumbling; parts of one row group each."""
    parts = []
    for run in range(RUNS):
        path = folder / f"run{run}.parquet"
        count = rows // RUNS
        with pq.ParquetWriter(path, pa.schema([(name, pa.float64()) for name in COLUMNS])) as writer:
            for order, start in enumerate(range(0, count, GROUP)):
                t = np.arange(start, min(start + GROUP, count)) * 0.01
                half = np.stack([0.011 * t + run, 0.3 * np.sin(0.007 * t), 0.4 * np.cos(0.003 * t)])
                q = np.stack([np.cos(half[0]), np.sin(half[0]), half[1], half[2]])
                writer.write_table(pa.table([t, *(q / np.linalg.norm(q, axis=0))], names=list(COLUMNS)))
                parts.append(Part(f"run{run}", order, (str(path), order)))
    return parts


def read_group(source: tuple[str, int]) -> Iterator[Chunk]:
    """One row group as one chunk."""
    path, group = source
    table = pq.ParquetFile(path).read_row_group(group, use_threads=False)
    columns = [table.column(name).to_numpy() for name in COLUMNS]
    yield columns[0], np.stack(columns[1:], axis=1)


def plan() -> Plan:
    """All nine axis pairs, so all twelve sequences."""
    frame = Frame("local", ("north", "east", "down"))
    names = ("a", "b", "c")
    distinct = [s for s in Sequence if s.name not in ("XZX", "YZY", "ZYZ")]
    return Plan.of([Convention(s.value, frame, frame, s, Sense.MOVING, names) for s in distinct])


def run_with(parts: list[Part], processes: int) -> float:
    """Seconds for the whole campaign with that many worker processes."""
    start = time.perf_counter()
    with ProcessPoolExecutor(processes, mp_context=multiprocessing.get_context("spawn")) as pool:
        campaign = reduce_campaign(parts, read_group, plan(), mapper=pool.map)
    spent = time.perf_counter() - start
    print(f"{processes} process(es): {spent:.1f} s, {campaign.rows / spent / 1e6:.1f} M rows/s")
    return spent


def main() -> None:
    """Print times, the ratio and the peak memory."""
    os.environ["OMP_NUM_THREADS"] = os.environ["OPENBLAS_NUM_THREADS"] = "1"  # as in workers that run calculations
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000_000
    with tempfile.TemporaryDirectory(dir=sys.argv[2] if len(sys.argv) > 2 else None) as folder:
        parts = write_runs(Path(folder), rows)
        print(f"{rows:,} rows in {len(parts)} row groups")
        one, two = run_with(parts, 1), run_with(parts, 2)
        print(f"two against one: {one / two:.2f}")
        peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024**2
        print(f"largest worker: {peak:.2f} GiB")


if __name__ == "__main__":
    main()
