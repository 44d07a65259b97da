"""What the reference-attitudes template calls: rows that show up every wrong reading, and the answers to them."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import degrees_text, mapping_sentence, number_text, singular_words, turn_sentences
from trunnion.crosswalk.answers import AGREES, Judgement, all_rows, judge
from trunnion.crosswalk.exchange import read_answers, row_names
from trunnion.crosswalk.reference import CAUGHT, ReferenceSet, reference_set
from trunnion.sheet import display, independent, parameters
from trunnion.sheet.describe import convention_rows
from trunnion.sheet.rounding import floor_text

_TOLERANCE_DEG = 1e-9
_NO_ANSWERS = "No answers were given, so none are judged."


class ReferenceAttitudes:
    """The reference attitudes of one convention; each `show_…` displays one part and records what it finds."""

    def __init__(self, *, convention: Mapping[str, Any], answers: Mapping[str, Any]) -> None:
        self._plain = dict(convention)
        self._answers = dict(answers)
        self.convention: Convention = parameters.convention(convention)

    @cached_property
    def reference(self) -> ReferenceSet:
        """The rows and the account of what was tried."""
        return reference_set(self.convention)

    @cached_property
    def judgement(self) -> Judgement | None:
        """How the other party's answers compare, or None without answers."""
        if not self._answers:
            return None
        text = parameters.input_path(self._answers["file"]).read_text(encoding="utf-8")
        kind, values = read_answers(text, self.reference)
        return judge(self.reference, kind, values)

    def show_inputs(self) -> None:
        """The convention, and the file of answers if there is one."""
        rows = convention_rows(self.convention.name, self._plain)
        if self._answers:
            source = str(self._answers.get("source", "not stated"))
            rows.append({"input": "answers", "stated": self._answers["file"], "source": source})
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """How the other party is assumed to read."""
        display.statement(
            "assumptions",
            "The other party carries out one and the same reading on every row. A program that errs differently "
            "on each row fails, but no single reading explains it.",
        )

    def show_rows(self) -> None:
        """The regular rows: angles, matrix, quaternion."""
        self._table("regular", "tbl:regular", "Reference attitudes: every wrong reading fails at least one of them")

    def show_lock_rows(self) -> None:
        """The extra rows at and near both singular attitudes, compared as rotations."""
        self._table("extra", "tbl:lock-rows", "Extra reference attitudes at and near lock, compared as rotations")
        display.statement(
            "lock-rows",
            [
                *singular_words(self.convention),
                "At lock every triple of the solution line passes: answers are compared as rotations, not as numbers.",
            ],
        )

    def show_tried(self) -> None:
        """What was tried, how many readings each row shows up, and what is the same under another name."""
        rows = []
        names = row_names(self.reference)
        for family in self.reference.families:
            caught = ", ".join(f"{names[part.row]} {part.count:,}" for part in family.caught)
            rows.append(
                [
                    family.name,
                    f"{family.names:,}",
                    f"{family.functions:,}",
                    str(family.same),
                    caught,
                    str(family.missed),
                ]
            )
        display.table(
            "tbl:tried",
            ["readings tried", "names", "functions", "same as ours", "first shown up by", "missed"],
            rows,
            caption=f"Wrong readings and the row that first shows each of them up by more than {degrees_text(CAUGHT)}",
            align="lrrrlr",
        )
        display.statement("same", list(self.reference.same_names), title="The same convention under another name")
        display.record(
            quantity="least miss of a wrong reading",
            of=self.convention.name,
            over=None,
            lo=float(np.degrees(self.reference.least_miss)),
            hi=None,
            unit="deg",
            basis="certified bound",
        )

    def show_answers(self) -> None:
        """The other party's answers, row by row, and the wrong reading that explains them if they fail."""
        found = self.judgement
        if found is None:
            display.statement("answers", _NO_ANSWERS)
            return
        display.table(
            "tbl:answers",
            ["row", "miss"],
            [
                [name, f"{float(np.degrees(miss)):.6f}°"]
                for name, miss in zip(row_names(self.reference), found.misses, strict=True)
            ],
            caption=f"Rotation angle between answer and reference (allowed {degrees_text(found.tolerance)})",
            align="lr",
        )
        display.statement("verdict", _verdict(found))
        display.record(
            quantity="largest miss of the answers",
            of=self.convention.name,
            over=None,
            lo=0.0,
            hi=float(np.degrees(found.misses.max())),
            attained=float(np.degrees(found.misses.max())),
            unit="deg",
            basis="certified bound",
        )

    def show_checks(self) -> None:
        """Every row again by scipy."""
        from scipy.spatial.transform import Rotation

        rows = all_rows(self.reference)
        theirs = independent.rotation(self.convention, np.degrees(rows.angles))
        apart = (Rotation.from_matrix(rows.truth).inv() * theirs).magnitude()
        quaternions = Rotation.from_quat(rows.quaternions[:, [1, 2, 3, 0]])
        stated = Rotation.from_matrix(rows.matrices)
        for identity, what, worst in (
            ("rows", "matrices of all reference attitudes", float(np.degrees(apart.max()))),
            (
                "quaternions",
                "quaternions of all reference attitudes against their matrices",
                float(np.degrees((quaternions.inv() * stated).magnitude().max())),
            ),
        ):
            display.check(
                f"check:{identity}",
                what,
                ours=0.0,
                theirs=worst,
                tolerance=_TOLERANCE_DEG,
                unit="deg",
                library=independent.LIBRARY,
            )

    def show_results(self) -> None:
        """What was found, in one table."""
        least = float(np.degrees(self.reference.least_miss))
        rows = [
            ["regular reference attitudes", str(len(self.reference.regular.angles))],
            ["every wrong reading misses some row by at least", f"{floor_text(least)}°"],
            ["names of the same convention", str(len(self.reference.same_names))],
        ]
        if self.judgement is not None:
            rows.append(["answers", "pass" if self.judgement.passed else "fail"])
        display.table("tbl:results", ["result", "value"], rows, caption="Results of this calculation")

    def show_statement(self) -> None:
        """The convention in words."""
        display.statement("words", [*turn_sentences(self.convention), mapping_sentence(self.convention)])

    def _table(self, which: str, identity: str, caption: str) -> None:
        rows = getattr(self.reference, which)
        names = row_names(self.reference)
        start = 0 if which == "regular" else len(self.reference.regular.angles)
        display.table(
            identity,
            ["row", *self.convention.angle_names, "matrix, by rows", "quaternion, scalar first"],
            [
                [
                    names[start + index],
                    *(degrees_text(float(angle)) for angle in rows.angles[index]),
                    "; ".join(" ".join(number_text(float(v)) for v in line) for line in rows.matrices[index]),
                    " ".join(number_text(float(v)) for v in rows.quaternions[index]),
                ]
                for index in range(len(rows.angles))
            ],
            caption=caption,
            align="lrrrll",
        )


def _verdict(found: Judgement) -> list[str]:
    if found.passed:
        return [f"The answers pass: no row misses by more than {degrees_text(AGREES)}."]
    if not found.explanations:
        return ["The answers fail, and no single wrong reading explains every row."]
    return ["The answers fail. Every row is explained by:", *(f"{words}." for words in found.explanations)]
