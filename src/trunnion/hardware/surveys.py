"""Alignment surveys: the mount from measured directions, attitude pairs or clinometer readings, with its uncertainty.

Letters: `b` host, `s` sensor, `n` the seat as drawn. Weighted least squares on v_b = R_bs v_s (Wahba's problem, solved
by scipy's `align_vectors`); covariance of the small turn in HOST axes: P = (sum (I - b b') / sigma^2)^-1.
Sources: MARKLEY-1988 (solution and covariance); the tests on residuals are the common chi-square ones.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.rotations import require_rotation, rotation_vector
from trunnion.errors import HardwareError
from trunnion.hardware.limits import PARALLEL, WEAKLY_INDEPENDENT
from trunnion.hardware.mount_check import PointingErrors, pointing_errors
from trunnion.hardware.mounts import Mount, TiltType
from trunnion.hardware.vectors import Array, angle_between, nearest_rotation, unit

OUTLIER_CHANCE = 0.01  # chance of one false outlier flag in a whole survey (divided among its observations)
CHI_SQUARE_CHANCE = 0.01  # two-sided chance at which residuals and stated accuracy are said to contradict
SIGNIFICANCE_CHANCE = 0.01  # chance at which a difference from the drawing is called significant


@dataclass(frozen=True, eq=False)
class ChiSquare:
    """Residuals against stated accuracy: statistic, degrees of freedom, chance of a larger one, verdict in words."""

    statistic: float
    freedom: int
    chance_larger: float
    words: str


@dataclass(frozen=True, eq=False)
class DrawingDifference:
    """Survey minus drawing.

    turn (3,) rad in host axes (R_bs = Exp(turn) R_bn); its angle; significant at `chance` (chi-square with 3 degrees
    of freedom); boresight and clocking apart if the drawing names a boresight. correction_deg: the turn rounded to
    the decimals the survey supports (`decimals`, degrees), zero where the difference is not significant.
    """

    turn: Array
    angle: float
    chance: float
    significant: bool
    pointing: PointingErrors | None
    correction_deg: Array
    decimals: int


@dataclass(frozen=True, eq=False)
class Survey:
    """Result of a survey.

    R_bs (3, 3); covariance (3, 3) rad^2 in host axes from the stated accuracy; residuals (N,) rad and in sigmas;
    outliers (N,) bool judged with the observation left out; chi_square; scale: square root of statistic over freedom
    (1 = as stated); spread (rad): largest angle between two of the lines used; warnings in words.
    """

    R_bs: Array
    covariance: Array
    residuals: Array
    residual_sigmas: Array
    outliers: Array
    chi_square: ChiSquare
    scale: float
    spread: float
    warnings: tuple[str, ...]
    difference: DrawingDifference | None

    @property
    def sigma(self) -> Array:
        """Standard deviations (3,) rad of the turn along the principal axes of the covariance, smallest first."""
        return np.sqrt(np.linalg.eigvalsh(self.covariance))

    @property
    def matrix_decimals(self) -> int:
        """Decimals of the nine entries that the survey supports: an entry is off by about the turn itself."""
        return supported_decimals(float(self.sigma[-1]))


def survey_directions(
    in_host: ArrayLike, in_sensor: ArrayLike, sigma: ArrayLike, *, drawing: Mount | None = None
) -> Survey:
    """The mount from N >= 2 directions (N, 3) seen in host and in sensor; sigma: rad, one each or one for all.

    sigma is the standard deviation of each of the two small components across the direction, both ends together.
    Raises HardwareError for fewer than two independent directions.
    """
    b, s, sig = _pairs(in_host, in_sensor, sigma)
    spread = _require_spread(b, s)
    R = _fit(b, s, sig)
    residuals = angle_between(b, s @ R.T)
    P = covariance_of(b, sig)
    chi = _chi_square(float(np.sum((residuals / sig) ** 2)), 2 * len(b) - 3)
    return Survey(
        R,
        P,
        residuals,
        residuals / sig,
        _outliers(b, s, sig),
        chi,
        float(np.sqrt(chi.statistic / chi.freedom)),
        spread,
        tuple(_warnings(P, spread)),
        None if drawing is None else difference_from_drawing(R, P, drawing),
    )


def covariance_of(in_host: ArrayLike, sigma: ArrayLike) -> Array:
    """Covariance (3, 3) rad^2 of the turn, host axes, of the best fit to directions (N, 3). Source: MARKLEY-1988."""
    b = unit(in_host)
    weight = 1.0 / np.square(np.broadcast_to(np.asarray(sigma, dtype=float), (len(b),)))
    information = np.einsum("n,nij->ij", weight, np.eye(3) - b[:, :, None] * b[:, None, :])
    return np.linalg.inv(information)


def _pairs(in_host: ArrayLike, in_sensor: ArrayLike, sigma: ArrayLike) -> tuple[Array, Array, Array]:
    b = unit(np.atleast_2d(np.asarray(in_host, dtype=float)), "a surveyed direction in the host")
    s = unit(np.atleast_2d(np.asarray(in_sensor, dtype=float)), "a surveyed direction in the sensor")
    if b.shape != s.shape:
        raise HardwareError(
            f"{len(b)} directions in the host and {len(s)} in the sensor", remedy="pair them row by row"
        )
    if len(b) < 2:
        raise HardwareError(
            "a survey with one direction leaves the turn about it open",
            remedy="measure a second one, best square to it",
        )
    sig = np.broadcast_to(np.asarray(sigma, dtype=float), (len(b),))
    if np.any(sig <= 0.0) or not np.all(np.isfinite(sig)):
        raise HardwareError(
            "a survey accuracy is zero, negative or not finite", remedy="state each sigma in angle units"
        )
    return b, s, sig


def _require_spread(b: Array, s: Array) -> float:
    """Largest angle between two lines, in the frame where it is smaller; refuses a survey along one line."""
    least = np.pi
    for name, v in (("host", b), ("sensor", s)):
        cosines = np.abs(v @ v.T)
        sines = np.linalg.norm(np.cross(v[:, None], v[None]), axis=-1)
        spread = float(np.max(np.arctan2(sines, cosines)))
        if spread < PARALLEL:
            raise HardwareError(
                f"all surveyed directions lie within {np.degrees(spread):.3g} deg of one line in the {name}: "
                "fewer than two are independent, and the turn about that line is open",
                remedy="measure a direction well away from that line, best square to it",
            )
        least = min(least, spread)
    return least


def _fit(b: Array, s: Array, sig: Array) -> Array:
    from scipy.spatial.transform import Rotation

    rotation, _ = Rotation.align_vectors(b, s, weights=(sig.min() / sig) ** 2)
    return rotation.as_matrix()


def _outliers(b: Array, s: Array, sig: Array) -> Array:
    """Each observation against the fit of all others, with that fit's own covariance; chi-square, two degrees."""
    from scipy.stats import chi2

    flags = np.zeros(len(b), dtype=bool)
    if len(b) < 4:
        return flags  # with two others left there is nothing to tell which of the three is wrong
    limit = chi2.ppf(1.0 - OUTLIER_CHANCE / len(b), 2)
    for k in range(len(b)):
        rest = np.arange(len(b)) != k
        if _spread_of(b[rest]) < PARALLEL:
            continue
        R = _fit(b[rest], s[rest], sig[rest])
        turn = np.cross(R @ s[k], b[k])
        across = np.eye(3) - np.outer(b[k], b[k])
        S = across @ covariance_of(b[rest], sig[rest]) @ across + sig[k] ** 2 * across
        flags[k] = float(turn @ np.linalg.pinv(S, rcond=1e-6) @ turn) > limit
    return _least_guilty(flags, b, s, sig)


