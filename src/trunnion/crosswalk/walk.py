"""Cross-walk: two conventions of one vehicle, the mapping of their angles and rates, and what it costs.

Letters: `r`, `b` reference and body frame of the first convention; `p`, `q` those of the second. `R_pr` takes r
components to p components, `R_bq` q to b; an attitude R_rb of the first is R_pq = R_pr R_rb R_bq in the second.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rates import convention_rate_matrix
from trunnion.attitude.rotations import require_rotation, rotation_angle
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

EXACT_MAP = 1e-9
"""rad; an angle map of whole signs and constants must hold this well at all 27 points of its proof."""

# A product of three turns is a trigonometric polynomial of degree one in each angle, so that two of them that agree
# on a 3 x 3 x 3 grid of angles agree everywhere.
_GRID = np.array(list(itertools.product(np.radians([-50.0, 20.0, 70.0]), repeat=3)))


@dataclass(frozen=True, eq=False)
class AngleMap:
    """second[n] = signs[n] * first[columns[n]] + constants[n] (rad, modulo a turn), for every attitude.

    twin: the second triple of the same attitude has this form as well (middle angle mirrored).
    """

    columns: tuple[int, int, int]
    signs: tuple[int, int, int]
    constants: tuple[float, float, float]

    def __call__(self, angles: ArrayLike) -> Array:
        """The second convention's angles (..., 3) rad, not wrapped."""
        first = np.asarray(angles, dtype=float)
        return first[..., self.columns] * np.array(self.signs) + np.array(self.constants)


@dataclass(frozen=True, eq=False)
class CrossWalk:
    """Both conventions, the constant rotations between their frames, and the angle map where there is one."""

    first: Convention
    second: Convention
    R_pr: Array
    R_bq: Array
    angle_map: AngleMap | None

    def attitude(self, R_rb: ArrayLike) -> Array:
        """R_pq (..., 3, 3) of R_rb."""
        return self.R_pr @ np.asarray(R_rb, dtype=float) @ self.R_bq

    def angles(self, angles: ArrayLike) -> tuple[Array, Array]:
        """The second convention's angles (..., 3) rad and its lock margin (...) rad, of the first one's angles."""
        found = self.second.angles(self.attitude(self.first.matrix(angles)))
        return np.asarray(found.angles), np.asarray(found.margin)

    def back(self) -> CrossWalk:
        """The same walk the other way."""
        return cross_walk(self.second, self.first, R_pr=self.R_pr.T, R_bq=self.R_bq.T)

    def rate_matrix(self, angles: ArrayLike) -> Array:
        """(..., 3, 3): second angle rates of first angle rates at first angles (..., 3) rad.

        Singular where the second convention locks: there AttitudeError.
        """
        stated, margin = self.angles(angles)
        if np.any(margin < 1e-12):
            raise AttitudeError(
                f"'{self.second.name}' is at lock, where its angle rates do not exist",
                remedy="exchange the angular velocity instead",
            )
        second = convention_rate_matrix(self.second, stated)
        return np.asarray(
            np.linalg.solve(second, self.R_bq.T @ convention_rate_matrix(self.first, angles)), dtype=float
        )

    def amplification(self, angles: ArrayLike) -> Array:
        """Largest growth (...) of a small error of the first triple into the second: 2-norm of `rate_matrix`."""
        return np.asarray(np.linalg.norm(self.rate_matrix(angles), ord=2, axis=(-2, -1)), dtype=float)


def frame_rotation(source: Frame, target: Frame) -> Array:
    """R (3, 3) that takes components in `source` to components in `target`, from axis names both frames know.

    Raises AttitudeError when the frames do not name the same three lines (north/east/down and east/north/up do).
    """
    try:
        columns = [target.direction(axis) for axis in source.axes]
    except AttitudeError as err:
        raise AttitudeError(
            f"frames '{source.name}' and '{target.name}' do not name the same axes, so what turns one into the other "
            "is not known",
            remedy="state the rotation between them",
        ) from err
    return require_rotation(np.column_stack(columns), f"the map from '{source.name}' to '{target.name}'")


