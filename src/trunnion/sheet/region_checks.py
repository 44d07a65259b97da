"""Checks of a least margin over a region by scipy: at its witness, and by searching the region built anew."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.envelope.regions import Between, Dispersed, Mounted, Poses, Region, Track, Union
from trunnion.envelope.results import Extreme
from trunnion.sheet import display, independent, parameters

Array = NDArray[np.float64]

WITNESS_TOLERANCE_DEG = 1e-4  # scipy sets its third angle to zero within 6e-6 deg of lock
SEARCH_TOLERANCE_DEG = 2e-3  # what a descent on a squared angle is good for close to zero margin


def check_least_margin(
    identity: str,
    what: str,
    *,
    convention: Convention,
    plain: Mapping[str, Any],
    region: Region,
    claimed: Extreme,
    R_bs: Array | None = None,
) -> None:
    """Show up to two checks of one least margin (see the module's first line).

    plain: the region in the spec's words. R_bs (3, 3): mount of the sensor whose convention it is (default none).
    """
    from scipy.spatial.transform import Rotation

    if claimed.witness is not None:
        theirs = independent.lock_margin_deg(convention, Rotation.from_matrix(claimed.witness.matrix))
        display.check(
            f"{identity}:witness",
            f"{what}, at its witness",
            ours=float(np.degrees(claimed.witness.value)),
            theirs=float(theirs[0]),
            tolerance=WITNESS_TOLERANCE_DEG,
            unit="deg",
            library=independent.LIBRARY,
        )
    found = searched_least(convention, plain, region, R_bs)
    if found is not None:
        low, high = (float(np.degrees(end)) for end in (claimed.lo, claimed.hi))
        display.check(
            f"{identity}:search",
            f"{what}, searched",
            ours=low,
            theirs=found,
            difference=max(0.0, low - found, found - high),
            tolerance=SEARCH_TOLERANCE_DEG,
            unit="deg",
            library=independent.OPTIMISER,
        )


def searched_least(
    convention: Convention, plain: Mapping[str, Any], region: Region, R_bs: Array | None = None
) -> float | None:
    """Least margin (deg) found in the region rebuilt from its words; None for a kind that has no sampler."""
    region = region.region if isinstance(region, Dispersed) else region
    found = _searched(convention, plain, region, np.eye(3) if R_bs is None else R_bs)
    dispersion = plain.get("dispersion")
    if found is None or dispersion is None:
        return found
    return max(0.0, found - independent.degrees(dispersion))


def _searched(convention: Convention, plain: Mapping[str, Any], region: Region, R_bs: Array) -> float | None:
    from scipy.spatial.transform import Rotation

    mount = Rotation.from_matrix(R_bs)
    if isinstance(region, Union) and "phases" in plain:
        parts = [searched_least(convention, plain["phases"][name], part, R_bs) for name, part in region.parts.items()]
        known = [part for part in parts if part is not None]
        return min(known) if len(known) == len(parts) else None
    if isinstance(region, Mounted):
        return searched_least(convention, plain["product"]["host"], region.region, region.R_bs @ R_bs)
    if isinstance(region, Poses) and "dispersion about" not in plain:
        listed = independent.lock_margin_deg(convention, Rotation.from_matrix(region.matrices) * mount)
        return max(0.0, float(listed.min()) - independent.degrees(plain.get("ball", "0 deg")))
    if isinstance(region, Track) and region.between is Between.RATE_LIMITED:
        return None  # floors between rows have no twin that could be searched
    if isinstance(region, Track):
        q = region.quaternions
        carried = Rotation.from_quat(q[:, [1, 2, 3, 0]]) * mount
        rows = carried.as_quat()[:, [3, 0, 1, 2]]
        if region.between is Between.SAMPLES:
            least = float(independent.lock_margin_deg(convention, carried).min())
        else:
            cuts = np.flatnonzero(np.diff(region.times) > (region.longest_gap or np.inf)) + 1
            pieces = zip(np.split(region.times, cuts), np.split(rows, cuts), strict=True)
            least = min(independent.track_margin_deg(convention, times, piece)[0] for times, piece in pieces)
        error = plain.get("attitude error")
        return max(0.0, least - (independent.degrees(error) if error is not None else 0.0))
    sampler = region_sampler(plain, region)
    if sampler is None:
        return None
    return independent.least_value(
        sampler, lambda attitudes: independent.lock_margin_deg(convention, attitudes * mount)
    )


def region_sampler(plain: Mapping[str, Any], region: Region) -> independent.Sampler | None:
    """The sampler of a box or a cone, with what it says of further cones and turns, from the plain words."""
    del region
    if "box" in plain:
        stated = parameters.convention(plain["convention"])
        found, frames = independent.sampler(plain, stated), (stated.reference, stated.body)
    elif "cone" in plain:
        frames = (_frame(plain["reference"]), _frame(plain["body"]))
        found = _cone_sampler(plain["cone"], *frames)
    else:
        return None
    about = plain.get("dispersion about")
    if found is None or (about and "also" in plain):
        return None
    if "also" in plain:
        found = independent.kept(found, [_cone_numbers(cone, *frames) for cone in plain["also"]])
    if about:
        of_body = about["axes of"] == "body"
        axes = np.array([_direction(word, frames[1] if of_body else frames[0]) for word in about["limits"]])
        limits = np.array([independent.degrees(limit) for limit in about["limits"].values()])
        found = independent.followed_by_turns(found, axes, limits, of_body=of_body)
    return found


def _cone_sampler(cone: Mapping[str, Any], reference: Frame, body: Frame) -> independent.Sampler:
    axis, around, nearest, farthest = _cone_numbers(cone, reference, body)
    free = independent.cone_sampler(axis, around, nearest, farthest)
    roll = cone.get("roll", "any")
    if roll == "any":
        return free
    ends = np.array(independent.range_deg(roll["range"]))
    return independent.rolled_cone_sampler(free, axis, around, _direction(roll["zero"], body), ends)


def _cone_numbers(cone: Mapping[str, Any], reference: Frame, body: Frame) -> tuple[Array, Array, float, float]:
    words = cone.get("between") or ["0 deg", cone["half angle"]]
    nearest, farthest = (independent.degrees(word) for word in words)
    return _direction(cone["axis"], body), _direction(cone["around"], reference), nearest, farthest


def _direction(value: Any, frame: Frame) -> Array:
    """A direction in words or three numbers, read here on purpose a second time."""
    if isinstance(value, str):
        return frame.direction(value)
    return np.array(value, dtype=float) / np.linalg.norm(value)


def _frame(plain: Mapping[str, Any]) -> Frame:
    first, second, third = plain["axes"]
    return Frame(plain["name"], (first, second, third))
