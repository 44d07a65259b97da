"""What the campaign-sweep template calls: many recorded runs of any length, reduced in flat memory."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property, partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sequence
from trunnion.envelope.campaign import Campaign, Part, Plan, RunSummary, reduce_campaign
from trunnion.envelope.regions import Between
from trunnion.envelope.results import Extreme, MarginRange
from trunnion.figures import charts
from trunnion.sheet import display, independent, parameters, region_checks, sharing
from trunnion.sheet.campaign_runs import Run, followed_least, read_run, runs_of, second_look
from trunnion.sheet.describe import convention_rows, region_rows
from trunnion.sheet.extremes import record_extreme
from trunnion.sheet.rounding import ceiling_text, floor_text
from trunnion.units import parse_quantity

Array = NDArray[np.float64]

_BINS_DEG = np.arange(0.0, 92.5, 2.5)
_MOST_RUNS_SHOWN = 60
_ROWS_LOOKED_AT = 20_000  # rows of each part that scipy looks at again
_MOTION = {
    Between.SLERP: "Between rows the vehicle turns at a constant rate about one axis (slerp).",
    Between.RATE_LIMITED: "Between rows the vehicle moves in any way its largest body rate allows.",
    Between.SAMPLES: "Nothing is said of what happens between rows.",
}
_BETWEEN = {"slerp": Between.SLERP, "rate limited": Between.RATE_LIMITED, "samples": Between.SAMPLES}


def read_part(source: Run) -> Any:
    """The chunks of one part: here a whole run."""
    return read_run(source)


class CampaignSweep:
    """The conventions and the campaign of one sweep; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, conventions: Mapping[str, Any], campaign: Mapping[str, Any]) -> None:
        self._plain = {"conventions": dict(conventions), "campaign": dict(campaign)}
        self.name = str(campaign.get("name", "campaign"))
        self.conventions: dict[str, Convention] = {
            name: parameters.convention(plain) for name, plain in conventions.items()
        }
        self.runs: dict[str, Run] = {run.name: run for run in runs_of(campaign)}
        self.plan = _plan(self.conventions, campaign)

    @cached_property
    def campaign(self) -> Campaign:
        """All runs reduced, on whatever does the work."""
        parts = [Part(name, 0, run) for name, run in self.runs.items()]
        with sharing.shared(len(parts)) as mapper:
            return reduce_campaign(
                parts,
                read_part,
                self.plan,
                mapper=mapper,
                progress=lambda done: sharing.tell_progress(done, len(parts), "runs"),
            )

    @property
    def margins(self) -> dict[str, MarginRange]:
        """Least and largest lock margin of each convention over all runs."""
        return {name: self.campaign.margins[name] for name in self.conventions}

    def show_inputs(self) -> None:
        """The conventions and the campaign's statement; the files are listed with the runs."""
        stated = {key: value for key, value in self._plain["campaign"].items() if key != "files"}
        rows = [row for name, plain in self._plain["conventions"].items() for row in convention_rows(name, plain)]
        count = {"input": "files", "stated": f"{len(self.runs):,} files match", "source": "this workbook"}
        display.inputs([*rows, *region_rows(self.name, stated), count])

    def show_assumptions(self) -> None:
        """The motion between rows and the error of the source."""
        error = self.plan.attitude_error
        known = (
            "The error of the recorded attitude is not stated: all margins are those of the recorded estimate."
            if error is None
            else f"The true attitude lies within {np.degrees(error):g}° of the recorded one."
        )
        gap = self.plan.longest_gap
        display.statement(
            "assumptions",
            [
                f"{_MOTION[self.plan.between]} Nothing is joined between one run and the next.",
                known,
                "Rows of one run are joined however far apart they are."
                if gap is None
                else f"Rows more than {gap:g} s apart are not joined, and nothing is said of the time between them.",
            ],
        )

    def show_margins(self) -> None:
        """Least and largest margin over all runs, recorded, with run and time."""
        rows = []
        for name, found in self.margins.items():
            self._record("lock margin", name, found.least)
            self._record("largest lock margin", name, found.largest)
            rows.append([name, _floor(found.least), _ceiling(found.largest), *self._place(found.least)])
        display.table(
            "tbl:margins",
            ["convention", "least margin", "largest margin", "run of the least", "time there"],
            rows,
            caption=f"Lock margins over all runs of {self.name}",
            align="lrrlr",
            notes=[f"Least margins rounded down, largest up. Basis: {self._basis()}.", self._size()],
        )

    def show_ranking(self) -> None:
        """All twelve sequences about moving axes over all runs."""
        names = [sequence.value for sequence in Sequence]
        values = [float(np.degrees(self.campaign.margins[_pair_name(s.axes[0], s.axes[2])].least.lo)) for s in Sequence]
        best = names[int(np.argmax(values))]
        display.figure(
            "fig:ranking",
            charts.ranking_chart(names, values),
            caption="The twelve sequences about moving axes over all runs, zero attitude along the frames' own axes",
            alt=f"Bar chart of the least lock margin of the twelve sequences over all runs; best is {best} with "
            f"{max(values):.2f} degrees.",
        )

    def show_runs(self) -> None:
        """Per-run margins: a picture of all runs, and a table of those that come nearest to lock."""
        ordered = sorted(self.campaign.runs, key=self._least)
        display.figure(
            "fig:runs",
            charts.run_margins(
                [run.run for run in ordered],
                {name: [float(np.degrees(run.margins[name].least.lo)) for run in ordered] for name in self.conventions},
            ),
            caption="Least lock margin of each run, runs in order of the least of all conventions",
            alt=f"Least lock margin in degrees of {len(ordered)} runs, one mark a convention; lowest is "
            f"{ordered[0].run}.",
        )
        shown = ordered[:_MOST_RUNS_SHOWN]
        left = len(ordered) - len(shown)
        display.table(
            "tbl:runs",
            ["run", "rows", "time joined", *self.conventions, "worst time", "of"],
            [self._run_row(run) for run in shown],
            caption="Least lock margin of each run and when it is reached, nearest to lock first",
            align="lrr" + "r" * len(self.conventions) + "rl",
            notes=[f"{left:,} further runs stay farther from lock."] if left else [],
        )

    def show_histogram(self) -> None:
        """Share of the joined time against the margin."""
        total = self.campaign.histogram.sum(axis=1, keepdims=True)
        shares = 100.0 * self.campaign.histogram / np.where(total > 0.0, total, 1.0)
        display.figure(
            "fig:histogram",
            charts.margin_histogram(
                _BINS_DEG, {name: shares[n] for n, name in enumerate(self.conventions)}, of="the time"
            ),
            caption="Share of the joined time of all runs against the lock margin (each row stands for half the time "
            "to either neighbour)",
            alt="Histogram of lock margins in per cent of the time, one curve a convention.",
        )

    def show_oddities(self) -> None:
        """What is odd about the rows: gaps and near half turns as findings, sign flips counted."""
        for run in self.campaign.runs:
            found = run.reduction
            if found.gaps:
                display.finding(
                    f"gap:{run.run}",
                    f"{found.gaps:,} gaps longer than stated, the longest {found.longest_gap:.6g} s: not joined",
                    against=f"{self.name}, {run.run}",
                )
            if found.near_half_turns and self.plan.between is not Between.SAMPLES:
                display.finding(
                    f"half-turn:{run.run}",
                    f"{found.near_half_turns:,} steps of nearly half a turn: which way round is a guess",
                    against=f"{self.name}, {run.run}",
                )
        flips = sum(run.reduction.sign_flips for run in self.campaign.runs)
        largest = max(self.campaign.runs, key=lambda run: run.reduction.largest_step)
        display.statement(
            "oddities",
            [
                f"Neighbouring rows whose quaternions have opposite signs: {flips:,} (the same attitude, no fault).",
                f"The largest step between rows is {np.degrees(largest.reduction.largest_step):.3f}°, "
                f"in {largest.run}.",
            ],
        )

    def show_checks(self) -> None:
        """Each least margin by scipy at its witness, along the governing run, and against rows of every run."""
        looks = self._looks()
        for name, found in self.margins.items():
            self._check_witness(name, found.least)
            self._check_followed(name, found.least)
            ours = float(np.degrees(found.least.lo))
            theirs = max(0.0, min(look.least[name] for look in looks) - self._error_deg())
            display.check(
                f"check:{name}:rows",
                f"least lock margin of {name}: no row looked at in any run lies nearer",
                ours=ours,
                theirs=theirs,
                difference=max(0.0, ours - theirs),
                tolerance=region_checks.WITNESS_TOLERANCE_DEG,
                unit="deg",
                library=independent.LIBRARY,
            )
        display.check(
            "check:rows",
            f"rows read ({sum(look.looked_at for look in looks):,} of them looked at by scipy)",
            ours=self.campaign.rows,
            theirs=sum(look.rows for look in looks),
            tolerance=0.0,
            unit="rows",
            library="a second reading",
        )

    def show_results(self) -> None:
        """The results in one table."""
        display.table(
            "tbl:results",
            ["quantity", "of", "over", "value", "basis", "governed by"],
            [
                [
                    "lock margin",
                    name,
                    self.name,
                    _floor(found.least),
                    found.least.basis.value,
                    self._place(found.least)[0],
                ]
                for name, found in self.margins.items()
            ],
            caption="Results of this calculation",
            align="lllrll",
        )

    # --- parts of the above ---

    def _looks(self) -> list[Any]:
        look = partial(second_look, conventions=list(self.conventions.values()), most_rows=_ROWS_LOOKED_AT)
        with sharing.shared(len(self.runs)) as mapper:
            return list(mapper(look, list(self.runs.values())))

    def _check_witness(self, name: str, least: Extreme) -> None:
        from scipy.spatial.transform import Rotation

        if least.witness is None:
            return
        attitude = Rotation.from_matrix(least.witness.matrix)
        display.check(
            f"check:{name}:witness",
            f"least lock margin of {name}, at its witness",
            ours=float(np.degrees(least.witness.value)),
            theirs=float(independent.lock_margin_deg(self.conventions[name], attitude)[0]),
            tolerance=region_checks.WITNESS_TOLERANCE_DEG,
            unit="deg",
            library=independent.LIBRARY,
        )

    def _check_followed(self, name: str, least: Extreme) -> None:
        """The governing run followed by scipy's own slerp; other motions between rows have no such twin."""
        if self.plan.between is not Between.SLERP:
            return
        run, gap = self._governing(least), self.plan.longest_gap or np.inf
        found = followed_least(self.runs[run], convention=self.conventions[name], longest_gap=gap)
        display.check(
            f"check:{name}:followed",
            f"least lock margin of {name} along {run}",
            ours=float(np.degrees(least.lo)),
            theirs=max(0.0, found - self._error_deg()),
            tolerance=region_checks.SEARCH_TOLERANCE_DEG,
            unit="deg",
            library="scipy Rotation and Slerp",
        )

    def _error_deg(self) -> float:
        return 0.0 if self.plan.attitude_error is None else float(np.degrees(self.plan.attitude_error))

    def _governing(self, least: Extreme) -> str:
        return least.governing[0] if least.governing else next(iter(self.runs))

    def _place(self, extreme: Extreme) -> list[str]:
        time = None if extreme.witness is None else extreme.witness.time
        return [", ".join(extreme.governing), "" if time is None else f"{time:.3f} s"]

    def _least(self, run: RunSummary) -> float:
        return min(run.margins[name].least.lo for name in self.conventions)

    def _run_row(self, run: RunSummary) -> list[str]:
        worst = min(self.conventions, key=lambda name: run.margins[name].least.lo)
        witness = run.margins[worst].least.witness
        time = "" if witness is None or witness.time is None else f"{witness.time:.3f} s"
        least = [_floor(run.margins[name].least) for name in self.conventions]
        return [run.run, f"{run.reduction.rows:,}", f"{run.reduction.joined_time:.6g} s", *least, time, worst]

    def _size(self) -> str:
        return (
            f"{len(self.runs):,} runs, {self.campaign.rows:,} rows, {self.campaign.joined_time:.6g} s of joined time."
        )

    def _basis(self) -> str:
        return next(iter(self.margins.values())).least.basis.value

    def _record(self, quantity: str, name: str, extreme: Extreme) -> None:
        record_extreme(extreme, quantity=quantity, of=name, over=self.name)


