"""Attitude noise in the angles: the linear law, its range, and what replaces it near lock.

Noise: a small random turn, its rotation vector normal with standard deviation sigma (rad) per axis, on the body or the
reference side. The carried axis then moves as a normal pair of coordinates, sigma each, around a point at the distance
m (margin) from the line of the reference axis. Its distance is the margin, its polar angle the first angle:

linear (sigma up to m/5)   outer angles sigma/sin m, middle sigma, correlation of the outer two of size cos m,
                           the combination known at lock sigma sqrt(2/(1 + cos m))
beyond                     the margin read is Rice distributed, the first angle follows the projected normal law;
                           from sigma = 3 m on the first angle is nearly uniform

The second pair of laws takes the neighbourhood of the reference axis for a plane: relative error of order (m + 2
sigma)^2/6. Sources: RICE-1945, CRAIG-1991 (both from memory); checked against scipy.stats and Monte Carlo on rotations.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

#: The linear law is taken to hold for sigma up to this share of the margin.
LINEAR_SHARE = 0.2

#: From sigma = this times the margin on the first angle is nearly uniform.
UNIFORM_SHARE = 3.0


class LinearNoise(NamedTuple):
    """Standard deviations (...) rad by the linear law, the size of the correlation, and where the law holds."""

    outer: Array
    middle: Array
    combination: Array
    correlation: Array
    holds: NDArray[np.bool_]


def linear_noise(margin: ArrayLike, sigma: ArrayLike) -> LinearNoise:
    """First-order propagation of sigma (...) rad per axis at a margin (...) rad; outer angles infinite at lock.

    `combination` is the sum or difference of the outer angles that stays known at lock.
    """
    m, s = np.broadcast_arrays(np.asarray(margin, dtype=float), _checked_sigma(sigma))
    with np.errstate(divide="ignore"):
        outer = s / np.sin(m)
    return LinearNoise(outer, s + 0.0, s / np.cos(m / 2.0), np.cos(m), s <= LINEAR_SHARE * m)


def mean_margin_read(margin: ArrayLike, sigma: ArrayLike) -> Array:
    """Mean (...) rad of the margin computed from noisy attitudes whose true margin is `margin`: Rice's mean.

    Larger than the true margin: a noisy log looks farther from lock than it is, at lock by sigma sqrt(pi/2).
    """
    m, s = np.broadcast_arrays(np.asarray(margin, dtype=float), _checked_sigma(sigma))
    x = (m / s) ** 2 / 4.0
    scaled0, scaled1 = _bessel_scaled(x)
    return s * np.sqrt(np.pi / 2.0) * ((1.0 + 2.0 * x) * scaled0 + 2.0 * x * scaled1)


def chance_margin_below(limit: ArrayLike, margin: ArrayLike, sigma: ArrayLike) -> Array:
    """Probability (...) that a noisy attitude of true margin `margin` reads a margin below `limit` (rad): Rice's
    law.
    """
    bound, m, s = np.broadcast_arrays(
        np.asarray(limit, dtype=float), np.asarray(margin, dtype=float), _checked_sigma(sigma)
    )
    # P = integral over the disc of radius `limit`, in polar coordinates about its centre, radius by Gauss-Legendre.
    nodes, weights = np.polynomial.legendre.leggauss(200)
    low, high = np.maximum(0.0, m - 9.0 * s), np.minimum(bound, m + 9.0 * s)
    radius = low[..., None] + 0.5 * (high - low)[..., None] * (nodes + 1.0)
    scaled0, _ = _bessel_scaled(radius * m[..., None] / (s[..., None] ** 2))
    density = radius / s[..., None] ** 2 * np.exp(-0.5 * ((radius - m[..., None]) / s[..., None]) ** 2) * scaled0
    total = 0.5 * (high - low) * np.sum(weights * density, axis=-1)
    return np.clip(np.where(high > low, total, 0.0), 0.0, 1.0)


def chance_first_angle_off(by: ArrayLike, margin: ArrayLike, sigma: ArrayLike) -> Array:
    """Probability (...) that noise moves the first angle by more than `by` rad (0 < by <= pi): projected normal law.

    Craig's form of the integral: (1/pi) times the integral over (0, pi - by) of exp(-(m sin by)^2/(2 sigma^2 sin^2 t)),
    which needs no error function. The margin m counts from the nearer end of the line.
    """
    t, m, s = np.broadcast_arrays(np.asarray(by, dtype=float), np.asarray(margin, dtype=float), _checked_sigma(sigma))
    if not np.all((t > 0.0) & (t <= np.pi)):
        raise AttitudeError("the first angle can be off by more than 0 and at most 180 deg", remedy="give `by` in rad")
    nodes, weights = np.polynomial.legendre.leggauss(400)
    width = np.pi - t
    phi = 0.5 * width[..., None] * (nodes + 1.0)
    with np.errstate(divide="ignore"):  # by = pi leaves nothing to integrate
        exponent = 0.5 * (m * np.sin(t) / s)[..., None] ** 2 / np.sin(phi) ** 2
    return 0.5 * width * np.sum(weights * np.exp(-exponent), axis=-1) / np.pi


def _bessel_scaled(x: Array) -> tuple[Array, Array]:
    """exp(-x) I0(x) and exp(-x) I1(x) for x >= 0, by the trapezoidal rule on their periodic integrals.

    (1/pi) integral of exp(x (cos t - 1)) cos(n t): converges geometrically; beyond x = 2000 the large-argument series.
    """
    values = np.asarray(x, dtype=float)
    t = (np.arange(512) + 0.5) * (np.pi / 512)
    near = np.minimum(values, 2000.0)[..., None]
    kernel = np.exp(near * (np.cos(t) - 1.0))
    zero, one = kernel.mean(axis=-1), (kernel * np.cos(t)).mean(axis=-1)
    u = 1.0 / np.maximum(values, 2000.0)
    front = np.sqrt(u / (2.0 * np.pi))
    far0 = front * (1.0 + u / 8.0 + 9.0 * u * u / 128.0)
    far1 = front * (1.0 - 3.0 * u / 8.0 - 15.0 * u * u / 128.0)
    return np.where(values > 2000.0, far0, zero), np.where(values > 2000.0, far1, one)


def _checked_sigma(sigma: ArrayLike) -> Array:
    s = np.asarray(sigma, dtype=float)
    if not np.all(s > 0.0):
        raise AttitudeError("a noise has a positive standard deviation", remedy="give sigma in rad per axis")
    return s
