"""What the onboard-threshold template calls: errors of angle extraction near lock, measured and held to their laws."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.onboard import (
    ExtractionErrors,
    ExtractionForm,
    Precision,
    consequences,
    extraction_law,
    measure_extraction,
    threshold_for_angles,
    threshold_for_attitude,
)
from trunnion.errors import AttitudeError, CalculationError
from trunnion.figures import charts
from trunnion.sheet import display, onboard_checks, parameters
from trunnion.sheet.describe import convention_rows
from trunnion.units import parse_quantity

_MARGINS_DEG = (30.0, 10.0, 1.0, 0.1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6)
_THRESHOLDS_DEG = (1.0, 0.1, 1e-2, 1e-3, 1e-4)


class OnboardThreshold:
    """One convention, precision and extraction form; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, convention: Mapping[str, Any], precision: str, extraction: str, accuracy: str) -> None:
        self._plain = dict(convention)
        self.convention: Convention = parameters.convention(convention)
        self.precision = _word(Precision, precision, "precision")
        self.form = _word(ExtractionForm, extraction, "extraction")
        self.accuracy_text = accuracy
        self.accuracy = parse_quantity(accuracy, kind="angle").value

    @cached_property
    def measured(self) -> ExtractionErrors:
        """Errors measured on the spot."""
        return measure_extraction(
            self.form,
            self.precision,
            np.radians(_MARGINS_DEG),
            sequence=self.convention.sequence,
            sense=self.convention.sense,
        )

    def show_inputs(self) -> None:
        """The convention and how the flight computer works."""
        rows = convention_rows(self.convention.name, self._plain)
        for name, value in (
            ("precision", self.precision.value),
            ("extraction", self.form.value),
            ("accuracy wanted", self.accuracy_text),
        ):
            rows.append({"input": name, "stated": value, "source": "this workbook"})
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What the measurement takes for granted."""
        display.statement(
            "assumptions",
            "The matrix reaches the extraction as a product of two rotations, multiplied in the working precision.",
        )

    def show_errors(self) -> None:
        """Errors against margin, measured with fixed seeds, beside the laws."""
        law = extraction_law(self.form, self.precision, np.radians(_MARGINS_DEG))
        display.table(
            "tbl:errors",
            ["margin", "middle", "law", "first angle", "law", "rebuilt attitude", "law"],
            [
                [
                    f"{margin:g}°",
                    *(
                        f"{value[index]:.1e}"
                        for pair in (
                            (self.measured.middle, law.middle),
                            (self.measured.first, law.first),
                            (self.measured.rebuilt, law.rebuilt),
                        )
                        for value in pair
                    ),
                ]
                for index, margin in enumerate(_MARGINS_DEG)
            ],
            caption=f"Errors in rad that 99 of 100 attitudes stay below, {self.precision.value}, {self.form.value}",
            align="rrrrrrr",
        )
        display.figure(
            "fig:errors",
            charts.error_laws(
                np.array(_MARGINS_DEG),
                {
                    "first angle": (self.measured.first, law.first),
                    "middle angle": (self.measured.middle, law.middle),
                    "rebuilt attitude": (self.measured.rebuilt, law.rebuilt),
                },
            ),
            caption="Measured errors (points) and their laws (lines) against the lock margin",
            alt="Errors of first angle, middle angle and rebuilt attitude against the lock margin, both logarithmic.",
        )

    def show_thresholds(self) -> None:
        """The margins at which the accuracy wanted is just kept, recorded; none is needed in residual form."""
        angles = threshold_for_angles(self.precision, self.accuracy)
        self._record("margin for angle accuracy", float(np.degrees(angles.margin)))
        lines = [
            f"Outer angles to {self.accuracy_text}: margin at least {np.degrees(angles.margin):.3g}°; {angles.why}."
        ]
        try:
            attitude = threshold_for_attitude(self.form, self.precision, self.accuracy)
            self._record("margin for the lock branch", float(np.degrees(attitude.margin)))
            lines.append(
                f"Rebuilt attitude to {self.accuracy_text}: take the branch for lock below "
                f"{np.degrees(attitude.margin):.3g}°; {attitude.why}. "
                f"Largest error then {np.degrees(attitude.largest_error):.3g}°."
            )
        except AttitudeError as err:
            lines.append(f"Rebuilt attitude to {self.accuracy_text}: {err.fault.cause}.")
        display.statement("thresholds", lines)

    def show_consequences(self) -> None:
        """What a threshold costs."""
        rows = consequences(self.form, self.precision, np.radians(_THRESHOLDS_DEG))
        display.table(
            "tbl:consequences",
            [
                "threshold",
                "outer angle error",
                "attitude error outside",
                "inside",
                "binary digits lost",
                "share of attitudes",
            ],
            [
                [
                    f"{np.degrees(row.threshold):g}°",
                    f"{np.degrees(row.outer_error):.1e}°",
                    f"{np.degrees(row.attitude_error_outside):.1e}°",
                    f"{np.degrees(row.attitude_error_inside):.1e}°",
                    f"{row.bits_lost:.1f}",
                    f"{100 * row.share_of_attitudes:.2g} %",
                ]
                for row in rows
            ],
            caption="Consequences of a threshold below which the branch for lock is taken",
            align="rrrrrr",
        )

    def show_residual_form(self) -> None:
        """Why the residual form needs no threshold."""
        residual = measure_extraction(
            ExtractionForm.RESIDUAL,
            self.precision,
            np.radians(_MARGINS_DEG),
            sequence=self.convention.sequence,
            sense=self.convention.sense,
        )
        worst = float(residual.rebuilt_largest.max())
        display.statement(
            "residual",
            "In residual form the third angle is taken from what the first leaves of the matrix, so that an error of "
            "the first is undone by the third. Largest error of the rebuilt attitude measured here at any margin: "
            f"{worst:.1e} rad, {worst / self.precision.eps:.1f} spacings of {self.precision.value} at one. "
            "No threshold is needed.",
        )

    def show_checks(self) -> None:
        """The measured errors again by scipy where it can follow."""
        onboard_checks.show_checks(self.convention)

    def show_results(self) -> None:
        """What was found, in one table."""
        angles = threshold_for_angles(self.precision, self.accuracy)
        display.table(
            "tbl:results",
            ["result", "value"],
            [
                ["margin below which outer angles miss the accuracy", f"{np.degrees(angles.margin):.3g}°"],
                [
                    "largest error of the rebuilt attitude, this form",
                    f"{float(self.measured.rebuilt_largest.max()):.1e} rad",
                ],
            ],
            caption="Results of this calculation",
        )

    def _record(self, quantity: str, margin: float) -> None:
        display.record(
            quantity=quantity,
            of=self.convention.name,
            over=f"{self.precision.value}, {self.form.value}",
            lo=margin,
            hi=margin,
            attained=margin,
            unit="deg",
            basis="sampled",
        )


def _word(kind: Any, word: str, name: str) -> Any:
    try:
        return kind(word)
    except ValueError as err:
        known = ", ".join(member.value for member in kind)
        raise CalculationError(f"{name} '{word}' is not known", remedy=f"one of {known}") from err
