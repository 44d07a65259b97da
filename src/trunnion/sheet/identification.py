"""What the convention-identification template calls: which convention a file's numbers are in, and why."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import number_text
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import Answer
from trunnion.crosswalk.near_fits import in_common
from trunnion.crosswalk.study import Study, study
from trunnion.crosswalk.told import SHOWN, answer_lines, asked_words, constant_words, fragment_lines, miss_text
from trunnion.figures.identification import residual_chart
from trunnion.sheet import display, identification_checks, parameters
from trunnion.sheet.describe import convention_rows, words
from trunnion.tables.samples import evidence_of
from trunnion.units import parse_quantity

Array = NDArray[np.float64]

CONSTANTS = {
    "none": Constants.NONE,
    "relabelled": Constants.RELABELLED,
    "body side": Constants.RIGHT,
    "reference side": Constants.LEFT,
    "both sides": Constants.BOTH,
}


class ConventionIdentification:
    """Samples in question with what is known; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        samples: Mapping[str, Any],
        reference: Mapping[str, Any],
        body: Mapping[str, Any],
        known_convention: Mapping[str, Any] | None = None,
        constants: str = "none",
        offsets: bool = False,
        noise: str = "",
    ) -> None:
        self._samples = {key: value for key, value in samples.items() if key != "source"}
        self._source = str(samples.get("source", "not stated"))
        self._known = dict(known_convention or {})
        self._reference, self._body = parameters.frame(reference), parameters.frame(body)
        self._allowed = CONSTANTS.get(constants)
        if self._allowed is None:
            from trunnion.errors import CalculationError

            raise CalculationError(f"constants are '{constants}'", remedy=f"say one of: {', '.join(CONSTANTS)}")
        self._offsets, self._noise_text = offsets, noise
        self._noise = parse_quantity(noise, kind="angle").value if noise else None

    @cached_property
    def study(self) -> Study:
        """The answer."""
        file = parameters.input_path(str(self._samples["table"]))
        known = parameters.convention(self._known) if self._known else None
        evidence = evidence_of(
            {**self._samples, "table": file.name},
            file.parent,
            convention=known,
            reference=self._reference,
            body=self._body,
        )
        assert self._allowed is not None
        return study(evidence, constants=self._allowed, noise=self._noise, offsets=self._offsets)

    @property
    def _over(self) -> str:
        return str(self._samples["table"]).partition("-")[2] or str(self._samples["table"])

    def show_inputs(self) -> None:
        """The samples, what is known of them, and what may be unknown."""
        rows = [{"input": f"samples {self._over}", "stated": words(self._samples), "source": self._source}]
        if self._known:
            rows += convention_rows(str(self._known.get("name", "known")), self._known)
        may = f"constants: {self._allowed.value if self._allowed else ''}; offsets: {'yes' if self._offsets else 'no'}"
        noise = f"noise at most {self._noise_text} an axis" if self._noise_text else "noise not stated"
        rows.append({"input": "what may be unknown", "stated": f"{may}; {noise}", "source": "this calculation"})
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What the answer rests on, and what of the file was used."""
        known = self.study.evidence.known or "the body rates"
        lines = [f"What is known of the true attitude ({known}) means what the inputs say."]
        lines += [f"Of the file: {note}." for note in self.study.evidence.notes]
        display.statement("assumptions", lines)

    def show_answer(self) -> None:
        """The answer in words, with the reasons where the data do not decide."""
        found = self._found
        lines = [*answer_lines(found), *(f"All that fit agree: {line}" for line in self._common())]
        display.statement(
            "answer",
            [*lines, *self.study.remarks],
        )
        if found.answer is not Answer.IDENTIFIED:
            display.finding("not-identified", lines[0].capitalize(), against=self._over)
        if found.outliers:
            display.finding(
                "outliers", f"samples {words(found.outliers)} do not belong to the others", against=self._over
            )

    def show_readings(self) -> None:
        """Every function that fits, with all its names; equal functions are one row."""
        rows = []
        for finding in self._found.fits[:SHOWN]:
            told = [constant_words(finding.left, "reference"), constant_words(finding.right, "body")]
            constants = "; ".join(text for text in told if text) or "none"
            rows.append([finding.reading.words, constants, miss_text(finding)])
        more = len(self._found.fits) - SHOWN
        display.table(
            "tbl:readings",
            ["reading", "constants", "miss"],
            rows or [["none fits", "", miss_text(self._found.next_best)]],
            caption="Functions that fit the samples, least miss first" + (f"; {more} more" if more > 0 else ""),
            align="llr",
        )
        if self._found.answer is Answer.IDENTIFIED:
            names = list(self._found.fits[0].reading.names)
            display.statement("names", names, title="Names of this one function; no data could tell them apart")

    def show_residuals(self) -> None:
        """The miss of each sample under the best reading and the next."""
        found = self._found
        if found.fits:
            shown = {"fits best": found.fits[0], "best that does not fit": found.next_best}
        else:
            shown = {"best": found.next_best, "next": found.second_best}
        drawn = {name: np.degrees(finding.residuals) for name, finding in shown.items() if finding is not None}
        if found.constants is Constants.LEFT and self.study.evidence.truth is None:
            caption = "Miss between the turns that angles and rates make over each stretch"
        else:
            caption = "Miss of each sample under the best reading and the nearest that is not as good"
        display.figure(
            "fig:residuals",
            residual_chart(drawn, limit=float(np.degrees(found.noise)) if found.noise_stated else None),
            caption=caption,
            alt="Points of two readings over the samples; the nearer to the bottom, the better the reading fits.",
        )

    def show_near_fits(self) -> None:
        """The mistake that leads from the best reading to each of the others, or what would fit where none does."""
        head = "Mistakes that explain near-fits" if self._found.fits else "What would fit"
        lines = list(self.study.mistakes) or ["Nothing to report."]
        display.statement("near-fits", lines, title=head)

    def show_next(self) -> None:
        """The attitude to measure next, where more than one reading is left."""
        if self.study.asked is None:
            display.statement("next", "No further measurement is needed to tell readings apart, or none can be named.")
        else:
            display.statement("next", f"Set {asked_words(self.study)}.")

    def show_fragment(self) -> None:
        """The spec lines that state the convention found."""
        lines = self._fragment()
        display.statement(
            "fragment",
            lines or ["No spec lines: they are written for exactly one chain of turns."],
            title="Spec lines for the workbook",
        )

    def show_checks(self) -> None:
        """The same attitudes and the same answer by scipy."""
        identification_checks.show(self.study, self._found)

    def show_results(self) -> None:
        """How many readings are left, the miss of the best, and the factor to the next."""
        found = self._found
        best = found.fits[0] if found.fits else found.next_best
        assert best is not None
        count, miss = len(found.fits), float(np.degrees(best.miss))
        for quantity, value, unit in (("readings left", float(count), ""), ("miss of the best reading", miss, "deg")):
            display.record(
                quantity=quantity, of=self._over, over="samples", lo=value, hi=value, unit=unit, basis="measured"
            )
        gap = found.gap if found.fits else float("nan")
        display.table(
            "tbl:results",
            ["result", "value"],
            [
                ["answer", found.answer.value],
                ["samples", str(self.study.evidence.samples)],
                ["functions tried", str(found.tried)],
                ["readings left", str(count)],
                ["miss of the best reading", miss_text(best)],
                ["next candidate worse by a factor", number_text(gap, 1) if np.isfinite(gap) else "not bounded"],
                ["samples that do not belong", words(found.outliers) if found.outliers else "none"],
            ],
            caption="Results of this calculation",
        )

    @property
    def _found(self) -> Any:
        found = self.study.found
        assert found is not None
        return found

    def _common(self) -> list[str]:
        return in_common(self._found, self.study.evidence.names)

    def _fragment(self) -> list[str]:
        return fragment_lines(self.study, self._reference.name, self._body.name)
