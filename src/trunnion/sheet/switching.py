"""What the switched-conventions template calls: conventions used in turn, and a rule that cannot chatter."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.envelope.regions import Union
from trunnion.envelope.switching import SwitchedSet, rank_switched, switching_rule
from trunnion.errors import RegionError
from trunnion.sheet import display, independent, parameters
from trunnion.sheet.describe import convention_rows, region_rows
from trunnion.sheet.regions import Regions
from trunnion.sheet.rounding import ceiling_text, floor_text
from trunnion.units import parse_quantity

_SIZES = (1, 2, 3)
_SECONDS = 4.0
_TOLERANCE_DEG = 1e-6


class SwitchedConventions:
    """Conventions used in turn over regions; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        conventions: Mapping[str, Any],
        envelopes: Mapping[str, Any],
        threshold: str,
        max_body_rate: str,
        attitude_error: str,
    ) -> None:
        self._plain = {"conventions": dict(conventions), "envelopes": dict(envelopes)}
        self.conventions: dict[str, Convention] = {
            name: parameters.convention(plain) for name, plain in conventions.items()
        }
        self.regions = Regions(envelopes)
        self.whole = Union(dict(self.regions))
        self.stated = {"switch threshold": threshold, "max body rate": max_body_rate, "attitude error": attitude_error}
        self.threshold = parse_quantity(threshold, kind="angle").value
        self.body_rate = parse_quantity(max_body_rate, kind="angular rate").value
        self.error = parse_quantity(attitude_error, kind="angle").value

    @cached_property
    def ranked(self) -> dict[int, list[SwitchedSet]]:
        """Sets of one, two and three conventions, best guaranteed margin first."""
        given = list(self.conventions.values())
        return {size: rank_switched(self.whole, given, size, seconds=_SECONDS) for size in _SIZES if size <= len(given)}

    def show_inputs(self) -> None:
        """Conventions, regions and the numbers of the switch rule."""
        rows = [row for name, plain in self._plain["conventions"].items() for row in convention_rows(name, plain)]
        rows += [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
        rows += [{"input": name, "stated": text, "source": "this workbook"} for name, text in self.stated.items()]
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What the rule takes for granted."""
        display.statement(
            "assumptions",
            "The margins of all conventions of a set are worked out on board all the time, from one attitude estimate "
            "whose error is within the stated one.",
        )
        self.regions.tell()

    def show_sets(self) -> None:
        """The guaranteed margin of every set: the least over the regions of the best margin at each attitude."""
        rows = []
        for size, sets in self.ranked.items():
            for found in sets:
                name = _name(found)
                least = found.margin
                display.record(
                    quantity="switched lock margin",
                    of=name,
                    over=None,
                    lo=float(np.degrees(least.lo)),
                    hi=float(np.degrees(least.hi)),
                    unit="deg",
                    basis=least.basis,
                    attained=None if least.witness is None else float(np.degrees(least.witness.value)),
                    witness=None
                    if least.witness is None
                    else {"matrix": least.witness.matrix, "where": least.witness.where},
                )
                low, high = floor_text(float(np.degrees(least.lo))), ceiling_text(float(np.degrees(least.hi)))
                rows.append([str(size), name, f"{low}°", f"{high}°", least.basis.value])
        display.table(
            "tbl:sets",
            ["used in turn", "conventions", "guaranteed", "reached somewhere", "basis"],
            rows,
            caption="Margin that the better of the conventions always has, over all regions",
            align="rlrrl",
        )

    def show_rule(self) -> None:
        """The switch rule of the best pair and of the best triple, with the proof that it cannot chatter."""
        for size, sets in self.ranked.items():
            if size == 1:
                continue
            best = sets[0]
            try:
                rule = switching_rule(best.margin.lo, self.threshold, self.body_rate, attitude_error=self.error)
                text = rule.statement()
                display.record(
                    quantity="least time between changes",
                    of=_name(best),
                    over=None,
                    lo=rule.dwell,
                    hi=None,
                    unit="s",
                    basis=best.margin.basis,
                )
            except RegionError as err:
                text = f"{err.fault.cause}; {err.fault.remedy}."
            display.statement(f"rule-{size}", text, title=_name(best))

    def show_checks(self) -> None:
        """The bracket's upper end again by scipy: the better margin at its witness."""
        from scipy.spatial.transform import Rotation

        for sets in self.ranked.values():
            best = sets[0]
            if best.margin.witness is None:
                continue
            attitude = Rotation.from_matrix(best.margin.witness.matrix)
            margins = [float(independent.lock_margin_deg(convention, attitude)[0]) for convention in best.conventions]
            display.check(
                f"check:{_name(best)}",
                f"better margin of {_name(best)} at the witness",
                ours=float(np.degrees(best.margin.witness.value)),
                theirs=max(margins),
                tolerance=_TOLERANCE_DEG,
                unit="deg",
                library=independent.LIBRARY,
            )

    def show_results(self) -> None:
        """The best set of each size."""
        display.table(
            "tbl:results",
            ["used in turn", "best set", "guaranteed"],
            [
                [str(size), _name(sets[0]), f"{floor_text(float(np.degrees(sets[0].margin.lo)))}°"]
                for size, sets in self.ranked.items()
            ],
            caption="Results of this calculation",
            align="rlr",
        )


def _name(found: SwitchedSet) -> str:
    return " with ".join(convention.name for convention in found.conventions)
