"""Spread of a track: slerp between rows, motion within a body rate, or rows only; gaps are left out, not filled."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.envelope.balls import listed_spread, widened
from trunnion.envelope.floors import rate_limited_spread
from trunnion.envelope.regions import Between, Track, step_angles
from trunnion.envelope.results import Spread, closed_form_ends, connected, joined
from trunnion.envelope.search import sign_change
from trunnion.envelope.trajectories import end_angles, matrices_at, rows_of
from trunnion.envelope.vectors import Array, dot

NEAR_HALF_TURN = np.radians(170.0)
"""A step larger than this is flagged: the shorter way round is nearly as long as the other, so slerp is a guess."""


def track_spread(track: Track, u: Array, v: Array) -> Spread:
    """Spread of a track for pairs u, v (3, M), on the basis the track itself allows."""
    spreads = {str(number): _piece_spread(track, piece, u, v) for number, piece in enumerate(pieces(track), start=1)}
    spread = joined(spreads, named=False) if len(spreads) > 1 else next(iter(spreads.values()))
    if track.attitude_error is None:
        basis = Basis.SAMPLED if track.between is Between.SAMPLES else Basis.MEASURED
        return replace(spread, basis=basis)
    if track.between is Between.RATE_LIMITED:  # its floors hold the error already
        return spread
    widened_spread = widened(spread, u, v, track.attitude_error, "attitude error")
    return replace(widened_spread, basis=Basis.SAMPLED) if track.between is Between.SAMPLES else widened_spread


def pieces(track: Track) -> list[slice]:
    """Runs of rows joined in time: split where rows are further apart than the track's longest gap."""
    if track.longest_gap is None:
        return [slice(0, len(track.times))]
    cuts = np.flatnonzero(np.diff(track.times) > track.longest_gap) + 1
    edges = [0, *cuts.tolist(), len(track.times)]
    return [slice(start, stop) for start, stop in pairwise(edges)]


def _piece_spread(track: Track, piece: slice, u: Array, v: Array) -> Spread:
    times, quaternions = track.times[piece], track.quaternions[piece]
    offset = piece.start or 0
    if track.between is Between.SLERP:
        return _slerp_spread(times, quaternions, offset, u, v)
    if track.between is Between.RATE_LIMITED:
        assert track.max_rate is not None
        error = track.attitude_error or 0.0
        return rate_limited_spread(times, quaternions, track.max_rate, error, offset, u, v)
    return listed_spread(matrix_from_quaternion(quaternions), u, v, label="row", times=times)


def _slerp_spread(times: Array, quaternions: Array, offset: int, u: Array, v: Array) -> Spread:
    """Exact in continuous time: both ends from the least angle to u and to -u."""
    count = u.shape[1]
    found = end_angles(rows_of(quaternions), u, v)
    stamps = _stamps(times, found.row, found.fraction)
    matrices = matrices_at(quaternions, found.row, found.fraction)
    places = [_place(row + offset, part) for row, part in zip(found.row, found.fraction, strict=True)]

    def crossing(pairs: NDArray[np.intp]) -> tuple[Array, Array, list[str]]:
        start = (found.row + found.fraction)[pairs]
        way = (found.row + found.fraction)[count + pairs] - start

        def at(t: Array) -> tuple[NDArray[np.intp], Array]:
            position = np.clip(start + t * way, 0.0, len(times) - 1.0)
            row = np.minimum(position.astype(np.intp), max(len(times) - 2, 0))
            return row, position - row

        def miss(t: Array) -> Array:
            row, fraction = at(t)
            R = matrices_at(quaternions, row.ravel(), fraction.ravel()).reshape(*t.shape, 3, 3)
            return dot(u[:, None, pairs], np.einsum("kmij,jm->ikm", R, v[:, pairs]))

        row, fraction = at(sign_change(miss, len(pairs)))
        where = [_place(r + offset, f) for r, f in zip(row, fraction, strict=True)]
        return matrices_at(quaternions, row, fraction), _stamps(times, row, fraction), where

    return connected(
        closed_form_ends(found.value[:count], matrices[:count], places[:count], stamps[:count]),
        closed_form_ends(np.pi - found.value[count:], matrices[count:], places[count:], stamps[count:]),
        crossing,
        Basis.CERTIFIED,
    )


def _stamps(times: Array, row: NDArray[np.intp], fraction: Array) -> Array:
    after = np.minimum(row + 1, len(times) - 1)
    return times[row] + fraction * (times[after] - times[row])


def _place(row: int, fraction: float) -> str:
    if fraction in (0.0, 1.0):
        return f"row {row + 1 + int(fraction):,}"
    return f"between rows {row + 1:,} and {row + 2:,}"


@dataclass(frozen=True)
class TrackReport:
    """What a reader of a track should know before trusting it; row numbers count from one."""

    rows: int
    duration: float
    sign_flips: int  # neighbouring rows whose quaternions have opposite signs: handled, no fault
    repeated: int  # steps without any turn
    largest_step: float  # rad
    near_half_turn: tuple[int, ...]  # rows after which a step is above NEAR_HALF_TURN: which way round is a guess
    gaps: tuple[tuple[int, float], ...]  # rows followed by a gap longer than stated, and its length
    norm_error: float

    def findings(self) -> list[str]:
        """The faults in words, one a line; empty when there is none."""
        found = [
            f"rows {row:,} and {row + 1:,} are {length:.6g} apart in time, longer than the stated gap: not joined"
            for row, length in self.gaps
        ]
        return found + [
            f"between rows {row:,} and {row + 1:,} the body turns nearly half a turn: which way round is a guess"
            for row in self.near_half_turn
        ]


def track_report(track: Track) -> TrackReport:
    """Count and locate what is odd in a track: sign flips, half turns, gaps, repeated rows."""
    q = track.quaternions
    steps = step_angles(q)
    spans = np.diff(track.times)
    gap = spans > (np.inf if track.longest_gap is None else track.longest_gap)
    half = (steps > NEAR_HALF_TURN) & ~gap
    if track.between is Between.SAMPLES:
        half[:] = False
    return TrackReport(
        rows=len(q),
        duration=float(track.times[-1] - track.times[0]),
        sign_flips=int(np.count_nonzero(np.einsum("ij,ij->i", q[1:], q[:-1]) < 0.0)),
        repeated=int(np.count_nonzero(steps == 0.0)),
        largest_step=float(steps.max(initial=0.0)),
        near_half_turn=tuple(int(i) + 1 for i in np.flatnonzero(half)),
        gaps=tuple((int(i) + 1, float(spans[i])) for i in np.flatnonzero(gap)),
        norm_error=track.norm_error,
    )
