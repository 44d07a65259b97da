"""Two or three conventions used in turn: the margin that is always there, and a switch rule that cannot chatter.

At each attitude the better (or best) of the conventions is used; what counts is the least over the region of the
largest of their margins. It is bracketed by branch and bound with a bound that knows the conventions jointly:
with F_j = cos² of margin j, for any weights adding up to one, min_j F_j <= sum of weight_j F_j, and the right side is
bounded over a cell to second order. Where the margins of two conventions cross, their gradients nearly oppose each
other, and the right weights cancel them: that is what makes the bracket close quickly.
"""

from __future__ import annotations

from collections.abc import Sequence as Several
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.envelope.branching import Bounds, Bracket, Cells, least_value
from trunnion.envelope.chains import ChainBox, box_chain, chain_matrices
from trunnion.envelope.cones import rolled_cone_box
from trunnion.envelope.regions import (
    Between,
    Box,
    Cone,
    Dispersed,
    Mounted,
    Poses,
    Referred,
    Region,
    Roll,
    Track,
    Union,
)
from trunnion.envelope.results import TIE, Extreme, Witness
from trunnion.envelope.tracks import pieces
from trunnion.envelope.trajectories import matrices_at
from trunnion.envelope.vectors import Array, cross, dot, turned
from trunnion.errors import RegionError

_ROUNDING = 1e-13


def all_attitudes() -> ChainBox:
    """Every attitude, as a box of three angles."""
    return ChainBox(
        axes=np.eye(3)[[2, 1, 2]],
        low=np.array([-np.pi, 0.0, -np.pi]),
        high=np.array([np.pi, np.pi, np.pi]),
        left=np.eye(3),
        right=np.eye(3),
        names=("first", "second", "third"),
    )


def switched_margin(
    region: Region | None,
    conventions: Several[Convention],
    *,
    tolerance: float = np.radians(0.01),
    seconds: float = 20.0,
) -> Extreme:
    """Bracket of the least over a region (None: all attitudes) of the largest lock margin of the conventions.

    The bracket is certified whatever the tolerance; when time runs out first it is wider, and stays a bracket.
    """
    if not conventions:
        raise RegionError("no conventions to switch between", remedy="name two or three")
    pairs = _Pairs.of([convention.lock_axes for convention in conventions])
    return _least_best(region, pairs, tolerance, seconds)


@dataclass(frozen=True, eq=False)
class _Pairs:
    """Lock directions u and v (3, J) of J conventions."""

    u: Array
    v: Array

    @classmethod
    def of(cls, lock_axes: list[tuple[Array, Array]]) -> _Pairs:
        return cls(np.stack([u for u, _ in lock_axes], axis=1), np.stack([v for _, v in lock_axes], axis=1))

    def best_margins(self, matrices: Array) -> Array:
        """Largest margin (N,) at each attitude (N, 3, 3)."""
        carried = np.einsum("nij,jm->inm", matrices, self.v)
        normal = cross(np.broadcast_to(self.u[:, None], carried.shape), carried)
        return np.max(np.arctan2(np.sqrt(dot(normal, normal)), np.abs(dot(self.u[:, None], carried))), axis=1)


def _least_best(region: Region | None, pairs: _Pairs, tolerance: float, seconds: float) -> Extreme:
    match region:
        case None:
            return _over_chain(all_attitudes(), pairs, tolerance, seconds)
        case Box():
            return _over_chain(box_chain(region), pairs, tolerance, seconds)
        case Cone():
            roll = region.roll or Roll(-np.pi, np.pi, np.roll(region.body_axis, 1) + np.array([0.1, 0.2, 0.3]))
            return _over_chain(rolled_cone_box(replace(region, roll=roll)), pairs, tolerance, seconds)
        case Poses():
            return _lowered(_over_list(region.matrices, pairs, "pose"), region.radius)
        case Track():
            return _over_track(region, pairs, tolerance, seconds)
        case Union():
            return _over_union(region, pairs, tolerance, seconds)
        case Dispersed():
            return _lowered(_least_best(region.region, pairs, tolerance, seconds), region.radius)
        case Mounted():
            inner = _Pairs(pairs.u, region.R_bs @ pairs.v)
            return _with_matrix(_least_best(region.region, inner, tolerance, seconds), np.eye(3), region.R_bs)
        case Referred():
            inner = _Pairs(region.R_qr.T @ pairs.u, pairs.v)
            return _with_matrix(_least_best(region.region, inner, tolerance, seconds), region.R_qr, np.eye(3))
    raise RegionError(f"{type(region).__name__} is no region known here")


