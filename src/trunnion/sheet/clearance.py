"""What the direction-clearance template calls: how near a body direction comes to a reference direction."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.frames import Frame
from trunnion.envelope.clearance import Directions, clearance_along, clearance_to_any
from trunnion.envelope.margins import direction_clearance
from trunnion.envelope.regions import Track
from trunnion.envelope.results import AngleRange, Extreme
from trunnion.errors import CalculationError
from trunnion.sheet import display, independent, parameters, region_checks
from trunnion.sheet.describe import region_rows, words
from trunnion.sheet.extremes import record_extreme
from trunnion.sheet.regions import Regions
from trunnion.sheet.rounding import ceiling_text, floor_text
from trunnion.spec.meaning.envelopes import STATEMENT_KEYS
from trunnion.tables.directions import read_direction_table

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class _Pair:
    """A body direction (3,) and the reference direction it is held against, with both in words.

    reference: (3,), or a table of directions that move; same_time: against it at the time of each row of a table of
    attitudes, else against all of its directions whenever they are met. origin: s, of the directions' clock.
    """

    body: Array
    reference: Array | Directions
    words: str
    same_time: bool = False
    origin: float = 0.0


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
        self.regions = Regions(envelopes)

    @cached_property
    def clearances(self) -> dict[tuple[str, str], AngleRange]:
        """Least and largest angle by (pair, region)."""
        return {(name, over): self._clearance(pair, over) for name, pair in self.pairs.items() for over in self.regions}

    def _clearance(self, pair: _Pair, over: str) -> AngleRange:
        region = self.regions[over]
        if not isinstance(pair.reference, Directions):
            return direction_clearance(region, pair.body, pair.reference)
        if not pair.same_time:
            return clearance_to_any(region, pair.body, pair.reference)
        return clearance_along(self._track(over), pair.body, self._shifted(pair, over))

    def _track(self, over: str) -> Track:
        region = self.regions[over]
        if not isinstance(region, Track):
            raise CalculationError(
                f"'{over}' is no table of attitudes, so that there is no same time for direction and attitude",
                remedy="write `at: any time`, or give the table of a run",
            )
        return region

    def _shifted(self, pair: _Pair, over: str) -> Directions:
        """The directions on the clock of a region's table, whose times count from its own origin."""
        assert isinstance(pair.reference, Directions)
        origin = parameters.open_table(_statement(self._plain["envelopes"][over])).origin
        return Directions(pair.reference.times + (pair.origin - origin), pair.reference.directions)

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
        moving = [name for name, pair in self.pairs.items() if isinstance(pair.reference, Directions)]
        still = [name for name in self.pairs if name not in moving]
        texts = [f"The reference directions of {', '.join(still)} stand still in the reference frame."] if still else []
        texts += [
            f"Between the rows of its table the reference direction of {name} moves along the great circle at a "
            "constant rate; it is compared "
            + (
                "with the attitude at the same time."
                if self.pairs[name].same_time
                else "with every attitude of the region, whenever either occurs."
            )
            for name in moving
        ]
        display.statement("assumptions", texts)
        self.regions.tell()

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
            shifted = self._shifted(pair, over) if pair.same_time else None
            for which, extreme in (("least", found.least), ("largest", found.largest)):
                _check_witness(
                    f"check:{name}:{over}:{which}", f"{which} angle of {name} over {over}", pair, extreme, shifted
                )
            searched = self._searched(pair, over)
            if searched is not None:
                low, high = (float(np.degrees(end)) for end in (found.least.lo, found.least.hi))
                display.check(
                    f"check:{name}:{over}:search",
                    f"least angle of {name} over {over}, searched",
                    ours=low,
                    theirs=searched,
                    difference=max(0.0, low - searched, searched - high),
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

    def _searched(self, pair: _Pair, over: str) -> float | None:
        """Least angle (deg) found by scipy over the region built anew; None for a kind that has no sampler."""
        plain, region = self._plain["envelopes"][over], self.regions[over]
        if pair.same_time:
            shifted, track = self._shifted(pair, over), self._track(over)
            least = independent.least_along(
                track.times, track.quaternions, shifted.times, shifted.directions, body=pair.body
            )
            return max(0.0, least - independent.degrees(plain.get("attitude error", "0 deg")))
        sampler = region_checks.region_sampler(plain, region)
        if sampler is None:
            return None
        if isinstance(pair.reference, Directions):
            sampler = independent.seen_by(sampler, pair.reference.times, pair.reference.directions)
            against = pair.reference.directions[0]
        else:
            against = pair.reference
        least = independent.least_value(sampler, lambda attitudes: _angles(pair.body, against, attitudes))
        return max(0.0, least - independent.degrees(plain.get("dispersion", "0 deg")))

    def _record(self, quantity: str, name: str, over: str, extreme: Extreme) -> None:
        witness, slack = extreme.witness, 1e-9
        reached = witness is not None and extreme.lo - slack <= witness.value <= extreme.hi + slack
        record_extreme(extreme, reached=reached, quantity=quantity, of=name, over=over)


def _statement(plain: Mapping[str, Any]) -> dict[str, Any]:
    return {key: plain[key] for key in STATEMENT_KEYS if key in plain}


def _pair(name: str, plain: Mapping[str, Any], reference: Frame, body: Frame) -> _Pair:
    stray = sorted(set(plain) - {"body", "reference", "at", "source"})
    missing = [key for key in ("body", "reference") if key not in plain]
    if stray or missing:
        raise CalculationError(
            f"direction '{name}' " + (f"knows no '{stray[0]}'" if stray else f"does not say its '{missing[0]}'"),
            remedy="write {body: forward, reference: up}, or a table of directions as reference and `at: same time`",
        )
    carried, against = _direction(plain["body"], body), plain["reference"]
    told = f"{words(plain['body'])} of {body.name} against "
    if not isinstance(against, Mapping):
        if "at" in plain:
            raise CalculationError(f"direction '{name}' stands still and needs no `at`", remedy="leave it out")
        return _Pair(carried, _direction(against, reference), f"{told}{words(against)} of {reference.name}")
    at = plain.get("at", "any time")
    if at not in ("any time", "same time"):
        raise CalculationError(f"direction '{name}': '{at}' is no time", remedy="write `any time` or `same time`")
    table = read_direction_table(against, parameters.input_path(str(against.get("table", ""))).parent)
    moving = Directions(table.times, table.directions)
    told += f"the direction in {against['table']}, components in {reference.name}, {at}"
    return _Pair(carried, moving, told, at == "same time", table.origin)


def _direction(value: Any, frame: Frame) -> Array:
    if isinstance(value, str):
        return frame.direction(value)
    vector = np.array(value, dtype=float)
    if vector.shape != (3,) or not np.linalg.norm(vector) > 0.0:
        raise CalculationError(f"{value!r} is no direction", remedy="an axis word, or three numbers not all zero")
    return vector / np.linalg.norm(vector)


def _angles(body: Array, reference: Array, attitudes: Any) -> Array:
    """Angles (N,) deg between the carried direction and the reference direction, by scipy's own rotation."""
    return independent.angle_deg(np.atleast_2d(attitudes.apply(body)), reference)


def _at_witness(pair: _Pair, extreme: Extreme, shifted: Directions | None) -> Array:
    """The reference direction (3,) at the time of a witness, by scipy's slerp of the turns between rows."""
    if not isinstance(pair.reference, Directions):
        return pair.reference
    moving = pair.reference if shifted is None else shifted
    assert extreme.witness is not None
    assert extreme.witness.time is not None
    return independent.moved(moving.times, moving.directions, np.array([extreme.witness.time]))[0]


def _check_witness(identity: str, what: str, pair: _Pair, extreme: Extreme, shifted: Directions | None) -> None:
    from scipy.spatial.transform import Rotation

    if extreme.witness is None:
        return
    display.check(
        identity,
        f"{what}, at its witness",
        ours=float(np.degrees(extreme.witness.value)),
        theirs=float(
            _angles(pair.body, _at_witness(pair, extreme, shifted), Rotation.from_matrix(extreme.witness.matrix))[0]
        ),
        tolerance=1e-9 if not isinstance(pair.reference, Directions) else 1e-7,
        unit="deg",
        library=independent.LIBRARY,
    )
