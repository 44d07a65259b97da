"""Time of a whole derivation with its proofs, against sympy.simplify of a single one of its identities, in one run.

Baseline: `sympy.simplify` applied to RᵀR − I for z-y-x with cosines and sines written out, the way not taken.
"""

from __future__ import annotations

import time

import sympy

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.symbolic.derivation import derive


def _baseline() -> float:
    a, b, c = sympy.symbols("a b c", real=True)
    R = sympy.rot_ccw_axis3(a) * sympy.rot_ccw_axis2(b) * sympy.rot_ccw_axis1(c)
    start = time.perf_counter()
    assert sympy.simplify(R.T * R - sympy.eye(3)) == sympy.zeros(3, 3)
    return time.perf_counter() - start


def main() -> None:
    """Print one line a sequence and the largest ratio."""
    level = Frame("level", ("north", "east", "down"))
    body = Frame("body", ("forward", "starboard", "down"))
    plain = Convention("warm", level, body, Sequence.XYZ, Sense.MOVING, ("a", "b", "d"))
    derive(plain)  # imports and SymPy's own caches
    baseline = _baseline()
    print(f"simplify, one identity: {baseline:.2f} s")
    worst = 0.0
    for sequence in Sequence:
        convention = Convention("timed", level, body, sequence, Sense.FIXED, ("a", "b", "d"))
        start = time.perf_counter()
        count = len([step for step in derive(convention).steps if step.proof])
        elapsed = time.perf_counter() - start
        worst = max(worst, elapsed)
        print(f"{sequence.name}: {count} proved identities in {elapsed:.2f} s, {elapsed / baseline:.2f} x baseline")
    print(f"worst {worst:.2f} s; 15 s asked for")


if __name__ == "__main__":
    main()
