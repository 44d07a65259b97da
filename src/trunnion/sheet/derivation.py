"""What the convention-derivation template calls: the convention derived, proven, drawn and confirmed."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rates import convention_rate_matrix
from trunnion.attitude.words import degrees_text, number_text, singular_attitudes
from trunnion.figures import charts
from trunnion.sheet import display, parameters
from trunnion.sheet.convention_page import page_drawing, stated_page
from trunnion.sheet.describe import convention_rows
from trunnion.symbolic.checking import confirmation, independent_check
from trunnion.symbolic.derivation import Derivation, derive
from trunnion.symbolic.proofs import Proof
from trunnion.symbolic.statement import ConventionStatement
from trunnion.symbolic.steps import Step

# The derivation's own sections, by the part of the notebook that shows them.
_PRODUCT = ("The three elementary turns", "The product")
_EXTRACTION = ("Angles from the matrix",)
_SINGULAR = ("The singular attitudes",)
_RATES = ("Angle rates and angular velocity",)
_EXPANSION = ("Near the singular attitudes",)
_OTHER = ("Small angles", "The quaternion", "Inverse and transposed mapping")

_RANK_AT_LOCK = 2
_NEAREST = np.radians(0.5)  # the curves against the middle angle end this far from lock


class ConventionDerivation:
    """One convention; each `show_…` displays one part of its derivation and records what it finds."""

    def __init__(self, *, convention: Mapping[str, Any]) -> None:
        self._plain = dict(convention)
        self.convention: Convention = parameters.convention(convention)

    @cached_property
    def derivation(self) -> Derivation:
        """Every formula of the convention with its proof."""
        return derive(self.convention)

    @cached_property
    def statement(self) -> ConventionStatement:
        """The convention in words, for the interface document."""
        return stated_page(self._plain)

    def show_inputs(self) -> None:
        """The convention as the injected parameters state it."""
        display.inputs(convention_rows(self.convention.name, self._plain))

    def show_assumptions(self) -> None:
        """What the derivation takes for granted."""
        display.statement(
            "assumptions", "None: both frames are right-handed triads and the turns are about their axes."
        )

    def show_statement(self) -> None:
        """The convention in words: what each angle does, where the angles lock, what the matrix means."""
        for number, part in enumerate(self.statement.parts, start=1):
            display.statement(f"statement-{number}", part.paragraphs, title=part.title)

    def show_turns(self) -> None:
        """The body axes before and after each turn, and the table of symbols."""
        svg, alt, caption = page_drawing(self.statement, self.convention)
        display.figure("fig:turns", svg, caption=caption, alt=alt)
        display.table(
            "tbl:notation",
            ["symbol", "means"],
            [[f"${symbol}$", meaning] for symbol, meaning in self.derivation.notation],
            caption="Symbols of this derivation",
        )

    def show_product(self) -> None:
        """Each elementary turn and their product."""
        self._show(_PRODUCT)

    def show_extraction(self) -> None:
        """The angles from the entries of the matrix, with their quadrants."""
        self._show(_EXTRACTION)

    def show_singular_case(self) -> None:
        """Both singular values of the middle angle: substitution, reduction to one turn, what is left."""
        self._show(_SINGULAR)

    def show_rates(self) -> None:
        """Rate matrices both ways, determinant, and the loss of rank at lock, which is recorded."""
        self._show(_RATES)
        for place, attitude in enumerate(singular_attitudes(self.convention), start=1):
            rank = int(np.linalg.matrix_rank(self._rates_at_lock(attitude.angle), tol=1e-9))
            display.record(
                quantity="rank of the rate matrix at lock",
                of=self.convention.name,
                over=f"singular value {place}, {self.convention.angle_names[1]} {degrees_text(attitude.angle)}",
                lo=rank,
                hi=rank,
                attained=rank,
                unit="",
                basis="exact",
                note=f"of 3; the reduction above shows {_RANK_AT_LOCK}",
            )

    def show_gains(self) -> None:
        """Growth of the outer rates and the condition number against the distance from lock."""
        rows = self.derivation.conditions
        display.table(
            "tbl:gains",
            ["lock margin", "|determinant|", "largest outer angle rate a unit body rate", "condition number"],
            [[degrees_text(float(np.radians(row[0]))), *(f"{value:.6g}" for value in row[1:])] for row in rows],
            caption="Rates against the distance from lock",
            align="rrrr",
        )
        locks = sorted(float(attitude.angle) for attitude in singular_attitudes(self.convention))
        first, last = locks if locks[1] - locks[0] < 1.5 * np.pi else (locks[1] - 2.0 * np.pi, locks[0])
        middle = np.linspace(first + _NEAREST, last - _NEAREST, 360)
        rates = convention_rate_matrix(self.convention, np.stack([0.3 + 0.0 * middle, middle, 0.0 * middle], axis=-1))
        outer = np.abs(np.linalg.inv(rates))
        display.figure(
            "fig:gains",
            charts.gain_curves(
                np.degrees(middle),
                {
                    "largest outer angle rate": np.linalg.norm(outer[:, [0, 2]], axis=-1).max(axis=-1),
                    "condition number": np.linalg.cond(rates),
                },
                locks=[float(np.degrees(lock)) for lock in (first, last)],
                x_label=self.convention.angle_names[1],
            ),
            caption=f"Outer angle rates from a unit body rate, and the condition number, against "
            f"{self.convention.angle_names[1]}",
            alt="Two curves that grow without bound towards both singular values of the middle angle.",
        )

    def show_expansion(self) -> None:
        """First terms near the singular attitudes."""
        self._show(_EXPANSION)

    def show_other_forms(self) -> None:
        """Small angles, the quaternion, the inverse and the transposed map."""
        self._show(_OTHER)

    def show_numbers(self) -> None:
        """One worked attitude through the derived formulas, number beside scipy's number."""
        display.table(
            "tbl:worked",
            ["quantity", "derived", "scipy", "difference"],
            [
                [name, number_text(ours, 9), number_text(theirs, 9), f"{difference:.1e}" if difference else "0"]
                for name, ours, theirs, difference in confirmation(self.derivation)
            ],
            caption="A worked attitude: matrix, quaternion (scalar first), and the angles read back from the matrix",
            align="lrrr",
        )

    def show_proofs(self) -> None:
        """Every identity shown above with the way it was proven and the largest difference to fifty digits."""
        display.table(
            "tbl:proofs",
            ["identity", "exact", "points", "digits", "largest difference"],
            [
                [
                    step.title,
                    step.proof.exact,
                    str(step.proof.points),
                    str(step.proof.digits),
                    "0" if step.proof.largest == "0.0" else str(step.proof.largest),
                ]
                for step in self.derivation.steps
                if step.proof is not None
            ],
            caption="How each identity of this derivation was proven",
            align="llrrr",
        )

    def show_checks(self) -> None:
        """The derived formulas against scipy, at ordinary attitudes and at both singular ones."""
        for number, row in enumerate(independent_check(self.derivation), start=1):
            display.check(
                f"check:{number}",
                row.what,
                ours=row.ours,
                theirs=row.theirs,
                difference=row.difference,
                tolerance=row.tolerance,
                unit=row.unit,
                library=row.library,
            )

    def show_results(self) -> None:
        """What was proven, and where the convention is singular."""
        proofs = [step.proof for step in self.derivation.steps if step.proof is not None]
        display.record(
            quantity="proven identities",
            of=self.convention.name,
            over=None,
            lo=len(proofs),
            hi=len(proofs),
            attained=len(proofs),
            unit="",
            basis="exact",
        )
        display.table(
            "tbl:results",
            ["result", "value"],
            [
                ["identities shown and proven", str(len(proofs))],
                ["digits of the numeric proof", str(min(proof.digits for proof in proofs))],
                *(
                    [f"singular value {place}", f"{self.convention.angle_names[1]} {degrees_text(attitude.angle)}"]
                    for place, attitude in enumerate(singular_attitudes(self.convention), start=1)
                ),
                ["rank of the rate matrix there", f"{_RANK_AT_LOCK} of 3"],
            ],
            caption="Results of this calculation",
        )

    def _show(self, sections: tuple[str, ...]) -> None:
        for title, steps in self.derivation.sections():
            if title in sections:
                for step in steps:
                    _show_step(step)

    def _rates_at_lock(self, middle: float) -> Any:
        return self.derivation.value("body rates", [0.4, middle, -0.9])


def _show_step(step: Step) -> None:
    """One step: its words under its title, its formula, and below it in one quiet line that it was proven."""
    display.statement(f"step-{step.id}", step.prose, title=step.title)
    if step.latex:
        display.equation(f"eq:{step.id}", step.latex, _quiet(step.proof))


def _quiet(proof: Proof | None) -> str:
    """The proof of a step in a few words: `exact, and to 50 digits at 3 points`."""
    return "" if proof is None else f"Proven exactly, and to {proof.digits} digits at {proof.points} random points."
