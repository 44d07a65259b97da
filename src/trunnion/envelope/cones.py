"""Cones and annuli: a body axis held between two angles from a reference direction, any roll or limited roll.

Any roll. With mu the angle between the held axis m and v, and R m at angle alpha from d, R v fills the circle of
radius mu about R m; over all azimuths and all alpha in [a1, a2] it fills exactly the directions between `near` and
`far` from d (below). The angle to u, itself at delta from d, then ranges from the distance of delta to that
interval up to pi minus the distance of pi - delta to it.

Limited roll is a box of three angles about d, a perpendicular n, and d again; the closed form of `box` does it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.basis import Basis
from trunnion.envelope.chains import ChainBox
from trunnion.envelope.regions import Cone
from trunnion.envelope.results import Spread, closed_form_ends, connected
from trunnion.envelope.search import sign_change
from trunnion.envelope.vectors import Array, angle_between, cross, dot, triangle_angle, turned


def free_cone_spread(cone: Cone, u: Array, v: Array) -> Spread:
    """Spread of a cone with any roll for pairs u, v (3, M)."""
    count = u.shape[1]
    m = np.broadcast_to(cone.body_axis[:, None], (3, count))
    d = np.broadcast_to(cone.reference_axis[:, None], (3, count))
    a1, a2 = cone.nearest, cone.farthest
    mu, delta = angle_between(m, v), angle_between(d, u)
    near = np.maximum(0.0, np.maximum(mu - a2, a1 - mu))
    far = np.pi - np.maximum(0.0, np.maximum(np.pi - mu - a2, a1 - (np.pi - mu)))
    towards, away = np.clip(delta, near, far), np.clip(np.pi - delta, near, far)
    side = _perpendicular_towards(d, u)

    def poses(pairs: NDArray[np.intp], polar: Array, azimuth: Array) -> Array:
        axis = d[:, pairs]
        goal = np.cos(polar) * axis + np.sin(polar) * turned(axis, azimuth, side[:, pairs])
        return _poses_carrying(v[:, pairs], goal, m[:, pairs], axis, mu[pairs], polar, a1, a2)

    def crossing(pairs: NDArray[np.intp]) -> tuple[Array, Array, list[str]]:
        start, stop = towards[pairs], away[pairs]

        def miss(t: Array) -> Array:
            polar, azimuth = start + t * (stop - start), np.pi * t
            axis = d[:, None, pairs]
            goal = np.cos(polar) * axis + np.sin(polar) * turned(axis, azimuth, side[:, None, pairs])
            return dot(u[:, None, pairs], goal)

        t = sign_change(miss, len(pairs))
        found = poses(pairs, start + t * (stop - start), np.pi * t)
        return found, np.full(len(pairs), np.nan), [_place(cone, R) for R in found]

    every = np.arange(count)
    nearest = poses(every, towards, np.zeros(count))
    farthest = poses(every, away, np.full(count, np.pi))
    return connected(
        closed_form_ends(np.abs(towards - delta), nearest, [_place(cone, R) for R in nearest]),
        closed_form_ends(np.pi - np.abs(np.pi - delta - away), farthest, [_place(cone, R) for R in farthest]),
        crossing,
        Basis.CERTIFIED,
    )


def rolled_cone_box(cone: Cone) -> ChainBox:
    """A cone with limited roll as a box: azimuth about d, tilt about n, roll about the held axis."""
    assert cone.roll is not None
    m, d = cone.body_axis, cone.reference_axis
    n = _any_perpendicular(d[:, None])[:, 0]
    body_zero = cone.roll.body_zero - (cone.roll.body_zero @ m) * m
    body_zero /= np.linalg.norm(body_zero)
    start = np.stack([d, np.cross(d, n), np.cross(d, np.cross(d, n))], axis=1)  # where m, body_zero, m × body_zero go
    body = np.stack([m, body_zero, np.cross(m, body_zero)], axis=1)
    return ChainBox(
        axes=np.stack([d, n, d]),
        low=np.array([-np.pi, cone.nearest, cone.roll.low]),
        high=np.array([np.pi, cone.farthest, cone.roll.high]),
        left=np.eye(3),
        right=start @ body.T,
        names=("azimuth", "tilt", "roll"),
    )


def _place(cone: Cone, R: Array) -> str:
    held = angle_between(cone.reference_axis, R @ cone.body_axis)
    return f"held axis {round(float(np.degrees(held)), 9) + 0.0:.6g} deg from the cone's direction"


def _any_perpendicular(d: Array) -> Array:
    """A unit vector perpendicular to each unit d (3, M)."""
    away = np.zeros_like(d)
    away[np.argmin(np.abs(d), axis=0), np.arange(d.shape[1])] = 1.0
    n = cross(d, away)
    return n / np.sqrt(dot(n, n))


def _perpendicular_towards(d: Array, u: Array) -> Array:
    """Unit vectors perpendicular to d on the side of u (3, M); any one where u lies along d."""
    normal = cross(d, u)
    length = np.sqrt(dot(normal, normal))
    normal = np.where(length > 1e-15, normal / np.maximum(length, 1e-300), _any_perpendicular(d))
    normal = normal - dot(normal, d) * d
    side = cross(normal / np.sqrt(dot(normal, normal)), d)
    return side / np.sqrt(dot(side, side))


def _poses_carrying(v: Array, goal: Array, m: Array, d: Array, mu: Array, polar: Array, a1: float, a2: float) -> Array:
    """Attitudes (M, 3, 3) with R v = goal and R m between a1 and a2 from d; goal is `polar` away from d."""
    alpha = np.minimum(np.maximum(a1, np.abs(polar - mu)), a2)
    corner = triangle_angle(polar, mu, alpha)
    tangent = turned(goal, corner, _perpendicular_towards(goal, d))
    body_side = _perpendicular_towards(v, m)
    body = np.stack([v, body_side, cross(v, body_side)])  # (triad, component, M)
    reference = np.stack([goal, tangent, cross(goal, tangent)])
    return np.einsum("tim,tjm->mij", reference, body)
