"""Pointing budgets: mount, sensor, thermal, timing and structural terms against a requirement.

Arithmetic sum and root sum square side by side, and the summation rules of ECSS-E-ST-60-10C: means add, fully
correlated standard deviations add, uncorrelated ones add in squares, and |mean| + n sigma must stay within the limit.
Source: ECSS-E-ST-60-10C (15 November 2008) with its annex C example. Angles in rad.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from trunnion.errors import HardwareError
from trunnion.hardware.mounts import MountTolerance
from trunnion.hardware.vectors import Array


@dataclass(frozen=True)
class Spread:
    """How one term is distributed on one axis: mean, standard deviation, and the largest value it is said to reach.

    bound is inf for a distribution without an end; the arithmetic sum then takes |mean| + n sigma.
    """

    mean: float
    sigma: float
    bound: float = float("inf")

    @property
    def rms(self) -> float:
        """Root mean square about zero."""
        return float(np.hypot(self.mean, self.sigma))

    def largest(self, n_sigma: float) -> float:
        """What the arithmetic sum counts: the bound, or |mean| + n sigma where there is none."""
        return min(self.bound, abs(self.mean) + n_sigma * self.sigma)


def gaussian(mean: float, sigma: float) -> Spread:
    """Normal distribution."""
    return Spread(mean, _not_negative(sigma, "a standard deviation"))


def uniform(lowest: float, highest: float) -> Spread:
    """Equally likely between two ends: sigma = width / sqrt(12)."""
    if highest < lowest:
        raise HardwareError(f"a uniform term runs from {lowest:g} down to {highest:g}", remedy="lower end first")
    return Spread((lowest + highest) / 2.0, (highest - lowest) / np.sqrt(12.0), max(abs(lowest), abs(highest)))


def sinusoid(amplitude: float) -> Spread:
    """A sine of unknown phase: sigma = amplitude / sqrt(2)."""
    return Spread(0.0, _not_negative(amplitude, "an amplitude") / np.sqrt(2.0), amplitude)


def bounded(largest: float) -> Spread:
    """Known only to lie within plus or minus `largest`, wherever: counted as uniform in squares, fully in the sum."""
    return uniform(-_not_negative(largest, "a bound"), largest)


def _not_negative(value: float, what: str) -> float:
    if not np.isfinite(value) or value < 0.0:
        raise HardwareError(f"{what} is {value:g}", remedy="give a finite number >= 0")
    return float(value)


def timing_error(relative_rate: float, time_error: float) -> float:
    """Attitude error (rad) of a time error (s) at a relative rate (rad/s): their product."""
    return abs(relative_rate) * abs(time_error)


@dataclass(frozen=True)
class Term:
    """One contributor: name, kind (mount, sensor, thermal, timing, structural, …), source, and its spread per axis.

    correlated: terms that bear the same mark add linearly (fully correlated); None means independent. counts_in: the
    error indices it enters (absolute, relative, … performance or knowledge error, as the requirement names them).
    """

    name: str
    kind: str
    source: str
    spreads: tuple[Spread, ...]
    correlated: str | None = None
    counts_in: tuple[str, ...] = ("APE",)


def mount_term(name: str, tolerance: MountTolerance, source: str, *, counts_in: tuple[str, ...] = ("APE",)) -> Term:
    """The three-axis term (sensor axes) of a mount's tolerance: its covariance, else its per-axis or total bounds."""
    if tolerance.covariance is not None:
        spreads = tuple(gaussian(0.0, float(np.sqrt(v))) for v in np.diag(tolerance.covariance))
    elif tolerance.per_axis is not None:
        spreads = tuple(bounded(b) for b in tolerance.per_axis)
    elif tolerance.total is not None:
        spreads = (bounded(tolerance.total),) * 3
    else:
        raise HardwareError(f"budget term '{name}': the mount states no tolerance")
    return Term(name, "mount", source, spreads, counts_in=counts_in)


def timing_term(
    name: str, relative_rate: Sequence[float], time_error: float, source: str, *, counts_in: tuple[str, ...] = ("APE",)
) -> Term:
    """The term of a time error (s) at the relative rates (rad/s) about each axis: bounds rate x time."""
    spreads = tuple(bounded(timing_error(rate, time_error)) for rate in relative_rate)
    return Term(name, "timing", source, spreads, counts_in=counts_in)


