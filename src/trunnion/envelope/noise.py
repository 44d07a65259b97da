"""What attitude noise does to the three angles near lock: the linear law, and the laws beyond it.

sigma is the standard deviation of the attitude error about each axis (rad, the same about all, either side), m the
margin. Linear law, good for sigma below about m/5: outer angles sigma/sin m, middle angle sigma, correlation of the
outer two of size cos m, and the one combination that stays fixed at lock sigma sqrt(2/(1 + cos m)).
Beyond it the carried axis is a two-dimensional normal around a point at distance m from the lock direction: its
distance, the margin found, follows the Rice law, its azimuth, the outer angle, the projected normal law.
Sources: the names of the two laws are from memory; the formulas are integrated here and tested by Monte Carlo.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from trunnion.errors import RegionError

LINEAR_UP_TO = 0.2
"""Largest sigma/m for which the linear law is used; measured to hold to a few per cent there."""


@dataclass(frozen=True)
class NoiseGain:
    """Standard deviations (rad) of the angles at one margin, by the linear law, and whether it holds there."""

    margin: float
    outer: float
    middle: float
    combination: float
    correlation: float
    linear: bool


def noise_gain(margin: float, sigma: float) -> NoiseGain:
    """The linear law at a margin (rad) for attitude noise of `sigma` rad about each axis."""
    _require(margin, sigma)
    sine, cosine = np.sin(margin), np.cos(margin)
    outer = sigma / sine if sine > 0.0 else np.inf
    combination = sigma * np.sqrt(2.0 / (1.0 + cosine))
    return NoiseGain(margin, float(outer), sigma, float(combination), float(cosine), sigma <= LINEAR_UP_TO * margin)


def mean_margin_found(margin: float, sigma: float) -> float:
    """Mean (rad) of the margin computed from noisy attitudes: Rice law with distance m and spread sigma."""
    from scipy.special import ive

    _require(margin, sigma)
    half = 0.25 * (margin / sigma) ** 2
    laguerre = (1.0 + 2.0 * half) * ive(0, half) + 2.0 * half * ive(1, half)
    return float(sigma * np.sqrt(0.5 * np.pi) * laguerre)


def outer_error_beyond(angle: float, margin: float, sigma: float) -> float:
    """Probability that an outer angle is off by more than `angle` rad (0 … pi): projected normal law."""
    from scipy.integrate import quad

    _require(margin, sigma)
    return float(2.0 * quad(_azimuth_density, angle, np.pi, args=(margin / sigma,), limit=200)[0])


def _azimuth_density(theta: float, ratio: float) -> float:
    """Density of the azimuth of a two-dimensional unit normal around a point at distance `ratio`."""
    from scipy.special import ndtr

    along = ratio * np.cos(theta)
    flat = np.exp(-0.5 * ratio**2) / (2.0 * np.pi)
    return float(flat + along / np.sqrt(2.0 * np.pi) * np.exp(-0.5 * (ratio * np.sin(theta)) ** 2) * ndtr(along))


def _require(margin: float, sigma: float) -> None:
    if not (0.0 <= margin <= np.pi / 2 + 1e-12 and sigma > 0.0):
        raise RegionError(
            f"a margin of {margin:g} rad with noise of {sigma:g} rad makes no sense",
            remedy="margins lie between 0 and a right angle, noise is positive",
        )
