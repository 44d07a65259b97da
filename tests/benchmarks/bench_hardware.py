"""Gimbal chains, a day of passes, and the ranking of right-angle mounts.

    python tests/benchmarks/bench_hardware.py

Wanted: joint solutions of 10^6 attitudes at most 5 x the time of scipy's `as_davenport` on the same attitudes (which
gives one solution, ours both with their clearance); keyhole map and analysis of a day of passes at most 2 s; ranking
the 24 right-angle mounts over ten regions at most 1 s.
"""

from __future__ import annotations

import numpy as np
from scipy.spatial.transform import Rotation
from timing import timed

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.margins import entry_margin_table
from trunnion.envelope.regions import Box
from trunnion.hardware.gimbals import GimbalChain, Joint, azimuth_elevation_chain
from trunnion.hardware.joint_solutions import attitude_solutions
from trunnion.hardware.keyholes import best_base_tilt, keyhole_map
from trunnion.hardware.passes import analyse_day, circular_pass
from trunnion.hardware.ranking import rank_right_angle_mounts
from trunnion.hardware.sectors import Sector, sectors_along_pass


def joint_solutions(count: int = 1_000_000) -> None:
    """Both joint solutions against scipy's one, in the same run."""
    axes = np.eye(3)[[2, 1, 0]]
    chain = GimbalChain("chain", tuple(Joint(f"a{k}", axis) for k, axis in enumerate(axes)))
    rotations = Rotation.random(count, random_state=1)
    matrices = rotations.as_matrix()
    ours = timed(lambda: attitude_solutions(chain, matrices), 3)
    theirs = timed(lambda: rotations.as_davenport(axes, "intrinsic"), 3)
    print(f"joint solutions of {count:,} attitudes: {ours:.2f} s, {ours / theirs:.2f} x scipy as_davenport (wanted 5)")


def day_of_passes(number: int = 14) -> None:
    """Keyhole map, pass analysis, base tilt and one forbidden sector over a day of passes sampled each second."""
    rng = np.random.default_rng(2)
    tracks = [
        circular_pass(780e3, elevation, heading=heading, name=f"pass {k + 1}")
        for k, (elevation, heading) in enumerate(
            zip(rng.uniform(0.2, 1.57, number), rng.uniform(0, 6.28, number), strict=True)
        )
    ]
    rates, accelerations = np.radians([6.0, 6.0]), np.radians([4.0, 4.0])
    chain = azimuth_elevation_chain(
        azimuth=(-4.7, 4.7), elevation=(-0.1, np.pi), rates=tuple(rates), accelerations=tuple(accelerations)
    )
    mast = Sector("mast", np.radians([[350, 0], [370, 0], [370, 40], [350, 40]]))
    parts = {
        "keyhole map": lambda: keyhole_map(chain, np.radians(0.55)),
        "pass analysis": lambda: analyse_day(chain, tracks),
        "base tilt": lambda: best_base_tilt(chain, tracks, largest=np.radians(30)),
        "sector": lambda: [sectors_along_pass([mast], track) for track in tracks],
    }
    times = {name: timed(part, 3) for name, part in parts.items()}
    said = ", ".join(f"{name} {seconds:.2f} s" for name, seconds in times.items())
    samples = sum(len(track.times) for track in tracks)
    print(f"day of {number} passes, {samples:,} samples: {said}; together {sum(times.values()):.2f} s (wanted 2)")


def mount_ranking(regions: int = 10) -> None:
    """Certified entry margins of ten boxes and the ranking over them."""
    local, body = Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down"))
    names = ("heading", "elevation", "bank")
    convention = Convention("ordinary", local, body, Sequence.ZYX, Sense.MOVING, names)
    rng = np.random.default_rng(3)
    low = rng.uniform(-1.2, 0.0, (regions, 3))
    boxes = [
        Box(convention, tuple((a, a + w) for a, w in zip(row, rng.uniform(0, 1.2, 3), strict=True))) for row in low
    ]

    def rank() -> None:
        tables = {f"region {k}": entry_margin_table(box).least for k, box in enumerate(boxes)}
        rank_right_angle_mounts(tables, convention, body)

    print(f"24 mounts over {regions} boxes, margins included: {timed(rank, 3):.3f} s (wanted 1)")


def main() -> None:
    """Print times and ratios."""
    joint_solutions()
    day_of_passes()
    mount_ranking()


if __name__ == "__main__":
    main()
