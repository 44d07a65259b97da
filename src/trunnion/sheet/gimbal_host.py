"""A gimbal that holds its payload while the host moves: clearance, rates, stops, reading back, the fourth axis.

Letters: `r` reference, `b` base on the host (R_rb), `p` payload. Three and four axes hold the payload's axes along the
reference's; two axes keep the boresight along one reference direction and leave the heading to the host.
"""

from __future__ import annotations

import re
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import matrix_from_quaternion, rotation_angle
from trunnion.attitude.words import degrees_text, number_text
from trunnion.envelope.margins import direction_clearance
from trunnion.envelope.regions import Track
from trunnion.envelope.results import AngleRange
from trunnion.errors import HardwareError
from trunnion.figures import sky
from trunnion.hardware.joint_rates import JointRateBounds, largest_joint_rates, middle_axis_keep_out
from trunnion.hardware.joint_solutions import ClearanceRange, Solutions, clearance_over
from trunnion.hardware.platforms import (
    clearance_directions,
    holding_solutions,
    host_attitude,
    levelling_solutions,
    required_attitude,
)
from trunnion.hardware.redundancy import RedundantPlan, plan_redundant
from trunnion.hardware.travel import TravelOver, plan_travel, stopping_room, travel_over
from trunnion.sheet import display, gimbal_checks, hardware_parts
from trunnion.sheet.rounding import ceiling_text, floor_text
from trunnion.sheet.sampled import attitudes
from trunnion.units import parse_quantity

if TYPE_CHECKING:
    from trunnion.sheet.gimbal import GimbalTravel

Array = NDArray[np.float64]

_LEVEL = Frame("level", ("north", "east", "down"))


