"""From evidence to an answer: what the numbers are, why nothing better can be said, what to measure next.

Evidence is numbers in an unknown convention with whatever is known beside them. `study` tries chains of turns, then the
forms that are no sequence; weighs rates where they were logged; and explains near-fits and misses.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.rotations import determinant, rotation_angle
from trunnion.attitude.words import degrees_text, listed
from trunnion.crosswalk.disagreement import Agreement, agreements
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import (
    Answer,
    Identification,
    identify_angles,
    identify_attitudes,
    matrix_readings,
    mirrored_readings,
    quaternion_readings,
)
from trunnion.crosswalk.near_fits import explanations
from trunnion.crosswalk.next_measurement import NextMeasurement, next_measurement
from trunnion.crosswalk.offsets import identify_with_offsets
from trunnion.crosswalk.other_forms import best_of, identify_other_forms
from trunnion.crosswalk.rate_evidence import (
    identify_attitudes_by_rates,
    identify_by_rates,
    identify_rate_columns,
)
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

THREE = ("first number", "second number", "third number")
_RATES_REMARK = (
    "the rate columns are taken for turns about x, y, z of the body in that order; a constant rotation of the "
    "reference frame stays open, for rates do not see it"
)
_FREER = (Constants.NONE, Constants.RELABELLED, Constants.RIGHT, Constants.LEFT, Constants.BOTH)


@dataclass(frozen=True, eq=False)
class Evidence:
    """What one file holds of N samples.

    One of numbers (N, 3), quaternion (N, 4), matrix (N, 9) is in question, as it stands in the file; with `agree` two
    or three of them are, against each other. truth (N, 3, 3) is the known R_rb, `known` says from what. times (N,) s
    and body rates (N, 3) come together; `rate_degrees` is their unit, None when unknown. `notes`: what was left out.
    known_quaternion (N, 4): the columns the truth was read from, in case it was read wrongly.
    """

    numbers: Array | None = None
    quaternion: Array | None = None
    matrix: Array | None = None
    names: tuple[str, str, str] = THREE
    truth: Array | None = None
    known: str = ""
    times: Array | None = None
    rates: Array | None = None
    rate_names: tuple[str, str, str] = THREE
    rate_degrees: bool | None = None
    notes: tuple[str, ...] = ()
    known_quaternion: Array | None = None

    @property
    def samples(self) -> int:
        """How many samples there are."""
        given = (self.numbers, self.quaternion, self.matrix)
        return len(next(values for values in given if values is not None))


@dataclass(frozen=True, eq=False)
class Study:
    """The answer and everything beside it."""

    evidence: Evidence
    constants: Constants
    found: Identification | None
    agreements: tuple[Agreement, ...] = ()
    rate_columns: Identification | None = None
    asked: NextMeasurement | None = None
    mistakes: tuple[str, ...] = ()
    remarks: tuple[str, ...] = field(default=())

    @property
    def answer(self) -> Answer:
        """The answer in one word; of statements against each other: whether exactly one way makes them agree."""
        if self.found is not None:
            return self.found.answer
        agreeing = [entry for entry in self.agreements if entry.agrees]
        if not agreeing:
            return Answer.NONE_FITS
        alone = len(agreeing) == 1 and (agreeing[0].angles is None or agreeing[0].angles.answer is Answer.IDENTIFIED)
        return Answer.IDENTIFIED if alone else Answer.AMBIGUOUS


def study(
    evidence: Evidence,
    *,
    constants: Constants = Constants.NONE,
    noise: float | None = None,
    offsets: bool = False,
    agree: bool = False,
) -> Study:
    """Answer for the evidence. noise: per axis (rad), None when unknown. offsets: per-angle offsets may be unknown.

    agree: nothing is known; the statements of the file are held against each other. Raises AttitudeError when the
    evidence holds nothing to compare with.
    """
    if agree:
        return _against_each_other(evidence, constants, noise)
    if evidence.truth is None and evidence.rates is None:
        raise AttitudeError(
            "nothing is known of the true attitude",
            remedy="give one: quaternion, matrix, angles, gravity, poses, rates",
        )
    if evidence.numbers is None:
        return _attitudes_in_question(evidence, constants, noise)
    if evidence.truth is None:
        return _by_rates_alone(evidence)
    remarks: list[str] = []
    if offsets:
        if constants is not Constants.NONE:
            raise AttitudeError(
                "offsets of the angles and constant rotations can't both be unknown here",
                remedy="outer offsets are constants already: ask for one of the two",
            )
        found = identify_with_offsets(evidence.numbers, evidence.truth, noise=noise, names=evidence.names)
    else:
        found = identify_angles(
            evidence.numbers, evidence.truth, constants=constants, noise=noise, names=evidence.names
        )
        if not found.fits:
            forms = identify_other_forms(
                evidence.numbers, evidence.truth, constants=constants, noise=noise, names=evidence.names
            )
            remarks.append("tilt pairs and rotation vectors were tried as well")
            found = best_of(found, forms)
    found, columns, more = _weigh_rates(evidence, found)
    mistakes = explanations(found, evidence.names) if found.fits else _would_fit(evidence, constants, noise)
    return Study(
        evidence,
        constants,
        found,
        rate_columns=columns,
        asked=next_measurement(found) if not offsets else None,
        mistakes=tuple(mistakes),
        remarks=(*remarks, *more),
    )


def _against_each_other(evidence: Evidence, constants: Constants, noise: float | None) -> Study:
    found = agreements(
        quaternion=evidence.quaternion,
        matrix=evidence.matrix,
        numbers=evidence.numbers,
        names=evidence.names,
        noise=noise,
    )
    return Study(evidence, constants, None, agreements=tuple(found))


def _attitudes_in_question(evidence: Evidence, constants: Constants, noise: float | None) -> Study:
    if evidence.quaternion is not None:
        two_sided = constants in (Constants.RELABELLED, Constants.BOTH)
        readings = quaternion_readings(evidence.quaternion, two_sided=two_sided)
    elif evidence.matrix is not None:
        mirrored = evidence.truth is not None and bool(np.any(determinant(evidence.matrix.reshape(-1, 3, 3)) < 0.0))
        readings = mirrored_readings(evidence.matrix) if mirrored else matrix_readings(evidence.matrix)
    else:
        raise AttitudeError("there is nothing in question", remedy="name the columns to be identified")
    if evidence.truth is not None:
        found = identify_attitudes(readings, evidence.truth, constants=constants, noise=noise)
        return Study(evidence, constants, found)
    times, rates = _timed_rates(evidence)
    found = identify_attitudes_by_rates(times, readings, rates, degrees=evidence.rate_degrees)
    return Study(evidence, Constants.LEFT, found, remarks=(_RATES_REMARK,))


def _timed_rates(evidence: Evidence) -> tuple[Array, Array]:
    if evidence.times is None or evidence.rates is None:
        raise AttitudeError("rates need the times of the samples", remedy="name the time column and its unit")
    return evidence.times, evidence.rates


def _by_rates_alone(evidence: Evidence) -> Study:
    assert evidence.numbers is not None
    times, rates = _timed_rates(evidence)
    found = identify_by_rates(times, evidence.numbers, rates, degrees=evidence.rate_degrees, names=evidence.names)
    mistakes = tuple(explanations(found, evidence.names))
    return Study(evidence, Constants.LEFT, found, mistakes=mistakes, remarks=(_RATES_REMARK,))


def _weigh_rates(evidence: Evidence, found: Identification) -> tuple[Identification, Identification | None, list[str]]:
    """What rates add to known attitudes: the rates' own columns, and which ambiguous readings move rightly."""
    if evidence.rates is None or evidence.times is None or evidence.truth is None or evidence.numbers is None:
        return found, None, []
    columns = identify_rate_columns(evidence.times, evidence.truth, evidence.rates, names=evidence.rate_names)
    if found.answer is not Answer.AMBIGUOUS or found.constants not in (Constants.NONE, Constants.LEFT):
        return found, columns, []
    by_rates = identify_by_rates(
        evidence.times, evidence.numbers, evidence.rates, degrees=evidence.rate_degrees, names=evidence.names
    )
    moving = {finding.reading.chain for finding in by_rates.fits}
    kept = tuple(finding for finding in found.fits if finding.reading.chain in moving)
    if not kept or len(kept) == len(found.fits):
        return found, columns, ["the rates do not tell the readings that are left apart"]
    remark = f"of {len(found.fits)} readings {len(kept)} move as the logged rates say"
    answer = Answer.IDENTIFIED if len(kept) == 1 else Answer.AMBIGUOUS
    reasons = () if len(kept) == 1 else found.reasons
    return replace(found, fits=kept, answer=answer, reasons=reasons), columns, [remark]