def _plan(conventions: Mapping[str, Convention], plain: Mapping[str, Any]) -> Plan:
    """The pairs of all conventions, then the nine pairs of the frames' own axes."""
    axes = [convention.lock_axes for convention in conventions.values()]
    eye = np.eye(3)
    u = np.concatenate([np.stack([pair[0] for pair in axes], axis=1), np.repeat(eye, 3, axis=1)], axis=1)
    v = np.concatenate([np.stack([pair[1] for pair in axes], axis=1), np.tile(eye, (1, 3))], axis=1)
    names = (*conventions, *(_pair_name(i, k) for i in range(3) for k in range(3)))
    return Plan(
        names,
        u,
        v,
        edges=np.radians(_BINS_DEG),
        between=_BETWEEN[str(plain.get("between samples", "samples"))],
        max_rate=_value(plain, "max body rate", "angular rate"),
        longest_gap=_value(plain, "max gap", "time"),
        attitude_error=_value(plain, "attitude error", "angle"),
    )


def _value(plain: Mapping[str, Any], key: str, kind: str) -> float | None:
    text = plain.get(key)
    return None if text is None else float(parse_quantity(text, kind=kind).value)


def _pair_name(i: int, k: int) -> str:
    return f"\0{i}{k}"  # no convention can bear this name


def _floor(extreme: Extreme) -> str:
    return f"{floor_text(float(np.degrees(extreme.lo)))}°"


def _ceiling(extreme: Extreme) -> str:
    return f"{ceiling_text(float(np.degrees(extreme.hi)))}°"