class HostWork:
    """The work over the host's regions of one gimbal."""

    def __init__(self, gimbal: GimbalTravel) -> None:
        self.gimbal = gimbal
        self.chain, self.regions = gimbal.chain, gimbal.regions
        self.axes = len(self.chain.joints)

    @cached_property
    def held_r(self) -> Array:
        """The reference direction (3,) two axes keep the boresight along."""
        return np.asarray(self._reference().direction(self.gimbal.hold), dtype=float)

    def _reference(self) -> Frame:
        """The reference frame of the first region that writes it out; north, east, down otherwise."""
        for plain in self.gimbal.plain["envelopes"].values():
            for holder in (plain.get("convention"), plain):
                if isinstance(holder, dict) and isinstance(holder.get("reference"), dict):
                    frame: Frame = hardware_parts.frame_of(holder["reference"])
                    return frame
        return _LEVEL

    @cached_property
    def pair(self) -> tuple[Array, Array]:
        """The base direction and the reference direction whose angle is d (see `joint_solutions`)."""
        if self.axes == 3:
            return clearance_directions(self.chain, np.eye(3))
        return self.chain.axes[0], self.held_r

    @cached_property
    def angles(self) -> dict[str, AngleRange]:
        """Certified range of d over each region."""
        return {name: direction_clearance(region, *self.pair) for name, region in self.regions.items()}

    @cached_property
    def clearances(self) -> dict[str, ClearanceRange]:
        """Certified clearance to the singular set over each region (two and three axes)."""
        return {
            name: clearance_over(self.chain, found.least.lo, found.largest.hi, boresight_p=self.gimbal.boresight)
            for name, found in self.angles.items()
        }

    @cached_property
    def turning(self) -> dict[str, float]:
        """Largest turning rate (rad/s) of the host over each region: that of the calculation, else the region's own."""
        if self.gimbal.host_rate is not None:
            return dict.fromkeys(self.regions, self.gimbal.host_rate)
        stated = {name: plain.get("max body rate") for name, plain in self.gimbal.plain["envelopes"].items()}
        return {name: parse_quantity(text, kind="angular rate").value for name, text in stated.items() if text}

    @cached_property
    def rates(self) -> dict[str, JointRateBounds]:
        """Certified largest joint rates over each region whose turning rate is stated."""
        return {
            name: largest_joint_rates(
                self.chain,
                rate,
                self.angles[name].least.lo,
                self.angles[name].largest.hi,
                boresight_p=self.gimbal.boresight,
            )
            for name, rate in self.turning.items()
        }

    def solutions(self, R_rb: Array) -> Solutions:
        """Joint solutions (..., 2, k) for host attitudes (..., 3, 3)."""
        if self.axes == 2:
            return levelling_solutions(self.chain, R_rb, up_r=self.held_r, up_p=self.gimbal.boresight)
        return holding_solutions(self.chain, R_rb, np.eye(3))

    @cached_property
    def travels(self) -> dict[str, TravelOver]:
        """Travel left over samples of each region (corners of boxes among them)."""
        return {
            name: travel_over(self.chain, self.solutions(attitudes(region))) for name, region in self.regions.items()
        }

    def show_clearance(self) -> None:
        """Clearance to the singular set over every region, recorded."""
        if not self.regions:
            display.statement("host", "No region of the host is given: the base stands still.")
            return
        if self.axes == 4:
            display.statement("host", "Four axes: clearance is judged with the free turn, below.")
            return
        what = "payload axes along the reference's" if self.axes == 3 else f"boresight along {self.gimbal.hold}"
        rows = []
        for name, found in self.clearances.items():
            least, largest = float(np.degrees(found.least)), float(np.degrees(found.largest))
            display.record(
                quantity="gimbal clearance", of=self.chain.name, over=name, lo=least, hi=largest, unit="deg",
                basis=self.angles[name].least.basis, note=f"rotation angle to the locked position, {what}",
            )  # fmt: skip
            rows.append([name, f"{floor_text(least)}°", self.angles[name].least.basis.value, self._where(name)])
            if least < 0.0:
                text = f"part of region {name} is out of reach by up to {-least:.3f} deg"
                display.finding(f"{self.chain.name}:{name}:reach", text, against=self.chain.name)
        display.table(
            "tbl:clearance",
            ["region", "least clearance", "basis", "nearest to lock"],
            rows,
            caption=f"Clearance of {self.chain.name} from its locked position, {what}",
            align="lrll",
        )

    def _where(self, name: str) -> str:
        found = self.angles[name]
        low, high = abs(np.pi / 2 - found.least.lo), abs(found.largest.hi - np.pi / 2)
        witness = (found.least if low >= high else found.largest).witness
        return "" if witness is None else re.sub(r"(?<!\w)-(?=\d)", "−", witness.where)

    def show_rates(self) -> None:
        """Largest joint rates for the stated host rate, and the middle axis's keep-out."""
        if not self.regions or self.axes == 4:
            display.statement("host-rates", "No joint rates of a moving host are worked out here.")
            return
        if not self.turning:
            display.statement("host-rates", "No turning rate of the host is stated, so no joint rates are worked out.")
            return
        rows = []
        for name, found in self.rates.items():
            for joint, rate, limit in zip(self.chain.joints, found.rate, found.rate_limit, strict=True):
                self._record_rate(name, joint.name, float(np.degrees(rate)))
                within = "" if not np.isfinite(limit) else "within" if rate <= limit else "beyond"
                rows.append([name, joint.name, _rate(rate), _rate(limit) if np.isfinite(limit) else "none", within])
        display.table(
            "tbl:host-rates",
            ["region", "axis", "largest rate, deg/s", "limit, deg/s", "against the limit"],
            rows,
            caption="Joint rates while the host turns at up to its stated rate",
            notes=_turning_notes(self.turning),
            align="llrrl",
        )
        self._show_keep_out()

    def _record_rate(self, over: str, joint: str, rate: float) -> None:
        if np.isfinite(rate):
            display.record(
                quantity=f"joint rate of {joint}", of=self.chain.name, over=over, lo=0.0, hi=rate, unit="deg/s",
                basis="certified bound",
            )  # fmt: skip

    def _show_keep_out(self) -> None:
        if self.axes != 3 or self.gimbal.reaction_time is None or not self.turning:
            return
        acceleration = self.chain.joints[1].acceleration
        found = middle_axis_keep_out(max(self.turning.values()), self.gimbal.reaction_time, acceleration=acceleration)
        display.statement(
            "keep-out",
            f"Middle axis (common practice, no published source): with {self.gimbal.reaction_time:g} s to react it "
            "travels "
            f"{degrees_text(found.reaction, 2)} and stops within {degrees_text(found.stopping, 2)} more, so it is kept "
            f"{degrees_text(found.keep_out, 2)} from lock and the alarm is set at {degrees_text(found.alarm, 2)} from "
            "its free centre.",
        )

    def show_travel(self) -> None:
        """Least distance to each stop over every region, recorded (sampled), and room for stopping from full rate."""
        if not self.regions or self.axes == 4:
            display.statement("host-travel", "No travel over a region of the host is worked out here.")
            return
        rows = []
        for name, found in self.travels.items():
            room = stopping_room(self.chain, found.left)
            for k, joint in enumerate(self.chain.joints):
                for side, word in ((0, "lower"), (1, "upper")):
                    if not np.isfinite(found.left[k, side]):
                        continue
                    self._record_travel(name, f"{joint.name}, {word} stop", found.left[k, side])
                    cells = (_angle(float(found.left[k, side])), _angle(float(room[k, side])))
                    rows.append([name, joint.name, word, *cells])
        if not rows:
            display.statement("host-travel", "No axis has stops.")
            return
        display.table(
            "tbl:travel",
            ["region", "axis", "stop", "travel left", "left after stopping from full rate"],
            rows,
            caption="Travel left at the stops, by samples of each region with the corners of its boxes",
            align="lllrr",
            notes=["Sampled: a demonstration, not a proof."],
        )

    def _record_travel(self, over: str, what: str, left: float) -> None:
        display.record(
            quantity="travel left", of=f"{self.chain.name}, {what}", over=over, lo=None, hi=None, unit="deg",
            basis="sampled", attained=float(np.degrees(left)), witness={"where": "least of the samples"},
        )  # fmt: skip

    def show_read_back(self) -> None:
        """Joint angles along a record, and the host's attitude read back from them."""
        tracks = self.gimbal.tracks
        if not tracks:
            display.statement("read-back", "No record of the host is given, so no joint angles against time are shown.")
            return
        if self.axes == 4:
            display.statement("read-back", "Four axes: the joint angles along the record are shown below.")
            return
        for name, track in tracks.items():
            self._show_record(name, track)

    def _show_record(self, name: str, track: Track) -> None:
        R_rb = matrix_from_quaternion(track.quaternions)
        plan = plan_travel(self.chain, track.times, self.solutions(R_rb))
        angles = np.full((len(track.times), self.axes), np.nan)
        for segment in plan.segments:
            angles[segment.first : segment.last + 1] = segment.angles
        names = [joint.name for joint in self.chain.joints]
        history = {joint: np.degrees(angles[:, k]) for k, joint in enumerate(names)}
        stops = {
            joint.name: (float(np.degrees(joint.travel[0])), float(np.degrees(joint.travel[1])))
            for joint in self.chain.joints
        }
        display.figure(
            f"fig:joints-{name}",
            sky.joint_history(track.times, history, stops=stops),
            caption=f"Joint angles while the host moves as recorded in {name}",
            alt="; ".join(f"{j} {np.nanmin(v):.1f} to {np.nanmax(v):.1f} deg" for j, v in history.items()),
        )
        text = f"The record {name} is followed " + (
            "from end to end without unwinding."
            if plan.whole
            else f"with {len(plan.unwindings)} break(s): "
            + "; ".join(f"at {u.at:.1f} s ({u.why}), {u.time:.1f} s to move" for u in plan.unwindings)
            + "."
        )
        if self.axes == 3 and plan.whole:
            apart = float(np.max(rotation_angle(host_attitude(self.chain, angles, np.eye(3)), R_rb)))
            text += (
                " Read back, R_rb = R_rp R_bp', the joint angles give the host's attitude relative to the stabilised "
                f"platform within {np.degrees(apart):.1e} deg."
            )
        display.statement(f"record-{name}", text)

    @cached_property
    def redundant(self) -> dict[str, RedundantPlan]:
        """Four axes over each record."""
        plans = {}
        for name, track in self.gimbal.tracks.items():
            R_rb = matrix_from_quaternion(track.quaternions)
            plans[name] = plan_redundant(self.chain, track.times, required_attitude(R_rb, np.eye(3)))
        return plans

    def show_redundancy(self) -> None:
        """The redundant solution beside the same chain with its outer axis held, and its rate cost."""
        if self.axes != 4:
            display.statement("redundancy", f"{self.axes} axes: no free turn is left to keep away from lock.")
            return
        if not self.redundant:
            raise HardwareError(
                f"'{self.chain.name}' has four axes", remedy="give a record of the host among the regions"
            )
        rows = []
        for name, plan in self.redundant.items():
            least, held = (float(np.degrees(np.min(v))) for v in (plan.clearance, plan.held_clearance))
            display.record(
                quantity="gimbal clearance", of=self.chain.name, over=name, lo=None, hi=None, unit="deg",
                basis="sampled", attained=least, witness={"where": "the free turn used, at the rows of the record"},
            )  # fmt: skip
            cost = _rate(plan.rate_cost)
            rows.append([name, degrees_text(np.radians(held), 2), degrees_text(np.radians(least), 2), cost,
                         _rate(float(np.max(plan.held_rates))), _rate(float(np.max(plan.rates)))])  # fmt: skip
            self._find_stops(name, plan.angles)
            names = [joint.name for joint in self.chain.joints]
            history = {joint: np.degrees(plan.angles[:, k]) for k, joint in enumerate(names)}
            display.figure(
                f"fig:redundant-{name}",
                sky.joint_history(self.gimbal.tracks[name].times, history),
                caption=f"Joint angles with the free turn used, {name}",
                alt="; ".join(f"{j} {np.min(v):.1f} to {np.max(v):.1f} deg" for j, v in history.items()),
            )
        display.table(
            "tbl:redundancy",
            ["record", "clearance, outer axis held", "clearance, free turn used", "outer axis, deg/s",
             "fastest axis, held", "fastest axis, used"],
            rows,
            caption="The fourth axis: what it buys and what it costs",
            align="lrrrrr",
        )  # fmt: skip

    def _find_stops(self, name: str, angles: Array) -> None:
        """A finding for every joint that the redundant solution would take beyond a stop."""
        for k, joint in enumerate(self.chain.joints):
            lower, upper = joint.travel
            middle = 0.0 if not np.isfinite(upper - lower) else (lower + upper) / 2.0
            column = angles[:, k] - 2.0 * np.pi * np.round((np.mean(angles[:, k]) - middle) / (2.0 * np.pi))
            beyond = float(np.degrees(max(lower - column.min(), column.max() - upper)))
            if beyond > 1e-9:
                text = f"over {name} the redundant solution takes {joint.name} {beyond:.1f} deg beyond a stop"
                display.finding(f"{self.chain.name}:{name}:{joint.name}", text, against=self.chain.name)

    def show_checks(self) -> None:
        """Solutions over the regions again: the payload must stand where it was to be held."""
        if self.axes == 4:
            display.statement("no-check", "No independent check is made of the free turn of four axes.")
            return
        for name, region in self.regions.items():
            gimbal_checks.check_held(self, name, attitudes(region)[:256])

    def result_rows(self) -> list[list[str]]:
        """Clearances and rates among the results."""
        rows: list[list[str]] = []
        if not self.regions:
            return rows
        if self.axes == 4:
            least = {name: float(np.degrees(np.min(plan.clearance))) for name, plan in self.redundant.items()}
            return [["gimbal clearance", name, f"{value:.2f}°", "sampled"] for name, value in least.items()]
        for name, found in self.clearances.items():
            basis = self.angles[name].least.basis.value
            rows.append(["gimbal clearance", name, f"{floor_text(float(np.degrees(found.least)))}°", basis])
            if name in self.turning:
                largest = float(np.degrees(np.max(self.rates[name].rate)))
                text = "unbounded" if not np.isfinite(largest) else f"{ceiling_text(largest)} deg/s"
                rows.append(["largest joint rate", name, text, "certified bound"])
        return rows


def _turning_notes(turning: dict[str, float]) -> list[str]:
    """What the host's rate is over each region; one line where it is the same over all."""
    if len(set(turning.values())) == 1:
        return [f"Host at up to {np.degrees(next(iter(turning.values()))):g} deg/s over every region."]
    return [f"{name}: host at up to {np.degrees(rate):g} deg/s." for name, rate in turning.items()]


def _angle(value: float) -> str:
    """An angle (rad) with two decimals, so that the column lines up."""
    return f"{number_text(float(np.degrees(value)), 2)}°"


def _rate(value: float) -> str:
    degrees = float(np.degrees(value))
    return "unbounded" if not np.isfinite(degrees) else ceiling_text(degrees)
