"""What the sensor-mount-check template calls: is the mount a rotation, where do its axes point, what must it read."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import axis_words, degrees_text, number_text
from trunnion.envelope.margins import entry_margin_table, lock_margin
from trunnion.envelope.regions import Mounted
from trunnion.envelope.results import AngleRange
from trunnion.errors import HardwareError
from trunnion.figures import drawings
from trunnion.hardware.bench import BenchTable
from trunnion.hardware.misalignment import AngleErrors
from trunnion.hardware.mount_check import MountCheck as MatrixCheck
from trunnion.hardware.mount_check import check_matrix, numbers_to_enter
from trunnion.hardware.mounts import Mount
from trunnion.hardware.ranking import RankedMount, rank_mounts, rank_right_angle_mounts
from trunnion.hardware.right_angles import right_angle_rotations
from trunnion.sheet import display, mount_bench, mount_checks, mount_tilts, mount_tolerance, parameters, region_checks
from trunnion.sheet.describe import angles_text, mount_rows, region_rows, words
from trunnion.sheet.regions import Regions
from trunnion.sheet.rounding import floor_text

Array = NDArray[np.float64]


class MountCheck:
    """One mount and the host's regions; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        mount: Mapping[str, Any],
        envelopes: Mapping[str, Any],
        drawing: Mapping[str, Any] | None = None,
        bench_field: Mapping[str, Any] | None = None,
    ) -> None:
        self._plain = {"mount": dict(mount), "envelopes": dict(envelopes), "drawing": dict(drawing or {})}
        self._field = dict(bench_field or {})
        self.drawing: Mount | None = parameters.mount(drawing) if drawing else None
        self.mount: Mount = parameters.mount(mount)
        self.regions = Regions(envelopes)

    @cached_property
    def matrix_check(self) -> MatrixCheck:
        """The check of the matrix as it is used."""
        typed = self.mount.R_bs if self.mount.typed is None else self.mount.typed
        return check_matrix(typed, self.mount.host, sensor_axes=self.mount.sensor_axes, drawing=self.drawing)

    @cached_property
    def margins(self) -> dict[str, AngleRange]:
        """Lock margin of the sensor's own angles over each region of the host."""
        convention = self.mount.angles_as
        if convention is None:
            return {}
        return {
            name: lock_margin(Mounted(region, self.mount.R_bs), convention) for name, region in self.regions.items()
        }

    @cached_property
    def table(self) -> BenchTable:
        """The bench table: six static poses and three turns."""
        return mount_bench.table_of(self.mount, self._field)

    def show_inputs(self) -> None:
        """The mount and the regions as the injected parameters state them."""
        rows = mount_rows(self.mount.name, self._plain["mount"])
        if self.drawing is not None:
            rows += mount_rows(f"{self.drawing.name} (drawing)", self._plain["drawing"])
        if self._field:
            rows.append({"input": "field at the bench", "stated": words(self._field), "source": "bench"})
        display.inputs(
            rows + [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
        )

    def show_assumptions(self) -> None:
        """What the readings take for granted."""
        texts = ["The sensor is rigidly fixed to its host and its own axes are square to each other."]
        if self.mount.accelerometer is not None:
            texts.append(f"At rest the accelerometer reports {self.mount.accelerometer.value}.")
        display.statement("assumptions", texts)
        self.regions.tell()

    def show_properness(self) -> None:
        """The matrix, its orthonormality error, determinant and distance from the nearest rotation."""
        measure = self.matrix_check.properness
        display.table(
            "tbl:matrix",
            ["", *self.mount.sensor_axes],
            [
                [self.mount.host.word(row), *(number_text(float(value), 6) for value in self.mount.R_bs[row])]
                for row in range(3)
            ],
            caption="The mount: columns are the sensor axes in host components",
            align="lrrr",
        )
        display.statement(
            "properness",
            [
                f"Largest deviation of the columns from orthonormality {_tiny(measure.orthonormality)}; determinant "
                f"{measure.determinant:+.6f}; distance from the nearest rotation {_tiny(measure.distance)}. "
                + (
                    "It is a proper rotation."
                    if measure.proper
                    else "It is a rotation only to the digits stated; the nearest rotation is what is used below."
                )
            ],
        )
        self._record("orthonormality error", measure.orthonormality, "", "certified bound")

    def show_pointing(self) -> None:
        """Where each sensor axis points, in words."""
        display.statement("pointing", [f"{text}." for text in self.matrix_check.pointing])

    def show_drawing(self) -> None:
        """The sensor axes beside the host's."""
        host = self.mount.host
        display.figure(
            "fig:mount",
            drawings.mount_drawing(self.mount.R_bs, host.axes, self.mount.sensor_axes, up=drawings.upward(host.axes)),
            caption=f"{self.mount.name} on {host.name}",
            alt="Drawing of the host's axes and of the sensor's axes on the host: "
            + "; ".join(self.matrix_check.pointing),
        )

    def show_nearest(self) -> None:
        """The nearest of the 24 right-angle mounts and how far this one is from it."""
        nearest = self.matrix_check.right_angle
        if nearest is None:
            raise HardwareError(f"mount '{self.mount.name}' is too far from a rotation to be compared")
        display.statement(
            "nearest",
            [
                f"Nearest of the 24 right-angle mounts: {nearest.words}, {degrees_text(nearest.deviation)} away. "
                f"The second nearest, {nearest.second_words}, is {degrees_text(nearest.second_deviation)} away."
            ],
        )
        self._record(
            "mount deviation from a right-angle mount", float(np.degrees(nearest.deviation)), "deg", "certified bound"
        )

    def show_entries(self) -> None:
        """The numbers to enter in the consuming system's own convention."""
        convention = self.mount.enter_as
        if convention is None:
            display.statement("entries", "The mount names no consuming system, so no numbers to enter are worked out.")
            return
        found = numbers_to_enter(self.mount, convention)
        display.table(
            "tbl:entries",
            ["angle", "enter"],
            [
                [name, degrees_text(float(angle))]
                for name, angle in zip(convention.angle_names, found.angles, strict=True)
            ],
            caption=f"Numbers to enter in the convention {convention.name}",
            align="lr",
            notes=[
                f"Margin of this triple {degrees_text(found.margin, 3)}; entered the other way round the error is "
                f"{degrees_text(found.inverse_separation, 3)}; read about the other kind of axes it is "
                f"{degrees_text(found.fixed_moving_separation, 3)}."
            ],
        )

    def show_margins(self) -> None:
        """The margin of the sensor's own angles over each region, recorded with its witness."""
        convention = self.mount.angles_as
        if convention is None:
            display.statement("margins", "The sensor states no angles of its own, so there is no margin to work out.")
            return
        rows = []
        for over, found in self.margins.items():
            least, witness = found.least, found.least.witness
            display.record(
                quantity="lock margin",
                of=self.mount.name,
                over=over,
                lo=float(np.degrees(least.lo)),
                hi=float(np.degrees(least.hi)),
                unit="deg",
                basis=least.basis,
                attained=None if witness is None else float(np.degrees(witness.value)),
                witness=None if witness is None else {"matrix": witness.matrix, "where": witness.where},
            )
            own = "" if witness is None else angles_text(convention, witness.matrix)
            rows.append([over, f"{floor_text(float(np.degrees(least.lo)))}°", least.basis.value, own])
        display.table(
            "tbl:sensor-margins",
            ["region", "least margin", "basis", "the sensor's own angles there"],
            rows,
            caption="Lock margin of the sensor's own angles while the host moves through each region",
            align="lrll",
        )

    def show_right_angle_ranking(self) -> None:
        """The 24 right-angle mounts by the guaranteed margin of the sensor's own angles."""
        if self.mount.angles_as is None or not self.regions:
            display.statement("ranking", "No angles or no regions are stated, so mounts are not ranked.")
            return
        ranked = self._ranked(self.mount.angles_as)
        display.table(
            "tbl:right-angle-mounts",
            ["rank", "mount", "guaranteed margin", "governed by"],
            [
                [str(place), mount.words, f"{floor_text(float(np.degrees(mount.margin)))}°", mount.governed_by]
                for place, mount in enumerate(ranked, start=1)
            ],
            caption="The 24 right-angle mounts by the guaranteed margin of the sensor's own angles over all regions",
            align="rlrl",
        )

    def _ranked(self, convention: Convention) -> list[RankedMount]:
        mount = self.mount
        if all(np.max(np.abs(axis)) > 1.0 - 1e-12 for axis in convention.lock_axes):
            tables = {name: entry_margin_table(region).least for name, region in self.regions.items()}
            return rank_right_angle_mounts(tables, convention, mount.host, mount.sensor_axes)
        candidates = {str(index): matrix for index, matrix in enumerate(right_angle_rotations())}
        return rank_mounts(
            candidates,
            lambda R_bs: {
                name: lock_margin(Mounted(region, R_bs), convention).least.lo for name, region in self.regions.items()
            },
        )

    def show_bench_table(self) -> None:
        """Poses and turns with the reading each axis must show and the largest deviation to accept."""
        mount_bench.show_table(self.table)

    def show_tilts(self) -> None:
        """A clinometer's tilt pair over the regions, and what taking it for pitch and roll would cost."""
        mount_tilts.show_tilts(self.mount, self.regions)

    def show_evidence(self) -> None:
        """What the bench table can show, and what level or planar poses alone would hide."""
        mount_bench.show_evidence(self.table)

    @cached_property
    def errors(self) -> dict[str, AngleErrors]:
        """Errors of the sensor's own angles from the misalignment, region by region."""
        return mount_tolerance.errors_over(self.mount, self.regions, self.margins)

    def show_tolerance(self) -> None:
        """What the stated misalignment costs: in the vehicle's attitude, in every margin, in every angle."""
        mount_tolerance.show_vehicle(self.mount)
        self._show_margins_left()

    def show_angle_errors(self) -> None:
        """The sensor's own angles: linear, certified worst and Monte Carlo side by side."""
        mount_tolerance.show_errors(self.mount, self.errors)

    def show_growth(self) -> None:
        """How the error of the outer angles grows towards lock."""
        mount_tolerance.show_growth(self.mount, self.margins)

    def _show_margins_left(self) -> None:
        largest = self.mount.tolerance.largest_turn
        if largest is None or not self.margins:
            return
        rows = []
        for over, found in self.margins.items():
            left = max(0.0, found.least.lo - largest)
            display.record(
                quantity="lock margin with misalignment",
                of=self.mount.name,
                over=over,
                lo=float(np.degrees(left)),
                hi=float(np.degrees(found.least.hi)),
                unit="deg",
                basis=found.least.basis,
            )
            rows.append([over, degrees_text(largest, 3), f"{floor_text(float(np.degrees(left)))}°"])
        display.table(
            "tbl:tolerance",
            ["region", "misalignment at most", "margin left"],
            rows,
            caption="What a misalignment within the stated tolerance leaves of the margin",
            align="lrr",
        )

    def show_comparison(self) -> None:
        """Against the drawing: boresight and clocking apart, and whether another reading of the matrix fits better."""
        check = self.matrix_check
        if self.drawing is None:
            display.statement("comparison", "No drawing is named that the mount could be compared with.")
            return
        errors = check.against_drawing
        texts = []
        if errors is not None:
            line = self.drawing.boresight or self.drawing.sensor_axes[2]
            clocking = "without meaning here" if errors.clocking is None else degrees_text(errors.clocking, 4)
            texts.append(
                f"Against the drawing {self.drawing.name} the sensor is turned by {degrees_text(errors.total, 4)} in "
                "all: its "
                f"boresight {line} is off by {degrees_text(errors.boresight, 4)} (boresight error), and it is turned "
                "about "
                f"that line by {clocking} (clocking error)."
            )
            self._record("boresight error", float(np.degrees(errors.boresight)), "deg", "exact")
            if errors.clocking is not None:
                self._record("clocking error", abs(float(np.degrees(errors.clocking))), "deg", "exact")
        readings = ", ".join(f"{name} {away:.4f}" for name, away in check.readings)
        texts.append(f"Distance of the matrix from the drawing, read in each way (Frobenius norm): {readings}.")
        if check.better is not None:
            display.finding(
                f"{self.mount.name}:reading",
                f"the matrix fits the drawing far better {check.better} than as given",
                against=self.mount.name,
            )
        display.statement("comparison", texts)

    def show_checks(self) -> None:
        """The mount, the margins and the readings again by scipy."""
        mount_checks.check_mount(self.mount, self._plain["mount"])
        mount_checks.check_readings(self.table)
        mount_tolerance.check_errors(self.mount, self.errors)
        mount_tilts.check_tilts(self.mount, self.regions)
        for over, found in self.margins.items():
            assert self.mount.angles_as is not None
            region_checks.check_least_margin(
                f"check:{self.mount.name}:{over}",
                f"least lock margin of {self.mount.name} over {over}",
                convention=self.mount.angles_as,
                plain=self._plain["envelopes"][over],
                region=self.regions[over],
                claimed=found.least,
                R_bs=self.mount.R_bs,
            )

    def show_results(self) -> None:
        """The results in one table."""
        nearest = self.matrix_check.right_angle
        rows = [
            ["sensor axis", axis, axis_words(self.mount.R_bs[:, index], self.mount.host), "exact"]
            for index, axis in enumerate(self.mount.sensor_axes)
        ]
        if nearest is not None:
            deviation = degrees_text(nearest.deviation)
            rows.append(["deviation from a right-angle mount", self.mount.name, deviation, "certified bound"])
        rows += [
            ["lock margin", over, f"{floor_text(float(np.degrees(found.least.lo)))}°", found.least.basis.value]
            for over, found in self.margins.items()
        ]
        display.table(
            "tbl:results",
            ["quantity", "of or over", "value", "basis"],
            rows,
            caption="Results of this calculation",
            align="llrl",
        )

    def _record(self, quantity: str, value: float, unit: str, basis: str) -> None:
        display.record(
            quantity=quantity, of=self.mount.name, over=None, lo=value, hi=value, unit=unit, basis=basis, attained=value
        )


def _tiny(value: float) -> str:
    """A number next to zero in powers of ten, or plain 0."""
    return f"{value:.1e}".replace("-", "−") if value else "0"
