"""Rates as evidence: attitudes and body rates logged together tell which reading of the angles moves as the body does.

Letters: A the attitude a reading makes of the numbers (body to some reference), G the attitude that the body rates add
up to. Over a stretch from sample m to n the turn in body axes is A_m^T A_n for the angles and G_m^T G_n for the rates;
a constant on the reference side drops out of both. Nothing is differenced, so noise is not amplified.

Rates name the body axes: their columns are taken as x, y, z of the body, in that order and sense. With known attitudes
it is the rates' own columns that are found (order, signs, unit), and nothing is taken for granted.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import matrix_from_quaternion, quaternion_from_rotation_vector, quaternion_product
from trunnion.crosswalk.fitting import Constants, angle_between, fit
from trunnion.crosswalk.identify import Identification, Reading, chain_reading, decide
from trunnion.crosswalk.readings import COLUMN_ORDERS, SIGNS, Triple, all_chains, chain_matrices
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_STRETCHES = 48
_TURN = np.radians(40.0)  # a stretch ends once the rates have added up to this much
_LEAST_TURN = np.radians(3.0)
_NO_AXES = ("first number", "second number", "third number")


@dataclass(frozen=True)
class RateColumns:
    """One way to read three rate columns: body axis n turns at signs[n] times columns[n], in deg/s or rad/s."""

    columns: Triple
    signs: Triple
    degrees: bool

    def words(self, names: tuple[str, str, str] = _NO_AXES) -> str:
        """`x: roll rate, y: −pitch rate, z: yaw rate; rad/s`."""
        parts = [
            f"{axis}: {'−' if sign < 0 else ''}{names[column]}"
            for axis, column, sign in zip("xyz", self.columns, self.signs, strict=True)
        ]
        return f"{', '.join(parts)}; {'deg/s' if self.degrees else 'rad/s'}"


def identify_by_rates(
    times: ArrayLike,
    numbers: ArrayLike,
    rates: ArrayLike,
    *,
    degrees: bool | None = None,
    names: tuple[str, str, str] = _NO_AXES,
) -> Identification:
    """Which chains make numbers (N, 3) turn as the body rates (N, 3) do over times (N,) s.

    degrees: the unit of the rates (True deg/s, False rad/s), None when it is unknown: then both are tried. The constant
    on the reference side stays open (rates do not see it). Raises AttitudeError when the body hardly turns.
    """
    t, written, w = _checked(times, numbers, rates)
    units = (True, False) if degrees is None else (degrees,)
    made: list[tuple[list[Reading], Array, Array]] = []
    for unit in units:
        track = integrated(t, np.radians(w) if unit else w)
        ends = stretches(track)
        if ends is None:
            continue
        attitudes = _chain_attitudes(written[np.unique(ends)])
        place = np.searchsorted(np.unique(ends), ends)
        turns = np.swapaxes(attitudes[:, place[:, 0]], -1, -2) @ attitudes[:, place[:, 1]]
        fitted = fit(turns, np.swapaxes(track[ends[:, 0]], -1, -2) @ track[ends[:, 1]], Constants.NONE)
        readings = [chain_reading(chain, Constants.LEFT, names) for chain in all_chains()]
        suffix = f"; rates in {'deg/s' if unit else 'rad/s'}"
        readings = [Reading(r.words + suffix, r.names, r.chain, (r.chain, unit)) for r in readings]
        made.append((readings, fitted.residuals, fitted.scores))
    if not made:
        raise _no_turns()
    return _best_unit(made)


def identify_rate_columns(
    times: ArrayLike,
    truth: ArrayLike,
    rates: ArrayLike,
    *,
    names: tuple[str, str, str] = _NO_AXES,
) -> Identification:
    """Order, signs and unit of rate columns (N, 3) against known attitudes R_rb (N, 3, 3) over times (N,) s.

    All 96 ways are tried, left-handed ones too (one sign wrong is the commonest mistake). The findings' keys are
    `RateColumns`.
    """
    R = np.asarray(truth, dtype=float)
    t, _, w = _checked(times, np.zeros((len(R), 3)), rates)
    ends = stretches(R)
    if ends is None:
        raise AttitudeError("the attitudes turn by less than 3 deg in all", remedy="take a stretch with larger turns")
    target = np.swapaxes(R[ends[:, 0]], -1, -2) @ R[ends[:, 1]]
    ways = [RateColumns(c, s, unit) for unit in (True, False) for c in COLUMN_ORDERS for s in SIGNS]
    turns = []
    for way in ways:
        read = w[:, way.columns] * np.array(way.signs, dtype=float)
        track = integrated(t, np.radians(read) if way.degrees else read)
        turns.append(np.swapaxes(track[ends[:, 0]], -1, -2) @ track[ends[:, 1]])
    readings = [Reading(way.words(names), (way.words(names),), None, way) for way in ways]
    return decide(readings, fit(np.array(turns), target, Constants.NONE), Constants.NONE, None, len(ways))


def identify_attitudes_by_rates(
    times: ArrayLike, readings: list[tuple[str, Array]], rates: ArrayLike, *, degrees: bool | None = None
) -> Identification:
    """Which readings of logged attitudes, each R (N, 3, 3), turn as the body rates (N, 3) do over times (N,) s.

    As `identify_by_rates`, for quaternions and matrices.
    """
    t, _, w = _checked(times, np.zeros((len(readings[0][1]), 3)), rates)
    made = []
    for unit in (True, False) if degrees is None else (degrees,):
        track = integrated(t, np.radians(w) if unit else w)
        ends = stretches(track)
        if ends is None:
            continue
        turns = np.array([np.swapaxes(R[ends[:, 0]], -1, -2) @ R[ends[:, 1]] for _, R in readings])
        fitted = fit(turns, np.swapaxes(track[ends[:, 0]], -1, -2) @ track[ends[:, 1]], Constants.NONE)
        suffix = f"; rates in {'deg/s' if unit else 'rad/s'}"
        named = [Reading(words + suffix, (words + suffix,), None, (words, unit)) for words, _ in readings]
        made.append((named, fitted.residuals, fitted.scores))
    if not made:
        raise _no_turns()
    return _best_unit(made)


def _no_turns() -> AttitudeError:
    return AttitudeError(
        "the body turns by less than 3 deg in all: rates are no evidence", remedy="log larger turns about all axes"
    )


def integrated(times: Array, rates: Array) -> Array:
    """Attitudes G (N, 3, 3) that body rates (N, 3) rad/s add up to, from the identity; the mean rate over each step."""
    steps = 0.5 * (rates[1:] + rates[:-1]) * np.diff(times)[:, None]
    q = np.zeros((len(times), 4))
    q[0, 0] = 1.0
    for n, step in enumerate(quaternion_from_rotation_vector(steps)):
        q[n + 1] = quaternion_product(q[n], step)
    return matrix_from_quaternion(q / np.linalg.norm(q, axis=1, keepdims=True))


def stretches(track: Array) -> NDArray[np.intp] | None:
    """(M, 2) starts and ends over which a track (N, 3, 3) turns by 40 deg, or as far as it goes; None at rest."""
    found = []
    for start in np.unique(np.linspace(0, len(track) - 2, _STRETCHES).astype(int)):
        turned = angle_between(track[start + 1 :], track[start])
        far = np.flatnonzero(turned >= _TURN)
        end = int(far[0]) if len(far) else int(np.argmax(turned))
        if turned[end] >= _LEAST_TURN:
            found.append((start, start + 1 + end))
    return np.array(found) if found else None


def _best_unit(made: list[tuple[list[Reading], Array, Array]]) -> Identification:
    """The unit whose best reading misses least; stretches differ between units, so they are decided apart."""
    from trunnion.crosswalk.fitting import Fitted

    answers = []
    for readings, residuals, score in made:
        eye = np.broadcast_to(np.eye(3), (len(readings), 3, 3))
        fitted = Fitted(eye, eye, residuals, score)
        answers.append((float(score.min()), decide(readings, fitted, Constants.LEFT, None, len(readings) * len(made))))
    return min(answers, key=lambda entry: entry[0])[1]


def _chain_attitudes(written: Array) -> Array:
    return np.concatenate([chain_matrices(written, degrees=True), chain_matrices(written, degrees=False)])


def _checked(times: ArrayLike, numbers: ArrayLike, rates: ArrayLike) -> tuple[Array, Array, Array]:
    t, written, w = (np.asarray(values, dtype=float) for values in (times, numbers, rates))
    if t.ndim != 1 or len(t) < 2 or written.shape != (len(t), 3) or w.shape != (len(t), 3):
        raise AttitudeError(
            f"times {t.shape}, numbers {written.shape} and rates {w.shape} do not go together",
            remedy="one time, three numbers and three rates a sample, at least two samples",
        )
    if not (np.isfinite(t).all() and np.isfinite(written).all() and np.isfinite(w).all()):
        raise AttitudeError("times, numbers or rates hold values that are no numbers", remedy="leave such samples out")
    if np.any(np.diff(t) <= 0.0):
        row = int(np.argmax(np.diff(t) <= 0.0)) + 2
        raise AttitudeError(f"the time of sample {row} does not lie after the one before", remedy="sort by time")
    return t, written, w
