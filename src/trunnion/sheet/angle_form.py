"""What the angle-form template calls: three numbers that are no sequence, converted, proven and walked across."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.forms import DirectionRoll, RotationVector, TiltPair, TiltType
from trunnion.attitude.stated_forms import StatedForm, form_sentences, worked_sentences
from trunnion.attitude.words import degrees_text, number_text, singular_words, turn_sentences
from trunnion.crosswalk.form_walk import FormWalk, form_walk
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Region
from trunnion.envelope.tilts import tilt_margin, turn_margin
from trunnion.sheet import display, independent, parameters
from trunnion.sheet.describe import convention_rows, region_rows, words
from trunnion.sheet.regions import Regions
from trunnion.sheet.rounding import floor_text
from trunnion.spec.build import form_from_plain
from trunnion.spec.frame_words import frame_notes
from trunnion.symbolic.forms import form_steps

Array = NDArray[np.float64]

# Numbers of the table of corresponding attitudes, in degrees whatever the form; a vector takes them as its components.
_TABLE_DEG = ((0, 0, 0), (90, 0, 0), (0, 10, 0), (0, 0, 10), (30, 10, 10), (30, 20, 20), (30, 30, 30), (-120, -40, 25))
_TOLERANCE_DEG = 1e-9
_CHECKED = 50
_SEED = 43


class AngleForm:
    """One form and the convention it is walked to; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, form: Mapping[str, Any], convention: Mapping[str, Any], envelopes: Mapping[str, Any]) -> None:
        self._plain = {"form": dict(form), "convention": dict(convention), "envelopes": dict(envelopes)}
        self.stated: StatedForm = form_from_plain(form)
        self.convention: Convention = parameters.convention(convention)
        self.regions = Regions(envelopes)

    @cached_property
    def walk(self) -> FormWalk:
        """The walk from the form to the convention."""
        return form_walk(self.stated, self.convention)

    @property
    def table(self) -> Array:
        """The numbers (N, n) rad of the table of corresponding attitudes."""
        return np.radians(np.array(_TABLE_DEG, dtype=float))[:, : len(self.stated.names)]

    def show_inputs(self) -> None:
        """Form, convention and regions as the injected parameters state them."""
        plain = self._plain["form"]
        stated = {"input": f"form {self.stated.name}", "stated": words(plain), "source": _source(plain)}
        rows = [stated, *convention_rows(self.convention.name, self._plain["convention"])]
        display.inputs(
            rows + [row for name, each in self._plain["envelopes"].items() for row in region_rows(name, each)]
        )

    def show_assumptions(self) -> None:
        """Form and convention speak of one vehicle; what is taken where the form leaves something open."""
        texts = ["Form and convention state the attitude of one vehicle; axes that bear one name are the same lines."]
        if isinstance(self.stated.form, TiltPair) and not self.stated.form.gimballed:
            texts.append("The body is upright unless the sign that says otherwise is given.")
        if len(self.stated.names) == 2:
            texts.append("Where an attitude is needed the free roll is taken as zero.")
        display.statement("assumptions", texts)
        self.regions.tell()

    def show_statement(self) -> None:
        """The statement page of the form, and the convention in words."""
        notes = frame_notes(self._plain["form"])
        frames = [
            f"{frame.name}: x {', y '.join(frame.axes[:2])}, z {frame.axes[2]}. {notes.get(frame.name, '')}".strip()
            for frame in (self.stated.reference, self.stated.body)
        ]
        display.statement("frames", frames, title="Frames")
        kind = f"{self.stated.kind[0].upper()}{self.stated.kind[1:]}."
        display.statement("numbers", [kind, *form_sentences(self.stated)], title="What each number is")
        display.statement("singular", [f"{_capital(self.stated.form.singular_set)}."], title="Where numbers are lost")
        display.statement("worked", worked_sentences(self.stated), title="A worked attitude")
        display.statement(
            "convention",
            [*turn_sentences(self.convention), *singular_words(self.convention)],
            title=f"The sequence beside it: {self.convention.name}",
        )

    def show_formulas(self) -> None:
        """The conversion both ways, each identity proven."""
        for step in form_steps(self.stated):
            display.statement(f"step-{step.id}", step.prose, title=step.title)
            proof = step.proof
            quiet = "" if proof is None else f"Proven exactly, and to {proof.digits} digits at {proof.points} points."
            display.equation(f"eq:{step.id}", step.latex, quiet)

    def show_table(self) -> None:
        """Corresponding attitudes with the margins of both, and the error of taking one for the other."""
        rows = []
        for values in self.table:
            there, margin = self.walk.angles(values)
            own = float(self.stated.form.margin(self.stated.rotation(values)))
            rows.append([self._numbers(values), degrees_text(own, 2), _triple(there), degrees_text(float(margin), 2)])
            if self.walk.columns is not None:
                rows[-1].append(degrees_text(float(self.walk.taken_for_angles(values)), 3))
        headers = [", ".join(self.stated.names), "margin", ", ".join(self.convention.angle_names), "margin"]
        if self.walk.columns is not None:
            headers.append("error if taken for them")
        display.table(
            "tbl:corresponding",
            headers,
            rows,
            caption=f"Corresponding attitudes: {self.stated.name} on the left, {self.convention.name} on the right; "
            "rotation angle of the error when the numbers on the left are taken for the angles on the right",
            align="lrlrr"[: len(headers)],
        )

    def show_back(self) -> None:
        """From the sequence back to the form, the flag of an inverted body included."""
        rows = []
        for values in self.table:
            angles = self.walk.angles(values)[0]
            found = self.walk.numbers(angles)
            rows.append([_triple(angles), self._numbers(found.values), "yes" if bool(found.inverted) else "no"])
        display.table(
            "tbl:back",
            [", ".join(self.convention.angle_names), ", ".join(self.stated.names), "upside down"],
            rows,
            caption=f"The same attitudes from {self.convention.name} back to {self.stated.name}",
            align="lll",
        )

    def show_amplification(self) -> None:
        """How a small error of the form's numbers grows into the angles, at the attitudes of the table."""
        rows = []
        for values in self.table:
            growth = self.walk.amplification(values)
            rows.append([self._numbers(values), number_text(float(growth), 4)])
        display.table(
            "tbl:amplification",
            [", ".join(self.stated.names), "growth of a small error"],
            rows,
            caption=f"Largest growth of a small error of {self.stated.name} into the angles of {self.convention.name}",
            align="lr",
        )

    def show_margins(self) -> None:
        """The form's own margin over each region: recorded, with its basis."""
        rows = []
        for over, region in self.regions.items():
            least, basis, attained = self._least_margin(region)
            display.record(
                quantity="form margin",
                of=self.stated.name,
                over=over,
                lo=float(np.degrees(least)),
                hi=None,
                attained=None if attained is None else float(np.degrees(attained)),
                unit="deg",
                basis=basis,
            )
            rows.append([over, f"{floor_text(float(np.degrees(least)))}°", basis])
        display.table(
            "tbl:margins",
            ["region", "rotation to the nearest attitude where numbers are lost, at least", "basis"],
            rows or [["none stated", "", ""]],
            caption=f"How far {self.stated.name} stays from its singular set",
            align="lrl",
        )

    def show_checks(self) -> None:
        """The numbers by scipy, from what each of them means, and the walk there and back."""
        from scipy.spatial.transform import Rotation

        generator = np.random.default_rng(_SEED)
        values = generator.uniform(-0.7, 0.7, size=(_CHECKED, len(self.stated.names)))
        attitudes = Rotation.from_matrix(self.stated.rotation(values))
        theirs = _by_meaning(self.stated, attitudes)
        apart = np.abs(np.remainder(theirs - values + np.pi, 2.0 * np.pi) - np.pi)
        self._check("numbers", "attitudes turned back into numbers from what each number means", float(apart.max()))
        there = self.walk.angles(values)[0]
        outer, inner = Rotation.from_matrix(self.walk.R_pr), Rotation.from_matrix(self.walk.R_bq)
        walked = independent.rotation(self.convention, np.degrees(there))
        miss = (walked.inv() * (outer * attitudes * inner)).magnitude()
        self._check("walk", "attitudes walked to the convention", float(miss.max()))

    def show_results(self) -> None:
        """What was found, in one table."""
        rows = [["identities shown and proven", str(len(form_steps(self.stated)))]]
        sequence = self.stated.as_convention()
        same = "no" if sequence is None else f"yes: {sequence.sequence.value} about moving axes"
        rows.append(["the numbers are turns of a sequence", same])
        if self.walk.columns is not None:
            worst = float(np.max(self.walk.taken_for_angles(self.table)))
            rows.append(["largest error in the table if taken for the angles", degrees_text(worst, 3)])
        display.table("tbl:results", ["result", "value"], rows, caption="Results of this calculation")

    def _least_margin(self, region: Region) -> tuple[float, str, float | None]:
        """(least margin rad, basis, attained rad) over a region."""
        form = self.stated.form
        sequence = self.stated.as_convention()
        if sequence is not None:
            found = lock_margin(region, sequence).least
        elif isinstance(form, TiltPair):
            found = tilt_margin(region, np.asarray(form.level.up), np.asarray(form.upright))
        else:
            return turn_margin(region), "certified bound", None
        return found.lo, found.basis.value, None if found.witness is None else found.witness.value

    def _numbers(self, values: Array) -> str:
        if isinstance(self.stated.form, RotationVector):
            return ", ".join(number_text(float(value)) for value in values)
        return _triple(values)

    def _check(self, identity: str, what: str, worst: float) -> None:
        display.check(
            f"check:{identity}",
            f"{_CHECKED} {what}",
            ours=0.0,
            theirs=float(np.degrees(worst)),
            tolerance=_TOLERANCE_DEG,
            unit="deg",
            library=independent.LIBRARY,
        )


