"""The independent route: the same quantities by scipy's rotations and a general-purpose optimiser.

Nothing here imports the modules whose results it checks (extraction, margins, closed forms, trajectories). Of a
convention only its statement is used: sequence letters, senses, constants. Regions are rebuilt from the plain words
of the injected parameters, so that a region read wrongly is noticed too.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
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
_KEPT_DEG = 1e-6  # a descent that ends this close to a constraint has kept it
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
    """A region as a map from a box of plain numbers (deg) onto its attitudes, of which those count where every one of
    `spare` (…, N), deg, is not negative."""

    low: Array
    high: Array
    attitudes: Callable[[Array], Any]
    spare: Callable[[Any], Array] | None = None


def sampler(plain: Mapping[str, Any], convention: Convention | None) -> Sampler | None:
    """Rebuild a box or cone region from its plain words; None for regions of other kinds.

    convention: the one the box is stated in (its angles' names give the order of the ranges).
    """
    if "box" in plain and convention is not None:
        ends = np.array([range_deg(plain["box"][name]) for name in convention.angle_names])
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


def rolled_cone_sampler(cone: Sampler, axis: Array, around: Array, zero: Array, roll_deg: Array) -> Sampler:
    """A cone whose roll (deg, two ends) counts from where body direction `zero` points as nearly to `around` as it
    can."""
    from scipy.spatial.transform import Rotation

    across = np.cross(around, np.eye(3)[int(np.argmin(np.abs(around)))])
    across /= np.linalg.norm(across)
    square = zero - (zero @ axis) * axis
    towards = np.stack([around, np.cross(around, across)])  # tilted about `across`, the second points back to `around`
    onto = Rotation.align_vectors(towards, np.stack([axis, square / np.linalg.norm(square)]))[0]

    def attitudes(parameters: Array) -> Rotation:
        tilt, bearing, roll = np.radians(np.atleast_2d(parameters)).T
        swing = Rotation.from_rotvec(bearing[:, None] * around) * Rotation.from_rotvec(tilt[:, None] * across)
        return swing * onto * Rotation.from_rotvec(roll[:, None] * axis)

    ends = [np.array([cone.low[0], -180.0, roll_deg[0]]), np.array([cone.high[0], 180.0, roll_deg[1]])]
    return Sampler(ends[0], ends[1], attitudes)


def kept(region: Sampler, cones: list[tuple[Array, Array, float, float]]) -> Sampler:
    """The attitudes of a region that also hold each body axis between two angles (deg) from its direction."""

    def spare(attitudes: Any) -> Array:
        rows = []
        for axis, around, nearest, farthest in cones:
            angle = angle_deg(np.atleast_2d(attitudes.apply(axis)), around)
            rows += [farthest - angle, angle - nearest]
        return np.stack(rows)

    return replace(region, spare=spare)


def followed_by_turns(region: Sampler, axes: Array, limits_deg: Array, *, of_body: bool) -> Sampler:
    """Each attitude followed by a turn whose rotation vector is limited along each of axes (K, 3)."""
    from scipy.spatial.transform import Rotation

    count = len(region.low)

    def attitudes(parameters: Array) -> Any:
        rows = np.atleast_2d(parameters)
        turn = Rotation.from_rotvec(np.radians(rows[:, count:]) @ axes)
        inner = region.attitudes(rows[:, :count])
        return inner * turn if of_body else turn * inner

    low, high = np.concatenate([region.low, -limits_deg]), np.concatenate([region.high, limits_deg])
    inner_spare = region.spare
    if inner_spare is None:
        return Sampler(low, high, attitudes)
    raise ValueError("constraints and turns about some axes are not searched together")


def _carried_along(times: Array, directions: Array) -> Any:
    """Slerp of rotations that carry the first direction along the great circles between the rows."""
    from scipy.spatial.transform import Rotation, Slerp

    if len(times) == 1:
        return lambda instants: Rotation.identity(len(np.atleast_1d(instants)))
    normal = np.cross(directions[:-1], directions[1:])
    length = np.linalg.norm(normal, axis=1)
    angle = np.arctan2(length, np.einsum("ij,ij->i", directions[:-1], directions[1:]))
    steps = Rotation.from_rotvec(normal * (angle / np.where(length > 0.0, length, 1.0))[:, None])
    path = [Rotation.identity()]
    for step in steps:
        path.append(step * path[-1])
    return Slerp(times, Rotation.concatenate(path))


def moved(times: Array, directions: Array, instants: Array) -> Array:
    """The moving direction (n, 3) at instants (n,)."""
    return np.atleast_2d(_carried_along(times, directions)(instants).apply(directions[0]))


def seen_by(region: Sampler, times: Array, directions: Array) -> Sampler:
    """Attitudes relative to a moving direction: one more number, the time, counted from 0 to 1.

    The angle from the moving direction to a carried one is that from its first row, both turned back along its path.
    """
    path = _carried_along(times, directions)

    def attitudes(parameters: Array) -> Any:
        rows = np.atleast_2d(parameters)
        instants = times[0] + np.clip(rows[:, -1], 0.0, 1.0) * (times[-1] - times[0])
        return path(np.clip(instants, times[0], times[-1])).inv() * region.attitudes(rows[:, :-1])

    return Sampler(np.append(region.low, 0.0), np.append(region.high, 1.0), attitudes)


def least_along(times: Array, quaternions: Array, moments: Array, directions: Array, *, body: Array) -> float:
    """Least angle (deg) between a carried direction and a moving one at the same time: fine steps, then descents."""
    from scipy.optimize import minimize_scalar
    from scipy.spatial.transform import Rotation, Slerp

    attitudes = Slerp(times, Rotation.from_quat(quaternions[:, [1, 2, 3, 0]]))
    path = _carried_along(moments, directions)

    def angles(instants: Array) -> Array:
        instants = np.clip(instants, times[0], times[-1])
        return angle_deg(path(instants).inv().apply(attitudes(instants).apply(body)), directions[0])

    knots = np.union1d(times, moments[(moments > times[0]) & (moments < times[-1])])
    fine = np.unique(np.interp(np.linspace(0, len(knots) - 1, 20 * (len(knots) - 1) + 1), np.arange(len(knots)), knots))
    values = angles(fine)
    best = float(values.min())
    for near in np.argsort(values)[:8]:
        ends = (fine[max(near - 1, 0)], fine[min(near + 1, len(fine) - 1)])
        found = minimize_scalar(lambda t: float(angles(np.array([t]))[0]), bounds=ends, method="bounded")
        best = min(best, float(found.fun))
    return best


def angle_deg(carried: Array, direction: Array) -> Array:
    """Angles (N,) deg between vectors (N, 3) and a direction (3,)."""
    return np.degrees(np.arctan2(np.linalg.norm(np.cross(carried, direction), axis=1), carried @ direction))


def least_value(region: Sampler, value: Callable[[Any], Array], *, starts: int = 24) -> float:
    """Least value over the region: corners, random samples, and descents from the best of them.

    It is an upper bound of the true minimum, and in practice the minimum; it proves nothing by itself.
    """
    from scipy.optimize import minimize

    generator = np.random.default_rng(_SEED)
    width = region.high - region.low
    count = len(width)
    corners = np.array(np.meshgrid(*[[0.0, 0.5, 1.0]] * count)).reshape(count, -1).T
    drawn = generator.uniform(size=(4000, count))
    unit = np.vstack([corners, drawn, np.round(generator.uniform(size=(1000, count)), 1)])
    points = region.low + unit * width
    if region.spare is not None:
        return _least_kept(region, region.spare, value, points, starts)
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


def _least_kept(
    region: Sampler, spare: Callable[[Any], Array], value: Callable[[Any], Array], points: Array, starts: int
) -> float:
    """The same where constraints are to be kept: descents that know them, from points that miss them least."""
    from scipy.optimize import minimize

    attitudes = region.attitudes(points)
    missing = np.maximum(-spare(attitudes), 0.0).sum(axis=0)
    values = value(attitudes)
    best = float(values[missing == 0.0].min(initial=np.inf))
    bounds = list(zip(region.low, region.high, strict=True))
    solve: Any = minimize
    for start in points[np.argsort(values + 10.0 * missing)[:starts]]:
        found = solve(
            lambda point: float(value(region.attitudes(point))[0]),
            start,
            method="SLSQP",
            bounds=bounds,
            constraints={"type": "ineq", "fun": lambda point: spare(region.attitudes(point))[:, 0]},
            options={"maxiter": 60, "ftol": 1e-10},
        )
        at = region.attitudes(np.clip(found.x, region.low, region.high))
        if np.isfinite(found.x).all() and float(spare(at).min()) >= -_KEPT_DEG:
            best = min(best, float(value(at)[0]))
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


def range_deg(words: Any) -> tuple[float, float]:
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
