"""All joint angles that give an attitude (three axes) or a direction (two axes), for axes in any directions.

With l12, l23 the angles between neighbouring axes and d = angle(n1, R n3), spherical trigonometry gives
  reachable      |l12 - l23| <= d <= pi - |pi - l12 - l23|
  sin^2(V/2)     = sin((d + e)/2) sin((d - e)/2) / (sin l12 sin l23),     e = l23 - l12
  cos^2(V/2)     = sin((s + d)/2) sin((s - d)/2) / (sin l12 sin l23),     s = l12 + l23
  middle angle   azimuth that carries n3 onto n1 about n2, plus or minus V
so there are two solutions, one where V is 0 or pi (the singular set). Pointing a direction with two axes is the same
problem with the boresight in place of n3. No inverse trigonometric function is taken before the end: half-angle sines
come from chords, so nothing is lost near the singular set.

Sources: PIOVAN-BULLO-2012 (reachable set of three general axes), DAVENPORT-1973 (all attitudes only with right
neighbour angles). Angles in rad.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.limits import SINGULAR
from trunnion.hardware.vectors import Array, angle_between, azimuth, perpendicular, unit

_BLOCK = 8192  # attitudes worked on at a time: the working set then stays in the processor's cache


@dataclass(frozen=True, eq=False)
class Solutions:
    """Joint solutions of N attitudes or directions.

    angles (..., 2, k) rad in [-pi, pi], the two solutions apart by the sign of V; equal at the singular set.
    clearance (...) rad: rotation angle to the singular set, negative by how far the target is out of reach (the
    angles are then those of the nearest attitude the chain does reach). outer_axes_angle (...) rad: d.
    """

    angles: Array
    clearance: Array
    outer_axes_angle: Array

    @property
    def reachable(self) -> NDArray[np.bool_]:
        """True (...) where the chain gives the target exactly."""
        return self.clearance >= -SINGULAR


class _Triangle:
    """Constants of three axes n1, n2, n3 in a basis whose third axis is n1."""

    def __init__(self, n1: Array, n2: Array, n3: Array) -> None:
        l12, l23 = float(angle_between(n1, n2)), float(angle_between(n2, n3))
        self.e, self.s = l23 - l12, l12 + l23
        self.n1, self.n3 = n1, n3
        self.basis = np.column_stack([e1 := perpendicular(n1), np.cross(n1, e1), n1])
        middle = float(azimuth(n2, n3, n1))
        self.cos_middle, self.sin_middle = np.cos(middle), np.sin(middle)
        self.turned_n3 = self._parts(n2, n3)
        self.p = perpendicular(n3)
        self.turned_p = self._parts(n2, self.p)
        self.turned_q = self._parts(n2, np.cross(n3, self.p))

    def _parts(self, n: Array, v: Array) -> Array:
        """Rot(n, t) v = parts[0] + cos t parts[1] + sin t parts[2], rows in the basis."""
        along = (n @ v) * n
        return np.array([along, v - along, np.cross(n, v)]) @ self.basis

    def half_sines(self, w: Array) -> tuple[Array, Array]:
        """sin and cos of d/2 from the chords between w (3, N, in the basis) and plus or minus n1."""
        across = w[0] * w[0] + w[1] * w[1]
        return 0.5 * np.sqrt(across + (w[2] - 1.0) ** 2), 0.5 * np.sqrt(across + (w[2] + 1.0) ** 2)

    def cos_sin_V(self, h: Array, g: Array) -> tuple[Array, Array]:
        """cos V and sin V from sin(d/2) = h and cos(d/2) = g, clamped to the nearest reachable d."""
        ce, se, cs, ss = np.cos(self.e / 2), np.sin(self.e / 2), np.cos(self.s / 2), np.sin(self.s / 2)
        P = (
            np.maximum((h * ce) ** 2 - (g * se) ** 2, 0.0)
            if self.e == 0.0
            else np.maximum((h * ce + g * se) * (h * ce - g * se), 0.0)
        )
        Q = np.maximum((ss * g + cs * h) * (ss * g - cs * h), 0.0)
        whole = P + Q
        return (Q - P) / whole, 2.0 * np.sqrt(P * Q) / whole

    def clearance(self, d: Array) -> Array:
        """Rotation angle (rad) from d to the singular set, negative out of reach."""
        return np.minimum(d - abs(self.e), np.pi - abs(np.pi - self.s) - d)

    def outer_two(self, w: Array, cV: Array, sV: Array) -> tuple[Array, Array, Array, Array]:
        """cos and sin of t1 and t2 for w = R n3 (3, N) in the basis and one sign of V."""
        c2 = self.cos_middle * cV - self.sin_middle * sV
        s2 = self.sin_middle * cV + self.cos_middle * sV
        a, b, c = self.turned_n3
        y0, y1 = a[0] + c2 * b[0] + s2 * c[0], a[1] + c2 * b[1] + s2 * c[1]
        c1, s1 = y0 * w[0] + y1 * w[1], y0 * w[1] - y1 * w[0]
        size = np.sqrt(c1 * c1 + s1 * s1)
        free = size > 1e-30  # d = 0 or pi: the first angle is free and set to zero, the last one takes it all
        size = np.where(free, size, 1.0)
        return np.where(free, c1 / size, 1.0), np.where(free, s1 / size, 0.0), c2, s2

    def last(self, z: Array, c1: Array, s1: Array, c2: Array, s2: Array) -> Array:
        """t3 from the residual rotation, so that the three angles rebuild R: z = R p (3, N) in the basis."""
        back = (c1 * z[0] + s1 * z[1], c1 * z[1] - s1 * z[0], z[2])

        def against(parts: Array) -> Array:
            a, b, c = parts
            return sum(((a[i] + c2 * b[i] + s2 * c[i]) * back[i] for i in range(3)), np.zeros_like(c2))

        return np.arctan2(against(self.turned_q), against(self.turned_p))


def attitude_solutions(chain: GimbalChain, R_gp: ArrayLike) -> Solutions:
    """Both joint solutions of attitudes R_gp (..., 3, 3) for a chain of three axes."""
    if len(chain.joints) != 3:
        raise HardwareError(
            f"chain '{chain.name}' has {len(chain.joints)} axes; an attitude needs three",
            remedy="two axes point a direction (`pointing_solutions`); four have a free choice (`redundancy`)",
        )
    R = np.asarray(R_gp, dtype=float)
    if R.shape[-2:] != (3, 3):
        raise HardwareError(f"attitudes have shape {R.shape}, expected (..., 3, 3)")
    n1, n2, n3 = chain.axes
    triangle = _Triangle(n1, n2, n3)
    zero = chain.R_gp0.T
    flat = np.ascontiguousarray(R).reshape(-1, 9)
    # w = R R0' n3 and z = R R0' p, both in the basis, as one product with the nine entries
    right = np.column_stack([zero @ n3, zero @ triangle.p])
    K = np.einsum("ia,jb->ijba", triangle.basis, right).reshape(9, 6)
    angles, d = np.empty((len(flat), 2, 3)), np.empty(len(flat))
    for start in range(0, len(flat), _BLOCK):
        part = slice(start, min(start + _BLOCK, len(flat)))
        both = np.ascontiguousarray((flat[part] @ K).T)
        h, g = triangle.half_sines(both[:3])
        d[part] = 2.0 * np.arctan2(h, g)
        cV, sV = triangle.cos_sin_V(h, g)
        for k, sign in enumerate((1.0, -1.0)):
            c1, s1, c2, s2 = triangle.outer_two(both[:3], cV, sign * sV)
            angles[part, k, 0] = np.arctan2(s1, c1)
            angles[part, k, 1] = np.arctan2(s2, c2)
            angles[part, k, 2] = triangle.last(both[3:], c1, s1, c2, s2)
    shape = R.shape[:-2]
    return Solutions(angles.reshape(*shape, 2, 3), triangle.clearance(d).reshape(shape), d.reshape(shape))


def pointing_solutions(
    chain: GimbalChain, direction_g: ArrayLike, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)
) -> Solutions:
    """Both joint solutions of a two-axis chain for directions (..., 3) in base components.

    boresight_p: the line to be pointed, payload components (x unless given). Clearance is the angle a direction has
    left to the keyhole's centre line or the edge of the unreachable cone.
    """
    if len(chain.joints) != 2:
        raise HardwareError(
            f"chain '{chain.name}' has {len(chain.joints)} axes; this points with two",
            remedy="three axes leave the turn about the line free: fix it by asking for an attitude",
        )
    target = unit(direction_g, "a direction to point at")
    n1, n2 = chain.axes
    line = chain.R_gp0 @ unit(boresight_p, "the boresight")
    if np.linalg.norm(np.cross(n2, line)) < 1e-9:
        raise HardwareError(
            f"the boresight of chain '{chain.name}' lies along its inner axis, which then does not move it",
            remedy="give the boresight in payload components",
        )
    triangle = _Triangle(n1, n2, line)
    w = np.ascontiguousarray((target.reshape(-1, 3) @ triangle.basis).T)
    h, g = triangle.half_sines(w)
    d = 2.0 * np.arctan2(h, g)
    cV, sV = triangle.cos_sin_V(h, g)
    angles = np.empty((len(d), 2, 2))
    for k, sign in enumerate((1.0, -1.0)):
        c1, s1, c2, s2 = triangle.outer_two(w, cV, sign * sV)
        angles[:, k, 0] = np.arctan2(s1, c1)
        angles[:, k, 1] = np.arctan2(s2, c2)
    shape = target.shape[:-1]
    return Solutions(angles.reshape(*shape, 2, 2), triangle.clearance(d).reshape(shape), d.reshape(shape))


@dataclass(frozen=True)
class ReachableSet:
    """What three axes, or two and a boresight, can reach.

    nearest, farthest (rad): bounds of the angle d between the outer axis and the carried inner one. cone_ahead,
    cone_behind (rad): half angles of the unreachable cones about the outer axis and its opposite. share: part of all
    attitudes (three axes) that is reached, sin l12 sin l23.
    """

    nearest: float
    farthest: float
    cone_ahead: float
    cone_behind: float
    share: float


def reachable_set(chain: GimbalChain, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)) -> ReachableSet:
    """Reachable range of d, the unreachable cones, and the share of attitudes reached (axes only, no travel limits)."""
    l12, l23 = triangle_angles(chain, boresight_p)
    nearest, farthest = abs(l12 - l23), np.pi - abs(np.pi - l12 - l23)
    return ReachableSet(nearest, farthest, nearest, np.pi - farthest, float(np.sin(l12) * np.sin(l23)))


def triangle_angles(chain: GimbalChain, boresight_p: ArrayLike) -> tuple[float, float]:
    """The two sides l12 and l23 (rad) the chain fixes: outer to middle axis, middle axis to the inner one or the
    line.
    """
    axes = chain.axes
    third = axes[2] if len(axes) >= 3 else chain.R_gp0 @ unit(boresight_p)
    return float(angle_between(axes[0], axes[1])), float(angle_between(axes[1], third))


@dataclass(frozen=True)
class ClearanceRange:
    """Certified range (rad) of the clearance to the singular set over a region; negative: something is out of reach."""

    least: float
    largest: float


def clearance_over(
    chain: GimbalChain, nearest: float, farthest: float, *, boresight_p: ArrayLike = (1.0, 0.0, 0.0)
) -> ClearanceRange:
    """Clearance when d is known to lie in [nearest, farthest] (rad), and as certain as those two bounds.

    For a platform held at R_rp on a host at R_rb, d is the angle between the host's direction n1 and the reference
    direction R_rp n3: a direction clearance of the host's region. The clearance is concave in d, so its least value is
    at an end and its largest at an end or in the middle.
    """
    if not 0.0 <= nearest <= farthest <= np.pi:
        raise HardwareError(
            f"the angle to the outer axis cannot range from {np.degrees(nearest):g} to {np.degrees(farthest):g} deg",
            remedy="0 <= nearest <= farthest <= 180 deg",
        )
    l12, l23 = triangle_angles(chain, boresight_p)
    low, high = abs(l12 - l23), np.pi - abs(np.pi - l12 - l23)
    ends = [min(d - low, high - d) for d in (nearest, farthest)]
    best = min(max((low + high) / 2.0, nearest), farthest)
    return ClearanceRange(min(ends), min(best - low, high - best))


def require_reachable(chain: GimbalChain, solutions: Solutions, *, what: str = "target") -> None:
    """HardwareError for targets out of reach: how far, and what would reach them."""
    beyond = np.atleast_1d(-solutions.clearance)
    worst = int(np.argmax(beyond))
    if beyond.flat[worst] <= SINGULAR:
        return
    d = float(np.atleast_1d(solutions.outer_axes_angle).flat[worst])
    ahead = d < np.pi / 2
    side = "about the outer axis" if ahead else "about the opposite of the outer axis"
    needed = (
        f"at most {np.degrees(d):.4g} deg apart"
        if ahead
        else f"summing to within {np.degrees(np.pi - d):.4g} deg of 180"
    )
    raise HardwareError(
        f"{what} {worst} is out of reach of chain '{chain.name}' by {np.degrees(beyond.flat[worst]):.4g} deg: it lies "
        f"in the unreachable cone {side}",
        remedy=f"the two neighbour angles would have to be {needed} (right angles reach everything), or the base "
        "tilted "
        f"by {np.degrees(beyond.flat[worst]):.4g} deg",
    )