def _by_meaning(stated: StatedForm, attitudes: Any) -> Array:
    """The numbers (N, n) rad of scipy rotations from what they mean: elevations, headings, as_rotvec."""
    form = stated.form
    if isinstance(form, RotationVector):
        return np.asarray((attitudes.inv() if form.reverse else attitudes).as_rotvec())
    if isinstance(form, DirectionRoll):
        return _pointing_by_meaning(form, attitudes)[:, : len(stated.names)]
    north, side, up = form.level.axes
    first, second, upright = (attitudes.apply(np.asarray(a)) for a in (form.first, form.second, form.upright))
    ahead = first if form.types[0] is TiltType.SINE or not form.gimballed else np.cross(second, up)
    if form.gimballed and form.types[0] is TiltType.TANGENT:
        ahead = ahead * np.sign(np.cross(np.asarray(form.second), np.asarray(form.upright)) @ np.asarray(form.first))
    heading = np.arctan2(ahead @ side, ahead @ north)
    tilts = [
        np.arcsin(np.clip(axis @ up, -1.0, 1.0)) if kind is TiltType.SINE else np.arctan2(axis @ up, upright @ up)
        for axis, kind in ((first, form.types[0]), (second, form.types[1]))
    ]
    return np.column_stack([heading, *tilts])


