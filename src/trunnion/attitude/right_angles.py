"""The 24 rotations that carry coordinate axes onto coordinate axes (the rotation group of the cube), and 24 mirrors."""

from __future__ import annotations

from functools import cache
from itertools import permutations, product

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@cache
def _signed_permutations(handed: int) -> tuple[Array, ...]:
    found = []
    for order in permutations(range(3)):
        for signs in product((1.0, -1.0), repeat=3):
            M = np.zeros((3, 3))
            M[list(order), range(3)] = signs
            if round(float(np.linalg.det(M))) == handed:
                M.setflags(write=False)
                found.append(M)
    return tuple(sorted(found, key=lambda matrix: -float(np.trace(matrix))))


def right_angle_rotations() -> tuple[Array, ...]:
    """The 24 proper signed permutation matrices (3, 3), the identity first."""
    return _signed_permutations(1)


def right_angle_mirrors() -> tuple[Array, ...]:
    """The 24 signed permutation matrices of determinant -1: what exchanged or inverted channels look like."""
    return _signed_permutations(-1)
