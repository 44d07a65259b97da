"""Best zero attitude: listed attitudes by hull and exchange, regions by exchange with the closed form.

    python tests/benchmarks/bench_envelope_zero.py

Wanted: 1,000 attitudes in 50 ms, a million of a box-like set in 1 s, regions in 2 s to a gap of 0.01 deg; scattered
sets report their time. Baseline in the same run: the hull of all points.
"""

from __future__ import annotations

import time

import numpy as np
from scipy.spatial import ConvexHull
from scipy.spatial.transform import Rotation
from timing import timed

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.farthest import farthest_line
from trunnion.envelope.regions import Box
from trunnion.envelope.zero import Side, best_zero


def box_points(count: int) -> np.ndarray:
    """Carried z axes of attitudes spread over a box of heading, elevation and bank."""
    rng = np.random.default_rng(2)
    angles = rng.uniform(-1.0, 1.0, (count, 3)) * [1.6, 0.5, 0.7]
    return Rotation.from_euler("ZYX", angles).as_matrix()[:, :, 2]


def main() -> None:
    """Print times."""
    for name, points in (
        ("1,000 scattered", Rotation.random(1000, random_state=1).as_matrix()[:, :, 0]),
        ("10,000 scattered", Rotation.random(10_000, random_state=1).as_matrix()[:, :, 0]),
        ("1,000 of a box", box_points(1000)),
        ("100,000 of a box", box_points(100_000)),
        ("1,000,000 of a box", box_points(1_000_000)),
    ):
        ours = timed(lambda points=points: farthest_line(points), 3)
        line = f"{name}: {ours * 1e3:.0f} ms"
        if len(points) <= 100_000:
            whole = timed(lambda points=points: ConvexHull(np.concatenate([points, -points])), 1)
            line += f", hull of all {whole * 1e3:.0f} ms, ratio {whole / ours:.1f}"
        print(line)
    frame = Frame("local", ("north", "east", "down"))
    convention = Convention("3-2-1", frame, frame, Sequence.ZYX, Sense.MOVING, ("a", "b", "c"))
    box = Box(convention, tuple(tuple(np.radians(span)) for span in ((-180, 180), (-25, 35), (-40, 40))))
    for sequence in (Sequence.ZYX, Sequence.ZXY, Sequence.YXZ):
        one = Convention("one", frame, frame, sequence, Sense.MOVING, ("a", "b", "c"))
        for side in Side:
            start = time.perf_counter()
            choice = best_zero(box, one, side)
            print(
                f"region, {sequence.value} {side.value}: {time.perf_counter() - start:.2f} s, "
                f"gap {np.degrees(choice.gap):.2g} deg, {choice.rounds} rounds"
            )


if __name__ == "__main__":
    main()
