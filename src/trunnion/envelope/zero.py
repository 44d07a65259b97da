"""Where zero should be: the constant rotation that maximizes the least lock margin over a region.

R_rb = left E right locks when R_rb v lies along ±u, with u fixed by `left` and v by `right`. A new constant on the
reference side moves only u, one on the body side only v; a turn about u (or v) changes nothing, and is used to stay as
near as possible to the present zero. So there are two-parameter problems only: find the line farthest from all R v
(reference side) or from all R^T u (body side).

For listed attitudes the answer is exact. For regions the same exchange runs with the closed-form minimum as its test:
the optimum over the attitudes collected so far bounds the truth from above, the closed form of the region from below,
and the attitude where it is taken is added. The gap left is stated.
"""

from __future__ import annotations

import enum
from dataclasses import dataclass, replace

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.attitude.rotations import about, rotation_angle
from trunnion.envelope.farthest import facets, farthest_line, flat_normal, line_margin
from trunnion.envelope.margins import lock_margin, ranges_of, spread_of
from trunnion.envelope.regions import Poses, Region
from trunnion.envelope.results import LARGEST_ANGLE, LEAST_ANGLE, LEAST_LINE, MarginRange, Spread
from trunnion.envelope.sampling import sample_region
from trunnion.envelope.vectors import Array
from trunnion.errors import RegionError

_HARDLY_FARTHER = np.radians(1.0)


ROUNDS_A_SECOND = 30
"""Rounds of the exchange counted as one second of work; an idle core of today does somewhat more."""


class Side(enum.Enum):
    """On which side the constant is put."""

    REFERENCE = "reference side"
    BODY = "body side"


@dataclass(frozen=True, eq=False)
class ZeroChoice:
    """A choice of zero and what it guarantees.

    convention: the present one with its constant replaced; turn (rad): rotation from the present constant. margin: the
    range over the region by the closed form. upper (rad): no constant on this side can give more; gap = upper minus the
    guaranteed least. finished: the gap is as small as asked for. equals: how many lines were found equally good.
    loss (rad per rad): margin lost per small turn of the lock line, mildest and worst way.
    """

    side: Side
    convention: Convention
    direction: Array
    turn: float
    margin: MarginRange
    upper: float
    gap: float
    finished: bool
    rounds: int
    equals: int
    loss: tuple[float, float]


def best_zero(
    region: Region,
    convention: Convention,
    side: Side,
    *,
    gap: float = np.radians(0.01),
    seconds: float = 2.0,
) -> ZeroChoice:
    """The best constant on one side, any rotation allowed; exact for listed attitudes, else to a stated gap.

    Stops after the work of nominal `seconds` in any case: rounds are counted, never the clock, so that the same
    input gives the same answer on every machine. An upper bound that creeps towards zero means that the region leads
    the axis along every direction: then no constant helps, and the upper bound says how little any could.
    """
    problem = _Problem(region, convention, side)
    if isinstance(region, Poses):
        found = farthest_line(problem.points(region.matrices))
        upper = max(found.margin - region.radius, 0.0)
        return problem.choice(found.equals, upper, 1, gap)
    return problem.exchange(gap, seconds)


def best_right_angle_zero(region: Region, convention: Convention, side: Side) -> list[ZeroChoice]:
    """The constants reached from the present one by the 24 right-angle turns of the chain's own axes, best first.

    They only permute the axes up to sign, so they can do no better than choosing among the twelve sequences; but they
    keep the familiar axis names. Each line is served by eight of the 24; the one with the smallest turn is given.
    """
    problem = _Problem(region, convention, side)
    options: dict[int, tuple[float, Array]] = {}
    for Q in right_angle_rotations():
        constant = convention.left @ Q if side is Side.REFERENCE else Q @ convention.right
        turn = float(rotation_angle(constant, problem.present))
        line = int(np.argmax(np.abs(Q[:, problem.axis] if side is Side.REFERENCE else Q[problem.axis])))
        if line not in options or turn < options[line][0] - 1e-12:
            options[line] = (turn, constant)
    choices = [problem.with_constant(constant) for _, constant in options.values()]
    best = max(choice.margin.least.lo for choice in choices)
    choices = [replace(c, upper=best, gap=best - c.margin.least.lo) for c in choices]
    return sorted(choices, key=lambda c: (-round(c.margin.least.lo, 12), c.turn))