def _spread_of(v: Array) -> float:
    return float(np.max(np.arctan2(np.linalg.norm(np.cross(v[:, None], v[None]), axis=-1), np.abs(v @ v.T))))


def _least_guilty(flags: Array, b: Array, s: Array, sig: Array) -> Array:
    """When one bad observation makes good ones look bad too, keep only those without which the rest agrees best."""
    from scipy.stats import chi2

    suspects = np.flatnonzero(flags)
    if len(suspects) < 2:
        return flags
    costs = []
    for k in suspects:
        rest = np.arange(len(b)) != k
        R = _fit(b[rest], s[rest], sig[rest])
        costs.append(float(np.sum((angle_between(b[rest], s[rest] @ R.T) / sig[rest]) ** 2)))
    if min(costs) > chi2.ppf(0.99, max(1, 2 * len(b) - 5)):
        return flags
    alone = np.zeros_like(flags)
    alone[suspects[int(np.argmin(costs))]] = True
    return alone


def _chi_square(statistic: float, freedom: int) -> ChiSquare:
    from scipy.stats import chi2

    larger = float(chi2.sf(statistic, freedom))
    if larger < CHI_SQUARE_CHANCE / 2:
        words = "the residuals are larger than the stated accuracy allows"
    elif larger > 1.0 - CHI_SQUARE_CHANCE / 2:
        words = "the residuals are smaller than the stated accuracy makes likely: it is understated or the data repeat"
    else:
        words = "the residuals agree with the stated accuracy"
    return ChiSquare(statistic, freedom, larger, words)


