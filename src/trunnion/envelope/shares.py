"""Share of the time or of a region spent within given distances of lock."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.envelope.regions import Between, Region, Track, as_pairs
from trunnion.envelope.results import weakest
from trunnion.envelope.sampling import sample_region
from trunnion.envelope.tracks import pieces
from trunnion.envelope.trajectories import forms
from trunnion.envelope.vectors import Array


@dataclass(frozen=True)
class Share:
    """Share (0 … 1) of a region or of the time with a lock margin of at most `distance` rad; the truth is in [lo, hi]
    on the stated basis and by the stated rule."""

    distance: float
    lo: float
    hi: float
    basis: Basis
    rule: str


def shares_near_lock(
    region: Region, convention: Convention, distances: ArrayLike, *, count: int = 16384, seed: int = 1
) -> list[Share]:
    """Share within each distance (rad) of lock: of the time for slerp tracks (exact), else of samples by a rule.

    A track's attitude error e brackets each share between those at distance - e and distance + e.
    """
    wanted = np.atleast_1d(np.asarray(distances, dtype=float))
    if isinstance(region, Track) and region.between is Between.SLERP and len(region.times) > 1:
        return _of_time(region, convention, wanted)
    samples = sample_region(region, count, seed=seed)
    margins = convention.lock_margin(samples.matrices)
    found = [float(np.mean(margins <= distance)) for distance in wanted]
    measured = isinstance(region, Track) and region.attitude_error is None
    basis = weakest(Basis.SAMPLED, Basis.MEASURED) if measured else Basis.SAMPLED
    return [Share(float(d), s, s, basis, samples.rule) for d, s in zip(wanted, found, strict=True)]


def _of_time(track: Track, convention: Convention, distances: Array) -> list[Share]:
    error = track.attitude_error or 0.0
    basis = Basis.MEASURED if track.attitude_error is None else Basis.CERTIFIED
    rule = "of the time along slerp" + (", of the recorded estimate" if track.attitude_error is None else "")
    shares = []
    for distance in distances:
        lo = time_within(track, convention, max(float(distance) - error, 0.0)) if error <= distance else 0.0
        hi = lo if error == 0.0 else time_within(track, convention, min(float(distance) + error, np.pi / 2))
        shares.append(Share(float(distance), lo, hi, basis, rule))
    return shares


def time_within(track: Track, convention: Convention, distance: float) -> float:
    """Share of the joined time of a slerp track with a margin of at most `distance` rad, in closed form.

    Along a step |P q(t)|² = mean - swing cos 2(t - t0), and the margin to one side of the line is at most the distance
    where that is at most sin²(distance/2): an interval of t, cut to the step. Both sides of the line are disjoint
    below a right angle.
    """
    if distance >= np.pi / 2:
        return 1.0
    u, v = as_pairs(*convention.lock_axes)
    form = forms(u, v)[0]
    inside = total = 0.0
    for piece in pieces(track):
        spans = np.diff(track.times[piece])
        total += float(spans.sum())
        for side in (form[:2], form[2:]):
            inside += float(spans @ _fraction_within(track.quaternions[piece], side, distance))
    return inside / total if total else 0.0


def _fraction_within(quaternions: Array, side: Array, distance: float) -> Array:
    """Fraction of each step (N-1,) within the distance of one end of the line."""
    q0, q1 = quaternions[:-1], quaternions[1:]
    q1 = np.where(np.einsum("ij,ij->i", q0, q1)[:, None] < 0.0, -q1, q1)
    step = q1 - q0
    chord = np.einsum("ij,ij->i", step, step)
    sine = np.sqrt(chord * (1.0 - 0.25 * chord))
    moving = sine > 0.0
    across = (step + 0.5 * chord[:, None] * q0) / np.where(moving, sine, 1.0)[:, None]
    length = np.arctan2(sine, 1.0 - 0.5 * chord)
    one, other = q0 @ side.T, across @ side.T
    d0, d1 = (one**2).sum(axis=1), (other**2).sum(axis=1)
    mixed = (one * other).sum(axis=1)
    swing = np.hypot(0.5 * (d1 - d0), mixed)
    limit = np.sin(0.5 * distance) ** 2
    centre = 0.5 * np.arctan2(-mixed, 0.5 * (d1 - d0))
    ratio = (0.5 * (d0 + d1) - limit) / np.where(swing > 0.0, swing, 1.0)
    half = 0.5 * np.arccos(np.clip(ratio, -1.0, 1.0))
    covered = np.zeros_like(length)
    for turn in (-np.pi, 0.0, np.pi):  # the interval repeats every half turn of the quaternion parameter
        low, high = np.maximum(centre + turn - half, 0.0), np.minimum(centre + turn + half, length)
        covered += np.maximum(high - low, 0.0)
    steady = ~moving | (swing <= 0.0)
    return np.where(steady, (d0 <= limit).astype(float), covered / np.where(moving, length, 1.0))
