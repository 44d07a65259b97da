"""What the benchmarks share: the clock."""

import math
import time


def timed(function, repeats: int) -> float:
    """Best of some runs, in seconds."""
    best = math.inf
    for _ in range(repeats):
        start = time.perf_counter()
        function()
        best = min(best, time.perf_counter() - start)
    return best
