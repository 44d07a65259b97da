"""Joint rates and accelerations: at given angles exactly, and over a range of clearance as certified bounds.

Letters: `g` base, `p` payload. With the present axes a1, a2, a3 (base components) the payload turns at w_gp_g = a1 t1'
+ a2 t2' + a3 t3', and the determinant of that matrix is sin l12 sin l23 sin V: zero at the singular set. A two-axis
mount moves its line b by b' = w x b. Rates in rad/s, accelerations in rad/s^2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import clearance_over, triangle_angles
from trunnion.hardware.vectors import Array, dot, unit


def attitude_rates(chain: GimbalChain, angles: ArrayLike, w_gp_g: ArrayLike) -> Array:
    """Joint rates (..., k) for the payload's turning rate w_gp_g (..., 3) against the base, base components.

    Three axes: the only solution, infinite at the singular set. Four: the one of least sum of squares.
    """
    A = chain.axes_at(angles)
    w = np.asarray(w_gp_g, dtype=float)
    if A.shape[-1] == 3:
        determinant = np.linalg.det(A)
        safe = np.abs(determinant) > 1e-300
        rates = np.full((*np.broadcast_shapes(A.shape[:-2], w.shape[:-1]), 3), np.inf)
        A, w = np.broadcast_to(A, (*rates.shape[:-1], 3, 3)), np.broadcast_to(w, rates.shape)
        safe = np.broadcast_to(safe, rates.shape[:-1])
        rates[safe] = np.linalg.solve(A[safe], w[safe][..., None])[..., 0]
        return rates
    if A.shape[-1] == 4:
        return np.einsum("...ij,...j->...i", np.linalg.pinv(A), w)
    raise HardwareError("two axes cannot follow an attitude", remedy="use `pointing_rates` for a direction")


def pointing_rates(chain: GimbalChain, angles: ArrayLike, direction_g: ArrayLike, change_g: ArrayLike) -> Array:
    """Rates (..., 2) of a two-axis mount whose line follows direction_g (..., 3) changing by change_g (..., 3) 1/s."""
    A = chain.axes_at(angles)
    b = unit(direction_g)
    a1, a2 = A[..., 0], A[..., 1]
    change = np.asarray(change_g, dtype=float)
    determinant = dot(a1, np.cross(a2, b))
    with np.errstate(divide="ignore", invalid="ignore"):
        outer = -dot(change, a2) / determinant
        inner = dot(change, a1) / determinant
    return np.stack([outer, inner], axis=-1)


@dataclass(frozen=True, eq=False)
class JointRateBounds:
    """Certified largest joint rates (k,) rad/s and accelerations (k,) rad/s^2, with the limits and what is left.

    acceleration is None when no angular acceleration was stated.
    """

    rate: Array
    acceleration: Array | None
    rate_limit: Array
    acceleration_limit: Array

    @property
    def within(self) -> bool:
        """True when every bound stays at or below its limit."""
        fits = bool(np.all(self.rate <= self.rate_limit))
        return fits and (self.acceleration is None or bool(np.all(self.acceleration <= self.acceleration_limit)))


def largest_joint_rates(
    chain: GimbalChain,
    rate: float,
    nearest: float,
    farthest: float,
    *,
    acceleration: float | None = None,
    boresight_p: ArrayLike = (1.0, 0.0, 0.0),
) -> JointRateBounds:
    """Largest joint rates while d lies in [nearest, farthest] and the payload turns at up to `rate` against the base.

    Three axes: w / (sin l12 sin V), w sin d / (sin l12 sin l23 sin V), w / (sin l23 sin V). Two axes and a line that
    moves across the base at up to `rate`: the first two. acceleration: bound of the payload's angular acceleration
    (three axes only). Infinite when the range touches the singular set.
    """
    if not np.isfinite(rate) or rate < 0.0:
        raise HardwareError(f"a turning rate of {rate:g} rad/s", remedy="give a finite rate >= 0")
    gains, sine_d = _largest_gains(chain, nearest, farthest, boresight_p)
    used = gains[: len(chain.joints)]
    bound = None
    if acceleration is not None and len(chain.joints) == 3:
        r = rate * gains
        sines = np.sin(chain.neighbour_angles)
        with np.errstate(invalid="ignore"):
            coupling = r[0] * r[1] * sines[0] + r[1] * r[2] * sines[1] + r[0] * r[2] * sine_d
            bound = np.nan_to_num(gains * (acceleration + coupling), nan=np.inf)
    return JointRateBounds(rate * used, bound, chain.limits("rate"), chain.limits("acceleration"))


def _largest_gains(chain: GimbalChain, nearest: float, farthest: float, boresight_p: ArrayLike) -> tuple[Array, float]:
    """Largest joint rate per unit of payload rate (3,), and the largest sin d, over the range of d."""
    l12, l23 = triangle_angles(chain, boresight_p)
    if clearance_over(chain, nearest, farthest, boresight_p=boresight_p).least <= 0.0:
        return np.full(3, np.inf), 1.0
    c, s = np.cos(l12) * np.cos(l23), np.sin(l12) * np.sin(l23)

    def sine_V(d: float) -> float:
        e, sigma = l23 - l12, l12 + l23
        P = np.sin((d + e) / 2) * np.sin((d - e) / 2)
        Q = np.sin((sigma + d) / 2) * np.sin((sigma - d) / 2)
        return float(2.0 * np.sqrt(max(P, 0.0) * max(Q, 0.0)) / s)

    least = min(sine_V(nearest), sine_V(farthest))
    candidates = [nearest, farthest]
    # stationary points of sin d / sin V in x = cos d: c x^2 - (1 + c^2 - s^2) x + c = 0
    for x in np.roots([c, -(1 + c * c - s * s), c]) if abs(c) > 1e-15 else [0.0]:
        if abs(np.imag(x)) < 1e-12 and abs(np.real(x)) <= 1.0 and nearest < np.arccos(np.real(x)) < farthest:
            candidates.append(float(np.arccos(np.real(x))))
    middle = max(np.sin(d) / (s * sine_V(d)) for d in candidates)
    largest_sine = 1.0 if nearest <= np.pi / 2 <= farthest else max(np.sin(nearest), np.sin(farthest))
    gains = np.array([1.0 / (np.sin(l12) * least), middle, 1.0 / (np.sin(l23) * least)])
    return gains, float(largest_sine)


def clearance_needed(chain: GimbalChain, rate: float, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)) -> float:
    """Clearance (rad) below which an outer joint would exceed its rate limit for a payload rate (rad/s).

    Right neighbour angles: asin(rate / limit). Otherwise from sin V. pi/2 or more means the limit never suffices.
    """
    l12, l23 = triangle_angles(chain, boresight_p)
    limits = chain.limits("rate")
    sines = [rate / (limits[0] * np.sin(l12))]
    if len(chain.joints) == 3:
        sines.append(rate / (limits[2] * np.sin(l23)))
    needed = max(sines)
    if needed >= 1.0:
        return float(np.pi / 2)
    V = float(np.arcsin(needed))
    c, s = np.cos(l12) * np.cos(l23), np.sin(l12) * np.sin(l23)
    low, high = abs(l12 - l23), np.pi - abs(np.pi - l12 - l23)
    near = np.arccos(np.clip(c + s * np.cos(V), -1, 1)) - low
    far = high - np.arccos(np.clip(c - s * np.cos(V), -1, 1))
    return float(max(near, far))


@dataclass(frozen=True)
class KeepOut:
    """Middle-axis keep-out before lock (rad): what the axis still travels while the operator reacts and it stops.

    alarm (rad): middle angle counted from its free centre at which to warn. Common practice, no source.
    """

    keep_out: float
    alarm: float
    reaction: float
    stopping: float


def middle_axis_keep_out(
    rate: float, reaction_time: float, *, acceleration: float | None = None, hard_margin: float = 0.0
) -> KeepOut:
    """Keep-out and alarm of the middle axis of a right-angled chain (common practice, no source).

    rate (rad/s) towards lock, reaction_time (s), acceleration (rad/s^2) for stopping, hard_margin (rad) that must
    remain. The axis is taken to lock a quarter turn from its centre.
    """
    if min(rate, reaction_time, hard_margin) < 0.0 or (acceleration is not None and acceleration <= 0.0):
        raise HardwareError("a keep-out needs a rate, reaction time and margin >= 0 and an acceleration > 0")
    reaction = rate * reaction_time
    stopping = 0.0 if acceleration is None else rate**2 / (2.0 * acceleration)
    keep_out = hard_margin + reaction + stopping
    return KeepOut(keep_out, np.pi / 2 - keep_out, reaction, stopping)
