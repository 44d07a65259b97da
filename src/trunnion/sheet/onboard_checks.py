"""Checks of the project's own extraction near lock: scipy rebuilds the matrix from the angles at every margin."""

from __future__ import annotations

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.sheet import display, independent

MARGINS_DEG = (10.0, 1e-2, 1e-5, 1e-8, 0.0)
TOLERANCE_DEG = 1e-12
_COUNT = 200
_SEED = 17


def show_checks(convention: Convention) -> None:
    """Angles taken by residual form from double-precision matrices, made into rotations again by scipy."""
    from scipy.spatial.transform import Rotation

    generator = np.random.default_rng(_SEED)
    lock = 0.0 if convention.sequence.repeated else np.pi / 2
    for margin in MARGINS_DEG:
        outer = generator.uniform(-np.pi, np.pi, size=(_COUNT, 2))
        middle = np.full(_COUNT, abs(lock - np.radians(margin)))
        stated = convention.stated_from_chain(np.column_stack([outer[:, 0], middle, outer[:, 1]]))
        truth = independent.rotation(convention, np.degrees(stated))
        found = np.asarray(convention.angles(truth.as_matrix()).angles)
        again = independent.rotation(convention, np.degrees(found))
        apart = np.degrees((Rotation.from_matrix(truth.as_matrix()).inv() * again).magnitude().max())
        display.check(
            f"check:rebuilt:{margin:g}",
            f"{_COUNT} attitudes {margin:g}° from lock, rebuilt from their angles",
            ours=0.0,
            theirs=float(apart),
            tolerance=TOLERANCE_DEG,
            unit="deg",
            library=independent.LIBRARY,
        )