def _warnings(P: Array, spread: float) -> list[str]:
    said = []
    sigmas = np.sqrt(np.linalg.eigvalsh(P))
    if spread < WEAKLY_INDEPENDENT:
        said.append(
            f"the directions lie within {np.degrees(spread):.3g} deg of one line: the turn about it is known "
            f"{sigmas[2] / sigmas[0]:.3g} times worse than the others"
        )
    return said


def difference_from_drawing(R_bs: Array, covariance: Array, drawing: Mount) -> DrawingDifference:
    """How far a surveyed mount lies from its drawing, whether that is significant, and what to correct."""
    from scipy.stats import chi2

    turn = rotation_vector(R_bs @ drawing.R_bs.T)
    chance = float(chi2.sf(float(turn @ np.linalg.solve(covariance, turn)), 3))
    significant = chance < SIGNIFICANCE_CHANCE
    sigma_deg = np.degrees(np.sqrt(np.max(np.linalg.eigvalsh(covariance))))
    decimals = supported_decimals(float(sigma_deg))
    correction = np.zeros(3)
    if significant:
        correction[:] = np.round(np.degrees(turn), decimals)
    errors = None
    if drawing.boresight is not None:
        errors = pointing_errors(R_bs, drawing.R_bs, drawing.sensor_direction(drawing.boresight))
    return DrawingDifference(turn, float(np.linalg.norm(turn)), chance, significant, errors, correction, decimals)


def supported_decimals(sigma: float) -> int:
    """Decimals worth printing for a standard deviation: the last one is not below a tenth of it, nor above it."""
    if sigma <= 0.0 or not np.isfinite(sigma):
        raise HardwareError(f"a standard deviation of {sigma:g} supports no digits")
    return max(0, int(np.ceil(-np.log10(sigma))))


def survey_attitudes(
    R_lb: ArrayLike, R_ls: ArrayLike, sigma: float, *, drawing: Mount | None = None, reference_shared: bool = True
) -> Survey:
    """The mount from N attitude pairs (N, 3, 3) of host and sensor; sigma (rad, per axis) of one pair.

    reference_shared: both attitudes are relative to the same frame, so each pair is a mount by itself. Otherwise the
    sensor's own reference is unknown: the axes of the turns between poses are the directions, so three poses that
    turn about two different lines are needed, and sigma is divided by the size of each turn.
    """
    host, sensor = np.asarray(R_lb, dtype=float), np.asarray(R_ls, dtype=float)
    if host.shape != sensor.shape or host.ndim != 3 or not len(host):
        raise HardwareError(f"attitude pairs have shapes {host.shape} and {sensor.shape}", remedy="(N, 3, 3) both")
    require_rotation(host, "host attitude")
    require_rotation(sensor, "sensor attitude")
    if not reference_shared:
        return _survey_turns(host, sensor, sigma, drawing)
    each = np.swapaxes(host, -1, -2) @ sensor
    R, _ = nearest_rotation(each.mean(axis=0))
    turns = rotation_vector(each @ R.T)
    residuals = np.linalg.norm(turns, axis=1)
    P = sigma**2 / len(each) * np.eye(3)
    freedom = 3 * len(each) - 3
    if freedom < 1:
        chi = ChiSquare(0.0, 0, float("nan"), "one pair: nothing to test the stated accuracy with")
    else:
        chi = _chi_square(float(np.sum((residuals / sigma) ** 2)), freedom)
    return Survey(
        R,
        P,
        residuals,
        residuals / sigma,
        _attitude_outliers(turns, sigma),
        chi,
        float(np.sqrt(chi.statistic / max(1, chi.freedom))),
        np.pi / 2,
        (),
        None if drawing is None else difference_from_drawing(R, P, drawing),
    )


