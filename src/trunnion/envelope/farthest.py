"""The line farthest from given directions: exact, by the facet of a convex hull nearest to the origin.

For unit points p_n the line along u stays at least arccos(max |p_n . u|) away from all of them. The largest |p . u| is
the support function of the hull of all ±p_n, whose least value over unit u is the hull's inradius: u is the normal of
the facet nearest to the origin. For many points the hull of a few is enough: their optimum is an upper bound for all;
points that violate it are added until none does.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.errors import RegionError

Array = NDArray[np.float64]

_FLAT = 1e-12  # smallest singular value of unit points that lie on one great circle
_ALL_AT_ONCE = 3000  # up to this many points the hull is taken of all of them
_ADDED = 32  # violators added a round
_ROUNDS = 25  # rounds before a scattered set is given to the hull as a whole
EQUAL = 1e-9  # facets whose distances differ by less are equally good


@dataclass(frozen=True, eq=False)
class FarLine:
    """A line: `direction` (3,) unit, `margin` rad to the nearest point line, and all equally good directions (E, 3)."""

    direction: Array
    margin: float
    equals: Array


def farthest_line(points: Array) -> FarLine:
    """The line whose least angle to the lines of unit points (N, 3) is largest; exact to rounding."""
    points = np.asarray(points, dtype=float)
    if points.ndim != 2 or points.shape[1:] != (3,) or not len(points):
        raise RegionError("no directions to stay away from", remedy="give at least one attitude")
    flat = flat_normal(points)
    if flat is not None:
        return FarLine(flat, line_margin(points, flat), flat[None])
    normals = facets(points)[0] if len(points) <= _ALL_AT_ONCE else _exchange(points)
    best = normals[int(np.argmin(np.abs(points @ normals.T).max(axis=0)))]
    return FarLine(best, line_margin(points, best), normals)


def line_margin(points: Array, direction: Array) -> float:
    """Least line angle (rad) between a direction (3,) and points (N, 3), accurate near zero and near a right angle."""
    cosines = np.abs(points @ direction)
    near = points[cosines >= cosines.max() - 1e-9]
    return float(np.arctan2(np.linalg.norm(np.cross(near, direction), axis=1), np.abs(near @ direction)).min())


def flat_normal(points: Array) -> Array | None:
    """The normal of the plane that holds all points, if there is one: a right angle away from each."""
    normal = np.linalg.eigh(points.T @ points).eigenvectors[:, 0]
    return normal if np.abs(points @ normal).max() <= _FLAT else None


def facets(points: Array, within: float = EQUAL, apart: float = 1e-6) -> tuple[Array, float, NDArray[np.intp]]:
    """Normals (E, 3) of the hull facets of ±points nearest to the origin, within `within` of the nearest one's
    distance, as lines more than about `apart` rad from each other; that distance; which points are hull corners."""
    hull = _hull(np.concatenate([points, -points]))
    distance = -hull.equations[:, 3]
    near = distance <= distance.min() + within
    normals = hull.equations[near, :3]
    normals = normals[np.argsort(distance[near], kind="stable")]
    return _distinct_lines(normals, apart), float(distance.min()), np.unique(hull.vertices % len(points))


def _hull(points: Array):  # type: ignore[no-untyped-def]
    """Convex hull; nearly flat sets need Qhull's search for a better start, or a rotation of the input."""
    from scipy.spatial import ConvexHull, QhullError

    for options in ("Qt", "Qt Qs", "Qt QR0"):
        try:
            return ConvexHull(points, qhull_options=options)
        except QhullError:
            continue
    raise RegionError("the directions are so nearly flat that their hull cannot be formed", remedy="state fewer digits")


def _distinct_lines(normals: Array, apart: float, most: int = 64) -> Array:
    """Up to `most` lines, first come first kept, each more than about `apart` from those kept before."""
    near = np.cos(apart)
    kept: list[Array] = []
    while len(normals) and len(kept) < most:
        kept.append(normals[0] / np.linalg.norm(normals[0]))
        normals = normals[np.abs(normals @ kept[-1]) < near]
    return np.array(kept)


def _exchange(points: Array) -> Array:
    """Optimal normals of many points by growing a small subset until no point violates its optimum."""
    stride = max(1, len(points) // 200)
    chosen = points[::stride]
    if flat_normal(chosen) is not None:
        chosen = points[np.random.default_rng(1).choice(len(points), min(400, len(points)), replace=False)]
    for _ in range(_ROUNDS):
        if flat_normal(chosen) is not None:
            normal = flat_normal(chosen)
            assert normal is not None
            normals, distance, corners = normal[None], 0.0, np.arange(len(chosen))
        else:
            normals, distance, corners = facets(chosen)
        heights = np.abs(points @ normals[0])
        if heights.max() <= distance + 1e-13:
            return normals
        worst = np.argpartition(heights, -min(_ADDED, len(points)))[-_ADDED:]
        worst = worst[heights[worst] > distance]
        chosen = np.concatenate([chosen[corners], points[worst]])
    return facets(points)[0]
