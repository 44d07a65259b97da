"""The independent route: the same quantities by scipy's rotations and a general-purpose optimiser.

Nothing here imports the modules whose results it checks (extraction, margins, closed forms, trajectories). Of a
convention only its statement is used: sequence letters, senses, constants. Regions are rebuilt from the plain words
of the injected parameters, so that a region read wrongly is noticed too.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense

if TYPE_CHECKING:
    from scipy.spatial.transform import Rotation

Array = NDArray[np.float64]

LIBRARY = "scipy Rotation"
OPTIMISER = "scipy Rotation with L-BFGS-B from many starts"

_DEGREES_PER = {"deg": 1.0, "rad": 180.0 / np.pi, "mrad": 0.18 / np.pi, "arcmin": 1 / 60, "arcsec": 1 / 3600}
_SEED = 20_310_504  # fixed: the same notebook draws the same samples


def rotation(convention: Convention, angles_deg: Array) -> Rotation:
    """Attitudes of stated angles (..., 3) deg by scipy: left * from_euler * right (body to reference)."""
    from scipy.spatial.transform import Rotation

    turns = (np.atleast_2d(angles_deg) - np.degrees(convention.offsets)) * np.array(convention.signs)
    chain = Rotation.from_euler(_letters(convention), turns, degrees=True)
    return Rotation.from_matrix(convention.left) * chain * Rotation.from_matrix(convention.right)


def lock_margin_deg(convention: Convention, attitudes: Rotation) -> Array:
    """Lock margins (N,) deg from scipy's second Euler angle of the chain; good to 1e-5 deg at lock itself."""
    import warnings

    from scipy.spatial.transform import Rotation

    chain = Rotation.from_matrix(convention.left.T) * attitudes * Rotation.from_matrix(convention.right.T)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UserWarning)  # scipy warns at lock, where its second angle is still right
        middle = np.atleast_2d(chain.as_euler(_letters(convention), degrees=True))[:, 1]
    if convention.sequence.repeated:
        return np.minimum(middle, 180.0 - middle)
    return 90.0 - np.abs(middle)


def _letters(convention: Convention) -> str:
    name = convention.sequence.name
    return name if convention.sense is Sense.MOVING else name.lower()


@dataclass(frozen=True)
class Sampler:
    """A region as a map from a box of three plain numbers (deg) onto its attitudes."""

    low: Array
    high: Array
    attitudes: Callable[[Array], Any]


def sampler(plain: Mapping[str, Any], convention: Convention | None) -> Sampler | None:
    """Rebuild a box or cone region from its plain words; None for regions of other kinds.

    convention: the one the box is stated in (its angles' names give the order of the ranges).
    """
    if "box" in plain and convention is not None:
        ends = np.array([_range_deg(plain["box"][name]) for name in convention.angle_names])
        return Sampler(ends[:, 0], ends[:, 1], lambda angles: rotation(convention, angles))
    return None


def cone_sampler(axis: Array, around: Array, nearest_deg: float, farthest_deg: float) -> Sampler:
    """All attitudes that hold body `axis` between two angles (deg) from reference direction `around`, any roll."""
    from scipy.spatial.transform import Rotation

    onto = Rotation.align_vectors(around[None], axis[None])[0]
    across = np.cross(around, np.eye(3)[int(np.argmin(np.abs(around)))])
    across /= np.linalg.norm(across)

    def attitudes(parameters: Array) -> Rotation:
        tilt, bearing, roll = np.radians(np.atleast_2d(parameters)).T
        swing = Rotation.from_rotvec(bearing[:, None] * around)
        return swing * Rotation.from_rotvec(tilt[:, None] * across) * onto * Rotation.from_rotvec(roll[:, None] * axis)

    return Sampler(np.array([nearest_deg, -180.0, -180.0]), np.array([farthest_deg, 180.0, 180.0]), attitudes)


def least_value(region: Sampler, value: Callable[[Any], Array], *, starts: int = 24) -> float:
    """Least value over the region: corners, random samples, and descents from the best of them.

    It is an upper bound of the true minimum, and in practice the minimum; it proves nothing by itself.
    """
    from scipy.optimize import minimize

    generator = np.random.default_rng(_SEED)
    width = region.high - region.low
    corners = np.array(np.meshgrid([0.0, 0.5, 1.0], [0.0, 0.5, 1.0], [0.0, 0.5, 1.0])).reshape(3, -1).T
    unit = np.vstack([corners, generator.uniform(size=(4000, 3)), np.round(generator.uniform(size=(1000, 3)), 1)])
    points = region.low + unit * width
    values = value(region.attitudes(points))
    best = float(values.min())
    bounds = list(zip(region.low, region.high, strict=True))
    for start in points[np.argsort(values)[:starts]]:
        found = minimize(
            lambda point: float(value(region.attitudes(point))[0]) ** 2,
            start,
            method="L-BFGS-B",
            bounds=bounds,
        )
        best = min(best, float(np.sqrt(max(found.fun, 0.0))))
    return best


def track_margin_deg(
    convention: Convention, times: Array, quaternions: Array, *, steps: int = 40
) -> tuple[float, float]:
    """Least margin (deg) and its time (s) of a table read as SLERP between rows: rows, then fine steps near the best.

    quaternions (N, 4) scalar first. Fine sampling covers every segment one of whose ends is within half the
    segment's turn of the best row; the true minimum is at most a fine step's half turn below the value found.
    """
    from scipy.spatial.transform import Rotation, Slerp

    attitudes = Rotation.from_quat(quaternions[:, [1, 2, 3, 0]])
    rows = lock_margin_deg(convention, attitudes)
    best, when = float(rows.min()), float(times[int(rows.argmin())])
    if len(times) == 1:
        return best, when
    turns = np.degrees((attitudes[:-1].inv() * attitudes[1:]).magnitude())
    near = np.flatnonzero(np.minimum(rows[:-1], rows[1:]) - turns / 2 <= best)
    fractions = np.linspace(0.0, 1.0, steps + 1)
    instants = (times[near, None] + fractions * (times[near + 1] - times[near])[:, None]).ravel()
    fine = lock_margin_deg(convention, Slerp(times, attitudes)(np.clip(instants, times[0], times[-1])))
    if fine.min() < best:
        best, when = float(fine.min()), float(instants[int(fine.argmin())])
    return best, when


def _range_deg(words: Any) -> tuple[float, float]:
    """`any`, one angle, or two angles, as they stand in the spec, in degrees; read here on purpose a second time."""
    if words in ("any", ["any"]):
        return -180.0, 180.0
    if isinstance(words, str):
        return (degrees(words),) * 2
    low, high = (degrees(word) for word in words)
    if high < low:
        high += 360.0
    return low, min(high, low + 360.0)


def degrees(words: str) -> float:
    """An angle with its unit, in degrees: `-20 deg`, `0.3 rad`."""
    match = re.fullmatch(r"\s*([-+]?[0-9.]+(?:[eE][-+]?[0-9]+)?)\s*([a-z]+)\s*", words)
    if match is None or match[2] not in _DEGREES_PER:
        raise ValueError(f"'{words}' is not an angle with its unit")
    return float(match[1]) * _DEGREES_PER[match[2]]