class _Problem:
    """One side of one convention over one region."""

    def __init__(self, region: Region, convention: Convention, side: Side) -> None:
        self.region, self.convention, self.side = region, convention, side
        self.u, self.v = convention.lock_axes
        on_reference = side is Side.REFERENCE
        self.now = self.u if on_reference else self.v
        self.present = np.asarray(convention.left if on_reference else convention.right)
        wanted = self.present[:, None] if on_reference else self.present.T[:, None]
        self.axis = int(np.argmax(np.abs(np.einsum("ixj,i->j", wanted, self.now))))

    def points(self, matrices: Array) -> Array:
        """Directions (N, 3) the lock line has to stay away from."""
        return matrices @ self.v if self.side is Side.REFERENCE else np.swapaxes(matrices, -1, -2) @ self.u

    def spread(self, directions: Array) -> Spread:
        """Closed-form extremes for candidate lock directions (M, 3)."""
        return spread_of(self.region, *self._pairs(directions))

    def _pairs(self, directions: Array) -> tuple[Array, Array]:
        candidates, count = directions.T.copy(), len(directions)
        fixed = np.repeat((self.v if self.side is Side.REFERENCE else self.u)[:, None], count, axis=1)
        return (candidates, fixed) if self.side is Side.REFERENCE else (fixed, candidates)

    def exchange(self, gap: float, seconds: float) -> ZeroChoice:
        """Cutting attitudes until upper and lower bound meet to `gap`, and on as long as that goes quickly."""
        found = _Tried()
        points, upper, rounds = self._start(), np.pi / 2, 0
        axes = self.present.T if self.side is Side.REFERENCE else self.present
        while not _enough(upper - found.best, gap, rounds / ROUNDS_A_SECOND, seconds):
            left_over = upper - max(found.best, 0.0)
            normals, upper_now, points = _optimal_lines(points, left_over)
            upper = min(upper, upper_now)
            around = _around(normals[0], max(upper - max(found.best, 0.0), 1e-7))
            candidates = np.concatenate([normals[:24], around, *([] if rounds else [axes])])
            spread = self.spread(candidates)
            found.add(candidates, spread.lo[LEAST_LINE])
            points = np.concatenate([points, self._cuts(spread, upper)])
            rounds += 1
        slack = max(upper - found.best, 1e-9)
        equals = self._more_equals(found.within(slack), found.best - slack)
        return self.choice(equals, max(upper, found.best), rounds, gap)

    def _start(self) -> Array:
        """A few attitudes to start from: witnesses for the axes and the present direction."""
        spread = self.spread(np.concatenate([np.eye(3), self.now[None], _around(self.now, 0.8)]))
        return self._cuts(spread, np.pi)

    def _cuts(self, spread: Spread, below: float) -> Array:
        """Directions at the witnesses that are nearer to a candidate line than the upper bound."""
        found = []
        for which in (LEAST_ANGLE, LARGEST_ANGLE):
            angle = spread.hi[which] if which == LEAST_ANGLE else np.pi - spread.lo[which]
            matrices = spread.matrices[which][angle <= below + 1e-12]
            found.append(self.points(matrices[np.isfinite(matrices).all(axis=(1, 2))]))
        return np.concatenate(found)

    def _more_equals(self, good: Array, least: float) -> Array:
        """Also try lines between the present one and the good ones: among equals the nearest is wanted."""
        nearest = good[np.argsort(-np.abs(good @ self.now))[:16]]
        more = [nearest]
        for line in nearest[:4]:
            toward = self.now if line @ self.now >= 0.0 else -self.now
            steps = np.linspace(0.0, 1.0, 17)[1:, None]
            blend = (1.0 - steps) * line + steps * toward
            more.append(blend / np.linalg.norm(blend, axis=1)[:, None])
        candidates = np.concatenate(more)
        return candidates[self.spread(candidates).lo[LEAST_LINE] >= least]

    def choice(self, equals: Array, upper: float, rounds: int, gap: float) -> ZeroChoice:
        """The nearest to the present zero among equally good lines."""
        direction = self._nearest(equals)
        turn = shortest_turn(self.now, direction)
        constant = turn @ self.present if self.side is Side.REFERENCE else self.present @ turn.T
        made = self.with_constant(constant)
        left_over = max(upper - made.margin.least.lo, 0.0)
        return replace(
            made, upper=upper, gap=left_over, finished=left_over <= gap + 1e-12, rounds=rounds, equals=len(equals)
        )

    def _nearest(self, equals: Array) -> Array:
        """The line nearest to the present one; a chain axis if one is hardly farther, since it is easier to say."""
        closeness = np.round(np.abs(equals @ self.now), 12)
        nearest = equals[int(np.argmax(closeness))]
        axes = self.present.T if self.side is Side.REFERENCE else self.present
        along_axis = np.abs(equals @ axes.T).max(axis=1) > 1.0 - 1e-14
        turns = np.arccos(np.clip(closeness, 0.0, 1.0))
        easy = along_axis & (turns <= turns.min() + _HARDLY_FARTHER)
        return equals[int(np.argmax(np.where(easy, closeness, -1.0)))] if easy.any() else nearest

    def with_constant(self, constant: Array) -> ZeroChoice:
        """The choice of one constant: its margin over the region and how it falls off around it."""
        if self.side is Side.REFERENCE:
            convention = replace(self.convention, left=constant)
        else:
            convention = replace(self.convention, right=constant)
        u, v = convention.lock_axes
        direction = u if self.side is Side.REFERENCE else v
        margin = lock_margin(self.region, convention)
        return ZeroChoice(
            side=self.side,
            convention=convention,
            direction=direction,
            turn=float(rotation_angle(constant, self.present)),
            margin=margin,
            upper=np.pi / 2,
            gap=np.pi / 2 - margin.least.lo,
            finished=False,
            rounds=0,
            equals=1,
            loss=self._loss(direction, margin.least.lo),
        )

    def _loss(self, direction: Array, margin: float, turn: float = np.radians(0.5)) -> tuple[float, float]:
        """Margin lost per rad when the lock line is turned a little, over 16 ways of turning it."""
        around = _around(direction, turn, 16)
        ranges = ranges_of(self.spread(around), *self._pairs(around), line=True)
        lost = [(margin - r.least.lo) / turn for r in ranges]
        return min(lost), max(lost)


