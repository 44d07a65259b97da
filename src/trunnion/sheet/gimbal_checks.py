"""Checks of gimbals by scipy's rotations and by plain trigonometry in the mount's own azimuth and elevation.

Nothing here uses the closed forms of the joint solutions; of the chain only its axes and limits are used.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import attitude_solutions, pointing_solutions
from trunnion.hardware.keyholes import Keyhole
from trunnion.hardware.passes import Pass, PassAnalysis
from trunnion.hardware.sectors import Sector, SectorResult
from trunnion.sheet import display

if TYPE_CHECKING:
    from trunnion.sheet.gimbal_host import HostWork

Array = NDArray[np.float64]

ANGLE_TOLERANCE_DEG = 1e-6
_SEED = 20_310_506


def _chained(chain: GimbalChain, angles: Array) -> Any:
    """Rot(n1, t1) … R_gp0 at joint angles (N, k) by scipy's rotation vectors."""
    from scipy.spatial.transform import Rotation

    whole = Rotation.identity(len(angles))
    for k, joint in enumerate(chain.joints):
        whole = whole * Rotation.from_rotvec(angles[:, k : k + 1] * joint.axis)
    return whole * Rotation.from_matrix(chain.R_gp0)


def check_solutions(chain: GimbalChain, line: Array) -> None:
    """Joint solutions of positions made by scipy: putting them in again must give the position back."""
    from scipy.spatial.transform import Rotation

    if len(chain.joints) > 3:
        return
    rng = np.random.default_rng(_SEED)
    wanted = _chained(chain, rng.uniform(-3.0, 3.0, (200, len(chain.joints))))
    if len(chain.joints) == 3:
        solved = attitude_solutions(chain, wanted.as_matrix()).angles
        gaps = [(wanted.inv() * _chained(chain, solved[:, b])).magnitude() for b in range(2)]
    else:
        goal = wanted.apply(line)
        solved = pointing_solutions(chain, goal, boresight_p=line).angles
        gaps = [_apart(goal, _chained(chain, solved[:, b]).apply(line)) for b in range(2)]
    display.check(
        f"check:{chain.name}:solutions",
        "both joint solutions of 200 positions, put in again",
        ours=0.0,
        theirs=float(np.degrees(np.max(gaps))),
        tolerance=ANGLE_TOLERANCE_DEG,
        unit="deg",
        library="scipy Rotation",
    )
    if len(chain.joints) == 3 and np.allclose(chain.neighbour_angles, np.pi / 2, rtol=0, atol=1e-12):
        _check_davenport(chain, wanted, solved, Rotation)


def _check_davenport(chain: GimbalChain, wanted: Any, solved: Array, Rotation: Any) -> None:
    """Right-angled chains: one of our solutions is scipy's Davenport angles."""
    zero = Rotation.from_matrix(chain.R_gp0)
    theirs = (wanted * zero.inv()).as_davenport(chain.axes, "intrinsic")
    gap = np.abs((solved - theirs[:, None] + np.pi) % (2.0 * np.pi) - np.pi).max(axis=2).min(axis=1)
    display.check(
        f"check:{chain.name}:davenport",
        "joint solutions of 200 attitudes",
        ours=0.0,
        theirs=float(np.degrees(gap.max())),
        tolerance=1e-5,
        unit="deg",
        library="scipy Rotation.as_davenport",
    )


def check_held(work: HostWork, name: str, R_rb: Array) -> None:
    """The payload stands where it was to be held, by scipy's rotations, over samples of a region."""
    from scipy.spatial.transform import Rotation

    angles = work.solutions(R_rb).angles[:, 0]
    held = Rotation.from_matrix(R_rb) * _chained(work.chain, angles)
    if work.axes == 3:
        gap = held.magnitude()
    else:
        gap = _apart(np.broadcast_to(work.held_r, (len(R_rb), 3)), held.apply(work.gimbal.boresight))
    display.check(
        f"check:{work.chain.name}:{name}:held",
        f"the payload stands as it is to be held, {len(R_rb)} attitudes of {name}",
        ours=0.0,
        theirs=float(np.degrees(np.max(gap))),
        tolerance=ANGLE_TOLERANCE_DEG,
        unit="deg",
        library="scipy Rotation",
    )
    found = work.clearances[name]
    theirs = _clearances(work, R_rb)
    display.check(
        f"check:{work.chain.name}:{name}:clearance",
        f"least clearance over {name}: no sample may lie below",
        ours=float(np.degrees(found.least)),
        theirs=float(np.degrees(np.min(theirs))),
        difference=max(0.0, float(np.degrees(found.least - np.min(theirs)))),
        tolerance=ANGLE_TOLERANCE_DEG,
        unit="deg",
        library="scipy Rotation",
    )


