"""The normal distribution inside an interval: probability and moments, good in the tails and in narrow intervals."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr

Floats = NDArray[np.float64]

HALF_LOG_TWO_PI = 0.5 * float(np.log(2.0 * np.pi))
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(40)
_NARROW = 2.0  # widths, against how fast the density falls, up to which quadrature is used
_TAIL = 4.0  # standard deviations beyond which quadrature is used
_FALLS = 45.0  # natural logs that the density falls by until it is taken as over


def log_density(x: Floats, mean: Floats, sd: Floats) -> Floats:
    """Natural log of the normal density; where sd is 0, inf at the mean and -inf elsewhere."""
    certain = sd <= 0.0
    with np.errstate(over="ignore"):
        z = (x - mean) / np.where(certain, 1.0, sd)
        found = -0.5 * z * z - HALF_LOG_TWO_PI - np.log(np.where(certain, 1.0, sd))
    return np.where(certain, np.where(x == mean, np.inf, -np.inf), found)


def standardised(low: Floats, high: Floats, mean: Floats, sd: Floats) -> tuple[Floats, Floats]:
    """Ends of an interval in standard deviations from the mean.

    Where sd is 0 they are -inf and inf if the mean is inside (low <= mean < high), and both inf if not.
    """
    certain = sd <= 0.0
    with np.errstate(over="ignore"):
        divisor = np.where(certain, 1.0, sd)
        start, end = (low - mean) / divisor, (high - mean) / divisor
    inside = (low <= mean) & (mean < high)
    return np.where(certain, np.where(inside, -np.inf, np.inf), start), np.where(certain, np.inf, end)


def log_between(start: Floats, end: Floats) -> Floats:
    """Natural log of the probability that a standard normal lies between; -inf where end <= start."""
    end = np.maximum(start, end)
    upper = start > -end
    low, high = np.where(upper, -end, start), np.where(upper, -start, end)  # now the nearer end is `high`
    log_high = log_ndtr(high)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        found = log_high + np.log(-np.expm1(log_ndtr(low) - log_high))
        width = high - low
        middle = 0.5 * (high + low)
        narrow = (width > 0.0) & (width * (1.0 + np.abs(middle)) < 1e-2)
    if np.any(narrow):  # by the Taylor series about the middle, where a difference would lose digits
        c, wide = np.where(narrow, middle, 0.0) ** 2, np.where(narrow, width, 1.0)
        w = wide**2
        series = np.log1p((c - 1.0) * w / 24.0 + ((c - 6.0) * c + 3.0) * w * w / 1920.0)
        found = np.where(narrow, -0.5 * c - HALF_LOG_TWO_PI + np.log(wide) + series, found)
    return np.where((end > start) & (log_high > -np.inf), found, -np.inf)


def moments_between(start: Floats, end: Floats) -> tuple[Floats, Floats]:
    """Mean and variance of a standard normal between two ends (Johnson, Kotz & Balakrishnan 1994, section 13.10).

    Where nothing lies between, the mean is the nearer end, and the variance 0.
    """
    start, end = np.broadcast_arrays(start, end)
    upper = start > -end
    low, high = np.where(upper, start, -end), np.where(upper, end, -start)  # now the nearer end is `low`
    log_mass = log_between(low, high)
    empty = ~(high > low)
    safe = np.where(np.isfinite(log_mass), log_mass, np.inf)
    with np.errstate(over="ignore", invalid="ignore"):
        at_low = _density_over(low, safe)
        at_high = _density_over(high, safe)
        mean = at_low - at_high
        variance = 1.0 + np.where(at_low > 0.0, low, 0.0) * at_low - np.where(at_high > 0.0, high, 0.0) * at_high
        variance = variance - mean * mean
        width = np.where(empty, 0.0, high) - np.where(empty, 0.0, low)
    close = ~empty & np.isfinite(low) & ((low > _TAIL) | (width < _NARROW / (1.0 + np.maximum(low, 1.0))))
    if np.any(close):
        mean, variance = np.array(mean), np.array(variance)
        mean[close], variance[close] = _by_quadrature(low[close], high[close])
    mean = np.where(empty, np.where(np.isfinite(low), low, 0.0), mean)
    return np.where(upper, mean, -mean), np.where(empty, 0.0, np.maximum(variance, 0.0))


def _density_over(x: Floats, log_mass: Floats) -> Floats:
    finite = np.isfinite(x)
    z = np.where(finite, x, 0.0)
    return np.where(finite, np.exp(-0.5 * z * z - HALF_LOG_TWO_PI - log_mass), 0.0)


def _by_quadrature(low: Floats, high: Floats) -> tuple[Floats, Floats]:
    """Gauss-Legendre on the part that matters; the density falls from `low` on, or hardly changes."""
    rate = np.maximum(low, 0.0)
    reach = np.minimum(high - low, _FALLS / np.maximum(rate, 1.0))
    t = 0.5 * reach[..., None] * (1.0 + _NODES)
    weights = _WEIGHTS * np.exp(-(low[..., None] + 0.5 * t) * t)
    total = weights.sum(axis=-1)
    mean = (weights * t).sum(axis=-1) / total
    variance = (weights * (t - mean[..., None]) ** 2).sum(axis=-1) / total
    return low + mean, variance
