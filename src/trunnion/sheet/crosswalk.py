"""What the convention-crosswalk template calls: the same attitude in two conventions, both ways, and what it costs."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import degrees_text, number_text, singular_words, turn_sentences
from trunnion.crosswalk.walk import AngleMap, CrossWalk, cross_walk, probes
from trunnion.envelope.margins import lock_margin
from trunnion.figures import charts
from trunnion.sheet import display, independent, parameters
from trunnion.sheet.describe import convention_rows, region_rows
from trunnion.sheet.regions import Regions

Array = NDArray[np.float64]

# First-convention chain angles (deg) of the table of corresponding attitudes: plain ones, then general ones.
_TABLE_DEG = ((0, 0, 0), (90, 0, 0), (0, 30, 0), (0, 0, 30), (35, 20, -50), (-120, -40, 75), (150, 60, 10))
_TOLERANCE_DEG = 1e-9
_CHECKED = 50
_SEED = 41


class ConventionCrosswalk:
    """Two conventions of one vehicle; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, first: Mapping[str, Any], second: Mapping[str, Any], envelopes: Mapping[str, Any]) -> None:
        self._plain = {"first": dict(first), "second": dict(second), "envelopes": dict(envelopes)}
        self.first: Convention = parameters.convention(first)
        self.second: Convention = parameters.convention(second)
        self.regions = Regions(envelopes)

    @cached_property
    def walk(self) -> CrossWalk:
        """The walk from the first convention to the second."""
        return cross_walk(self.first, self.second)

    def show_inputs(self) -> None:
        """Both conventions and the regions as the injected parameters state them."""
        rows = convention_rows(self.first.name, self._plain["first"])
        rows += convention_rows(self.second.name, self._plain["second"])
        display.inputs(
            rows + [row for name, plain in self._plain["envelopes"].items() for row in region_rows(name, plain)]
        )

    def show_assumptions(self) -> None:
        """Both conventions speak of one and the same vehicle."""
        display.statement(
            "assumptions",
            "Both conventions state the attitude of one vehicle; axes that bear one name in both are the same lines.",
        )
        self.regions.tell()

    def show_statements(self) -> None:
        """Both conventions in words, and where each is singular."""
        for convention in (self.first, self.second):
            display.statement(
                f"words-{convention.name}",
                [*turn_sentences(convention), *singular_words(convention)],
                title=convention.name,
            )

    def show_frames(self) -> None:
        """The constant rotations between the frames of the two conventions."""
        walk = self.walk
        for identity, matrix, source, target in (
            ("reference", walk.R_pr, self.first.reference, self.second.reference),
            ("body", walk.R_bq.T, self.first.body, self.second.body),
        ):
            display.table(
                f"tbl:frames-{identity}",
                [f"to {target.name}, from {source.name}", *source.axes],
                [[target.axes[row], *(number_text(float(v)) for v in matrix[row])] for row in range(3)],
                caption=f"Components in {target.name} of the axes of {source.name}",
                align="lrrr",
            )

    def show_map(self) -> None:
        """The exact map of the angles both ways where one of signs and constants exists."""
        for walk in (self.walk, self.walk.back()):
            name = f"map-{walk.first.name}"
            title = f"{walk.first.name} to {walk.second.name}"
            if walk.angle_map is None:
                display.statement(
                    name,
                    "No map of signs and constants exists: each angle of the second convention depends on all three of "
                    "the first. The angles are worked out through the matrix, at every attitude.",
                    title=title,
                )
            else:
                display.statement(name, _map_lines(walk, walk.angle_map), title=title)

    def show_table(self) -> None:
        """Corresponding attitudes with both margins."""
        rows = []
        for turns in _TABLE_DEG:
            angles = self.first.stated_from_chain(np.radians(self._middle_shifted(turns)))
            there, margin = self.walk.angles(angles)
            own = float(self.first.lock_margin(self.first.matrix(angles)))
            rows.append([_triple(angles), degrees_text(own, 2), _triple(there), degrees_text(float(margin), 2)])
        display.table(
            "tbl:corresponding",
            [", ".join(self.first.angle_names), "margin", ", ".join(self.second.angle_names), "margin"],
            rows,
            caption=f"Corresponding attitudes: {self.first.name} on the left, {self.second.name} on the right",
            align="lrlr",
        )

    def show_rates(self) -> None:
        """The matrix that takes the first convention's angle rates to the second's, at one general attitude."""
        angles = self.first.stated_from_chain(np.radians(self._middle_shifted((35, 20, -50))))
        matrix = self.walk.rate_matrix(angles)
        display.table(
            "tbl:rates",
            ["rate of", *(f"per {name}" for name in self.first.angle_names)],
            [
                [name, *(number_text(float(v), 6) for v in row)]
                for name, row in zip(self.second.angle_names, matrix, strict=True)
            ],
            caption=f"Angle rates of {self.second.name} from those of {self.first.name} at {_triple(angles)}",
            align="lrrr",
        )

    def show_amplification(self) -> None:
        """How far the mapping can amplify a small angle error over each region: recorded, with its bound."""
        rows = []
        for over, region in self.regions.items():
            own = lock_margin(region, self.first).least.lo
            theirs = lock_margin(region, self.second).least
            if self.walk.angle_map is not None:
                bound, basis = 1.0, "exact"
            elif theirs.lo > 0.0:
                bound, basis = float(np.sqrt((1 + np.cos(own)) / (1 - np.cos(theirs.lo)))), theirs.basis.value
            else:
                rows.append([over, "unbounded", "the second convention locks inside the region"])
                continue
            display.record(
                quantity="error amplification",
                of=f"{self.first.name} to {self.second.name}",
                over=over,
                lo=None,
                hi=bound,
                unit="",
                basis=basis,
            )
            rows.append([over, f"{np.ceil(1e4 * bound - 1e-9) / 1e4:.4f}", basis])
        display.table(
            "tbl:amplification",
            ["region", "amplification at most", "basis"],
            rows or [["none stated", "", ""]],
            caption="Growth of a small angle error in the mapping",
            align="lrl",
        )
        margins = np.linspace(0.5, 90.0, 180)
        growth = np.sqrt(2.0 / (1.0 - np.cos(np.radians(margins))))
        display.figure(
            "fig:amplification",
            charts.gain_curves(
                margins, {"bound of the amplification": growth}, locks=[0.0], x_label="margin of the second"
            ),
            caption=f"Largest growth of an angle error when {self.second.name} stands at the margin shown",
            alt="A curve that grows without bound as the margin of the second convention goes to zero.",
        )

    def show_probes(self) -> None:
        """Three attitudes to try the map on, and what each shows when only one side of it is applied."""
        found = probes(self.walk)
        if all(miss is None for probe in found for miss in probe.misses):
            display.statement(
                "probes", "The frames of both conventions coincide, so there is no map to apply by halves."
            )
            return
        rows = [
            [
                probe.words,
                _triple(probe.angles),
                _triple(self.walk.angles(probe.angles)[0]),
                *("no error" if miss is None else degrees_text(miss, 2) for miss in probe.misses),
                "sufficient" if probe.sufficient else "insufficient",
            ]
            for probe in found
        ]
        display.table(
            "tbl:probes",
            ["probe", "given", "right answer", "reference map only", "body map only", "no map", "by itself"],
            rows,
            caption="Error that each probe attitude shows when the map between the frames is applied by halves",
            align="lllrrrl",
        )

    def show_checks(self) -> None:
        """The walk against scipy on attitudes drawn with a fixed seed, there and back."""
        from scipy.spatial.transform import Rotation

        generator = np.random.default_rng(_SEED)
        angles = self.first.stated_from_chain(generator.uniform(-1.4, 1.4, size=(_CHECKED, 3)) + self._centre())
        outer, inner = Rotation.from_matrix(self.walk.R_pr), Rotation.from_matrix(self.walk.R_bq)
        theirs = outer * independent.rotation(self.first, np.degrees(angles)) * inner
        ours = independent.rotation(self.second, np.degrees(self.walk.angles(angles)[0]))
        self._check("there", "attitudes mapped to the second convention", ours, theirs)
        again = independent.rotation(self.first, np.degrees(self.walk.back().angles(self.walk.angles(angles)[0])[0]))
        self._check(
            "back", "attitudes mapped there and back", again, independent.rotation(self.first, np.degrees(angles))
        )

    def show_results(self) -> None:
        """What was found, in one table."""
        exact = "yes" if self.walk.angle_map is not None else "no"
        display.table(
            "tbl:results",
            ["result", "value"],
            [
                ["a map of signs and constants exists", exact],
                ["singular attitudes are shared", "yes" if self._share_lock() else "no"],
            ],
            caption="Results of this calculation",
        )

    def _share_lock(self) -> bool:
        u, v = self.first.lock_axes
        other_u, other_v = self.second.lock_axes
        shared = abs(float((self.walk.R_pr @ u) @ other_u)), abs(float((self.walk.R_bq.T @ v) @ other_v))
        return min(shared) > 1.0 - 1e-12

    def _check(self, identity: str, what: str, ours: Any, theirs: Any) -> None:
        apart = float(np.degrees((ours.inv() * theirs).magnitude()).max())
        display.check(
            f"check:{identity}",
            f"{_CHECKED} {what}",
            ours=0.0,
            theirs=apart,
            tolerance=_TOLERANCE_DEG,
            unit="deg",
            library=independent.LIBRARY,
        )

    def _centre(self) -> Array:
        return np.array([0.0, np.pi / 2 if self.first.sequence.repeated else 0.0, 0.0])

    def _middle_shifted(self, turns: tuple[int, int, int]) -> Array:
        return np.asarray(turns, dtype=float) + np.degrees(self._centre())


def _map_lines(walk: CrossWalk, found: AngleMap) -> list[str]:
    """`yaw = 90° − yaw of ordinary`, one line an angle."""
    lines = []
    for place, name in enumerate(walk.second.angle_names):
        sign = "−" if found.signs[place] < 0 else ""
        constant = found.constants[place]
        source = f"{walk.first.angle_names[found.columns[place]]} of {walk.first.name}"
        start = "" if abs(constant) < 1e-12 else degrees_text(constant) + (" + " if not sign else " ")
        lines.append(f"{name} of {walk.second.name} = {start}{sign}{' ' if sign and start else ''}{source}")
    return [*lines, "The map holds at every attitude (proven on the 27 attitudes that decide it), modulo whole turns."]


def _triple(angles: Array) -> str:
    return ", ".join(degrees_text(float(angle), 3) for angle in angles)