def _with_matrix(extreme: Extreme, left: Array, right: Array) -> Extreme:
    if extreme.witness is None:
        return extreme
    return replace(extreme, witness=replace(extreme.witness, matrix=left @ extreme.witness.matrix @ right))


def _lowered(extreme: Extreme, radius: float) -> Extreme:
    """A ball lowers the guaranteed side by its radius; what is attained inside it is not known better than before."""
    return replace(extreme, lo=max(0.0, extreme.lo - radius)) if radius else extreme


def _over_union(region: Union, pairs: _Pairs, tolerance: float, seconds: float) -> Extreme:
    share = seconds / len(region.parts)
    found = {name: _least_best(part, pairs, tolerance, share) for name, part in region.parts.items()}
    lo, best = min(e.lo for e in found.values()), min(found.values(), key=lambda e: e.hi)
    governing = tuple(name for name, e in found.items() if e.lo <= lo + max(TIE, tolerance) and e.lo <= best.hi)
    bases = [e.basis for e in found.values()]
    basis = next((b for b in (Basis.MEASURED, Basis.SAMPLED) if b in bases), Basis.CERTIFIED)
    return Extreme(lo, best.hi, basis, best.witness, governing)


def _over_list(matrices: Array, pairs: _Pairs, label: str, times: Array | None = None) -> Extreme:
    margins = pairs.best_margins(matrices)
    at = int(np.argmin(margins))
    stamp = None if times is None else float(times[at])
    witness = Witness(matrices[at], float(margins[at]), stamp, f"{label} {at + 1:,}")
    return Extreme(max(float(margins[at]) - _ROUNDING, 0.0), float(margins[at]) + _ROUNDING, Basis.CERTIFIED, witness)


def _over_chain(chain: ChainBox, pairs: _Pairs, tolerance: float, seconds: float) -> Extreme:
    problem = _JointProblem(chain, pairs)
    found = least_value(problem.bound, chain.low, chain.high, tolerance=tolerance, seconds=seconds, batch=1024)
    matrix = chain_matrices(chain, found.at[:, None])[0]
    value = float(pairs.best_margins(matrix[None])[0])
    return _extreme(found, Witness(matrix, value, None, chain.place(found.at)))


def _extreme(found: Bracket, witness: Witness) -> Extreme:
    return Extreme(max(found.lo - _ROUNDING, 0.0), witness.value + _ROUNDING, Basis.CERTIFIED, witness)


