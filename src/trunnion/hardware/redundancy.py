"""Four axes: one more than an attitude needs. The free turn of the outermost axis keeps the other three from lock.

Letters: `g` base, `p` platform. For every outer angle t1 the inner three axes solve Rot(n1, -t1) R_gp; their clearance
depends on t1 through d = angle(n2, Rot(n1, -t1) R n4) alone. Over a record the outer angles are chosen by dynamic
programming: clearance against rate, on a grid of t1 (sampled), the joints then solved exactly. Angles rad, times s.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.rotations import about
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import Solutions, attitude_solutions
from trunnion.hardware.vectors import Array, turned, wrapped


def inner_chain(chain: GimbalChain) -> GimbalChain:
    """The inner three joints of a four-axis chain as a chain of their own, on a base carried by the outermost joint."""
    if len(chain.joints) != 4:
        raise HardwareError(f"chain '{chain.name}' has {len(chain.joints)} axes; redundancy needs four")
    return GimbalChain(f"{chain.name}, inner axes", chain.joints[1:], chain.R_gp0)


def inner_solutions(chain: GimbalChain, R_gp: ArrayLike, outer: ArrayLike) -> Solutions:
    """Both solutions of the inner three joints for attitudes R_gp (..., 3, 3) at outer angles (...) rad."""
    inner = inner_chain(chain)
    R = np.asarray(R_gp, dtype=float)
    back = np.swapaxes(_outer_turn(chain, outer), -1, -2)
    return attitude_solutions(inner, back @ R)


def _outer_turn(chain: GimbalChain, outer: ArrayLike) -> Array:
    return about(chain.joints[0].axis, np.asarray(outer, dtype=float))


def best_outer_angle(chain: GimbalChain, R_gp: ArrayLike) -> tuple[Array, Array]:
    """The outer angle (...) rad of greatest inner clearance for attitudes (..., 3, 3), and that clearance (...) rad.

    cos d = A + B cos t1 + C sin t1: the angle whose cos d comes nearest to the middle of the reachable range is in
    closed form. Travel of the outer joint is not considered; of two equally good angles the smaller is taken.
    """
    inner = inner_chain(chain)
    n1, n2 = chain.axes[0], chain.axes[1]
    w = np.asarray(R_gp, dtype=float) @ chain.R_gp0.T @ chain.axes[3]
    l12, l23 = inner.neighbour_angles
    ideal = np.cos((abs(l12 - l23) + np.pi - abs(np.pi - l12 - l23)) / 2.0)
    # n2 . Rot(n1, -t) w = Rot(n1, t) n2 . w
    A = (w @ n1) * (n1 @ n2)
    B = w @ n2 - A
    C = w @ np.cross(n1, n2)
    size, phase = np.hypot(B, C), np.arctan2(C, B)
    with np.errstate(invalid="ignore", divide="ignore"):
        half = np.where(size > 1e-15, np.arccos(np.clip((ideal - A) / np.where(size > 1e-15, size, 1.0), -1, 1)), 0.0)
    options = np.stack([wrapped(phase + half), wrapped(phase - half)])
    t = np.take_along_axis(options, np.argmin(np.abs(options), axis=0)[None], axis=0)[0]
    d = np.arccos(np.clip(A + size * np.cos(t - phase), -1, 1))
    low, high = abs(l12 - l23), np.pi - abs(np.pi - l12 - l23)
    return t, np.minimum(d - low, high - d)


@dataclass(frozen=True, eq=False)
class RedundantPlan:
    """How a four-axis chain follows a record, beside the same chain with its outer axis held at zero.

    angles (N, 4) rad; clearance (N,) rad of the inner axes; rates (4,) rad/s: largest of each joint, by differences.
    held_clearance, held_rates: the same with the outer axis held. rate_cost (rad/s): largest rate of the outer axis,
    which is what keeping away from lock costs.
    """

    angles: Array
    clearance: Array
    rates: Array
    held_clearance: Array
    held_rates: Array

    @property
    def rate_cost(self) -> float:
        """Largest rate (rad/s) of the outermost axis."""
        return float(self.rates[0])


def plan_redundant(
    chain: GimbalChain,
    times: ArrayLike,
    R_gp: ArrayLike,
    *,
    weight: float = 1.0,
    grid: int = 73,
    start: float | None = 0.0,
) -> RedundantPlan:
    """Outer angles over a record R_gp (N, 3, 3) at times (N,) s that keep the inner axes away from lock.

    Cost of a record: the sum over time of 1/sin^2(clearance) plus `weight` times the squared outer rate; the outer
    angle moves on `grid` values of its travel (of a turn when unlimited), not faster than its rate limit, from `start`
    (rad; None leaves the start free, as when the record may be prepared for).
    """
    t, R = np.asarray(times, dtype=float), np.asarray(R_gp, dtype=float)
    if t.ndim != 1 or len(t) != len(R) or len(t) < 2 or np.any(np.diff(t) <= 0.0):
        raise HardwareError("a record needs two or more attitudes at advancing times")
    lower, upper = chain.joints[0].travel
    values = np.linspace(lower if np.isfinite(lower) else -np.pi, upper if np.isfinite(upper) else np.pi, grid)
    clearance = _clearances(chain, R, values)
    limit = chain.joints[0].rate or np.inf
    chosen = _least_cost(t, clearance, values, weight, limit, start)
    outer = values[chosen]
    angles, rates = _followed(chain, t, R, outer)
    _, held_rates = _followed(chain, t, R, np.zeros(len(t)))
    held = inner_solutions(chain, R, np.zeros(len(t))).clearance
    return RedundantPlan(angles, clearance[np.arange(len(t)), chosen], rates, held, held_rates)


def _clearances(chain: GimbalChain, R: Array, values: Array) -> Array:
    """Inner clearance (N, G) for each attitude and outer angle, without solving the joints."""
    inner = inner_chain(chain)
    w = R @ chain.R_gp0.T @ chain.axes[3]
    axis = turned(chain.axes[0], values, chain.axes[1])
    d = np.arctan2(np.linalg.norm(np.cross(w[:, None], axis[None]), axis=-1), w @ axis.T)
    l12, l23 = inner.neighbour_angles
    return np.minimum(d - abs(l12 - l23), np.pi - abs(np.pi - l12 - l23) - d)


def _least_cost(t: Array, clearance: Array, values: Array, weight: float, limit: float, start: float | None) -> Array:
    """Dynamic programming over the grid of outer angles; returns the chosen column (N,) of each sample."""
    sine = np.sin(np.clip(clearance, 1e-6, np.pi / 2))
    node = np.where(clearance > 0.0, 1.0 / sine**2, 1e12)
    step = np.abs(values[:, None] - values[None, :])
    total, came = node[0] * (t[1] - t[0]), np.zeros((len(t), len(values)), dtype=int)
    if start is not None:
        total = np.where(np.arange(len(values)) == np.argmin(np.abs(values - start)), total, np.inf)
    for k in range(1, len(t)):
        dt = t[k] - t[k - 1]
        move = weight * step**2 / dt
        move[step > limit * dt + 1e-12] = np.inf
        whole = total[:, None] + move
        came[k] = np.argmin(whole, axis=0)
        total = whole[came[k], np.arange(len(values))] + node[k] * dt
    chosen = np.empty(len(t), dtype=int)
    chosen[-1] = int(np.argmin(total))
    for k in range(len(t) - 1, 0, -1):
        chosen[k - 1] = came[k, chosen[k]]
    return chosen


def _followed(chain: GimbalChain, t: Array, R: Array, outer: Array) -> tuple[Array, Array]:
    """Joint angles (N, 4) along the record and the peak rates (4,): the inner branch least beyond the stops, then of
    lower peak rate.
    """
    solutions = inner_solutions(chain, R, outer)
    found = []
    for branch in range(2):
        inner, beyond = _within_stops(chain, np.unwrap(solutions.angles[:, branch], axis=0))
        angles = np.column_stack([outer, inner])
        rates = np.max(np.abs(np.diff(angles, axis=0) / np.diff(t)[:, None]), axis=0)
        found.append((beyond, float(np.max(rates)), angles, rates))
    best = min(found, key=lambda way: way[:2])
    return best[2], best[3]


def _within_stops(chain: GimbalChain, inner: Array) -> tuple[Array, float]:
    """Inner angles (N, 3) brought by whole turns as near to the middle of their travel as they go, and how far (rad)
    they still lie beyond a stop.
    """
    travel = chain.travel[1:]
    stopped = np.asarray(np.isfinite(travel).all(axis=1))
    middle = np.where(stopped, np.where(stopped[:, None], travel, 0.0).sum(axis=1) / 2.0, 0.0)
    centre = (inner.max(axis=0) + inner.min(axis=0)) / 2.0
    shifted = inner - 2.0 * np.pi * np.round((centre - middle) / (2.0 * np.pi))
    beyond = np.maximum(travel[:, 0] - shifted.min(axis=0), shifted.max(axis=0) - travel[:, 1])
    return shifted, float(np.max(np.maximum(beyond, 0.0)))
