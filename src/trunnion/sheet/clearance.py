"""What the direction-clearance template calls: how near a body direction comes to a reference direction."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.frames import Frame
from trunnion.envelope.margins import direction_clearance
from trunnion.envelope.regions import Region
from trunnion.envelope.results import AngleRange, Extreme
from trunnion.sheet import display, independent, parameters, region_checks
from trunnion.sheet.describe import region_rows, words
from trunnion.sheet.rounding import ceiling_text, floor_text

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class _Pair:
    """A body direction (3,) and the reference direction (3,) it is held against, with both in words."""

    body: Array
    reference: Array
    words: str


class DirectionClearance:
    """Named pairs of directions over regions; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        directions: Mapping[str, Any],
        reference: Mapping[str, Any],
        body: Mapping[str, Any],
        envelopes: Mapping[str, Any],
    ) -> None:
        self._plain = {"directions": dict(directions), "envelopes": dict(envelopes)}
        first, second = parameters.frame(reference), parameters.frame(body)
        self.pairs = {name: _pair(name, plain, first, second) for name, plain in directions.items()}
        self.regions: dict[str, Region] = {name: parameters.region(plain) for name, plain in envelopes.items()}

    @cached_property
    def clearances(self) -> dict[tuple[str, str], AngleRange]:
        """Least and largest angle by (pair, region)."""
        return {
            (name, over): direction_clearance(region, pair.body, pair.reference)
            for name, pair in self.pairs.items()
            for over, region in self.regions.items()
        }

    def show_inputs(self) -> None:
        """The directions and the regions as the injected parameters state them."""
        rows = [
            {"input": f"direction {name}", "stated": words(plain), "source": str(plain.get("source", "not stated"))}
            for name, plain in self._plain["directions"].items()
        ]
        display.inputs(
            rows + [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
        )

    def show_assumptions(self) -> None:
        """What the reference directions are taken to be."""
        display.statement(
            "assumptions", "The reference directions stand still in the reference frame while the body moves."
        )

    def show_clearances(self) -> None:
        """Least and largest angle of every pair over every region, recorded, and where they are reached."""
        rows = []
        for (name, over), found in self.clearances.items():
            self._record("least direction clearance", name, over, found.least)
            self._record("largest direction clearance", name, over, found.largest)
            where = "" if found.least.witness is None else found.least.witness.where
            least, largest = float(np.degrees(found.least.lo)), float(np.degrees(found.largest.hi))
            rows.append(
                [name, over, f"{floor_text(least)}°", f"{ceiling_text(largest)}°", found.least.basis.value, where]
            )
        display.table(
            "tbl:clearances",
            ["direction", "region", "least angle", "largest angle", "basis", "least angle is reached"],
            rows,
            caption="Angle between each body direction and its reference direction",
            align="llrrll",
            notes=[f"{name}: {pair.words}." for name, pair in self.pairs.items()],
        )

    def show_checks(self) -> None:
        """Each least and largest angle again by scipy at its witness, and by searching the region built anew."""
        for (name, over), found in self.clearances.items():
            pair = self.pairs[name]
            for which, extreme in (("least", found.least), ("largest", found.largest)):
                _check_witness(f"check:{name}:{over}:{which}", f"{which} angle of {name} over {over}", pair, extreme)
            searched = _searched(pair, self._plain["envelopes"][over], self.regions[over])
            if searched is not None:
                display.check(
                    f"check:{name}:{over}:search",
                    f"least angle of {name} over {over}, searched",
                    ours=float(np.degrees(found.least.lo)),
                    theirs=searched,
                    tolerance=region_checks.SEARCH_TOLERANCE_DEG,
                    unit="deg",
                    library=independent.OPTIMISER,
                )

    def show_results(self) -> None:
        """The results in one table."""
        display.table(
            "tbl:results",
            ["quantity", "of", "over", "value", "basis"],
            [
                [f"{which} direction clearance", name, over, text, extreme.basis.value]
                for (name, over), found in self.clearances.items()
                for which, extreme, text in (
                    ("least", found.least, f"{floor_text(float(np.degrees(found.least.lo)))}°"),
                    ("largest", found.largest, f"{ceiling_text(float(np.degrees(found.largest.hi)))}°"),
                )
            ],
            caption="Results of this calculation",
            align="lllrl",
        )

    def _record(self, quantity: str, name: str, over: str, extreme: Extreme) -> None:
        witness = extreme.witness
        display.record(
            quantity=quantity,
            of=name,
            over=over,
            lo=float(np.degrees(extreme.lo)),
            hi=float(np.degrees(extreme.hi)),
            unit="deg",
            basis=extreme.basis,
            attained=None if witness is None else float(np.degrees(witness.value)),
            witness=None
            if witness is None
            else {"matrix": witness.matrix, "where": witness.where, "time": witness.time},
        )


def _pair(name: str, plain: Mapping[str, Any], reference: Frame, body: Frame) -> _Pair:
    carried, against = str(plain["body"]), str(plain["reference"])
    text = f"{carried} of {body.name} against {against} of {reference.name}"
    return _Pair(body.direction(carried), reference.direction(against), text)


def _angles(pair: _Pair, attitudes: Any) -> Array:
    """Angles (N,) deg between the carried direction and the reference direction, by scipy's own rotation."""
    carried = np.atleast_2d(attitudes.apply(pair.body))
    return np.degrees(np.arctan2(np.linalg.norm(np.cross(carried, pair.reference), axis=1), carried @ pair.reference))


def _check_witness(identity: str, what: str, pair: _Pair, extreme: Extreme) -> None:
    from scipy.spatial.transform import Rotation

    if extreme.witness is not None:
        display.check(
            identity,
            f"{what}, at its witness",
            ours=float(np.degrees(extreme.witness.value)),
            theirs=float(_angles(pair, Rotation.from_matrix(extreme.witness.matrix))[0]),
            tolerance=1e-9,
            unit="deg",
            library=independent.LIBRARY,
        )


def _searched(pair: _Pair, plain: Mapping[str, Any], region: Region) -> float | None:
    sampler = region_checks.region_sampler(plain, region)
    if sampler is None:
        return None
    least = independent.least_value(sampler, lambda attitudes: _angles(pair, attitudes))
    dispersion = plain.get("dispersion")
    return max(0.0, least - (independent.degrees(dispersion) if dispersion is not None else 0.0))
