"""Campaigns: many runs of any length, reduced chunk by chunk in flat memory.

`reduce_chunk` turns a stretch of rows into a `Reduction`; `merged` joins two that follow each other, the step between
them included. Merging is associative, so chunks may be reduced anywhere, in other processes or on other machines, and
merged in their order; a run never needs to be held whole. Everything here is pure: give the same rows, get the same
reduction, as often as some scheduler cares to try.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, replace
from functools import partial
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.envelope.margins import ranges_of
from trunnion.envelope.regions import Between, Track
from trunnion.envelope.results import MarginRange, Spread, joined
from trunnion.envelope.tracks import track_report, track_spread
from trunnion.envelope.trajectories import cosines
from trunnion.envelope.vectors import Array
from trunnion.errors import RegionError

Chunk = tuple[Array, Array]
"""Times (n,) and quaternions (n, 4) scalar first of consecutive rows."""

_HISTOGRAM_CHUNK = 16384


@dataclass(frozen=True, eq=False)
class Plan:
    """What is wanted of every run: pairs u, v (3, M) with their names, bins, and how rows are joined.

    edges (B + 1,) rad increasing from 0 to pi/2: bins of the histogram of margins, filled with time by rows (each row
    stands for half the time to either neighbour; sampled). between, longest_gap, attitude_error as in `Track`.
    """

    names: tuple[str, ...]
    u: Array
    v: Array
    edges: Array = field(default_factory=lambda: np.radians(np.arange(0.0, 95.0, 5.0)))
    between: Between = Between.SLERP
    max_rate: float | None = None
    longest_gap: float | None = None
    attitude_error: float | None = None

    @classmethod
    def of(cls, conventions: Iterable[Convention], **options: Any) -> Plan:
        """A plan for the lock margins of some conventions."""
        listed = list(conventions)
        axes = [convention.lock_axes for convention in listed]
        u, v = (np.stack([pair[side] for pair in axes], axis=1) for side in (0, 1))
        return cls(tuple(convention.name for convention in listed), u, v, **options)


@dataclass(frozen=True, eq=False)
class Reduction:
    """All that is kept of a stretch of rows; arrays as in `Spread` and (M, B) for the histogram (time)."""

    rows: int
    first: Chunk
    last: Chunk
    spread: Spread
    histogram: Array
    joined_time: float
    sign_flips: int
    near_half_turns: int
    gaps: int
    longest_gap: float
    largest_step: float


def reduce_chunk(chunk: Chunk, plan: Plan) -> Reduction:
    """Reduce consecutive rows; raises RegionError for rows that are none (see `Track`)."""
    track = _track(chunk, plan)
    report = track_report(track)
    spread = track_spread(track, plan.u, plan.v)
    spans = np.diff(track.times)
    gap = spans > (np.inf if plan.longest_gap is None else plan.longest_gap)
    weights = np.zeros(len(track.times))
    weights[:-1] += np.where(gap, 0.0, 0.5 * spans)
    weights[1:] += np.where(gap, 0.0, 0.5 * spans)
    return Reduction(
        rows=report.rows,
        first=(track.times[:1].copy(), track.quaternions[:1].copy()),
        last=(track.times[-1:].copy(), track.quaternions[-1:].copy()),
        spread=spread,
        histogram=_histogram(track.quaternions, weights, plan),
        joined_time=float(spans[~gap].sum()),
        sign_flips=report.sign_flips,
        near_half_turns=len(report.near_half_turn),
        gaps=int(np.count_nonzero(gap)),
        longest_gap=float(spans.max(initial=0.0)),
        largest_step=report.largest_step,
    )


def _track(chunk: Chunk, plan: Plan) -> Track:
    times, quaternions = chunk
    return Track(times, quaternions, plan.between, plan.max_rate, plan.attitude_error, plan.longest_gap)


def _histogram(quaternions: Array, weights: Array, plan: Plan) -> Array:
    """Time (M, B) in each bin of the margin."""
    bins = len(plan.edges) - 1
    edges = np.cos(plan.edges)[::-1]  # margins fall as cosines grow
    found = np.zeros((plan.u.shape[1], bins))
    for start in range(0, len(quaternions), _HISTOGRAM_CHUNK):
        part = slice(start, start + _HISTOGRAM_CHUNK)
        sizes = np.abs(cosines(quaternions[part].T, plan.u, plan.v))
        place = np.minimum(np.maximum(bins - np.searchsorted(edges, sizes), 0), bins - 1)
        for pair in range(len(found)):
            found[pair] += np.bincount(place[pair], weights[part], minlength=bins)
    return found


def merged(before: Reduction, after: Reduction, plan: Plan) -> Reduction:
    """The reduction of two stretches that follow each other, with the step between them."""
    step = reduce_chunk(
        (np.concatenate([before.last[0], after.first[0]]), np.concatenate([before.last[1], after.first[1]])), plan
    )
    parts = (before, step, after)
    return Reduction(
        rows=before.rows + after.rows,
        first=before.first,
        last=after.last,
        spread=joined({str(n): part.spread for n, part in enumerate(parts)}, named=False),
        histogram=before.histogram + step.histogram + after.histogram,
        joined_time=before.joined_time + step.joined_time + after.joined_time,
        sign_flips=sum(part.sign_flips for part in parts),
        near_half_turns=sum(part.near_half_turns for part in parts),
        gaps=sum(part.gaps for part in parts),
        longest_gap=max(part.longest_gap for part in parts),
        largest_step=max(part.largest_step for part in parts),
    )


def reduce_chunks(chunks: Iterable[Chunk], plan: Plan) -> Reduction:
    """Reduce a stream of chunks in order; holds one chunk at a time."""
    total: Reduction | None = None
    for times, quaternions in chunks:
        if not len(times):
            continue
        try:
            part = reduce_chunk((times, quaternions), plan)
            total = part if total is None else merged(total, part, plan)
        except RegionError as err:
            done = 0 if total is None else total.rows
            raise RegionError(f"after row {done:,}: {err.fault.cause}", remedy=err.fault.remedy) from err
    if total is None:
        raise RegionError("a run without rows", remedy="leave it out of the campaign")
    return total


@dataclass(frozen=True)
class Part:
    """A part of a run: which run, its place in the run's order, and whatever the reader needs to read it."""

    run: str
    order: int
    source: Any


