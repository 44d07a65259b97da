"""What the zero-attitude template calls: where zero should be, on either side, free and by right angles."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import axis_words, degrees_text
from trunnion.envelope.both_sides import BothSides, best_zero_both_sides
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Union
from trunnion.envelope.zero import Side, ZeroChoice, best_right_angle_zero, best_zero
from trunnion.errors import CalculationError
from trunnion.sheet import display, parameters, region_checks
from trunnion.sheet.describe import convention_rows, region_rows
from trunnion.sheet.maps import region_samples
from trunnion.sheet.regions import Regions
from trunnion.sheet.rounding import ceiling_text, floor_text

Array = NDArray[np.float64]

_SHOWN_RIGHT_ANGLES = 6


class ZeroAttitude:
    """One convention and the regions it must serve; each `show_…` displays one part and records what it finds."""

    def __init__(
        self, *, convention: Mapping[str, Any], envelopes: Mapping[str, Any], both_sides: bool | str = False
    ) -> None:
        self._plain = {"convention": dict(convention), "envelopes": dict(envelopes)}
        self.convention: Convention = parameters.convention(convention)
        self.regions = Regions(envelopes)
        self.whole = Union(dict(self.regions))
        self._wants_both = _yes(both_sides, "both sides")

    @cached_property
    def free(self) -> dict[Side, ZeroChoice]:
        """The best constant on each side, any rotation allowed."""
        return {side: best_zero(self.whole, self.convention, side) for side in Side}

    @cached_property
    def both(self) -> BothSides:
        """The best constants found on both sides at once, with the bracket of what any pair could give."""
        return best_zero_both_sides(self.whole, self.convention)

    @cached_property
    def right_angles(self) -> dict[Side, list[ZeroChoice]]:
        """The constants reached by right-angle turns on each side, best first."""
        return {side: best_right_angle_zero(self.whole, self.convention, side) for side in Side}

    def show_inputs(self) -> None:
        """The convention and the regions as the injected parameters state them."""
        rows = convention_rows(self.convention.name, self._plain["convention"])
        display.inputs(
            rows + [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
        )

    def show_assumptions(self) -> None:
        """What is held fixed."""
        display.statement(
            "assumptions",
            "Sequence, senses and the constant on the other side stay as they are; one constant is chosen at a time.",
        )
        self.regions.tell()

    def show_present(self) -> None:
        """The margin with today's zero, recorded."""
        found = lock_margin(self.whole, self.convention).least
        self._record("lock margin", "present zero", found.lo, found.hi, found.basis.value)
        display.statement(
            "present",
            [f"With today's zero the least margin over all regions is {floor_text(float(np.degrees(found.lo)))}°."],
        )

    def show_free(self) -> None:
        """The best constant on each side: margin, upper bound, gap, turn from today's zero, sensitivity."""
        rows = []
        for side, choice in self.free.items():
            least = choice.margin.least
            self._record("lock margin with best zero", side.value, least.lo, choice.upper, least.basis.value)
            rows.append(
                [
                    side.value,
                    f"{floor_text(float(np.degrees(least.lo)))}°",
                    f"{ceiling_text(float(np.degrees(choice.upper)))}°",
                    degrees_text(choice.turn, 3),
                    axis_words(choice.direction, self._frame(side), 3),
                    " to ".join(f"{loss:.2f}" for loss in choice.loss),
                ]
            )
        display.table(
            "tbl:free-zero",
            [
                "constant on the",
                "guaranteed",
                "no constant gives more than",
                "turn from today's",
                "lock line then",
                "loss",
            ],
            rows,
            caption="The best constant on each side, any rotation allowed",
            align="lrrrlr",
            notes=["Loss: degrees of margin lost for each degree the lock line is turned, mildest to worst way."],
        )

    def show_matrices(self) -> None:
        """The constants themselves, as rotations from today's."""
        for side, choice in self.free.items():
            self._show_matrix(side.name.lower(), side, choice.convention, "to state in the spec")

    def _show_matrix(self, identity: str, side: Side, convention: Convention, words: str) -> None:
        matrix = convention.left if side is Side.REFERENCE else convention.right
        display.table(
            f"tbl:constant-{identity}",
            ["row", "1", "2", "3"],
            [[str(row + 1), *(f"{float(v):+.9f}".replace("-", "−") for v in matrix[row])] for row in range(3)],
            caption=f"The constant on the {side.value} {words}",
            align="lrrr",
        )

    def show_both_sides(self) -> None:
        """Constants on both sides at once, if asked for: what is guaranteed, and what no pair can pass."""
        if not self._wants_both:
            display.statement("both-sides", "Constants on both sides at once were not asked for.")
            return
        least = self.both.margin.least
        self._record("lock margin with best zero", "both sides", least.lo, self.both.upper, least.basis.value)
        low, high = (float(np.degrees(end)) for end in (least.lo, self.both.upper))
        gap = f"{ceiling_text(float(np.degrees(self.both.gap)), 3)}°"
        display.statement(
            "both-sides",
            [
                f"With the constants below on both sides the least margin is {floor_text(low)}°; no pair of constants "
                f"gives more than {ceiling_text(high)}°. The gap of {gap} remains open: "
                + ("it is as narrow as asked for." if self.both.finished else "the time ran out before it closed."),
            ],
        )
        for side in Side:
            self._show_matrix(f"both-{side.name.lower()}", side, self.both.convention, "with both sides chosen")

    def show_right_angles(self) -> None:
        """The right-angle choices, best first: they keep the familiar axes."""
        rows = []
        for side, choices in self.right_angles.items():
            for choice in choices[:_SHOWN_RIGHT_ANGLES]:
                least = float(np.degrees(choice.margin.least.lo))
                line = axis_words(choice.direction, self._frame(side), 3)
                rows.append([side.value, f"{floor_text(least)}°", degrees_text(choice.turn, 3), line])
        display.table(
            "tbl:right-angle-zero",
            ["constant on the", "guaranteed", "turn from today's", "lock line then"],
            rows,
            caption="Constants reached by right-angle turns, best first on each side",
            align="lrrl",
            notes=["They only exchange axes, so that none of them does better than the best of the twelve sequences."],
        )

    def show_rule_of_thumb(self) -> None:
        """Common practice: keep the usual attitude near the middle of the middle angle's range."""
        samples = [R for region in self.regions.values() if (R := region_samples(region)) is not None]
        if not samples:
            display.statement("thumb", "No region can be sampled, so the rule of thumb is not looked at.")
            return
        attitudes = np.concatenate(samples)
        named = {
            "today's zero": self.convention,
            **{f"best on the {s.value}": c.convention for s, c in self.free.items()},
        }
        display.table(
            "tbl:thumb",
            ["zero", "median margin over samples", "share of samples beyond 45°"],
            [
                [name, f"{np.degrees(np.median(margin)):.1f}°", f"{100 * np.mean(margin > np.pi / 4):.0f} %"]
                for name, convention in named.items()
                for margin in [convention.lock_margin(attitudes)]
            ],
            caption="Rule of thumb (common practice, no source): the usual attitude should stand near the middle of "
            "the middle angle's range, 90° from lock",
            align="lrr",
        )

    def show_checks(self) -> None:
        """The margins with each chosen zero again by scipy."""
        for side, choice in self.free.items():
            self._check(side.name.lower(), f"with the best constant on the {side.value}", choice.convention)
        if self._wants_both:
            self._check("both", "with the best constants on both sides", self.both.convention)

    def _check(self, identity: str, words: str, convention: Convention) -> None:
        for over, region in self.regions.items():
            region_checks.check_least_margin(
                f"check:{identity}:{over}",
                f"least margin over {over} {words}",
                convention=convention,
                plain=self._plain["envelopes"][over],
                region=region,
                claimed=lock_margin(region, convention).least,
            )

    def show_results(self) -> None:
        """What was found, in one table."""
        present = lock_margin(self.whole, self.convention).least
        rows = [["today's zero", f"{floor_text(float(np.degrees(present.lo)))}°", ""]]
        for side, choice in self.free.items():
            gap = f"{ceiling_text(float(np.degrees(choice.gap)), 3)}°"
            rows.append([f"best on the {side.value}", f"{floor_text(float(np.degrees(choice.margin.least.lo)))}°", gap])
        if self._wants_both:
            low, gap = self.both.margin.least.lo, f"{ceiling_text(float(np.degrees(self.both.gap)), 3)}°"
            rows.append(["best found on both sides", f"{floor_text(float(np.degrees(low)))}°", gap])
        display.table(
            "tbl:results",
            ["zero", "guaranteed margin", "gap to the upper bound"],
            rows,
            caption="Results of this calculation",
            align="lrr",
        )

    def _frame(self, side: Side) -> Any:
        return self.convention.reference if side is Side.REFERENCE else self.convention.body

    def _record(self, quantity: str, over: str, lo: float, hi: float, basis: str) -> None:
        display.record(
            quantity=quantity,
            of=self.convention.name,
            over=over,
            lo=float(np.degrees(lo)),
            hi=float(np.degrees(hi)),
            unit="deg",
            basis=basis,
        )


def _yes(value: bool | str, what: str) -> bool:
    """`yes`/`no` as a spec has them, or true/false."""
    words = {"yes": True, "no": False, "": False, True: True, False: False}
    if value not in words:
        raise CalculationError(f"'{value}' is no answer to '{what}'", remedy="write yes or no")
    return words[value]
