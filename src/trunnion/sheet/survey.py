"""What the alignment-survey template calls: the mount from measured directions, and whether it differs from the
drawing.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import degrees_text, number_text
from trunnion.figures import drawings
from trunnion.hardware.mounts import Mount
from trunnion.hardware.surveys import Survey, survey_directions
from trunnion.sheet import display, hardware_parts, independent
from trunnion.sheet.rounding import ceiling_text

Array = NDArray[np.float64]


class AlignmentSurvey:
    """One survey; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, survey: Mapping[str, Any], table: str = "") -> None:
        self._plain = dict(survey)
        if table:
            self._plain["sightings"] = [*survey["sightings"], *hardware_parts.sightings(table)]
        self.data = hardware_parts.survey(self._plain)

    @property
    def name(self) -> str:
        """The survey's name."""
        return str(self._plain.get("name", "survey"))

    @property
    def drawing(self) -> Mount | None:
        """The mount as drawn, if one is named."""
        mount: Mount | None = self.data["drawing"]
        return mount

    @property
    def _axes(self) -> tuple[str, str, str]:
        return ("x", "y", "z") if self.drawing is None else self.drawing.sensor_axes

    @property
    def _host(self) -> list[str]:
        return list(self._plain["host"]["axes"])

    @cached_property
    def found(self) -> Survey:
        """The fit."""
        data = self.data
        return survey_directions(data["in_host"], data["in_sensor"], data["sigma"], drawing=data["drawing"])

    def show_inputs(self) -> None:
        """Every sighting and the drawing it is compared with."""
        accuracy = self._plain["accuracy"]
        rows = [
            {
                "input": f"sighting {number}",
                "stated": f"sensor {_direction(row['sensor'])}; host {_direction(row['host'])}; one standard deviation "
                f"{row.get('accuracy', accuracy)}",
                "source": str(self._plain.get("source", "not stated")),
            }
            for number, row in enumerate(self._plain["sightings"], start=1)
        ]
        if self.drawing is not None:
            rows.append(hardware_parts.row("mount as drawn", self.drawing.name, self._plain["mount"]))
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What the fit takes for granted."""
        display.statement(
            "assumptions",
            "The accuracy stated is one standard deviation of each of the two small components across a direction, "
            "both "
            "ends of the sighting together; sightings are independent and free of a common bias.",
        )

    def show_fit(self) -> None:
        """The mount found, with as many decimals as the data support."""
        decimals = self.found.matrix_decimals
        display.table(
            "tbl:fit",
            ["", *self._axes],
            [[self._host[row], *(number_text(float(v), decimals) for v in self.found.R_bs[row])] for row in range(3)],
            caption=f"The mount found: columns are the sensor axes in host components, {decimals} decimals supported",
            align="lrrr",
        )
        quaternion = _quaternion(self.found.R_bs)
        display.statement(
            "quaternion",
            "As a quaternion, scalar first, sensor components to host components: "
            + ", ".join(number_text(float(v), decimals + 1) for v in quaternion)
            + ".",
        )
        sigma = [f"{float(np.degrees(value)):.2g}°" for value in self.found.sigma]
        display.statement(
            "uncertainty",
            f"One standard deviation of the turn left about the three principal axes: {', '.join(sigma)}. The largest "
            f"angle between two of the lines sighted is {degrees_text(self.found.spread, 2)}.",
        )
        largest = float(np.degrees(self.found.sigma[-1]))
        display.record(
            quantity="survey standard deviation",
            of=self.name,
            over="weakest axis",
            lo=largest,
            hi=largest,
            unit="deg",
            basis="measured",
        )

    def show_covariance(self) -> None:
        """The covariance of the turn about the host's axes."""
        arcmin = (60.0 * np.degrees(1.0)) ** 2
        display.table(
            "tbl:covariance",
            ["", *self._host],
            [
                [self._host[row], *(number_text(float(arcmin * v), 4) for v in self.found.covariance[row])]
                for row in range(3)
            ],
            caption="Covariance of the turn about the host's axes, square arc minutes",
            align="lrrr",
        )

    def show_residuals(self) -> None:
        """Residual of every sighting, outliers flagged."""
        rows = [
            [
                str(number),
                f"{number_text(float(np.degrees(angle)), 4)}°",
                f"{float(size):.2f}",
                "outlier" if flag else "in line",
            ]
            for number, (angle, size, flag) in enumerate(
                zip(self.found.residuals, self.found.residual_sigmas, self.found.outliers, strict=True), start=1
            )
        ]
        display.table(
            "tbl:residuals",
            ["sighting", "residual", "in standard deviations", "judged"],
            rows,
            caption="Residuals, each sighting judged with itself left out",
            align="rrrl",
        )
        largest = float(np.degrees(np.max(self.found.residuals)))
        display.record(
            quantity="largest residual",
            of=self.name,
            over="sightings",
            lo=0.0,
            hi=largest,
            unit="deg",
            basis="measured",
        )

    def show_verdict(self) -> None:
        """The chi-square test against the stated accuracy, and what weakens the survey."""
        test = self.found.chi_square
        display.statement(
            "chi-square",
            f"Sum of squared residuals {test.statistic:.3g} with {test.freedom} degrees of freedom; chance of a larger "
            f"one {100.0 * test.chance_larger:.3g} %: {test.words}.",
        )
        for number, text in enumerate(self.found.warnings, start=1):
            display.finding(f"{self.name}:warning-{number}", text, against=self.name)
        for number in np.flatnonzero(self.found.outliers).tolist():
            text = f"sighting {number + 1} is an outlier: {self.found.residual_sigmas[number]:.1f} standard deviations"
            display.finding(f"{self.name}:outlier-{number + 1}", text, against=self.name)

    def show_difference(self) -> None:
        """Survey minus drawing, its significance, boresight and clocking apart, and the correction."""
        found = self.found.difference
        if found is None:
            display.statement("difference", "No drawing is named, so there is nothing to compare the survey with.")
            return
        turn = ", ".join(
            f"{axis} {degrees_text(float(value), found.decimals + 1)}"
            for axis, value in zip(self._host, found.turn, strict=True)
        )
        says = "significant" if found.significant else "not significant"
        paragraphs = [
            f"From the drawing to the survey the sensor is turned by {degrees_text(found.angle, found.decimals + 1)} "
            "in "
            f"all (about the host's axes: {turn}); chance of at least this by accident {_percent(found.chance)}: "
            f"{says}."
        ]
        if found.pointing is not None:
            clocking = found.pointing.clocking
            paragraphs.append(
                f"Boresight error {degrees_text(found.pointing.boresight, found.decimals + 1)}; clocking error, the "
                "turn "
                "about the boresight, "
                + ("without meaning here." if clocking is None else f"{degrees_text(clocking, found.decimals + 1)}.")
            )
        correction = ", ".join(
            f"{axis} {value:+.{found.decimals}f}°" for axis, value in zip(self._host, found.correction_deg, strict=True)
        )
        paragraphs.append(
            f"Correction the data support, {found.decimals} decimals of a degree: {correction}."
            if found.significant
            else "No correction is recommended: the drawing stands."
        )
        display.statement("difference", [text.replace("-", "−") for text in paragraphs])
        self._record_difference()

    def _record_difference(self) -> None:
        found = self.found.difference
        assert found is not None
        values = {"difference from drawing": found.angle}
        if found.pointing is not None:
            values["boresight error"] = found.pointing.boresight
            if found.pointing.clocking is not None:
                values["clocking error"] = abs(found.pointing.clocking)
        for quantity, value in values.items():
            size = float(np.degrees(value))
            display.record(quantity=quantity, of=self.name, over=None, lo=size, hi=size, unit="deg", basis="measured")

    def show_drawing(self) -> None:
        """The sensor axes as surveyed, beside the host's."""
        display.figure(
            "fig:survey",
            drawings.mount_drawing(self.found.R_bs, self._host, self._axes, up=drawings.upward(self._host)),
            caption="The sensor axes as surveyed on the host",
            alt="Drawing of the host's axes and of the sensor's axes as surveyed",
        )

    def show_checks(self) -> None:
        """Fit and covariance again by scipy from the plain words of the sightings."""
        from scipy.spatial.transform import Rotation

        seen, known, sigma = _from_words(self._plain, self._axes)
        theirs, _, sensitivity = Rotation.align_vectors(known, seen, weights=sigma**-2, return_sensitivity=True)
        display.check(
            f"check:{self.name}:fit",
            "rotation between the fit and scipy's",
            ours=0.0,
            theirs=float(np.degrees((Rotation.from_matrix(self.found.R_bs).inv() * theirs).magnitude())),
            tolerance=1e-8,
            unit="deg",
            library="scipy Rotation.align_vectors",
        )
        covariance = sensitivity * len(sigma) / np.sum(sigma**-2)
        display.check(
            f"check:{self.name}:covariance",
            "largest standard deviation from scipy's sensitivity",
            ours=float(np.degrees(np.sqrt(np.max(np.diag(self.found.covariance))))),
            theirs=float(np.degrees(np.sqrt(np.max(np.diag(covariance))))),
            tolerance=1e-3 * float(np.degrees(self.found.sigma[-1])) + float(np.degrees(_misfit(self.found, sigma))),
            unit="deg",
            library="scipy Rotation.align_vectors",
        )

    def show_results(self) -> None:
        """The results in one table."""
        found = self.found
        rows = [
            ["standard deviation, weakest axis", f"{ceiling_text(float(np.degrees(found.sigma[-1])), 4)}°"],
            ["largest residual", degrees_text(float(np.max(found.residuals)), 4)],
        ]
        if found.difference is not None:
            rows.append(["difference from drawing", degrees_text(found.difference.angle, 4)])
        display.table(
            "tbl:results", ["quantity", "value"], rows, caption="Results of this calculation, all measured", align="lr"
        )


