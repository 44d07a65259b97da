"""A two-axis mount that follows passes: keyhole, lost time, base tilt, stops, forbidden sectors, ways round them."""

from __future__ import annotations

from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import degrees_text
from trunnion.errors import HardwareError
from trunnion.figures import sky
from trunnion.hardware.keyholes import BaseTilt, Keyhole, best_base_tilt, keyhole, keyhole_map, tilted
from trunnion.hardware.passes import PassAnalysis, analyse_pass, azimuth_elevation
from trunnion.hardware.sectors import SectorResult, sectors_along_pass, unwinding_routes
from trunnion.hardware.vectors import about_all
from trunnion.sheet import display, gimbal_checks
from trunnion.sheet.rounding import ceiling_text, floor_text

if TYPE_CHECKING:
    from trunnion.sheet.gimbal import GimbalTravel

Array = NDArray[np.float64]


class SkyWork:
    """The work over the passes of one two-axis gimbal."""

    def __init__(self, gimbal: GimbalTravel) -> None:
        self.gimbal, self.chain = gimbal, gimbal.chain
        self.passes, self.sectors = gimbal.passes, gimbal.sectors

    @cached_property
    def keyhole(self) -> Keyhole | None:
        """The keyhole for the line of sight rate; None without a rate, a rate limit, or with more than two axes."""
        rate = self.gimbal.sight_rate
        if rate is None or len(self.chain.joints) != 2 or self.chain.joints[0].rate is None:
            return None
        return keyhole(self.chain, rate, boresight_p=self.gimbal.boresight)

    @cached_property
    def analyses(self) -> dict[str, PassAnalysis]:
        """Every pass analysed."""
        return {
            name: analyse_pass(self.chain, track, boresight_p=self.gimbal.boresight)
            for name, track in self.passes.items()
        }

    @cached_property
    def sector_results(self) -> dict[str, list[SectorResult]]:
        """Clearance from every sector along every pass."""
        chosen = list(self.sectors.values())
        return {name: sectors_along_pass(chosen, track, mode=self.gimbal.mode) for name, track in self.passes.items()}

    @cached_property
    def tilt(self) -> BaseTilt | None:
        """The base tilt with the least time beyond the outer rate limit."""
        if self.gimbal.largest_tilt is None or not self.passes or self.chain.joints[0].rate is None:
            return None
        return best_base_tilt(self.chain, list(self.passes.values()), largest=self.gimbal.largest_tilt)

    def show_keyhole(self) -> None:
        """The keyhole apart from the unreachable cones, recorded."""
        found = self.keyhole
        if found is None:
            display.statement(
                "keyhole", "No keyhole is worked out: it takes two axes, a rate limit and a line of sight."
            )
            return
        assert self.gimbal.sight_rate is not None
        size = float(np.degrees(found.half_angle))
        display.record(
            quantity="keyhole half angle", of=self.chain.name, over=None, lo=size, hi=size, unit="deg", basis="exact",
            note="from the stated rate and acceleration limits",
        )  # fmt: skip
        acceleration = (
            f"; its acceleration limit asks for {degrees_text(found.by_acceleration, 3)}"
            if np.isfinite(self.chain.limits("acceleration")[0])
            else ""
        )
        display.statement(
            "keyhole",
            [
                f"A line of sight that moves at {np.degrees(self.gimbal.sight_rate):.4g} deg/s asks more of the "
                "outer axis "
                f"than its rate limit within {degrees_text(found.by_rate, 3)} of the outer axis{acceleration}. These "
                "directions are reached; they cannot be followed.",
                f"Never reached: {degrees_text(found.unreachable_ahead, 3)} about the outer axis and "
                f"{degrees_text(found.unreachable_behind, 3)} about its opposite.",
            ],
        )

    def show_passes(self) -> None:
        """What each pass demands, what is lost, recorded (sampled)."""
        if not self.passes:
            display.statement("passes", "No pass is given.")
            return
        outer, inner = (joint.name for joint in self.chain.joints)
        rows = []
        for name, found in self.analyses.items():
            display.record(
                quantity="time lost", of=self.chain.name, over=name, lo=None, hi=None, unit="s", basis="sampled",
                attained=float(found.seconds_lost), witness={"where": "rows of the pass"},
            )  # fmt: skip
            clearance = float(np.degrees(found.clearance))
            display.record(
                quantity="pass clearance", of=self.chain.name, over=name, lo=clearance, hi=None, unit="deg",
                basis="certified bound", note="least angle to the outer axis, between rows on great circles",
            )  # fmt: skip
            flip = f"{sum(gap.seconds for gap in found.lost_with_flip):.1f}" if found.lost_with_flip else "none"
            rates, accelerations = np.degrees(found.rates), np.degrees(found.accelerations)
            rows.append([
                name, degrees_text(found.highest, 2), f"{floor_text(clearance)}°",
                *(f"{v:.2f}" for v in rates), f"{accelerations[0]:.3f}", f"{found.seconds_over_rate[0]:.1f}",
                f"{sum(gap.seconds for gap in found.lost):.1f}", flip,
            ])  # fmt: skip
        display.table(
            "tbl:passes",
            ["pass", "highest", "clearance", f"{outer}, deg/s", f"{inner}, deg/s", f"{outer}, deg/s²",
             "beyond rate, s", "off target, s", "with flip, s"],
            rows,
            caption="What the passes demand, and the time lost with the axis catching up within its limits",
            align="lrrrrrrrr",
        )  # fmt: skip

    def show_sky(self) -> None:
        """The sky seen from the mount."""
        if len(self.chain.joints) != 2 or not (self.passes or self.sectors or self.gimbal.sight_rate):
            display.statement("sky", "No sky is drawn: it takes two axes and a pass, a sector or a line of sight rate.")
            return
        axis = self.chain.axes[0] if self.chain.axes[0][2] <= 0.0 else -self.chain.axes[0]
        centre = tuple(float(np.degrees(v)) for v in azimuth_elevation(axis))
        found, cones = self.keyhole, {}
        hole = None
        if found is not None and max(found.by_rate, found.by_acceleration) > 0.0:
            hole = _outline(axis, min(found.half_angle, np.pi / 2))
        for word, cone, line in (
            ("unreachable", self.gimbal.reach.cone_ahead, self.chain.axes[0]),
            ("unreachable, opposite", self.gimbal.reach.cone_behind, -self.chain.axes[0]),
        ):
            if cone > 1e-6 and line[2] <= 0.0:
                cones[word] = _outline(line, cone)
        stops = keyhole_map(self.chain, self.gimbal.sight_rate or 1.0, boresight_p=self.gimbal.boresight)
        tracks = {}
        for name, track in self.passes.items():
            azimuth, elevation = azimuth_elevation(track.direction_g)
            tracks[name] = (np.degrees(np.unwrap(azimuth)), np.degrees(elevation))
        display.figure(
            "fig:sky",
            sky.sky_plot(
                tracks,
                outer_axis=(centre[0], centre[1]),
                keyhole=hole,
                out_of_travel=(np.degrees(stops.azimuth), np.degrees(stops.elevation), ~stops.in_travel),
                sectors={
                    name: np.degrees(sector.corners)
                    for name, sector in self.sectors.items()
                    if sector.holds_in(self.gimbal.mode)
                },
                cones=cones,
            ),
            caption=f"The sky seen from {self.chain.name}: zenith in the middle",
            alt=f"Sky plot with outer axis at elevation {centre[1]:.1f} deg"
            + ("" if found is None else f", keyhole of {np.degrees(found.half_angle):.2f} deg half angle")
            + (f", passes {', '.join(tracks)}" if tracks else "")
            + (f", sectors {', '.join(self.sectors)}" if self.sectors else ""),
        )

    def show_histories(self) -> None:
        """Joint angles along every pass, with the stops."""
        if not self.passes:
            display.statement("histories", "No pass is given, so no joint angles are drawn.")
        for name, found in self.analyses.items():
            track = self.passes[name]
            angles = np.full((len(track.times), 2), np.nan)
            for segment in found.plan.segments:
                angles[segment.first : segment.last + 1] = segment.angles
            joints = self.chain.joints
            display.figure(
                f"fig:pass-{name}",
                sky.joint_history(
                    track.times,
                    {joint.name: np.degrees(angles[:, k]) for k, joint in enumerate(joints)},
                    stops={j.name: (float(np.degrees(j.travel[0])), float(np.degrees(j.travel[1]))) for j in joints},
                ),
                caption=f"Joint angles along pass {name}",
                alt="; ".join(
                    f"{j.name} {np.nanmin(np.degrees(angles[:, k])):.1f} to "
                    f"{np.nanmax(np.degrees(angles[:, k])):.1f} deg"
                    for k, j in enumerate(joints)
                ),
            )

    def show_tilt(self) -> None:
        """The best tilt of the base, and the passes on it."""
        found = self.tilt
        if found is None:
            display.statement("tilt", "No largest tilt of the base is stated, so none is searched for.")
            return
        display.statement(
            "tilt",
            f"Of the tilts up to {degrees_text(self.gimbal.largest_tilt or 0.0, 2)} the best found leans the outer "
            "axis by "
            f"{degrees_text(found.tilt, 2)} towards azimuth {degrees_text(found.towards, 1)}: time beyond the outer "
            "rate "
            f"limit over all passes {found.seconds_over[0]:.1f} s before and {found.seconds_over[1]:.1f} s after, "
            "least "
            f"clearance {degrees_text(found.clearance[0], 2)} before and {degrees_text(found.clearance[1], 2)} "
            "after. It is "
            "the best of a search, not proven best.",
        )
        display.record(
            quantity="time beyond rate, best tilt", of=self.chain.name, over="all passes", lo=None, hi=None, unit="s",
            basis="sampled", attained=found.seconds_over[1], witness={"where": "rows of the passes"},
        )  # fmt: skip
        self._show_on_tilt(found)

    def _show_on_tilt(self, found: BaseTilt) -> None:
        leaning = tilted(self.chain, found)
        rows = []
        for name, track in self.passes.items():
            try:
                again = analyse_pass(leaning, track, boresight_p=self.gimbal.boresight)
            except HardwareError as err:
                rows.append([name, "not followed", err.fault.cause])
                continue
            breaks = len(again.plan.unwindings)
            rows.append([name, f"{again.seconds_lost:.1f}", "no break" if again.plan.whole else f"{breaks} break(s)"])
        display.table(
            "tbl:tilted",
            ["pass", "time lost on the tilted base, s", "at the stops"],
            rows,
            caption="The passes on the tilted base",
            align="lrl",
        )

    def show_sectors(self) -> None:
        """Certified clearance of each pass from every sector that holds, and time inside."""
        if not self.sectors or not self.passes:
            display.statement("sectors", "No forbidden sector, or no pass to hold it against, is given.")
            return
        rows = []
        for name, results in self.sector_results.items():
            for found in results:
                clearance = float(np.degrees(found.clearance))
                display.record(
                    quantity="sector clearance", of=found.sector, over=name, lo=clearance, hi=None, unit="deg",
                    basis="certified bound",
                )  # fmt: skip
                display.record(
                    quantity="time in sector", of=found.sector, over=name, lo=None, hi=None, unit="s", basis="sampled",
                    attained=float(found.seconds), witness={"where": "ten points a step"},
                )  # fmt: skip
                rows.append([found.sector, name, f"{floor_text(clearance)}°", f"{found.seconds:.1f}"])
        mode = self.gimbal.mode or "any mode"
        display.table(
            "tbl:sectors",
            ["sector", "pass", "clearance", "time inside, s"],
            rows,
            caption=f"Forbidden sectors in {mode}",
            align="llrr",
        )

    def show_unwinding(self) -> None:
        """Where a pass runs into a stop, how the mount gets round, and a way clear of the sectors."""
        if not self.passes:
            display.statement("unwinding", "No pass is given.")
            return
        texts = []
        for name, found in self.analyses.items():
            if found.plan.whole:
                texts.append(f"{name}: followed inside the travel without unwinding.")
                continue
            steps = [f"at {u.at:.0f} s ({u.why}) the mount moves for {u.time:.1f} s" for u in found.plan.unwindings]
            texts.append(f"{name}: " + "; ".join(steps) + "." + self._routes(found))
        display.statement("unwinding", texts)

    def _routes(self, found: PassAnalysis) -> str:
        if not self.sectors:
            return ""
        try:
            ways = unwinding_routes(
                self.chain,
                found.plan,
                list(self.sectors.values()),
                mode=self.gimbal.mode,
                boresight_p=self.gimbal.boresight,
            )
        except HardwareError as err:
            return f" No way round the sectors: {err.fault.cause}."
        return " Clear of the sectors: " + "; ".join(
            f"{len(way.angles) - 1} leg(s), {way.time:.1f} s, clearance {degrees_text(way.clearance, 2)}"
            for way in ways
        ) + "."  # fmt: skip

    def show_checks(self) -> None:
        """Keyhole and rates of the passes by plain trigonometry."""
        if self.keyhole is not None:
            gimbal_checks.check_keyhole(self.chain, self.gimbal.sight_rate or 0.0, self.keyhole)
        for name, found in self.analyses.items():
            gimbal_checks.check_pass(self.chain, name, self.passes[name], found)
        for name, results in self.sector_results.items():
            gimbal_checks.check_sectors(list(self.sectors.values()), name, self.passes[name], results)

    def result_rows(self) -> list[list[str]]:
        """Keyhole, losses and sector clearances among the results."""
        rows = []
        if self.keyhole is not None:
            size = float(np.degrees(self.keyhole.half_angle))
            rows.append(["keyhole half angle", "", f"{ceiling_text(size, 3)}°", "exact"])
        rows += [["time lost", name, f"{found.seconds_lost:.1f} s", "sampled"] for name, found in self.analyses.items()]
        for name, results in self.sector_results.items():
            rows += [
                [
                    "sector clearance",
                    f"{name}, {r.sector}",
                    f"{floor_text(float(np.degrees(r.clearance)))}°",
                    "certified bound",
                ]
                for r in results
            ]
        return rows


def _outline(axis: Array, radius: float) -> list[tuple[float, float]]:
    """A circle on the sky as (azimuth, elevation) deg, closed."""
    points = about_all(axis, radius, 181)
    azimuth, elevation = azimuth_elevation(np.concatenate([points, points[:1]]))
    return [(float(np.degrees(a)), float(np.degrees(e))) for a, e in zip(np.unwrap(azimuth), elevation, strict=True)]


def _span(angles: Array) -> str:
    """Least and largest of joint angles (N,) rad, breaks left out, in words."""
    return f"{np.degrees(np.nanmin(angles)):.1f} to {np.degrees(np.nanmax(angles)):.1f} deg"
