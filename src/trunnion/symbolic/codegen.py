"""Source of a convention for other programs: C99, header only, float and double; Python without numpy.

Written from the expressions of the derivation, singular branch and residual form included. Each comes with a
self-test that runs reference attitudes: rows (stated angles rad, stated matrix, quaternion of the stated matrix,
scalar first).
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import singular_attitudes, worked_angles
from trunnion.errors import AttitudeError
from trunnion.symbolic.codegen_c import header, self_test
from trunnion.symbolic.codegen_python import module
from trunnion.symbolic.derivation import derive
from trunnion.symbolic.emission import stem_of

Row = tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]


def codegen(convention: Convention, rows: Iterable[tuple[ArrayLike, ArrayLike, ArrayLike]] = ()) -> dict[str, str]:
    """Sources by file name: `<name>.h`, `<name>_selftest.c`, `<name>.py`; pure ASCII.

    `rows` are the reference attitudes of the self-tests; without any, the worked triple of the convention and one
    attitude at each singular value are used. Raises AttitudeError for rows of the wrong shape.
    """
    checked = [_row(number, *row) for number, row in enumerate(rows, start=1)] or _own_rows(convention)
    derivation = derive(convention)
    stem = stem_of(convention.name)
    return {
        f"{stem}.h": header(derivation, stem),
        f"{stem}_selftest.c": self_test(derivation, stem, checked),
        f"{stem}.py": module(derivation, stem, checked),
    }


def _row(number: int, angles: ArrayLike, matrix: ArrayLike, quaternion: ArrayLike) -> Row:
    values = tuple(np.asarray(part, dtype=float) for part in (angles, matrix, quaternion))
    shapes = tuple(part.shape for part in values)
    if shapes != ((3,), (3, 3), (4,)) or not all(np.all(np.isfinite(part)) for part in values):
        raise AttitudeError(
            f"reference attitude {number} has parts of shape {shapes}",
            remedy="three angles in rad, a 3 x 3 matrix and four quaternion components, all finite",
        )
    return values  # type: ignore[return-value]


def _own_rows(convention: Convention) -> list[Row]:
    triples = [worked_angles(convention)]
    for singular in singular_attitudes(convention):
        first, _, last = triples[0]
        triples.append(np.array([first, singular.angle, last]))
    found = []
    for angles in triples:
        R_rb = convention.matrix(angles)
        found.append((angles, convention.stated_matrix(R_rb), convention.stated_quaternion(R_rb)))
    return found
