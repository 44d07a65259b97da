"""Tables exact between samples, all twelve sequences, against twelve `Rotation.as_euler` calls (rows only), one run.

    python tests/benchmarks/bench_envelope_tracks.py [rows]

Wanted: at least 25 times as fast on one core. Three logs: a tumble (0.2 deg a row), a slow flight, and a nearly
motionless one, on which screening has least to hold on to.
"""

from __future__ import annotations

import sys
import warnings

import numpy as np
from scipy.spatial.transform import Rotation
from timing import timed

from trunnion.attitude.sequences import Sequence
from trunnion.envelope.margins import entry_margin_table
from trunnion.envelope.regions import Track
from trunnion.envelope.trajectories import end_angles, rows_of


def smooth_path(rows: int, step: float, wander: float, seed: int) -> np.ndarray:
    """Quaternions (rows, 4) of a path with slowly turning rate axis; steps of `step` rad."""
    t = np.arange(rows) / rows
    rng = np.random.default_rng(seed)
    angles = np.stack([np.sin(2 * np.pi * (f * t + rng.uniform())) for f in rng.uniform(1, 9, 3)], axis=1) * wander
    angles[:, 0] += step * np.arange(rows)
    return np.roll(Rotation.from_euler("ZYX", angles).as_quat(), 1, axis=1)


def twelve_as_euler(q: np.ndarray) -> None:
    """What a user would write today: angles of all twelve sequences and the least margin of each."""
    rotation = Rotation.from_quat(q[:, [1, 2, 3, 0]])
    for sequence in Sequence:
        middle = rotation.as_euler(sequence.name)[:, 1]
        (np.minimum(middle, np.pi - middle) if sequence.repeated else np.pi / 2 - np.abs(middle)).min()


def main() -> None:
    """Print the three ratios."""
    warnings.simplefilter("ignore")  # scipy warns of each locked row
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 2_000_000
    u, v = np.repeat(np.eye(3), 3, axis=1), np.tile(np.eye(3), (1, 3))
    for name, step, wander in (
        ("tumble", np.radians(0.2), 2.0),
        ("slow flight", 1e-6, 0.4),
        ("motionless", 0.0, 1e-3),
    ):
        q = smooth_path(rows, step, wander, 5)
        track = Track(np.arange(rows, dtype=float), q)
        ours = timed(lambda track=track: entry_margin_table(track), 5)
        only_least = timed(lambda q=q: end_angles(rows_of(q), u, v), 5)
        theirs = timed(lambda q=q: twelve_as_euler(q), 1)
        print(
            f"{name}: least and largest with witnesses {ours * 1e3:.0f} ms ({rows / ours / 1e6:.0f} M rows/s), "
            f"kernel {only_least * 1e3:.0f} ms, twelve as_euler {theirs * 1e3:.0f} ms, ratio {theirs / ours:.0f}"
        )


if __name__ == "__main__":
    main()
