"""Several direction constraints at once: margins and clearances bracketed over the attitudes that keep them all.

A box of angles (or a first cone, which is one) gives the parameters; further cones are constraints on the cosine
g = d . R m. No closed form is known, so the extreme is bracketed by branch and bound. Both the quantity and the
constraints are bounded over a cell to second order. For constraints c_l >= 0 and multipliers y_l >= 0,
F >= F - sum y_l c_l wherever the constraints hold, and the right side has no slope left where the multipliers balance
the quantity against the active constraints, so cells at the edge of the allowed set close as quickly as others.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.envelope.branching import Bounds, Bracket, Cells, least_value
from trunnion.envelope.chains import ChainBox, box_chain, chain_matrices
from trunnion.envelope.cones import rolled_cone_box
from trunnion.envelope.regions import Box, Cone, Region, Roll, as_pairs
from trunnion.envelope.results import AngleRange, Extreme, Spread, Witness, spread_from
from trunnion.envelope.vectors import Array, cross, dot, turned
from trunnion.errors import RegionError

_ROUNDING = 1e-13
TOLERANCE = np.radians(0.02)
"""rad; how narrow a bracket is asked for."""
SECONDS = 10.0
"""Time a pair may take before its bracket is stated as wide as it is."""
FEASIBLE = 1e-9
"""rad; an attitude this close to keeping a constraint is taken to keep it (said with every such result)."""


@dataclass(frozen=True, eq=False)
class Constrained(Region):
    """The attitudes of `region` (a box or a cone) that also keep every one of `cones` (any roll)."""

    region: Box | Cone
    cones: tuple[Cone, ...]

    def __post_init__(self) -> None:
        if not self.cones or any(cone.roll is not None for cone in self.cones):
            raise RegionError("further constraints are cones without a limit on roll", remedy="put the roll first")

    def chain(self) -> ChainBox:
        """The parameters: three angles."""
        if isinstance(self.region, Box):
            return box_chain(self.region)
        any_roll = Roll(-np.pi, np.pi, np.cross(self.region.body_axis, _across(self.region.body_axis)))
        return rolled_cone_box(replace(self.region, roll=self.region.roll or any_roll))


def _across(axis: Array) -> Array:
    return np.eye(3)[int(np.argmin(np.abs(axis)))]


def constrained_margin(
    region: Constrained, convention: Convention, *, tolerance: float = np.radians(0.02), seconds: float = 10.0
) -> AngleRange:
    """Brackets of the least and the largest lock margin; wider than the tolerance if time runs out, never wrong."""
    u, v = convention.lock_axes
    share = seconds / 3.0
    near = _bracket(region, u, v, "angle", tolerance, share)
    far = _bracket(region, -u, v, "angle", tolerance, share)
    least = near if near.hi <= far.hi else far
    least = replace(least, lo=min(near.lo, far.lo))
    outward = _bracket(region, u, v, "square", tolerance, share)
    return AngleRange(least, _mirrored(outward, np.pi / 2))


def constrained_spread(region: Constrained, u: Array, v: Array) -> Spread:
    """The four extremes of M pairs u, v (3, M), each bracketed as in `constrained_margin`."""
    return spread_from([_pair_extremes(region, tuple(u[:, m]), tuple(v[:, m])) for m in range(u.shape[1])])


@lru_cache(maxsize=256)
def _pair_extremes(region: Constrained, u: tuple[float, ...], v: tuple[float, ...]) -> tuple[Extreme, ...]:
    """Least and largest angle, least and largest line angle; a sweep asks for the same pair several times."""
    line, body = np.array(u), np.array(v)
    near, far = (_bracket(region, side * line, body, "angle", TOLERANCE, SECONDS / 3.0) for side in (1.0, -1.0))
    least = replace(near if near.hi <= far.hi else far, lo=min(near.lo, far.lo), hi=min(near.hi, far.hi))
    outward = _bracket(region, line, body, "square", TOLERANCE, SECONDS / 3.0)
    return near, _mirrored(far, np.pi), least, _mirrored(outward, np.pi / 2)


def constrained_clearance(
    region: Constrained,
    body_direction: ArrayLike,
    reference_direction: ArrayLike,
    *,
    tolerance: float = np.radians(0.02),
    seconds: float = 10.0,
) -> AngleRange:
    """Brackets of the least and the largest angle between a body and a reference direction."""
    u, v = (pair[:, 0] for pair in as_pairs(reference_direction, body_direction))
    least = _bracket(region, u, v, "angle", tolerance, 0.5 * seconds)
    far = _bracket(region, -u, v, "angle", tolerance, 0.5 * seconds)
    return AngleRange(least, _mirrored(far, np.pi))


def _mirrored(extreme: Extreme, total: float) -> Extreme:
    """The largest x from the least of total - x."""
    witness = extreme.witness
    flipped = None if witness is None else replace(witness, value=total - witness.value)
    return replace(extreme, lo=total - extreme.hi, hi=total - extreme.lo, witness=flipped)


def _bracket(region: Constrained, u: Array, v: Array, what: str, tolerance: float, seconds: float) -> Extreme:
    """Least angle to u ("angle"), or a right angle less the largest line angle ("square")."""
    chain = region.chain()
    problem = _Problem(chain, u, v, region.cones, what)
    probe = least_value(problem.bound, chain.low, chain.high, tolerance=0.1, seconds=0.3 * seconds)
    if probe.finished and not np.isfinite(probe.hi):
        raise RegionError("no attitude keeps all the constraints at once", remedy="look for a contradiction")
    known = problem.polished_start(probe)
    found = least_value(
        problem.bound_below(known), chain.low, chain.high, tolerance=tolerance, seconds=0.7 * seconds, batch=1024
    )
    best = _polished(problem, found, known)
    if best is None:
        return Extreme(max(found.lo - _ROUNDING, 0.0), problem.largest, Basis.CERTIFIED, None)
    at, value = best
    matrix = chain_matrices(chain, at[:, None])[0]
    witness = Witness(matrix, value, None, f"{chain.place(at)} (constraints kept to {FEASIBLE:g} rad)")
    return Extreme(max(min(found.lo, value) - _ROUNDING, 0.0), value + _ROUNDING, Basis.CERTIFIED, witness)


def _polished(problem: _Problem, found: Bracket, known: tuple[Array, float] | None) -> tuple[Array, float] | None:
    """The best allowed point: the start's, or one improved from what the search found."""
    options = [] if known is None else [known]
    if np.isfinite(found.hi) and len(found.at):
        options.append((found.at, found.hi))
        better = problem.polish(found.at)
        options += [] if better is None else [better]
    return min(options, key=lambda option: option[1]) if options else None


