"""Reading a spec back: wall time of a fresh process, beside one that only imports numpy and pydantic (same run)."""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from pathlib import Path

EXAMPLE = Path(__file__).parents[2] / "workbooks" / "sedgewing"
ROUNDS = 7
BASELINE = "import numpy, pydantic, yaml; class_ = type('M', (pydantic.BaseModel,), {'__annotations__': {'a': int}})"
READBACK = (
    "from trunnion.spec import load_workbook; from trunnion.spec.readback import read_back;"
    f"read_back(load_workbook({str(EXAMPLE)!r}))"
)


def seconds(code: str) -> float:
    """Wall time of a fresh interpreter running `code`."""
    start = time.perf_counter()
    subprocess.run([sys.executable, "-c", code], check=True)
    return time.perf_counter() - start


def main() -> None:
    """Print both medians, taken in turn, and their ratio. Aim: the example is read back within one second."""
    pairs = [(seconds(BASELINE), seconds(READBACK)) for _ in range(ROUNDS)]
    base, ours = (statistics.median(column) for column in zip(*pairs, strict=True))
    print(f"imports alone {base:.3f} s, readback {ours:.3f} s, ratio {ours / base:.2f} (median of {ROUNDS})")


if __name__ == "__main__":
    main()