class _JointProblem:
    """Bounds of max_j margin_j over cells of a box of angles, from weighted sums of cos² of the margins."""

    def __init__(self, chain: ChainBox, pairs: _Pairs) -> None:
        self.p, self.q, self.r = (axis[:, None] for axis in chain.axes)
        self.u, self.v = chain.left.T @ pairs.u, chain.right @ pairs.v
        arm_u = np.linalg.norm(np.cross(chain.axes[0], self.u.T), axis=1)
        arm_v = np.linalg.norm(np.cross(chain.axes[2], self.v.T), axis=1)
        first = np.stack([arm_u, np.ones_like(arm_u), arm_v])  # bounds on the first derivatives of f_j, (3, J)
        second = np.stack(
            [
                np.stack([arm_u, arm_u, arm_u * arm_v]),
                np.stack([arm_u, np.ones_like(arm_u), arm_v]),
                np.stack([arm_u * arm_v, arm_v, arm_v]),
            ]
        )
        self.second = 2.0 * (first[:, None] * first[None] + second)  # bounds on those of f_j², (3, 3, J)
        self.weights = _weights(self.u.shape[1])

    def bound(self, cells: Cells) -> Bounds:
        """Lower bound of the largest margin over each cell, and its value at the centre."""
        square, slopes = self._at(cells.centre)  # (J, n), (3, J, n)
        rest = 0.5 * np.einsum("ikj,in,kn->jn", self.second, cells.half, cells.half)
        mixed = np.einsum("wj,kjn->kwn", self.weights, slopes)
        swing = np.einsum("kwn,kn->wn", np.abs(mixed), cells.half)
        top = (self.weights @ (square + rest) + swing + _ROUNDING).min(axis=0)
        lower = np.arccos(np.sqrt(np.clip(top, 0.0, 1.0)))
        value = np.arccos(np.sqrt(np.clip(square.min(axis=0), 0.0, 1.0)))
        urge = cells.half * (np.abs(mixed).max(axis=1) + 0.5 * np.einsum("ikj,kn->in", self.second, cells.half))
        return Bounds(lower, value, cells.centre, urge, cells)

    def _at(self, angles: Array) -> tuple[Array, Array]:
        """f_j² (J, n) and its derivatives (3, J, n)."""
        tilted = turned(self.q, angles[1], np.broadcast_to(self.r, angles.shape))
        squares, slopes = [], []
        for u, v in zip(self.u.T, self.v.T, strict=True):
            x = turned(self.p, -angles[0], np.broadcast_to(u[:, None], angles.shape))
            y = turned(self.q, angles[1], turned(self.r, angles[2], np.broadcast_to(v[:, None], angles.shape)))
            f, normal = dot(x, y), cross(y, x)
            squares.append(f * f)
            slopes.append(2.0 * f * np.stack([dot(self.p, normal), dot(self.q, normal), dot(tilted, normal)]))
        return np.stack(squares), np.stack(slopes, axis=1)


def _weights(count: int, steps: int = 8) -> Array:
    """Points (W, count) of the simplex of weights on a regular lattice."""
    if count == 1:
        return np.ones((1, 1))
    found = []
    for bars in combinations(range(steps + count - 1), count - 1):
        edges = (-1, *bars, steps + count - 1)
        found.append([edges[i + 1] - edges[i] - 1 for i in range(count)])
    return np.array(found, dtype=float) / steps


def _over_track(track: Track, pairs: _Pairs, tolerance: float, seconds: float) -> Extreme:
    """Rows, or slerp steps halved in time: every margin changes by at most the turn."""
    if track.between is Between.RATE_LIMITED:
        raise RegionError("switched margins of motion known only by its rate are not offered", remedy="state slerp")
    if track.between is Between.SAMPLES or len(track.times) == 1:
        found = _over_list(matrix_from_quaternion(track.quaternions), pairs, "row", track.times)
    else:
        found = _over_slerp(track, pairs, tolerance, seconds)
    if track.attitude_error is not None:
        found = _lowered(found, track.attitude_error)
    if track.between is Between.SAMPLES:
        return replace(found, basis=Basis.SAMPLED)
    return replace(found, basis=Basis.MEASURED) if track.attitude_error is None else found


def _over_slerp(track: Track, pairs: _Pairs, tolerance: float, seconds: float) -> Extreme:
    steps = np.concatenate(
        [np.arange(piece.start or 0, max(piece.stop - 1, (piece.start or 0) + 1)) for piece in pieces(track)]
    )
    quaternions = track.quaternions
    after = np.minimum(np.arange(len(quaternions)) + 1, len(quaternions) - 1)
    inner = np.abs(np.einsum("ij,ij->i", quaternions, quaternions[after]))
    turns = 2.0 * np.arccos(np.clip(inner, 0.0, 1.0)) + 1e-7  # an upper bound is enough

    def bound(cells: Cells) -> Bounds:
        row = cells.centre[0].astype(np.intp)
        value = pairs.best_margins(matrices_at(quaternions, row, cells.centre[1]))
        reach = turns[row] * cells.half[1]
        return Bounds(value - reach, value, cells.centre, np.stack([np.full_like(reach, -1.0), reach]), cells)

    low, high = np.stack([steps, np.zeros(len(steps))]), np.stack([steps, np.ones(len(steps))])
    found = least_value(bound, low, high, tolerance=tolerance, seconds=seconds)
    row, fraction = int(found.at[0]), float(found.at[1])
    matrix = matrices_at(quaternions, np.array([row]), np.array([fraction]))[0]
    spans = np.append(np.diff(track.times), 0.0)
    witness = Witness(
        matrix,
        float(pairs.best_margins(matrix[None])[0]),
        float(track.times[row] + fraction * spans[row]),
        f"after row {row + 1:,}",
    )
    return _extreme(found, witness)