Reader = Callable[[Any], Iterator[Chunk]]
"""Reads the chunks of a part from its source; must be importable, so that other processes can call it."""


def reduce_part(part: Part, *, read: Reader, plan: Plan) -> Reduction:
    """Reduce one part: the unit of work handed to processes or to a cluster."""
    try:
        return reduce_chunks(read(part.source), plan)
    except RegionError as err:
        raise RegionError(f"run '{part.run}', part {part.order}: {err.fault.cause}", remedy=err.fault.remedy) from err


@dataclass(frozen=True, eq=False)
class RunSummary:
    """One run: margins by name, time in each bin (M, B) and what is odd about its rows."""

    run: str
    margins: dict[str, MarginRange]
    reduction: Reduction


@dataclass(frozen=True, eq=False)
class Campaign:
    """All runs and the whole: margins by name (governing runs named), histogram (M, B) of time, rows and time."""

    plan: Plan
    runs: tuple[RunSummary, ...]
    margins: dict[str, MarginRange]
    histogram: Array
    rows: int
    joined_time: float


def reduce_campaign(
    parts: Iterable[Part],
    read: Reader,
    plan: Plan,
    *,
    mapper: Callable[..., Iterable[Reduction]] = map,
    progress: Callable[[int], None] | None = None,
) -> Campaign:
    """Reduce all parts and gather them by run.

    mapper: `map`, a process pool's `map`, or anything else that applies a pure function to each part in order, such as
    a cluster's; retries are its business. progress is called with the number of parts done.
    """
    listed = sorted(parts, key=lambda part: (part.run, part.order))
    if not listed:
        raise RegionError("a campaign without runs", remedy="name at least one")
    runs: dict[str, Reduction] = {}
    for done, (part, reduction) in enumerate(
        zip(listed, mapper(partial(reduce_part, read=read, plan=plan), listed), strict=True), start=1
    ):
        runs[part.run] = merged(runs[part.run], reduction, plan) if part.run in runs else reduction
        if progress is not None:
            progress(done)
    return gathered(runs, plan)


def gathered(runs: dict[str, Reduction], plan: Plan) -> Campaign:
    """The campaign of finished runs; nothing is joined between one run and the next."""
    summaries = tuple(RunSummary(name, _margins(found.spread, plan, name), found) for name, found in runs.items())
    whole = joined({name: found.spread for name, found in runs.items()})
    return Campaign(
        plan=plan,
        runs=summaries,
        margins=_margins(whole, plan, None),
        histogram=np.sum([found.histogram for found in runs.values()], axis=0),
        rows=sum(found.rows for found in runs.values()),
        joined_time=sum(found.joined_time for found in runs.values()),
    )


def _margins(spread: Spread, plan: Plan, run: str | None) -> dict[str, MarginRange]:
    """Ranges by name; a witness is placed by its run and time, since rows are numbered within chunks only."""
    where = spread.where.copy()
    for place in np.ndindex(*where.shape):
        names = (run,) if run is not None else spread.governing[place]
        where[place] = f"run {', '.join(map(str, names))}"
    ranges = ranges_of(replace(spread, where=where), plan.u, plan.v, line=True)
    return dict(zip(plan.names, ranges, strict=True))