def _would_fit(evidence: Evidence, constants: Constants, noise: float | None) -> list[str]:
    """What would have to be allowed for a reading to fit: constants first, then offsets, then other known readings."""
    assert evidence.numbers is not None
    assert evidence.truth is not None
    lines = []
    for freer in _FREER[_FREER.index(constants) + 1 :]:
        if len(evidence.truth) < (5 if freer is Constants.BOTH else 3):
            continue
        found = identify_angles(evidence.numbers, evidence.truth, constants=freer, noise=noise, names=evidence.names)
        if found.fits and found.gap >= 2.0:
            lines.append(f"{found.fits[0].reading.words} would fit with {_constant_words(found, freer)}")
            break
    if constants is Constants.NONE and not lines and len(evidence.truth) >= 4:
        found = identify_with_offsets(evidence.numbers, evidence.truth, noise=noise, names=evidence.names)
        if found.fits:
            lines.append(f"{found.fits[0].reading.words} would fit")
    q = evidence.known_quaternion
    if q is not None:
        pairs = agreements(quaternion=q, numbers=evidence.numbers, names=evidence.names, noise=noise)
        lines += [f"without any, if the known quaternion is read otherwise: {e.line()}" for e in pairs if e.agrees]
    return lines


def _constant_words(found: Identification, constants: Constants) -> str:
    best = found.fits[0]
    told = []
    for side, matrix in (("reference", best.left), ("body", best.right)):
        angle = float(rotation_angle(np.eye(3), matrix))
        if angle > 1e-9:
            told.append(f"a constant turn of {degrees_text(angle, 3)} on the {side} side")
    return f"{listed(told) if told else constants.value} (miss {degrees_text(best.miss, 4)})"