class _Form:
    """d . T m for one pair over a chain: value, derivatives, and constants bounding the second derivatives."""

    def __init__(self, chain: ChainBox, d: Array, m: Array) -> None:
        self.p, self.q, self.r = (axis[:, None] for axis in chain.axes)
        self.d, self.m = chain.left.T @ d, chain.right @ m
        arm_d = float(np.linalg.norm(np.cross(chain.axes[0], self.d)))
        arm_m = float(np.linalg.norm(np.cross(chain.axes[2], self.m)))
        self.first = np.array([arm_d, 1.0, arm_m])
        self.second = np.array([[arm_d, arm_d, arm_d * arm_m], [arm_d, 1.0, arm_m], [arm_d * arm_m, arm_m, arm_m]])

    def at(self, angles: Array) -> tuple[Array, Array, Array]:
        """Value (n,), derivatives (3, n) and 1 - value (n,) without cancellation."""
        x = turned(self.p, -angles[0], np.broadcast_to(self.d[:, None], angles.shape))
        tilted = turned(self.q, angles[1], np.broadcast_to(self.r, angles.shape))
        y = turned(self.q, angles[1], turned(self.r, angles[2], np.broadcast_to(self.m[:, None], angles.shape)))
        normal, apart = cross(y, x), x - y
        slopes = np.stack([dot(self.p, normal), dot(self.q, normal), dot(tilted, normal)])
        return dot(x, y), slopes, 0.5 * dot(apart, apart)


