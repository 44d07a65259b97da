"""Boxes: least and largest margin of all nine axis pairs; one box, many at once, and the subdivision for comparison.

    python tests/benchmarks/bench_envelope_box.py

Wanted: at most 10 ms a box, at least 1,000 boxes a second in a batch. The baseline in the same run is one matrix from
scipy's Rotation per attitude of a grid of 41 x 41 x 41, which proves nothing and costs this much.
"""

from __future__ import annotations

import numpy as np
from scipy.spatial.transform import Rotation
from timing import timed

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.box import box_angle_range
from trunnion.envelope.margins import entry_margin_table
from trunnion.envelope.regions import Box
from trunnion.envelope.subdivision import self_check

RANGES = tuple(tuple(np.radians(span)) for span in ((-180.0, 180.0), (-25.0, 35.0), (-40.0, 40.0)))


def batch_rate(boxes: int = 500) -> float:
    """Boxes a second, all nine pairs, random ranges."""
    rng = np.random.default_rng(1)
    low = rng.uniform(-np.pi, np.pi, (3, boxes))
    high = low + rng.uniform(0.0, 3.5, (3, boxes))
    u = np.tile(np.repeat(np.eye(3), 3, axis=1), (1, boxes))
    v = np.tile(np.tile(np.eye(3), (1, 3)), (1, boxes))
    low, high = np.repeat(low, 9, axis=1), np.repeat(high, 9, axis=1)
    axes = np.eye(3)[[2, 1, 0]]
    return boxes / timed(lambda: box_angle_range(axes, low, high, u, v), 5)


def grid_margins() -> None:
    """The grid a user would sweep instead."""
    points = np.stack(np.meshgrid(*(np.linspace(*span, 41) for span in RANGES)), axis=-1).reshape(-1, 3)
    np.abs(Rotation.from_euler("ZYX", points).as_matrix()).max(axis=0)


def main() -> None:
    """Print times and ratios."""
    frame = Frame("local", ("north", "east", "down"))
    names = ("heading", "elevation", "bank")
    convention = Convention("3-2-1", frame, frame, Sequence.ZYX, Sense.MOVING, names)
    other = Convention("1-3-2", frame, frame, Sequence.XZY, Sense.MOVING, names)
    box = Box(convention, RANGES)
    one = timed(lambda: entry_margin_table(box), 20)
    print(f"one box, nine pairs, least and largest with witnesses: {one * 1e3:.1f} ms")
    print(f"in a batch: {batch_rate():.0f} boxes/s, nine pairs each")
    print(f"41-cubed grid by scipy, no proof: {timed(grid_margins, 5) / one:.1f} x the time of the closed form")
    check = timed(lambda: self_check(box, other, tolerance=np.radians(1e-3)), 3)
    print(f"subdivision to 0.001 deg, one pair: {check * 1e3:.0f} ms")


if __name__ == "__main__":
    main()
