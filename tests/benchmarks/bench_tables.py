"""Reading 10^6 CSV rows into an attitude table, as a ratio to the plain pyarrow call on the same file.

Run: python tests/benchmarks/bench_tables.py    Target: quaternions at most 2 x the plain call.
"""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pyarrow as pa
from pyarrow import csv as arrow_csv
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.tables import read_table, statement_from_plain

ROWS = 1_000_000
REPEATS = 5
TARGET = 2.0
CONVENTION = Convention(
    "ordinary",
    Frame("local", ("north", "east", "down")),
    Frame("body", ("forward", "starboard", "down")),
    Sequence.ZYX,
    Sense.MOVING,
    ("heading", "elevation", "bank"),
)


def write_files(folder: Path) -> None:
    """One file with quaternions and one with angles, ROWS rows each, one row a hundredth of a second."""
    rng = np.random.default_rng(7)
    time_s = np.arange(ROWS) / 100.0
    turns = Rotation.from_euler("ZYX", rng.uniform(-1.0, 1.0, (ROWS, 3)))
    columns = {"t": time_s, **dict(zip(("qx", "qy", "qz", "qw"), turns.as_quat().T.round(9), strict=True))}
    arrow_csv.write_csv(pa.table(columns), folder / "quaternions.csv")
    angles = dict(zip(("h", "e", "b"), np.degrees(rng.uniform(-1.0, 1.0, (3, ROWS))).round(7), strict=True))
    arrow_csv.write_csv(pa.table({"t": time_s, **angles}), folder / "angles.csv")


def best(call: Callable[[], object]) -> float:
    """The shortest of REPEATS runs, in seconds."""
    times = []
    for _ in range(REPEATS):
        start = time.perf_counter()
        call()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> None:
    """Print both ratios."""
    common = {"between samples": "slerp"}
    clock = {"time": {"column": "t", "unit": "s"}}
    quaternions = statement_from_plain(
        {
            "table": "quaternions.csv",
            "columns": {**clock, "quaternion": ["qx", "qy", "qz", "qw"]},
            "scalar": "last",
            "maps": "body to reference",
            **common,
        }
    )
    angles = statement_from_plain(
        {"table": "angles.csv", "columns": {**clock, "angles": ["h", "e", "b"], "unit": "deg"}, **common}, CONVENTION
    )
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_files(folder)
        for statement in (quaternions, angles):
            plain = best(lambda path=folder / statement.path: arrow_csv.read_csv(path))
            ours = best(lambda statement=statement: read_table(statement, folder))
            print(
                f"{statement.path}: {ROWS} rows, plain pyarrow {plain:.3f} s, table {ours:.3f} s, "
                f"ratio {ours / plain:.2f} (target {TARGET:g} for quaternions)"
            )


if __name__ == "__main__":
    main()
