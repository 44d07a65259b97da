"""Attitudes of a region by a stated rule, for shares, histograms and pictures; never for a bound.

Rules. Boxes: a Sobol sequence, uniform in the stated angles. Cones: uniform in solid angle of the held axis and in
roll. Listed poses and tracks: as they are (tracks at equal times along slerp). Balls: each attitude followed by a turn
drawn uniformly from the ball's rotations. The rule belongs to every share printed, since another rule gives another
share.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from trunnion.attitude.rotations import about, from_rotation_vector, matrix_from_quaternion
from trunnion.envelope.axis_dispersion import AxisDispersion, TurnSide
from trunnion.envelope.chains import ChainBox, box_chain, chain_matrices
from trunnion.envelope.cones import rolled_cone_box
from trunnion.envelope.constrained import Constrained
from trunnion.envelope.regions import (
    Between,
    Box,
    Cone,
    Dispersed,
    Mounted,
    Poses,
    Referred,
    Region,
    Roll,
    Track,
)
from trunnion.envelope.tracks import pieces
from trunnion.envelope.trajectories import matrices_at
from trunnion.envelope.vectors import Array, angle_between
from trunnion.errors import RegionError


@dataclass(frozen=True, eq=False)
class Samples:
    """Attitudes (N, 3, 3) and the rule by which they were drawn."""

    matrices: Array
    rule: str


def sample_region(region: Region, count: int = 16384, *, seed: int = 1) -> Samples:
    """About `count` attitudes of a region (not of a union: its parts have no common measure)."""
    match region:
        case Box():
            return Samples(_sobol_box(box_chain(region), count, seed), "Sobol sequence, uniform in the stated angles")
        case Cone():
            return _cone(region, count, seed)
        case Poses():
            return _in_ball(Samples(region.matrices, "each listed attitude once"), region.radius, seed)
        case Track():
            return _in_ball(_track(region, count), region.attitude_error or 0.0, seed)
        case Dispersed():
            return _in_ball(sample_region(region.region, count, seed=seed), region.radius, seed)
        case Mounted():
            inner = sample_region(region.region, count, seed=seed)
            return Samples(inner.matrices @ region.R_bs, inner.rule)
        case Referred():
            inner = sample_region(region.region, count, seed=seed)
            return Samples(region.R_qr @ inner.matrices, inner.rule)
        case Constrained():
            return _constrained(region, count, seed)
        case AxisDispersion():
            return _axis_dispersed(region, count, seed)
    raise RegionError(
        "a union has no measure common to its parts", remedy="take the share of each part by itself, or of the time"
    )


def unit_cube(dimensions: int, count: int, seed: int) -> Array:
    """Scrambled Sobol points (2^k >= count, dimensions) in the unit cube, the same for the same seed."""
    from scipy.stats import qmc

    sampler = qmc.Sobol(dimensions, scramble=True, seed=seed)
    return np.asarray(sampler.random_base2(max(0, int(np.ceil(np.log2(count))))))


def _sobol_box(chain: ChainBox, count: int, seed: int) -> Array:
    t = unit_cube(3, count, seed)
    return chain_matrices(chain, (chain.low + t * (chain.high - chain.low)).T)


def _cone(cone: Cone, count: int, seed: int) -> Samples:
    roll = cone.roll or Roll(-np.pi, np.pi, np.cross(cone.body_axis, np.eye(3)[np.argmin(np.abs(cone.body_axis))]))
    chain = rolled_cone_box(Cone(cone.body_axis, cone.reference_axis, cone.nearest, cone.farthest, roll))
    t = unit_cube(3, count, seed)
    angles = chain.low + t * (chain.high - chain.low)
    cosines = np.cos(cone.nearest) + t[:, 1] * (np.cos(cone.farthest) - np.cos(cone.nearest))
    angles[:, 1] = np.arccos(np.clip(cosines, -1.0, 1.0))
    return Samples(chain_matrices(chain, angles.T), "Sobol sequence, uniform in solid angle and roll")


def _constrained(region: Constrained, count: int, seed: int) -> Samples:
    """Those of the first region that keep every further constraint; more are drawn where few do."""
    for more in (1, 16, 256):
        drawn = sample_region(region.region, count * more, seed=seed)
        kept = np.ones(len(drawn.matrices), dtype=bool)
        for cone in region.cones:
            held = drawn.matrices @ cone.body_axis
            angle = angle_between(held.T, np.broadcast_to(cone.reference_axis[:, None], (3, len(held))))
            kept &= (angle >= cone.nearest) & (angle <= cone.farthest)
        if np.count_nonzero(kept) >= min(count, 200):
            break
    if not kept.any():
        raise RegionError("no sample keeps all the constraints at once", remedy="look for a contradiction")
    return Samples(drawn.matrices[kept][:count], f"{drawn.rule}, those that keep every constraint")


def _axis_dispersed(region: AxisDispersion, count: int, seed: int) -> Samples:
    inner = sample_region(region.region, count, seed=seed)
    t = unit_cube(len(region.limits), len(inner.matrices), seed + 1)[: len(inner.matrices)]
    turns = from_rotation_vector(((2.0 * t - 1.0) * region.limits) @ region.axes)
    body = region.side is TurnSide.BODY
    matrices = inner.matrices @ turns if body else turns @ inner.matrices
    return Samples(matrices, f"{inner.rule}, then turns uniform within the limits of each axis")


def _track(track: Track, count: int) -> Samples:
    if track.between is not Between.SLERP or len(track.times) == 1:
        return Samples(matrix_from_quaternion(track.quaternions), "each row once")
    found = []
    total = sum(_duration(track, piece) for piece in pieces(track)) or 1.0
    for piece in pieces(track):
        times, quaternions = track.times[piece], track.quaternions[piece]
        share = max(1, round(count * _duration(track, piece) / total))
        instants = times[0] + (np.arange(share) + 0.5) / share * (times[-1] - times[0])
        row = np.clip(np.searchsorted(times, instants, side="right") - 1, 0, max(len(times) - 2, 0))
        step = np.diff(times)[row] if len(times) > 1 else np.ones(share)
        found.append(matrices_at(quaternions, row, (instants - times[row]) / step))
    return Samples(np.concatenate(found), "at equal times along slerp")


def _duration(track: Track, piece: slice) -> float:
    return float(track.times[piece][-1] - track.times[piece][0])


def _in_ball(samples: Samples, radius: float, seed: int) -> Samples:
    if radius == 0.0:
        return samples
    t = unit_cube(3, len(samples.matrices), seed + 1)[: len(samples.matrices)]
    cosine, azimuth = 2.0 * t[:, 0] - 1.0, 2.0 * np.pi * t[:, 1]
    sine = np.sqrt(1.0 - cosine**2)
    axis = np.stack([sine * np.cos(azimuth), sine * np.sin(azimuth), cosine], axis=1)
    turns = about(axis, _ball_angles(t[:, 2], radius))
    return Samples(turns @ samples.matrices, f"{samples.rule}, then a turn uniform in the ball")


def _ball_angles(t: Array, radius: float) -> Array:
    """Turn angles with the density sin²(angle/2) of uniform rotations, by a table of the integral."""
    angle = np.linspace(0.0, radius, 2049)
    integral = angle - np.sin(angle)
    return np.interp(t, integral / integral[-1], angle)
