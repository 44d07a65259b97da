"""Checks of a least margin over a region by scipy: at its witness, and by searching the region built anew."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.envelope.regions import Region, Track
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
        display.check(
            f"{identity}:search",
            f"{what}, searched",
            ours=float(np.degrees(claimed.lo)),
            theirs=found,
            tolerance=SEARCH_TOLERANCE_DEG,
            unit="deg",
            library=independent.OPTIMISER,
        )


def searched_least(
    convention: Convention, plain: Mapping[str, Any], region: Region, R_bs: Array | None = None
) -> float | None:
    """Least margin (deg) found in the region rebuilt from its words; None for a kind that has no sampler."""
    from scipy.spatial.transform import Rotation

    mount = Rotation.from_matrix(np.eye(3) if R_bs is None else R_bs)
    if isinstance(region, Track):
        q = region.quaternions
        carried = Rotation.from_quat(q[:, [1, 2, 3, 0]]) * mount
        rows = carried.as_quat()[:, [3, 0, 1, 2]]
        least, _ = independent.track_margin_deg(convention, region.times, rows)
        error = plain.get("attitude error")
        return max(0.0, least - (independent.degrees(error) if error is not None else 0.0))
    sampler = region_sampler(plain, region)
    if sampler is None:
        return None
    margin = independent.least_value(
        sampler, lambda attitudes: independent.lock_margin_deg(convention, attitudes * mount)
    )
    dispersion = plain.get("dispersion")
    return max(0.0, margin - (independent.degrees(dispersion) if dispersion is not None else 0.0))


def region_sampler(plain: Mapping[str, Any], region: Region) -> independent.Sampler | None:
    """The sampler of a box or of a cone with any roll, from the plain words."""
    if "box" in plain:
        return independent.sampler(plain, parameters.convention(plain["convention"]))
    cone = plain.get("cone")
    if cone is None or cone.get("roll", "any") != "any":
        return None
    axis = _frame(plain["body"]).direction(cone["axis"])
    around = _frame(plain["reference"]).direction(cone["around"])
    if "half angle" in cone:
        return independent.cone_sampler(axis, around, 0.0, independent.degrees(cone["half angle"]))
    nearest, farthest = (independent.degrees(word) for word in cone["between"])
    return independent.cone_sampler(axis, around, nearest, farthest)


def _frame(plain: Mapping[str, Any]) -> Frame:
    first, second, third = plain["axes"]
    return Frame(plain["name"], (first, second, third))