def _attitude_outliers(turns: Array, sigma: float) -> Array:
    from scipy.stats import chi2

    count = len(turns)
    if count < 3:
        return np.zeros(count, dtype=bool)
    left_out = turns * count / (count - 1)  # against the mean of the others
    variance = sigma**2 * (1.0 + 1.0 / (count - 1))
    flags = np.sum(left_out**2, axis=1) / variance > chi2.ppf(1.0 - OUTLIER_CHANCE / count, 3)
    if np.sum(flags) > 1:  # keep the worst only if the others then agree
        worst = int(np.argmax(np.sum(left_out**2, axis=1)))
        rest = np.delete(turns, worst, axis=0)
        if not np.any(_attitude_outliers(rest - rest.mean(axis=0), sigma)):
            flags = np.arange(count) == worst
    return flags


def _survey_turns(host: Array, sensor: Array, sigma: float, drawing: Mount | None) -> Survey:
    if len(host) < 3:
        raise HardwareError(
            f"{len(host)} poses give {len(host) - 1} turn(s): with an unknown sensor reference two are needed",
            remedy="add poses that turn the host about two different lines",
        )
    turn_b = rotation_vector(np.swapaxes(host[:1], -1, -2) @ host[1:])
    turn_s = rotation_vector(np.swapaxes(sensor[:1], -1, -2) @ sensor[1:])
    size = np.linalg.norm(turn_b, axis=1)
    if np.any(size < PARALLEL):
        raise HardwareError("two poses are the same, so the turn between them has no axis", remedy="turn the host")
    return survey_directions(turn_b, turn_s, sigma * np.sqrt(2.0) / np.minimum(size, 2.0), drawing=drawing)


def up_from_tilts(tilts: ArrayLike, tilt_type: TiltType, *, third_up: bool = True) -> Array:
    """The direction up (..., 3) in sensor axes from the two tilts (..., 2) rad of the first two axes.

    Sine type: the components are the sines. Tangent type: ratios to the third axis. third_up: the third axis points
    to the upper half (two tilts cannot say which). Tilts no attitude can give are an error.
    """
    t = np.asarray(tilts, dtype=float)
    if tilt_type is TiltType.TANGENT:
        v = np.concatenate([np.tan(t), np.ones((*t.shape[:-1], 1))], axis=-1)
        return unit(v if third_up else v * np.array([-1.0, -1.0, -1.0]))
    sines = np.sin(t)
    rest = 1.0 - np.sum(sines**2, axis=-1)
    if np.any(rest < 0.0):
        raise HardwareError(
            "two sine tilts together exceed what any attitude gives: their squared sines sum above one",
            remedy="check the tilt type and the unit (degrees or radians)",
        )
    return np.concatenate([sines, (1.0 if third_up else -1.0) * np.sqrt(rest)[..., None]], axis=-1)


def survey_clinometer(
    up_b: ArrayLike,
    tilts: ArrayLike,
    sigma: ArrayLike,
    tilt_type: TiltType,
    *,
    third_up: bool = True,
    drawing: Mount | None = None,
) -> Survey:
    """The mount of a clinometer from the host's known up directions (N, 3) and its two tilts (N, 2) rad.

    Poses must tip the host about two lines: level poses leave the turn about the vertical open.
    """
    return survey_directions(up_b, up_from_tilts(tilts, tilt_type, third_up=third_up), sigma, drawing=drawing)
