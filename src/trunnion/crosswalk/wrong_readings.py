"""The ways another party may read one convention's data wrongly, each as a function that can be carried out.

Three numbers: every chain of `readings` with every right-angle relabelling on its right, which together are all
relabellings of both frames (1152 * 24 = 27,648 functions behind 2,654,208 names); mirrored frames on both sides are
among them, since two mirrors make a rotation. Constants and offsets of the convention left out or put on the other
side. Quaternions: scalar first or last, conjugated, both. Matrices: rows taken for columns.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.attitude.words import vector_text
from trunnion.crosswalk.readings import Chain, all_chains, chain_matrices

Array = NDArray[np.float64]


@dataclass(frozen=True)
class WrongReading:
    """One wrong way to read exchanged data: family, words, and the attitudes R (N, 3, 3) it makes of rows."""

    family: str
    words: str
    attitudes: Callable[[Rows], Array]


@dataclass(frozen=True, eq=False)
class Rows:
    """Exchanged data: stated angles (N, 3) rad, stated matrices (N, 3, 3), stated quaternions (N, 4) scalar first."""

    convention: Convention
    angles: Array
    matrices: Array
    quaternions: Array

    @classmethod
    def of(cls, convention: Convention, angles: ArrayLike) -> Rows:
        """The rows of stated angles (N, 3) rad."""
        stated = np.atleast_2d(np.asarray(angles, dtype=float))
        R = convention.matrix(stated)
        return cls(convention, stated, convention.stated_matrix(R), convention.stated_quaternion(R))

    @property
    def truth(self) -> Array:
        """R_rb (N, 3, 3) of the rows."""
        return self.convention.from_stated_matrix(self.matrices)


@dataclass(frozen=True, eq=False)
class ChainFamily:
    """All chains with all 24 relabellings, carried out between the convention's own constants; degrees first."""

    convention: Convention

    def separations(self, rows: Rows) -> Array:
        """Rotation angles (1152, 24, N) rad of every function's attitude from the truth of the rows."""
        return self.separations_from(rows, rows.truth)

    def separations_from(self, rows: Rows, attitudes: Array) -> Array:
        """Rotation angles (1152, 24, N) rad between every function of the rows' angles and R_rb (N, 3, 3)."""
        numbers = np.degrees(rows.angles - np.asarray(self.convention.offsets))
        E = self.convention.chain(attitudes)
        relabel = np.array(right_angle_rotations())
        found = []
        for degrees in (True, False):
            chains = chain_matrices(numbers, degrees=degrees)  # (576, N, 3, 3); radians: degree numbers taken as rad
            cosine = np.einsum("nji,cnjk,mki->cmn", E, chains, relabel, optimize=True)
            found.append(np.arccos(np.clip((cosine - 1.0) / 2.0, -1.0, 1.0)))
        return np.concatenate(found)

    def chain(self, index: int) -> Chain:
        """The chain at an index of the first axis."""
        return all_chains()[index]

    def words(self, index: int, relabelling: int) -> str:
        """One function in words: its first name about moving axes, and where relabelled axes point."""
        names = self.convention.angle_names
        text = self.chain(index).readings()[0].words(names)
        if relabelling == 0:
            return text
        matrix = right_angle_rotations()[relabelling]
        axes = ", ".join(f"{axis} is {vector_text(matrix[:, n], 0)}" for n, axis in enumerate("xyz"))
        return f"{text}; body frame relabelled: its {axes}"


def single_readings(convention: Convention) -> list[WrongReading]:
    """Wrong readings that are no chain of three plain numbers: constants, offsets, quaternions, matrices."""
    found = [
        WrongReading(
            "quaternion", "scalar last where it is first", lambda rows: _from_quaternion(rows, (1, 2, 3, 0), 1.0)
        ),
        WrongReading("quaternion", "conjugated", lambda rows: _from_quaternion(rows, (0, 1, 2, 3), -1.0)),
        WrongReading(
            "quaternion", "scalar last and conjugated", lambda rows: _from_quaternion(rows, (1, 2, 3, 0), -1.0)
        ),
        WrongReading("matrix", "transposed: rows taken for columns", lambda rows: rows.truth.transpose(0, 2, 1)),
    ]
    found += [WrongReading("constants", words, _carried_out(other)) for words, other in _other_constants(convention)]
    return found


def _carried_out(other: Convention) -> Callable[[Rows], Array]:
    """What another convention makes of the rows' angles."""
    return lambda rows: other.matrix(rows.angles)


def _from_quaternion(rows: Rows, order: tuple[int, int, int, int], sense: float) -> Array:
    read = rows.quaternions[:, order] * np.array([1.0, sense, sense, sense])
    return rows.convention.from_stated_matrix(matrix_from_quaternion(read))


def _other_constants(convention: Convention) -> list[tuple[str, Convention]]:
    """The convention with a constant or an offset left out, transposed, or put on the other side."""
    left, right, none = convention.left, convention.right, np.eye(3)
    found: list[tuple[str, Convention]] = []
    if not np.allclose(left, none, rtol=0, atol=1e-12):
        found.append(("constant on the reference side left out", replace(convention, left=none)))
        found.append(("constant on the reference side transposed", replace(convention, left=left.T)))
    if not np.allclose(right, none, rtol=0, atol=1e-12):
        found.append(("constant on the body side left out", replace(convention, right=none)))
        found.append(("constant on the body side transposed", replace(convention, right=right.T)))
    if not np.allclose(left, right, rtol=0, atol=1e-12):
        found.append(("constants of the two sides exchanged", replace(convention, left=right, right=left)))
    if any(convention.offsets):
        first, second, third = (-offset for offset in convention.offsets)
        found.append(("offsets left out", replace(convention, offsets=(0.0, 0.0, 0.0), ranges=None)))
        found.append(
            ("offsets taken with the other sign", replace(convention, offsets=(first, second, third), ranges=None))
        )
    return found
