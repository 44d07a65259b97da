"""The self-check: margins by subdivision with a second-order bound, which knows nothing of the closed forms.

Over a cell of half widths h around centre angles, f = u . T v obeys
f <= f(centre) + sum |f_i| h_i + 1/2 sum K_ij h_i h_j, with constants K from the lever arms: a derivative with respect
to a turn is a cross product with its axis, so the second ones are bounded by the sines of the angles between u and the
first axis and between v and the third. Where a first derivative keeps its sign over a cell, the cell shrinks to its
side. Cells are halved until the bracket is as narrow as asked for.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_product
from trunnion.envelope.branching import Bounds, Bracket, Cells, least_value
from trunnion.envelope.chains import ChainBox, box_chain
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
    as_pairs,
)
from trunnion.envelope.tracks import pieces
from trunnion.envelope.vectors import Array, cross, dot, turned
from trunnion.errors import RegionError

_ROUNDING = 1e-14  # added to every bound on f


@dataclass(frozen=True, eq=False)
class SelfCheck:
    """Bracket (rad) of a least margin found without the closed forms, cells looked at, tolerance met or not."""

    lo: float
    hi: float
    cells: int
    finished: bool


def self_check(
    region: Region, convention: Convention, *, tolerance: float = np.radians(1e-3), most_cells: int = 1_000_000
) -> SelfCheck:
    """Bracket the least lock margin over a region by subdivision; independent of `lock_margin`."""
    u, v = convention.lock_axes
    return check_line(region, u, v, tolerance=tolerance, most_cells=most_cells)


def check_line(region: Region, u: Array, v: Array, *, tolerance: float, most_cells: int = 1_000_000) -> SelfCheck:
    """Bracket the least line angle between u (3,) and R v (3,): the smaller of those to u and to -u."""
    near = check_angle(region, u, v, tolerance=tolerance, most_cells=most_cells)
    far = check_angle(region, -u, v, tolerance=tolerance, most_cells=most_cells)
    finished = near.finished and far.finished
    return SelfCheck(min(near.lo, far.lo), min(near.hi, far.hi), near.cells + far.cells, finished)


def check_angle(region: Region, u: Array, v: Array, *, tolerance: float, most_cells: int = 1_000_000) -> SelfCheck:
    """Bracket the least angle between u (3,) and R v (3,) over a region."""
    again: dict[str, Any] = {"tolerance": tolerance, "most_cells": most_cells}
    match region:
        case Box():
            return _chain(box_chain(region), u, v, **again)
        case Cone(roll=None):
            free = Roll(-np.pi, np.pi, _any_across(region.body_axis))
            return _chain(rolled_cone_box(replace(region, roll=free)), u, v, **again)
        case Cone():
            return _chain(rolled_cone_box(region), u, v, **again)
        case Poses():
            return _lowered(_listed(region.matrices, u, v), region.radius)
        case Track():
            return _lowered(_track(region, u, v, **again), region.attitude_error or 0.0)
        case Union():
            checks = [check_angle(part, u, v, **again) for part in region.parts.values()]
            return SelfCheck(
                min(c.lo for c in checks),
                min(c.hi for c in checks),
                sum(c.cells for c in checks),
                all(c.finished for c in checks),
            )
        case Dispersed():
            return _lowered(check_angle(region.region, u, v, **again), region.radius)
        case Mounted():
            return check_angle(region.region, u, region.R_bs @ v, **again)
        case Referred():
            return check_angle(region.region, region.R_qr.T @ u, v, **again)
    raise RegionError(f"no self-check is known for {type(region).__name__}")


def _any_across(axis: Array) -> Array:
    return np.cross(axis, np.eye(3)[np.argmin(np.abs(axis))])


def _lowered(check: SelfCheck, radius: float) -> SelfCheck:
    return replace(check, lo=max(0.0, check.lo - radius), hi=max(0.0, check.hi - radius))


def _listed(matrices: Array, u: Array, v: Array) -> SelfCheck:
    carried = matrices @ v
    sine = np.linalg.norm(np.cross(u, carried), axis=-1)
    least = float(np.arctan2(sine, carried @ u).min())
    return SelfCheck(least, least, len(matrices), True)


def _to_angle(cosine_gap: Array) -> Array:
    """Angle from 1 - cos, accurate for small ones."""
    return 2.0 * np.arcsin(np.sqrt(np.clip(0.5 * cosine_gap, 0.0, 1.0)))


def _chain(chain: ChainBox, u: Array, v: Array, *, tolerance: float, most_cells: int) -> SelfCheck:
    left, right = as_pairs(chain.left.T @ u, chain.right @ v)
    problem = _ChainProblem(chain.axes, left, right)
    found = least_value(problem.bound, chain.low, chain.high, tolerance=tolerance, most_cells=most_cells)
    return _from_bracket(found)


def _from_bracket(found: Bracket) -> SelfCheck:
    return SelfCheck(found.lo, found.hi, found.cells, found.finished)


class _ChainProblem:
    """Second-order bounds of the angle between u and Rot(p,a) Rot(q,b) Rot(r,c) v."""

    def __init__(self, axes: Array, u: Array, v: Array) -> None:
        self.p, self.q, self.r = (axis[:, None] for axis in axes)
        self.u, self.v = u, v
        arm_u = float(np.linalg.norm(np.cross(axes[0], u[:, 0])))
        arm_v = float(np.linalg.norm(np.cross(axes[2], v[:, 0])))
        self.second = np.array([[arm_u, arm_u, arm_u * arm_v], [arm_u, 1.0, arm_v], [arm_u * arm_v, arm_v, arm_v]])

    def bound(self, cells: Cells) -> Bounds:
        """Lower bound, value at the centre, and shrunken cells."""
        slopes, _ = self._at(cells.centre)
        swing = self.second @ cells.half
        steady = np.abs(slopes) > swing + _ROUNDING
        side = np.where(steady, np.sign(slopes) * cells.half, 0.0)  # f grows towards this side
        cells = Cells(cells.centre + side, np.where(steady, 0.0, cells.half))
        slopes, gap = self._at(cells.centre)
        first = np.abs(slopes) * cells.half
        second = cells.half * (self.second @ cells.half)
        lower = _to_angle(gap - first.sum(axis=0) - 0.5 * second.sum(axis=0) - _ROUNDING)
        return Bounds(lower, _to_angle(gap), cells.centre, first + second, cells)

    def _at(self, angles: Array) -> tuple[Array, Array]:
        """Derivatives of f by a, b, c (3, n), and 1 - f (n,)."""
        x = turned(self.p, -angles[0], np.broadcast_to(self.u, angles.shape))
        tilted = turned(self.q, angles[1], np.broadcast_to(self.r, angles.shape))
        y = turned(self.q, angles[1], turned(self.r, angles[2], np.broadcast_to(self.v, angles.shape)))
        normal = cross(y, x)
        slopes = np.stack([dot(self.p, normal), dot(self.q, normal), dot(tilted, normal)])
        apart = x - y
        return slopes, 0.5 * dot(apart, apart)


def _track(track: Track, u: Array, v: Array, *, tolerance: float, most_cells: int) -> SelfCheck:
    """Rows only, or slerp steps halved in time: along a step of angle s, f'' is at most s² in the fraction."""
    if track.between is Between.SAMPLES:
        return _listed(matrix_from_quaternion(track.quaternions), u, v)
    if track.between is Between.RATE_LIMITED:
        raise RegionError("motion known only by its rate is not a set to subdivide", remedy="check a slerp track")
    lows = []
    for piece in pieces(track):
        count = len(track.quaternions[piece])
        lows.append((piece.start or 0) + np.arange(max(count - 1, 1)))
    start = np.concatenate(lows).astype(float)
    problem = _StepProblem(track.quaternions, u, v)
    found = least_value(
        problem.bound,
        np.stack([start, np.zeros_like(start)]),
        np.stack([start, np.ones_like(start)]),
        tolerance=tolerance,
        most_cells=most_cells + len(start),
    )
    return _from_bracket(found)


class _StepProblem:
    """Cells are (row, fraction): parts of slerp steps."""

    def __init__(self, quaternions: Array, u: Array, v: Array) -> None:
        self.quaternions, self.u, self.v = quaternions, u, v

    def bound(self, cells: Cells) -> Bounds:
        """Bounds along parts of steps; the row number has no width and is never halved."""
        row = cells.centre[0].astype(np.intp)
        after = np.minimum(row + 1, len(self.quaternions) - 1)
        q0, q1 = self.quaternions[row], self.quaternions[after]
        turn = quaternion_product(q0 * np.array([1.0, -1.0, -1.0, -1.0]), q1)
        turn = np.where(turn[:, :1] < 0.0, -turn, turn)
        length = np.linalg.norm(turn[:, 1:], axis=1)
        angle = 2.0 * np.arctan2(length, turn[:, 0])
        axis = turn[:, 1:] / np.where(length > 0.0, length, 1.0)[:, None]
        part = 0.5 * angle * cells.centre[1]
        step = np.concatenate([np.cos(part)[:, None], np.sin(part)[:, None] * axis], axis=1)
        R = matrix_from_quaternion(quaternion_product(q0, step))
        carried = R @ self.v
        slope = np.abs((R @ np.cross(axis, self.v)[..., None])[..., 0] @ self.u)
        apart = carried - self.u
        gap = 0.5 * np.einsum("ij,ij->i", apart, apart)
        reach = angle * cells.half[1]
        lower = _to_angle(gap - slope * reach - 0.5 * reach**2 - _ROUNDING)
        urge = np.stack([np.full_like(reach, -1.0), reach])
        return Bounds(lower, _to_angle(gap), cells.centre, urge, cells)
