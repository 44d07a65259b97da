"""Three numbers that are no sequence of turns: tilt pairs and rotation vectors, tried before it is said that none fits.

Direction and roll is a sequence with right-angle constants, and so is a gimballed tilt pair; both are among the chains
with relabelled frames. What remains: heading with two tilts to the horizontal, each on its own (sine type: angle of the
body axis itself; tangent type: angle seen in the plane of that axis and the upright one), and the rotation vector. Each
is tried in every column order and sign, in both units, and with every right-angle relabelling of both frames.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.forms import Level, TiltPair, TiltType
from trunnion.attitude.right_angles import right_angle_rotations
from trunnion.attitude.rotations import from_rotation_vector
from trunnion.attitude.words import vector_text
from trunnion.crosswalk.fitting import Constants, Fitted, angle_between, fit
from trunnion.crosswalk.identify import (
    SPREAD,
    Finding,
    Identification,
    Reading,
    checked_samples,
    decide,
    well_spread,
)
from trunnion.crosswalk.readings import COLUMN_ORDERS, SIGNS, Triple
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_SIDES: dict[Constants, tuple[bool, Constants]] = {
    # which mode: are the 24 turns of the reference frame tried one by one, and what is fitted besides
    Constants.NONE: (True, Constants.RELABELLED),
    Constants.RELABELLED: (True, Constants.RELABELLED),
    Constants.RIGHT: (True, Constants.RIGHT),
    Constants.LEFT: (False, Constants.LEFT),
    Constants.BOTH: (False, Constants.BOTH),
}
Entry = tuple["FormReading", Array, Array, Array, float]
_KEPT = 64
_SAME = 1e-6


@dataclass(frozen=True)
class FormReading:
    """One form read from three columns: `kind` is `sine`, `tangent` or `vector`; signs and columns as for a chain."""

    kind: str
    columns: Triple
    signs: Triple
    degrees: bool

    def matrix(self, numbers: ArrayLike) -> Array:
        """R (..., 3, 3) with heading from x about down, tilts of x and y, z upright; AttitudeError for no attitude."""
        written = np.asarray(numbers, dtype=float)
        turned = (np.radians(written) if self.degrees else written)[..., self.columns] * np.array(self.signs)
        if self.kind == "vector":
            return from_rotation_vector(turned)
        kind = TiltType.SINE if self.kind == "sine" else TiltType.TANGENT
        x, y, z = np.eye(3)
        return TiltPair(Level(z, x), x, y, z, (kind, kind)).rotation(turned)

    def words(self, names: tuple[str, str, str]) -> str:
        """What each column is, and the unit."""
        told = [
            f"{'−' if sign < 0 else ''}{names[column]}" for sign, column in zip(self.signs, self.columns, strict=True)
        ]
        unit = "deg" if self.degrees else "rad"
        if self.kind == "vector":
            return f"rotation vector ({', '.join(told)}); {unit}"
        return (
            f"heading {told[0]} with two tilts to the horizontal, {told[1]} and {told[2]}, of {self.kind} type, "
            f"upright; {unit}"
        )


def identify_other_forms(
    numbers: ArrayLike,
    truth: ArrayLike,
    *,
    constants: Constants = Constants.NONE,
    noise: float | None = None,
    names: tuple[str, str, str] = ("first number", "second number", "third number"),
) -> Identification:
    """Which form that is no sequence takes numbers (N, 3) to R_rb (N, 3, 3); keys of the findings are `FormReading`.

    Without a constant both frames may still be relabelled, since a form's own axes have no names. Raises AttitudeError
    as `identify_angles` does.
    """
    written, R = checked_samples(numbers, truth)
    some = well_spread(written) if len(R) > 2 * SPREAD else np.arange(len(R))
    forms, attitudes = _possible(written, some)
    whole_truth, R = R, R[some]
    one_by_one, besides = _SIDES[constants]
    lefts = np.array(right_angle_rotations()) if one_by_one else np.eye(3)[None]
    found: list[Entry] = []
    for left in lefts:
        fitted = fit(left @ attitudes, R, besides)
        for k in np.argsort(fitted.scores, kind="stable")[:_KEPT]:
            whole = fitted.left[k] @ left
            found.append((forms[k], whole, fitted.right[k], fitted.residuals[k], float(fitted.scores[k])))
    found.sort(key=lambda entry: entry[4])
    kept = _different(found[:_KEPT])
    readings = [_reading(form, left, right, names, constants) for form, left, right, _, _ in kept]
    merged = Fitted(*(np.array([entry[n] for entry in kept]) for n in (1, 2, 3, 4)))
    if len(some) < len(whole_truth):
        merged = _on_all(kept, written, whole_truth, besides)
    return decide(readings, merged, constants, noise, len(forms) * len(lefts))


def best_of(turns: Identification, forms: Identification) -> Identification:
    """The sequences' answer, unless none of them fits and a form does."""
    return forms if not turns.fits and forms.fits else turns