@dataclass(frozen=True, eq=False)
class BudgetTotal:
    """Sums per axis (rad): mean, sigma (root sum square with correlated groups), arithmetic sum, |mean| + n sigma,
    the limit and whether it is met (within); directional: the same for the turn of a line across two axes.
    """

    index: str
    axes: tuple[str, ...]
    mean: Array
    sigma: Array
    arithmetic: Array
    total: Array
    limit: Array | None
    within: tuple[bool, ...] | None
    n_sigma: float


@dataclass(frozen=True)
class Budget:
    """A list of terms on named axes. Every term must say its source."""

    axes: tuple[str, ...]
    terms: tuple[Term, ...] = field(default=())

    def __post_init__(self) -> None:
        for term in self.terms:
            if len(term.spreads) != len(self.axes):
                raise HardwareError(
                    f"budget term '{term.name}' has {len(term.spreads)} values for {len(self.axes)} axes"
                )
            if not term.source.strip():
                raise HardwareError(f"budget term '{term.name}' has no source", remedy="say where the number is from")

    def total(self, index: str = "APE", *, n_sigma: float = 2.0, limit: ArrayLike | None = None) -> BudgetTotal:
        """Sum the terms that count in `index`; limit (one number or one per axis, rad, above zero)."""
        used = [term for term in self.terms if index in term.counts_in]
        if not used:
            raise HardwareError(f"no budget term counts in {index}", remedy="mark the terms that enter this index")
        mean = np.array([[s.mean for s in term.spreads] for term in used]).sum(axis=0)
        sigma = _combine(used, len(self.axes))
        total = np.abs(mean) + n_sigma * sigma
        bound = None if limit is None else _limit(limit, len(self.axes))
        return BudgetTotal(
            index,
            self.axes,
            mean,
            sigma,
            np.array([[s.largest(n_sigma) for s in term.spreads] for term in used]).sum(axis=0),
            total,
            bound,
            None if bound is None else tuple(bool(t <= b) for t, b in zip(total, bound, strict=True)),
            n_sigma,
        )

    def shares(self, index: str = "APE") -> Mapping[str, Array]:
        """Each term's share of the summed variance per axis (independent terms), for the budget bars."""
        used = [term for term in self.terms if index in term.counts_in]
        variance = {term.name: np.array([s.sigma**2 for s in term.spreads]) for term in used}
        whole = np.sum(list(variance.values()), axis=0)
        return {name: v / np.where(whole > 0.0, whole, 1.0) for name, v in variance.items()}


def _combine(terms: Sequence[Term], axes: int) -> Array:
    groups: dict[str, Array] = {}
    for k, term in enumerate(terms):
        mark = f"group {term.correlated}" if term.correlated else f"alone {k}"
        groups[mark] = groups.get(mark, np.zeros(axes)) + np.array([s.sigma for s in term.spreads])
    return np.sqrt(np.sum(np.square(list(groups.values())), axis=0))


def _limit(limit: ArrayLike, axes: int) -> Array:
    bound = np.broadcast_to(np.asarray(limit, dtype=float), (axes,))
    if np.any(bound <= 0.0) or not np.all(np.isfinite(bound)):
        raise HardwareError("a pointing limit is zero or below", remedy="give a limit above zero")
    return bound


def directional_total(total: BudgetTotal, one: str, other: str, *, n_sigma: float | None = None) -> float:
    """Error (rad) of a line square to two axes: root of the summed squares of means and of sigmas.

    sqrt(mean_1^2 + mean_2^2) + n sqrt(sigma_1^2 + sigma_2^2), n as in the total unless given (see `rayleigh_factor`).
    """
    a, b = total.axes.index(one), total.axes.index(other)
    n = total.n_sigma if n_sigma is None else n_sigma
    return float(np.hypot(total.mean[a], total.mean[b]) + n * np.hypot(total.sigma[a], total.sigma[b]))


def rayleigh_factor(probability: float) -> float:
    """Factor on the common sigma of two equal independent normal axes that holds with `probability`.

    sqrt(-2 ln(1 - P)); the cautious factor is n sqrt(2). Source: ECSS-E-ST-60-10C.
    """
    if not 0.0 < probability < 1.0:
        raise HardwareError(f"probability {probability:g} is not between 0 and 1")
    return float(np.sqrt(-2.0 * np.log1p(-probability)))