@dataclass(frozen=True)
class SwitchRule:
    """When to change convention, and what that guarantees.

    Stay with the convention in use while its margin is at least `threshold`; when it falls below, change to the one
    with the largest margin. `hysteresis` (rad) is the least turn of the body between two changes, `dwell` the least
    time; `in_use` (rad) is the margin the convention in use always has.
    """

    guaranteed: float
    threshold: float
    hysteresis: float
    in_use: float
    body_rate: float
    dwell: float

    def statement(self) -> str:
        """The rule and its proof in words."""
        return (
            f"Stay with the convention in use while its margin is at least {_floor_degrees(self.threshold)} deg; below "
            "that, change to the convention with the largest margin. Over the whole envelope the largest margin is at "
            f"least {_floor_degrees(self.guaranteed)} deg, so each change arrives with at least that (less what the "
            "attitude error takes). A margin changes by no more than the rotation angle, so before the next change "
            f"the body turns by at least {_floor_degrees(self.hysteresis)} deg, which at no more than "
            f"{np.degrees(self.body_rate):.6g} deg/s takes at least {self.dwell:.4g} s. The rule cannot chatter, and "
            f"the margin in use never falls below {_floor_degrees(self.in_use)} deg."
        )


def _floor_degrees(angle: float) -> str:
    return f"{np.floor(np.degrees(angle) * 1e4 + 1e-9) / 1e4:g}"


def switching_rule(guaranteed: float, threshold: float, body_rate: float, *, attitude_error: float = 0.0) -> SwitchRule:
    """The switch rule for a guaranteed best margin (lo of `switched_margin`), a threshold and a largest body rate.

    attitude_error (rad): the margins the switch logic sees may be off by that much. The convention it arrives in is
    seen with at least guaranteed - e, so it truly has guaranteed - 2 e, and it is left at truly threshold + e at most:
    three errors come off the hysteresis, one off the margin in use. Raises RegionError when no hysteresis is left: the
    rule could then chatter.
    """
    hysteresis = guaranteed - threshold - 3.0 * attitude_error
    if not (threshold >= attitude_error >= 0.0 and hysteresis > 0.0):
        raise RegionError(
            f"a threshold of {np.degrees(threshold):g} deg leaves no hysteresis below the guaranteed "
            f"{np.degrees(guaranteed):g} deg",
            remedy="the switch could chatter; lower the threshold",
        )
    if not body_rate > 0.0:
        raise RegionError("the largest body rate must be positive", remedy="state it")
    return SwitchRule(guaranteed, threshold, hysteresis, threshold - attitude_error, body_rate, hysteresis / body_rate)


@dataclass(frozen=True, eq=False)
class SwitchedSet:
    """Conventions used in turn and the bracket of the margin that is always there."""

    conventions: tuple[Convention, ...]
    margin: Extreme


def rank_switched(
    region: Region | None,
    conventions: Several[Convention],
    size: int,
    *,
    tolerance: float = np.radians(0.05),
    seconds: float = 20.0,
) -> list[SwitchedSet]:
    """All sets of `size` of the conventions, best margin first.

    Sets no farther apart than the brackets are wide stay in the order in which they are stated.
    """
    sets = list(combinations(conventions, size))
    if not sets:
        raise RegionError(f"{len(conventions)} conventions hold no set of {size}", remedy="name more conventions")
    share = seconds / len(sets)
    found = [SwitchedSet(s, switched_margin(region, s, tolerance=tolerance, seconds=share)) for s in sets]
    return sorted(found, key=lambda item: -round(item.margin.hi / (2.0 * tolerance)))