class _Tried:
    """Lines tried so far with their guaranteed margins."""

    def __init__(self) -> None:
        self.best = -1.0
        self.lines: list[Array] = []
        self.margins: list[Array] = []

    def add(self, lines: Array, margins: Array) -> None:
        self.lines.append(lines)
        self.margins.append(margins)
        self.best = max(self.best, float(margins.max()))

    def within(self, slack: float) -> Array:
        return np.concatenate(self.lines)[np.concatenate(self.margins) >= self.best - slack]


def _enough(left_over: float, gap: float, spent: float, seconds: float) -> bool:
    """Half the gap asked for is the goal (choosing the nearest among equals may cost as much again); a hundredth of it
    is taken when a tenth of the time is enough."""
    return left_over <= 0.005 * gap or spent > seconds or (left_over <= 0.5 * gap and spent > 0.1 * seconds)


def _around(direction: Array, turn: float, count: int = 6) -> Array:
    """Directions (count, 3) a small turn away from one, all round."""
    across = np.cross(direction, np.eye(3)[np.argmin(np.abs(direction))])
    across /= np.linalg.norm(across)
    tilted = about(across, min(turn, 0.8)) @ direction
    return about(direction, 2.0 * np.pi * np.arange(count) / count) @ tilted


def _optimal_lines(points: Array, left_over: float) -> tuple[Array, float, Array]:
    """Best lines for the points so far, the first one optimal; the margin they allow; the points that matter.

    Lines within the gap left over are listed too: where the optimum is a whole family, cuts are wanted all along it.
    """
    flat = flat_normal(points)
    if flat is not None:
        return flat[None], np.pi / 2, points
    normals, _, corners = facets(points, within=min(left_over, 0.1), apart=0.5 * np.sqrt(left_over))
    return normals, line_margin(points, normals[0]), points[corners]


def shortest_turn(now: Array, goal: Array) -> Array:
    """The smallest rotation that brings the line of `now` onto the line of `goal`."""
    goal = goal if now @ goal >= 0.0 else -goal
    axis = np.cross(now, goal)
    length = float(np.linalg.norm(axis))
    return np.eye(3) if length < 1e-15 else about(axis, np.arctan2(length, now @ goal))


@dataclass(frozen=True)
class RuleOfThumb:
    """The rule of common practice, checked: is the usual attitude far from lock?

    Three different axes: the usual attitude near zero middle angle (level for an aircraft, straight up for a rocket);
    a repeated axis: near a middle angle of 90 deg. Both say the same: the usual attitude near a right angle to lock.
    Common practice, no source: it looks at one attitude only and proves nothing about the envelope.
    """

    margin: float
    kept: bool

    def statement(self) -> str:
        """The finding in words."""
        verdict = "keeps" if self.kept else "does not keep"
        return (
            f"The usual attitude is {np.degrees(self.margin):.6g} deg from lock (a right angle is best); the choice "
            f"{verdict} the rule of common practice within {np.degrees(RULE_WITHIN):g} deg."
        )


RULE_WITHIN = np.radians(30.0)
"""How near to a right angle the rule of thumb is taken to ask (our reading; the trade gives no number)."""


def rule_of_thumb(convention: Convention, usual_attitude: Array) -> RuleOfThumb:
    """Check the rule for one usual attitude R_rb (3, 3)."""
    margin = float(convention.lock_margin(usual_attitude))
    return RuleOfThumb(margin, margin >= np.pi / 2 - RULE_WITHIN)


def sampled_zero_upper(region: Region, convention: Convention, side: Side, count: int = 4096) -> float:
    """An upper bound (rad) for any constant on one side, from attitudes of the region alone; needs no closed form."""
    problem = _Problem(region, convention, side)
    samples = sample_region(region, count)
    if not len(samples.matrices):
        raise RegionError("no attitude to look at")
    return farthest_line(problem.points(samples.matrices)).margin
