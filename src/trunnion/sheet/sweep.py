"""What the envelope-sweep template calls: margins of conventions over regions, ranked, pictured and checked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.demand import margin_for_rate
from trunnion.attitude.noise import linear_noise
from trunnion.attitude.sequences import Sequence
from trunnion.envelope.demand import peak_demand
from trunnion.envelope.findings import region_findings
from trunnion.envelope.margins import entry_margin_table, lock_margin
from trunnion.envelope.regions import Dispersed, Mounted, Region, Track, Union
from trunnion.envelope.results import AngleRange, Extreme
from trunnion.envelope.shares import shares_near_lock
from trunnion.envelope.subdivision import self_check
from trunnion.envelope.tracks import track_report
from trunnion.errors import TrunnionError
from trunnion.figures import charts, drawings
from trunnion.sheet import display, parameters, region_checks
from trunnion.sheet.describe import angles_text, convention_rows, region_rows, table_lines
from trunnion.sheet.extremes import record_extreme
from trunnion.sheet.maps import angle_maps, body_track, gains, histogram, phases_along
from trunnion.sheet.rounding import ceiling_text, floor_text, interval_text
from trunnion.units import parse_quantity

Array = NDArray[np.float64]

_MOST_FINDINGS = 12  # of one region; what is beyond is counted
_NEAR_LOCK_DEG = (2.0, 5.0, 10.0)


class EnvelopeSweep:
    """The conventions and regions of one sweep; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        conventions: Mapping[str, Any],
        envelopes: Mapping[str, Any],
        angle_rate_limit: str = "",
        attitude_noise: str = "",
        self_check: bool = False,
    ) -> None:
        self._plain = {"conventions": dict(conventions), "envelopes": dict(envelopes)}
        self._stated = {"angle rate limit": angle_rate_limit, "attitude noise": attitude_noise}
        self._self_check = self_check
        self.conventions: dict[str, Convention] = {
            name: parameters.convention(plain) for name, plain in conventions.items()
        }
        self._tables: dict[str, list[Any]] = {name: [] for name in envelopes}
        self.regions: dict[str, Region] = {
            name: parameters.region(plain, self._tables[name]) for name, plain in envelopes.items()
        }

    @cached_property
    def margins(self) -> dict[tuple[str, str], AngleRange]:
        """Least and largest lock margin by (convention, region)."""
        return {
            (name, over): lock_margin(region, convention)
            for name, convention in self.conventions.items()
            for over, region in self.regions.items()
        }

    def show_inputs(self) -> None:
        """The conventions and regions as the injected parameters state them."""
        display.inputs(
            [row for name, plain in self._plain["conventions"].items() for row in convention_rows(name, plain)]
            + [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
            + [
                {"input": name, "stated": text, "source": "this workbook"}
                for name, text in self._stated.items()
                if text
            ]
        )

    def show_assumptions(self) -> None:
        """What is taken for granted about each table: the motion between its rows and the error of its source; what is
        odd about a region is a finding against it."""
        tracks = self._tracks()
        texts = [
            f"Between the rows of {name} the vehicle {track.between.value}; "
            + (
                "the error of the recorded attitude is not stated: its margins are those of the recorded estimate."
                if track.attitude_error is None
                else f"the true attitude lies within {np.degrees(track.attitude_error):g}° of the recorded one."
            )
            for name, track in tracks.items()
        ]
        texts += [
            line for name, tables in self._tables.items() for table in tables for line in table_lines(name, table)
        ]
        texts += [line for name, track in tracks.items() for line in _handled(name, track)]
        display.statement("assumptions", texts or ["None beyond the inputs: every region is stated in closed form."])
        for name, region in self.regions.items():
            found = region_findings(region)
            for number, text in enumerate(found[:_MOST_FINDINGS], start=1):
                display.finding(f"region:{name}:{number}", text, against=name)
            if len(found) > _MOST_FINDINGS:
                left = f"{len(found) - _MOST_FINDINGS:,} further findings of the same kinds"
                display.finding(f"region:{name}:more", left, against=name)
        for name, tables in self._tables.items():
            for number, trouble in enumerate(
                (t for table in tables for t in table.findings if t.kind != "gap"), start=1
            ):
                display.finding(f"{name}-{number}", f"{name}: {trouble}.", against=f"input {name}")

    def show_margins(self) -> None:
        """The table of least margins, each one recorded with its witness, and where each is reached."""
        for (name, over), found in self.margins.items():
            self._record("lock margin", name, over, found.least)
            self._record("largest lock margin", name, over, found.largest)
        display.table(
            "tbl:margins",
            ["convention", *self.regions],
            [
                [name, *(_least_text(self.margins[name, over].least) for over in self.regions)]
                for name in self.conventions
            ],
            caption="Least lock margin of each convention over each region",
            align="l" + "r" * len(self.regions),
            notes=["Rounded down. Basis: " + self._bases()],
        )
        display.table(
            "tbl:witnesses",
            ["convention", "region", "margin there", "the convention's own angles there", "place in the region"],
            [self._witness_row(name, over) for name, over in self.margins],
            caption="Where the least margin is reached",
            align="llrll",
        )

    def show_pairs(self) -> None:
        """The nine axis pairs over all regions together, with the sequences each pair serves."""
        first = next(iter(self.conventions.values()))
        words = [first.body.word(axis) for axis in range(3)]
        rows = [
            [
                first.reference.word(i),
                *(f"{_floor_degrees(self._entries[i, k])} ({', '.join(_served(i, k))})" for k in range(3)),
            ]
            for i in range(3)
        ]
        display.table(
            "tbl:pairs",
            ["reference axis", *(f"body {word}" for word in words)],
            rows,
            caption="Least angle between each reference axis and each body axis over all regions, with the sequences "
            "about moving axes that lock there",
            align="lrrr",
            notes=["A sequence about fixed axes locks where the reversed sequence about moving axes does."],
        )

    def show_ranking(self) -> None:
        """All twelve sequences about moving axes, best guaranteed margin first."""
        names = [sequence.value for sequence in Sequence]
        values = [float(np.degrees(self._entries[sequence.axes[0], sequence.axes[2]])) for sequence in Sequence]
        best = names[int(np.argmax(values))]
        display.figure(
            "fig:ranking",
            charts.ranking_chart(names, values),
            caption="The twelve sequences about moving axes, zero attitude along the frames' own axes",
            alt=f"Bar chart of the guaranteed least lock margin of the twelve sequences; best is {best} with "
            f"{max(values):.2f} degrees.",
        )

    def show_distribution(self) -> None:
        """How the margin is distributed over samples of all regions, for each convention."""
        edges, shares = histogram(self.conventions, self.regions)
        display.figure(
            "fig:distribution",
            charts.margin_histogram(edges, shares),
            caption="Distribution of the lock margin over samples of each region, evenly in the angles of boxes and in "
            "solid angle and roll of cones, and over the rows of tables (an illustration, not evidence)",
            alt="Histogram of lock margins in per cent of samples, one curve a convention.",
        )

    def show_maps(self) -> None:
        """Maps for each convention: its margin over each pair of angles of the box region that governs it."""
        for name, convention in self.conventions.items():
            drawn = angle_maps(
                convention, self.regions, {over: self.margins[name, over].least for over in self.regions}
            )
            if drawn is not None:
                display.figure(
                    f"fig:map-{name}",
                    charts.margin_maps(drawn.panels),
                    caption=f"Lock margin of {name} over {drawn.words}, two at a time, the third held where the margin "
                    f"is least (diamond); the box is the region {drawn.region}, coloured lines surround lock",
                    alt=f"Three contour maps of the lock margin of {name}; the least margin in the box is marked.",
                )

    def show_history(self) -> None:
        """Margin against time for every table, phases shaded, and the track of the carried axis among the lock
        directions."""
        for name, track in self._tracks().items():
            R = _matrices(track)
            others = {over: region for over, region in self.regions.items() if over != name}
            phases = phases_along(track, others)
            curves = {key: np.degrees(convention.lock_margin(R)) for key, convention in self.conventions.items()}
            worst = {
                key: (float(track.times[int(curve.argmin())]), float(curve.min())) for key, curve in curves.items()
            }
            display.figure(
                f"fig:history-{name}",
                charts.margin_against_time(track.times, curves, worst=worst, phases=phases),
                caption=f"Lock margin of the recorded estimate against time, {name}; least rows marked"
                + ("; shaded while the recorded attitude lies in the region named above" if phases else ""),
                alt=f"Lock margin in degrees against time for the table {name}, one curve a convention.",
            )
            key, convention = min(self.conventions.items(), key=lambda pair: worst[pair[0]][1])
            display.figure(
                f"fig:sphere-{name}",
                drawings.sphere_drawing(**body_track(name, track, convention)),
                caption=f"Path of the axis that {key} must keep away from its lock line, {name}",
                alt=f"Sphere with the path of the carried axis of {key} and caps of ten degrees about the lock line.",
            )

    def show_shares(self) -> None:
        """Shares of each region, or of the time of each table, within given distances of lock."""
        rows = []
        for name, convention in self.conventions.items():
            for over, region in self._measurable():
                shares = shares_near_lock(region, convention, np.radians(_NEAR_LOCK_DEG))
                display.record(
                    quantity=f"share within {_NEAR_LOCK_DEG[-1]:g} deg of lock",
                    of=name,
                    over=over,
                    lo=100.0 * shares[-1].lo,
                    hi=100.0 * shares[-1].hi,
                    unit="%",
                    basis=shares[-1].basis,
                )
                rows.append([name, over, *(_share_text(share.lo, share.hi) for share in shares), shares[0].rule])
        display.table(
            "tbl:shares",
            ["convention", "region", *(f"within {distance:g}°" for distance in _NEAR_LOCK_DEG), "share"],
            rows,
            caption="Share within given distances of lock",
            align="ll" + "r" * len(_NEAR_LOCK_DEG) + "l",
        )

    def show_rates(self) -> None:
        """What the stated body rates and accelerations can demand of the outer angles, and the margin a limit needs."""
        rows = [row for name in self.conventions for over in self.regions if (row := self._demand_row(name, over))]
        if not rows:
            display.statement("rates", "No region states a body rate, so no angle rates are worked out.")
            return
        display.table(
            "tbl:rates",
            [
                "convention",
                "region",
                "body rate",
                "outer angle rate at most",
                "body acceleration",
                "outer angle acceleration at most",
            ],
            rows,
            caption="What the stated body rates and accelerations can demand of the outer angles",
            align="llrrrr",
        )
        limit = self._stated["angle rate limit"]
        if limit:
            display.statement("rate-limit", [self._limit_line(over, limit) for over in self.regions])

    def show_gains(self) -> None:
        """What a body rate or a small attitude error becomes in the angles, against the middle angle."""
        for number, (kind, picture) in enumerate(gains(self.conventions), start=1):
            display.figure(
                f"fig:gains-{number}",
                charts.gain_curves(**picture),
                caption=f"Sequences about {kind}: largest angle rate for a body rate of one, and standard deviation of "
                "the angles for attitude noise of one an axis, against the middle angle; lock is crossed",
                alt=f"Amplification against the middle angle for sequences about {kind}, without bound at lock.",
            )

    def show_noise(self) -> None:
        """How attitude noise grows into each angle at the least margin, and where the linear law holds."""
        text = self._stated["attitude noise"]
        if not text:
            display.statement("noise", "No attitude noise is stated, so its growth is not worked out.")
            return
        sigma = parse_quantity(text, kind="angle").value
        rows = []
        for (name, over), found in self.margins.items():
            if found.least.lo <= 0.0:
                rows.append([name, over, "unbounded", "", "no"])
                continue
            noise = linear_noise(found.least.lo, sigma)
            holds = "yes" if bool(noise.holds) else "no: Rice and projected-normal laws apply"
            rows.append([name, over, f"{np.degrees(noise.outer):.4f}°", f"{np.degrees(noise.combination):.4f}°", holds])
        display.table(
            "tbl:noise",
            ["convention", "region", "outer angles", "their known combination", "linear law holds"],
            rows,
            caption=f"Standard deviation of the angles at the least margin for {text} of attitude noise an axis",
            align="llrrl",
        )

    def show_self_check(self) -> None:
        """The least margins bracketed by subdivision, which knows nothing of the closed forms, if asked for."""
        if not self._self_check:
            display.statement("self-check", "The check by subdivision was not asked for.")
            return
        rows = []
        for (name, over), found in self.margins.items():
            bracket = self_check(self.regions[over], self.conventions[name])
            display.check(
                f"check:{name}:{over}:subdivision",
                f"least lock margin of {name} over {over}, bracketed by subdivision",
                ours=float(np.degrees(found.least.lo)),
                theirs=float(np.degrees(bracket.lo)),
                difference=float(np.degrees(max(0.0, bracket.lo - found.least.hi, found.least.lo - bracket.hi))),
                tolerance=1e-9,
                unit="deg",
                library="second-order subdivision",
            )
            low, high = (float(np.degrees(end)) for end in (bracket.lo, bracket.hi))
            rows.append([name, over, f"{floor_text(low, 4)}° … {ceiling_text(high, 4)}°", f"{bracket.cells:,}"])
        display.table(
            "tbl:self-check",
            ["convention", "region", "bracket", "cells looked at"],
            rows,
            caption="Least margins bracketed by subdivision",
            align="llrr",
        )

    def show_checks(self) -> None:
        """Each least margin again by scipy: at its witness, and by searching the region rebuilt from its words."""
        for (name, over), found in self.margins.items():
            region_checks.check_least_margin(
                f"check:{name}:{over}",
                f"least lock margin of {name} over {over}",
                convention=self.conventions[name],
                plain=self._plain["envelopes"][over],
                region=self.regions[over],
                claimed=found.least,
            )

    def show_results(self) -> None:
        """The results in one table: interval, basis, and what governs where a region has parts."""
        rows = [
            ["lock margin", name, over, _least_text(found.least), found.least.basis.value, _governed(found.least)]
            for (name, over), found in self.margins.items()
        ]
        heads = ["quantity", "of", "over", "value", "basis", "governed by"]
        shown = len(heads) if any(row[-1] for row in rows) else len(heads) - 1
        display.table(
            "tbl:results",
            heads[:shown],
            [row[:shown] for row in rows],
            caption="Results of this calculation",
            align="lllrll"[:shown],
        )

    @cached_property
    def _entries(self) -> Array:
        """Guaranteed least angle (3, 3) rad between reference axis i and body axis k over all regions together."""
        return entry_margin_table(Union(dict(self.regions))).least

    def _measurable(self) -> list[tuple[str, Region]]:
        """Regions that have a measure of their own: phases one by one, since they have none in common."""
        return [found for over, region in self.regions.items() for found in _phases_apart(over, region)]

    def _tracks(self) -> dict[str, Track]:
        return {name: region for name, region in self.regions.items() if isinstance(region, Track)}

    def _bases(self) -> str:
        return "; ".join(
            f"{over} {'/'.join(sorted({self.margins[name, over].least.basis.value for name in self.conventions}))}"
            for over in self.regions
        )

    def _record(self, quantity: str, name: str, over: str, extreme: Extreme) -> None:
        note = f"governed by {_governed(extreme)}" if extreme.governing else ""
        record_extreme(extreme, quantity=quantity, of=name, over=over, note=note)

    def _witness_row(self, name: str, over: str) -> list[str]:
        witness = self.margins[name, over].least.witness
        if witness is None:
            return [name, over, "", "", "bound only, no attitude is known to reach it"]
        when = "" if witness.time is None else f", t = {witness.time:.3f} s"
        place = witness.where.replace(" -", " −")
        angles = angles_text(self.conventions[name], witness.matrix)
        return [name, over, f"{np.degrees(witness.value):.4f}°", angles, f"{place}{when}"]

    def _demand_row(self, name: str, over: str) -> list[str]:
        plain = self._plain["envelopes"][over]
        stated, faster = plain.get("max body rate"), plain.get("max angular acceleration")
        if stated is None:
            return []
        rate = parse_quantity(stated, kind="angular rate").value
        acceleration = 0.0 if faster is None else parse_quantity(faster, kind="angular acceleration").value
        demand = peak_demand(self.regions[over], self.conventions[name], rate, acceleration)
        row = [name, over, stated]
        if not np.isfinite(demand.outer_rate[1]):
            return [*row, "unbounded: lock is within the region", faster or "not stated", "unbounded"]
        self._record_demand("largest angle rate", name, over, demand.outer_rate, "deg/s", demand.basis.value)
        row += [f"{ceiling_text(float(np.degrees(demand.outer_rate[1])), 1)} deg/s", faster or "not stated"]
        if faster is None:
            return [*row, "not worked out"]
        found = demand.outer_acceleration
        self._record_demand("largest angle acceleration", name, over, found, "deg/s^2", demand.basis.value)
        return [*row, f"{ceiling_text(float(np.degrees(found[1])), 1)} deg/s²"]

    def _record_demand(
        self, quantity: str, name: str, over: str, ends: tuple[float, float], unit: str, basis: str
    ) -> None:
        lo, hi = (float(np.degrees(end)) for end in ends)
        display.record(quantity=quantity, of=name, over=over, lo=min(lo, hi), hi=hi, unit=unit, basis=basis)

    def _limit_line(self, over: str, limit: str) -> str:
        stated = self._plain["envelopes"][over].get("max body rate")
        if stated is None:
            return f"{over}: no body rate is stated."
        try:
            needed = margin_for_rate(parse_quantity(stated, kind="angular rate").value, parse_quantity(limit).value)
        except TrunnionError as err:
            return f"{over}: {err.fault.cause}."
        margin = ceiling_text(float(np.degrees(needed)))
        return f"{over}: a limit of {limit} on the outer angle rates needs a margin of {margin}°."


def _handled(name: str, track: Track) -> list[str]:
    """What was noticed in a table and handled."""
    report = track_report(track)
    lines = []
    if report.sign_flips:
        lines.append(
            f"{name}: {report.sign_flips:,} neighbouring rows have quaternions of opposite signs, which are the "
            "same attitudes; handled."
        )
    if report.repeated:
        lines.append(f"{name}: {report.repeated:,} rows repeat the attitude of the row before.")
    return lines


def _phases_apart(name: str, region: Region) -> list[tuple[str, Region]]:
    if isinstance(region, Union):
        return [found for part, inner in region.parts.items() for found in _phases_apart(f"{name}, {part}", inner)]
    if isinstance(region, Dispersed | Mounted):
        return [(part, replace(region, region=inner)) for part, inner in _phases_apart(name, region.region)]
    return [(name, region)]


def _share_text(low: float, high: float) -> str:
    lowest, highest = f"{100 * low:.2f}", f"{100 * high:.2f}"
    return f"{lowest} %" if lowest == highest else f"{lowest} … {highest} %"


def _matrices(track: Track) -> Array:
    from trunnion.attitude.rotations import matrix_from_quaternion

    return matrix_from_quaternion(track.quaternions)


def _least_text(extreme: Extreme) -> str:
    return interval_text(float(np.degrees(extreme.lo)), None).removeprefix("at least ")


def _floor_degrees(angle: float) -> str:
    return interval_text(float(np.degrees(angle)), None).removeprefix("at least ")


def _governed(extreme: Extreme) -> str:
    return ", ".join(extreme.governing)


def _served(i: int, k: int) -> list[str]:
    return [sequence.value for sequence in Sequence if (sequence.axes[0], sequence.axes[2]) == (i, k)]