def _percent(chance: float) -> str:
    """A chance in percent; one too small to mean anything is only bounded."""
    return "below 0.01 %" if chance < 1e-4 else f"{100.0 * chance:.2g} %"


def _direction(value: Any) -> str:
    return value if isinstance(value, str) else "(" + ", ".join(f"{float(part):g}" for part in value) + ")"


def _quaternion(R: Array) -> Array:
    from trunnion.attitude.rotations import quaternion_from_matrix

    return quaternion_from_matrix(R)


def _misfit(found: Survey, sigma: Array) -> float:
    """Second-order part of the covariance: the residuals' own size, at which scipy's and ours may part."""
    return float(np.max(found.residuals) * np.max(sigma))


def _from_words(plain: Mapping[str, Any], axes: tuple[str, str, str]) -> tuple[Array, Array, Array]:
    """Directions in the sensor (N, 3), in the host (N, 3), and standard deviations (N,) rad, read a second time."""
    host = hardware_parts.frame_of(plain["host"])
    seen, known, sigma = [], [], []
    for row in plain["sightings"]:
        seen.append(_vector(row["sensor"], lambda word: _sensor_axis(word, axes)))
        known.append(_vector(row["host"], host.direction))
        sigma.append(np.radians(independent.degrees(row.get("accuracy", plain["accuracy"]))))
    return np.array(seen), np.array(known), np.array(sigma)


def _vector(value: Any, meaning: Any) -> Array:
    v = np.asarray(meaning(value) if isinstance(value, str) else value, dtype=float)
    return v / np.linalg.norm(v)


def _sensor_axis(word: str, axes: tuple[str, str, str]) -> Array:
    sign = -1.0 if word.startswith("-") else 1.0
    return sign * np.eye(3)[axes.index(word.lstrip("+-"))]
