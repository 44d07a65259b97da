"""Stabilised platforms: what the joints must do, what reading them back says, and what small errors cost.

Letters: `r` reference (level), `b` host, `g` gimbal base on the host (R_bg), `p` platform. A platform held at R_rp on
a host at R_rb asks the chain for R_gp = (R_rb R_bg)' R_rp; read back, the joints give the host as R_rb = R_rp R_gp'
R_bg'. Angles in rad.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.rotations import rotation_angle
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import Solutions, attitude_solutions, pointing_solutions
from trunnion.hardware.vectors import Array, unit


def required_attitude(R_rb: ArrayLike, R_rp: ArrayLike, R_bg: ArrayLike | None = None) -> Array:
    """R_gp (..., 3, 3) a chain on base R_bg must give to hold the platform at R_rp on a host at R_rb."""
    R_rg = np.asarray(R_rb, dtype=float) @ (np.eye(3) if R_bg is None else np.asarray(R_bg, dtype=float))
    return np.swapaxes(R_rg, -1, -2) @ np.asarray(R_rp, dtype=float)


def levelling_solutions(
    chain: GimbalChain, R_rb: ArrayLike, *, up_r: ArrayLike, up_p: ArrayLike, R_bg: ArrayLike | None = None
) -> Solutions:
    """Both solutions of a two-axis chain that keeps the platform's `up_p` along the reference's `up_r` (3,).

    The platform's heading is then what the chain makes of it: two axes cannot hold it.
    """
    R_rg = np.asarray(R_rb, dtype=float) @ (np.eye(3) if R_bg is None else np.asarray(R_bg, dtype=float))
    return pointing_solutions(chain, np.swapaxes(R_rg, -1, -2) @ unit(up_r, "up"), boresight_p=up_p)


def holding_solutions(
    chain: GimbalChain, R_rb: ArrayLike, R_rp: ArrayLike, *, R_bg: ArrayLike | None = None
) -> Solutions:
    """Both solutions of a three-axis chain that holds the platform at R_rp (..., 3, 3) on a host at R_rb."""
    return attitude_solutions(chain, required_attitude(R_rb, R_rp, R_bg))


def host_attitude(chain: GimbalChain, angles: ArrayLike, R_rp: ArrayLike, *, R_bg: ArrayLike | None = None) -> Array:
    """The host's attitude R_rb (..., 3, 3) read back from joint angles (..., k) against a platform held at R_rp."""
    R_pg = np.swapaxes(chain.attitude(angles), -1, -2)
    R_gb = np.eye(3) if R_bg is None else np.asarray(R_bg, dtype=float).T
    return np.asarray(R_rp, dtype=float) @ R_pg @ R_gb


def encoder_error(chain: GimbalChain, angles: ArrayLike) -> Array:
    """Largest attitude error (...) rad from encoder resolution, half a step each way, at joint angles (..., k).

    First order: the largest length of the sum of the axes, each with plus or minus half its step; every sign tried.
    """
    steps = np.array([joint.encoder_step or 0.0 for joint in chain.joints])
    if not np.any(steps > 0.0):
        raise HardwareError(f"chain '{chain.name}' states no encoder step", remedy="give the step of each encoder")
    A = chain.axes_at(angles)
    signs = np.array(list(product((1.0, -1.0), repeat=len(steps))))
    sums = np.einsum("...ik,sk->...si", A, signs * steps / 2.0)
    return np.max(np.linalg.norm(sums, axis=-1), axis=-1)


@dataclass(frozen=True, eq=False)
class AxisMisalignment:
    """What crooked axes cost: bound (...) rad of the platform's attitude error, and each axis's part (..., k) rad."""

    bound: Array
    parts: Array


def axis_misalignment(chain: GimbalChain, angles: ArrayLike, crookedness: ArrayLike) -> AxisMisalignment:
    """Attitude error when each axis is off its drawing by up to crookedness (k,) rad, zeroed at zero angles.

    An axis turned by e makes a turn t about it wrong by e - Rot(n, t) e, at most 2 |sin(t/2)| |e|; parts add. First
    order in the crookedness, exact in the joint angles.
    """
    e = np.asarray(crookedness, dtype=float)
    if e.shape != (len(chain.joints),) or np.any(e < 0.0) or not np.all(np.isfinite(e)):
        raise HardwareError(f"chain '{chain.name}' needs one crookedness >= 0 for each of {len(chain.joints)} axes")
    t = np.asarray(angles, dtype=float)
    parts = 2.0 * np.abs(np.sin(t / 2.0)) * e
    return AxisMisalignment(np.sum(parts, axis=-1), parts)


def held_heading_error(
    chain: GimbalChain, angles: ArrayLike, R_rb: ArrayLike, R_rp: ArrayLike, *, R_bg: ArrayLike | None = None
) -> Array:
    """Rotation angle (...) rad between the platform a two-axis chain gives and the one wanted, R_rp (..., 3, 3).

    A level platform on two axes turns with its host in heading, and a little more as the host tilts.
    """
    return rotation_angle(chain.attitude(angles), required_attitude(R_rb, R_rp, R_bg))


def clearance_directions(chain: GimbalChain, R_rp: ArrayLike, *, R_bg: ArrayLike | None = None) -> tuple[Array, Array]:
    """The host direction (3,) and the reference direction (3,) whose angle is d of `clearance_over`, three axes.

    With the platform held at R_rp (3, 3), d is the angle between the outermost axis, fixed in the host, and the
    innermost one, fixed in the reference: the direction clearance of the host's region between these two, certified,
    gives the certified clearance of the chain.
    """
    if len(chain.joints) != 3:
        raise HardwareError(f"chain '{chain.name}' has {len(chain.joints)} axes; this is for three")
    outer = chain.axes[0] if R_bg is None else np.asarray(R_bg, dtype=float) @ chain.axes[0]
    return outer, np.asarray(R_rp, dtype=float) @ chain.R_gp0.T @ chain.axes[2]