def _clearances(work: HostWork, R_rb: Array) -> Array:
    """Clearance of right-angled chains from the angle between outer axis and what the inner joints carry, by scipy."""
    outer, other = work.pair
    d = _apart(R_rb @ outer, np.broadcast_to(other, (len(R_rb), 3)))
    axes = work.chain.axes
    third = axes[2] if work.axes == 3 else work.chain.R_gp0 @ work.gimbal.boresight
    l12, l23 = _apart(axes[0], axes[1]), _apart(axes[1], third)
    return np.asarray(np.minimum(d - abs(l12 - l23), np.pi - abs(np.pi - l12 - l23) - d))


def _apart(a: Array, b: Array) -> Array:
    return np.asarray(np.arctan2(np.linalg.norm(np.cross(a, b), axis=-1), np.sum(a * b, axis=-1)))


def check_keyhole(chain: GimbalChain, rate: float, found: Keyhole) -> None:
    """Right-angled mounts: asin(line of sight rate / outer rate limit), the formula of the trade."""
    limit = float(chain.limits("rate")[0])
    if max(found.unreachable_ahead, found.unreachable_behind) > 1e-9 or rate >= limit:
        return
    display.check(
        f"check:{chain.name}:keyhole",
        "keyhole by rate",
        ours=float(np.degrees(found.by_rate)),
        theirs=float(np.degrees(np.arcsin(rate / limit))),
        tolerance=1e-9,
        unit="deg",
        library="asin(rate / limit)",
    )


def check_pass(chain: GimbalChain, name: str, track: Pass, found: PassAnalysis) -> None:
    """Largest outer rate of an upright mount by differences of the pass's own azimuth, worked out with arctan2."""
    if abs(abs(chain.axes[0][2]) - 1.0) > 1e-12 or max(chain.neighbour_angles) - np.pi / 2 > 1e-9:
        return
    v = track.direction_g
    # d(azimuth)/dt of a unit vector: (x y' - y x') / (x^2 + y^2)
    x, y, change = v[:, 0], v[:, 1], track.change_g
    azimuth_rate = (x * change[:, 1] - y * change[:, 0]) / (x * x + y * y)
    display.check(
        f"check:{chain.name}:{name}:rate",
        f"largest outer rate along {name}",
        ours=float(np.degrees(found.rates[0])),
        theirs=float(np.degrees(np.max(np.abs(azimuth_rate)))),
        tolerance=1e-6 * max(1.0, float(np.degrees(found.rates[0]))),
        unit="deg/s",
        library="plain trigonometry of azimuth",
    )


def check_sectors(sectors: Sequence[Sector], name: str, track: Pass, results: Sequence[SectorResult]) -> None:
    """No row of the pass lies in a sector whose clearance is above zero, by winding numbers."""
    v = track.direction_g
    azimuth, elevation = np.arctan2(v[:, 1], v[:, 0]), np.arcsin(np.clip(-v[:, 2], -1.0, 1.0))
    for found in results:
        (sector,) = [entry for entry in sectors if entry.name == found.sector]
        rows = [np.abs(_winding(sector.corners, azimuth + 2.0 * np.pi * turn, elevation)) > np.pi for turn in (0, 1)]
        entered = bool(np.any(rows))
        display.check(
            f"check:{found.sector}:{name}",
            f"whether {name} enters {found.sector} (1: it does)",
            ours=1.0 if found.seconds > 0.0 else 0.0,
            theirs=float(entered),
            tolerance=0.5,
            unit="",
            library="winding numbers, row by row",
        )


def _winding(corners: Array, x: Array, y: Array) -> Array:
    """The angle (N,) rad a polygon (M, 2) turns round each point: a whole turn inside, none outside."""
    seen = (corners[:, 0] - x[:, None]) + 1j * (corners[:, 1] - y[:, None])
    return np.asarray(np.sum(np.angle(np.roll(seen, -1, axis=1) * np.conj(seen)), axis=1))