class _Problem:
    """Least of F over a box of angles under c_l >= 0; F = 1 - cos(angle to u), or cos² of the line angle."""

    def __init__(self, chain: ChainBox, u: Array, v: Array, cones: tuple[Cone, ...], what: str) -> None:
        self.chain, self.square = chain, what == "square"
        self.largest = np.pi / 2 if self.square else np.pi
        self.quantity = _Form(chain, u, v)
        self.constraints: list[tuple[_Form, float, float]] = []  # sign * g - limit >= 0
        slack: list[float] = []
        for cone in cones:
            form = _Form(chain, cone.reference_axis, cone.body_axis)
            if cone.farthest < np.pi:
                self.constraints.append((form, 1.0, float(np.cos(cone.farthest))))
                slack.append(_cosine_slack(cone.farthest))
            if cone.nearest > 0.0:
                self.constraints.append((form, -1.0, -float(np.cos(cone.nearest))))
                slack.append(_cosine_slack(cone.nearest))
        self.allowed = -np.array(slack)[:, None]
        single = self.quantity.second
        pairwise = 2.0 * (np.outer(self.quantity.first, self.quantity.first) + single)
        self.curve = pairwise if self.square else single

    def value(self, angles: Array) -> tuple[Array, Array]:
        """F (n,) and its derivatives (3, n)."""
        f, slopes, gap = self.quantity.at(angles)
        return (f * f, 2.0 * f * slopes) if self.square else (gap, -slopes)

    def to_angle(self, F: Array) -> Array:
        """The angle that belongs to F: to u, or the right angle's complement of the line angle."""
        if self.square:
            return np.arcsin(np.sqrt(np.clip(F, 0.0, 1.0)))
        return 2.0 * np.arcsin(np.sqrt(np.clip(0.5 * F, 0.0, 1.0)))

    def slack(self, angles: Array) -> tuple[Array, Array]:
        """Constraints c (L, n), allowed where not negative, and derivatives (L, 3, n)."""
        values, slopes = [], []
        for form, sign, limit in self.constraints:
            g, slope, _ = form.at(angles)
            values.append(sign * g - limit)
            slopes.append(sign * slope)
        return np.stack(values), np.stack(slopes)

    def bound_below(self, known: tuple[Array, float] | None) -> Callable[[Cells], Bounds]:
        """The bound for `least_value`; `known` is an allowed point to start from."""

        def bound(cells: Cells) -> Bounds:
            found = self.bound(cells)
            if known is not None and len(found.value) and known[1] < found.value.min():
                found.value[0], found.at[:, 0] = known[1], known[0]
            return found

        return bound

    def bound(self, cells: Cells) -> Bounds:
        """Proven lower bound over each cell (inf where no attitude of it is allowed) and value at allowed centres."""
        F, slopes = self.value(cells.centre)
        c, c_slopes = self.slack(cells.centre)
        rest = 0.5 * np.einsum("ij,in,jn->n", self.curve, cells.half, cells.half)
        c_rest = np.stack(
            [0.5 * np.einsum("ij,in,jn->n", form.second, cells.half, cells.half) for form, _, _ in self.constraints]
        )
        highest = c + np.einsum("lin,in->ln", np.abs(c_slopes), cells.half) + c_rest + _ROUNDING
        best = self._bound_with(F, slopes, rest, cells.half)
        for chosen in self._choices():
            weights = _multipliers(slopes, c_slopes[chosen], cells.half)
            moved = F - (weights * c[chosen]).sum(axis=0)
            tilt = slopes - np.einsum("ln,lin->in", weights, c_slopes[chosen])
            best = np.maximum(
                best, self._bound_with(moved, tilt, rest + (weights * c_rest[chosen]).sum(axis=0), cells.half)
            )
        lower = np.where((highest < 0.0).any(axis=0), np.inf, self.to_angle(best))
        allowed = (c >= self.allowed).all(axis=0)
        value = np.where(allowed, self.to_angle(F), np.inf)
        bends = np.stack([form.second @ cells.half for form, _, _ in self.constraints])
        urge = cells.half * (np.abs(slopes) + self.curve @ cells.half + (np.abs(c_slopes) + bends).max(axis=0))
        return Bounds(lower, value, cells.centre.copy(), urge, cells)

    def _choices(self) -> list[list[int]]:
        """Which constraints get multipliers: one or two at a time."""
        every = range(len(self.constraints))
        return [[n] for n in every] + [list(pair) for pair in combinations(every, 2)]

    @staticmethod
    def _bound_with(F: Array, slopes: Array, rest: Array, half: Array) -> Array:
        return F - (np.abs(slopes) * half).sum(axis=0) - rest - _ROUNDING

    def polished_start(self, probe: Bracket) -> tuple[Array, float] | None:
        """A good allowed point by local searches from a first search's best point and from a coarse grid."""
        ends = zip(self.chain.low, self.chain.high, strict=True)
        grid = np.stack(np.meshgrid(*(np.linspace(*end, 13) for end in ends), indexing="ij")).reshape(3, -1)
        c, _ = self.slack(grid)
        F, _ = self.value(grid)
        starts = [grid[:, n] for n in np.argsort(F + 10.0 * np.maximum(-c, 0.0).sum(axis=0))[:3]]
        found = [self.polish(start) for start in starts + ([probe.at] if len(probe.at) else [])]
        points = [point for point in found if point is not None]
        if np.isfinite(probe.hi):
            points.append((probe.at, probe.hi))
        return min(points, key=lambda point: point[1]) if points else None

    def polish(self, start: Array) -> tuple[Array, float] | None:
        """A local search under the constraints; None unless it ends at an allowed point."""
        from scipy.optimize import minimize

        limits: Any = [
            {
                "type": "ineq",
                "fun": lambda t, n=n: float(self.slack(t[:, None])[0][n, 0]),
                "jac": lambda t, n=n: self.slack(t[:, None])[1][n, :, 0],
            }
            for n in range(len(self.constraints))
        ]
        box = list(zip(self.chain.low, self.chain.high, strict=True))
        solve: Any = minimize
        result = solve(
            lambda t: float(self.value(t[:, None])[0][0]),
            start,
            jac=lambda t: self.value(t[:, None])[1][:, 0],
            bounds=box,
            constraints=limits,
            method="SLSQP",
            options={"maxiter": 40, "ftol": 1e-14},
        )
        at = np.clip(result.x, self.chain.low, self.chain.high)
        c, _ = self.slack(at[:, None])
        if not (np.isfinite(at).all() and (c >= self.allowed).all()):
            return None
        return at, float(self.to_angle(self.value(at[:, None])[0])[0])


def _cosine_slack(angle: float) -> float:
    """What FEASIBLE is in the cosine at an angle."""
    return float(FEASIBLE * np.sin(angle) + 0.5 * FEASIBLE**2)


def _multipliers(slopes: Array, c_slopes: Array, half: Array) -> Array:
    """Multipliers (L, n) >= 0 that balance the slopes in the cell's own measure; least squares, then clipped."""
    scaled, target = c_slopes * half, slopes * half
    if len(scaled) == 1:
        size = (scaled[0] ** 2).sum(axis=0)
        return np.maximum((scaled[0] * target).sum(axis=0) / np.where(size > 0.0, size, np.inf), 0.0)[None]
    a, b = (scaled[0] ** 2).sum(axis=0), (scaled[1] ** 2).sum(axis=0)
    m = (scaled[0] * scaled[1]).sum(axis=0)
    s, t = (scaled[0] * target).sum(axis=0), (scaled[1] * target).sum(axis=0)
    det = a * b - m * m
    safe = np.where(det > 1e-12 * a * b, det, np.inf)
    return np.maximum(np.stack([(s * b - t * m) / safe, (t * a - s * m) / safe]), 0.0)