def cross_walk(
    first: Convention, second: Convention, *, R_pr: ArrayLike | None = None, R_bq: ArrayLike | None = None
) -> CrossWalk:
    """The walk from one convention to another of the same vehicle; rotations not given follow from the axis names."""
    outer = frame_rotation(first.reference, second.reference) if R_pr is None else require_rotation(R_pr, "R_pr")
    inner = frame_rotation(second.body, first.body) if R_bq is None else require_rotation(R_bq, "R_bq")
    bare = CrossWalk(first, second, outer, inner, None)
    return CrossWalk(first, second, outer, inner, _angle_map(bare))


def _angle_map(walk: CrossWalk) -> AngleMap | None:
    """A map of signs, columns and constants that holds at all attitudes, or None.

    The candidate is read off at one attitude from the rate matrix (whose entries must be 0 and +-1) and proven on the
    27 points on which two products of three turns must agree.
    """
    chain = _GRID[5]
    start = walk.first.stated_from_chain(chain)
    stated, margin = walk.angles(start)
    if float(margin) < 1e-6:
        return None
    slopes = walk.rate_matrix(start)
    whole = np.round(slopes)
    if np.max(np.abs(slopes - whole)) > 1e-7 or np.any(np.abs(whole).sum(axis=1) != 1):
        return None
    i, j, k = (int(np.argmax(np.abs(row))) for row in whole)
    si, sj, sk = (int(row[column]) for row, column in zip(whole, (i, j, k), strict=True))
    constants = np.remainder(stated - np.array([si, sj, sk]) * start[[i, j, k]] + np.pi, 2 * np.pi) - np.pi
    candidate = AngleMap((i, j, k), (si, sj, sk), (float(constants[0]), float(constants[1]), float(constants[2])))
    points = walk.first.stated_from_chain(_GRID)
    miss = rotation_angle(walk.second.matrix(candidate(points)), walk.attitude(walk.first.matrix(points)))
    return candidate if float(np.max(miss)) <= EXACT_MAP else None


@dataclass(frozen=True, eq=False)
class Probe:
    """A probe attitude: what it is in words, the first convention's angles (3,) rad, and what it tells apart (rad).

    misses: rotation angle of the error when the reference map alone, the body map alone, or neither is applied; None
    where that would be no error because the map left out is no turn.
    """

    words: str
    angles: Array
    misses: tuple[float | None, float | None, float | None]

    @property
    def sufficient(self) -> bool:
        """True when each wrong way of applying the maps by halves shows up by more than a degree."""
        return all(miss is None or miss > np.radians(1.0) for miss in self.misses)


def probes(walk: CrossWalk) -> tuple[Probe, ...]:
    """Zero attitude, zero turned by a quarter about the first axis, and one general attitude.

    The first two alone are what half-applied maps often survive: `sufficient` says whether they do.
    """
    turns = (
        ("zero attitude", (0.0, 0.0, 0.0)),
        ("first angle a quarter turn from zero", (np.pi / 2, 0.0, 0.0)),
        ("a general attitude", tuple(np.radians((35.0, 20.0, -50.0)))),
    )
    turned = [float(rotation_angle(matrix, np.eye(3))) > EXACT_MAP for matrix in (walk.R_pr, walk.R_bq)]
    wrong = (turned[1], turned[0], any(turned))
    found = []
    for words, chain in turns:
        angles = walk.first.stated_from_chain(np.array(chain))
        R_rb = walk.first.matrix(angles)
        right = walk.attitude(R_rb)
        halves = (walk.R_pr @ R_rb, R_rb @ walk.R_bq, R_rb)
        misses = [
            float(rotation_angle(half, right)) if counts else None for half, counts in zip(halves, wrong, strict=True)
        ]
        found.append(Probe(words, angles, (misses[0], misses[1], misses[2])))
    return tuple(found)