def _pointing_by_meaning(form: DirectionRoll, attitudes: Any) -> Array:
    """Azimuth, elevation and roll of carried boresight and mark."""
    from scipy.spatial.transform import Rotation

    pole, zero = np.asarray(form.pole), np.asarray(form.zero_azimuth)
    sight, mark = attitudes.apply(np.asarray(form.boresight)), attitudes.apply(np.asarray(form.mark))
    grow = np.cross(zero, pole) if form.clockwise else np.cross(pole, zero)
    azimuth, elevation = np.arctan2(sight @ grow, sight @ zero), np.arcsin(np.clip(sight @ pole, -1.0, 1.0))
    upper = pole - (sight @ pole)[:, None] * sight  # where the mark points at zero roll, any length
    quarter = Rotation.from_rotvec(np.pi / 2.0 * sight).apply(upper)
    roll = np.arctan2(np.sum(mark * quarter, axis=1), np.sum(mark * upper, axis=1))
    return np.column_stack([azimuth, elevation, roll if form.roll_right_handed else -roll])


def _source(plain: Mapping[str, Any]) -> str:
    return str(plain.get("source", "not stated"))


def _capital(text: str) -> str:
    return text[0].upper() + text[1:]


def _triple(angles: Array) -> str:
    return ", ".join(degrees_text(float(angle), 3) for angle in angles)
