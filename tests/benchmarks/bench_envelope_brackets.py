"""Brackets where no closed form is known: three named cases each, time and gap.

    python tests/benchmarks/bench_envelope_brackets.py

Wanted: at most 10 s and 0.1 deg a case, or the gap printed. Baseline in the same run: the closed form of a plain box.
"""

from __future__ import annotations

import time

import numpy as np
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.axis_dispersion import AxisDispersion, TurnSide, axis_dispersed_margin
from trunnion.envelope.both_sides import best_zero_both_sides
from trunnion.envelope.constrained import Constrained, constrained_margin
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Box, Cone, Poses, Union

d = np.radians
FRAME = Frame("local", ("north", "east", "down"))


def convention(sequence: Sequence) -> Convention:
    """A plain convention."""
    return Convention(sequence.value, FRAME, FRAME, sequence, Sense.MOVING, ("a", "b", "c"))


def box(*spans: tuple[float, float]) -> Box:
    """A 3-2-1 box, ranges in degrees."""
    return Box(convention(Sequence.ZYX), tuple(tuple(d(np.array(span))) for span in spans))


def report(name: str, call, unit: float) -> None:
    """Time one call; gap in degrees; multiples of the closed form."""
    start = time.perf_counter()
    gap = call()
    spent = time.perf_counter() - start
    print(f"{name}: {spent:.2f} s, gap {np.degrees(gap):.3f} deg, {spent / unit:.0f} x a closed form")


def widths(margin) -> float:
    """The wider of the two brackets."""
    return max(margin.least.hi - margin.least.lo, margin.largest.hi - margin.largest.lo)


def main() -> None:
    """Print nine lines."""
    cruise, hover = box((-180, 180), (-20, 25), (-45, 45)), Cone([1, 0, 0], [0, 0, -1], 0.0, d(10.0))
    start = time.perf_counter()
    for _ in range(20):
        lock_margin(cruise, convention(Sequence.ZXY))
    unit = (time.perf_counter() - start) / 20
    sun = Cone([0, 1, 0], [0.3, 0.8, 0.2], d(20.0), d(60.0))
    tracker = Cone([0, 1, 1], [0, 0, 1], d(40.0), np.pi)
    for name, region in (
        ("two constraints, imaging", Constrained(Cone([0, 0, 1], [0, 0, 1], 0.0, d(15.0)), (sun,))),
        ("two constraints, star tracker", Constrained(Cone([1, 0, 0], [1, 0, 0], 0.0, d(30.0)), (tracker,))),
        ("two constraints, survey", Constrained(cruise, (Cone([1, 0, 0], [1, 1, 0], 0.0, d(40.0)),))),
    ):
        report(name, lambda region=region: widths(constrained_margin(region, convention(Sequence.YZX))), unit)
    narrow, eye = box((10, 50), (20, 40), (-10, 5)), np.eye(3)
    for name, region in (
        ("some axes, pitch in cruise", AxisDispersion(cruise, eye[1:2], d(np.array([5.0])))),
        ("some axes, pitch and yaw in hover", AxisDispersion(hover, eye[1:], d(np.array([3.0, 1.0])))),
        ("some axes, north and east", AxisDispersion(narrow, eye[:2], d(np.array([4.0, 2.0])), TurnSide.REFERENCE)),
    ):
        report(name, lambda region=region: widths(axis_dispersed_margin(region, convention(Sequence.ZXY))), unit)
    scattered = Rotation.from_rotvec(np.random.default_rng(1).normal(size=(40, 3)) * 0.6).as_matrix()
    transition = box((-180, 180), (0, 90), (0, 0))
    for name, region in (
        ("both sides, 40 poses", Poses(scattered)),
        ("both sides, tail-sitter", Union({"hover": hover, "transition": transition, "cruise": cruise})),
        ("both sides, box", box((-40, 60), (-25, 35), (-40, 40))),
    ):
        report(name, lambda region=region: best_zero_both_sides(region, convention(Sequence.ZYX)).gap, unit)


if __name__ == "__main__":
    main()