def is_form(finding: Finding) -> bool:
    """Whether a finding is one of these forms."""
    return isinstance(finding.reading.key, FormReading)


def _on_all(kept: list[Entry], written: Array, R: Array, besides: Constants) -> Fitted:
    """The forms that are left fitted again to all samples; the turn of the reference frame that was tried stays."""
    rows = []
    for form, left, right, _, _ in kept:
        tried = left if besides in (Constants.RIGHT, Constants.RELABELLED) else np.eye(3)
        free = besides if besides is not Constants.RELABELLED else Constants.NONE
        after = right if besides is Constants.RELABELLED else np.eye(3)
        fitted = fit((tried @ form.matrix(written) @ after)[None], R, free)
        rows.append((fitted.left[0] @ tried, after @ fitted.right[0], fitted.residuals[0], fitted.scores[0]))
    return Fitted(*(np.array([row[n] for row in rows]) for n in range(4)))


def _possible(written: Array, some: NDArray[np.intp]) -> tuple[list[FormReading], Array]:
    """Forms under which every sample is an attitude, and the attitudes (K, n, 3, 3) of some of them."""
    forms, attitudes = [], []
    for kind, unit in itertools.product(("sine", "tangent", "vector"), (True, False)):
        for columns, signs in itertools.product(COLUMN_ORDERS, SIGNS):
            form = FormReading(kind, columns, signs, unit)
            try:
                if signs == SIGNS[0]:
                    form.matrix(written)
                attitudes.append(form.matrix(written[some]))
                forms.append(form)
            except AttitudeError:
                break  # signs do not matter to what is possible
    return forms, np.array(attitudes)


def _different(entries: list[Entry]) -> list[Entry]:
    """Of forms that predict the same attitudes the first by name."""
    probes = np.random.default_rng(12).uniform(-0.6, 0.6, size=(6, 3))
    kept: list[tuple[Array, Entry]] = []
    for entry in sorted(entries, key=_plainness):
        form, left, right = entry[:3]
        made = left @ form.matrix(np.degrees(probes) if form.degrees else probes) @ right
        if not any(
            held[0].degrees == form.degrees and angle_between(other, made).max() < _SAME for other, held in kept
        ):
            kept.append((made, entry))
    return [entry for _, entry in kept]


def _columns(matrix: Array) -> str:
    return ", ".join(vector_text(matrix[:, n], 0) for n in range(3))


def _plainness(entry: Entry) -> tuple[float, str, float, int, Triple]:
    """Least miss first, then the one whose frames are turned least and whose signs are positive."""
    form, left, right, _, miss = entry
    return round(miss, 9), form.kind, -round(float(np.trace(left) + np.trace(right)), 6), -sum(form.signs), form.columns


def _reading(
    form: FormReading, left: Array, right: Array, names: tuple[str, str, str], constants: Constants
) -> Reading:
    words = form.words(names)
    if form.kind == "vector" and constants in (Constants.NONE, Constants.RELABELLED):
        words += "" if np.allclose(left @ right, np.eye(3)) else f"; at zero x, y, z lie along {_columns(left @ right)}"
        words += "" if np.allclose(left, np.eye(3)) else f"; components along {_columns(left)} of the reference"
    if form.kind != "vector" and constants in (Constants.NONE, Constants.RELABELLED, Constants.RIGHT):
        words += f"; reference axes: heading from {vector_text(left[:, 0], 0)}, up {vector_text(left[:, 2], 0)}"
    if form.kind != "vector" and constants is not Constants.RIGHT:
        tilted = ", ".join(
            f"{what} {vector_text(right[n], 0)}" for n, what in enumerate(("first", "second", "upright"))
        )
        words += f"; body axes: {tilted}"
    return Reading(words, (words,), None, form)
