"""A standard normal kept inside intervals: how much of it, and one of it, also far out in a tail."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr, ndtri, ndtri_exp

Floats = NDArray[np.float64]
Interval = tuple[float, float]

_NARROW = 1e-4  # an interval this narrow beside 1 / its distance from 0 is told by the density at its middle
_FAR = -5.0  # below this shares are kept as logarithms
_LOG_ROOT = 0.5 * np.log(2.0 * np.pi)


def log_density(away: Floats, sd: Floats) -> Floats:
    """Natural log of the normal density `away` from its mean; sd 0 is all at the mean: 0 there, else -inf."""
    at_once = sd == 0.0
    spread = np.where(at_once, 1.0, sd)
    found = -0.5 * (away / spread) ** 2 - np.log(spread) - _LOG_ROOT
    return np.asarray(np.where(at_once, np.where(away == 0.0, 0.0, -np.inf), found))


def band_shares(cuts: Floats, mean: Floats, sd: Floats) -> Floats:
    """(..., bands) share of each normal in each band between ascending cuts; sd 0 is all in one band."""
    if not cuts.size:
        return np.ones((*mean.shape, 1))
    at_once = (sd == 0.0)[..., None]
    away = cuts - mean[..., None]
    below = np.where(at_once, away > 0.0, ndtr(away / np.where(at_once, 1.0, sd[..., None])))
    return np.diff(below, prepend=0.0, append=1.0, axis=-1)


def bounds(interval: Interval, mean: Floats, sd: Floats) -> tuple[Floats, Floats]:
    """Both ends in sds from the mean. With sd 0: all of the line when the mean is inside, else nothing of it."""
    low, high = interval
    at_once = sd == 0.0
    spread = np.where(at_once, 1.0, sd)
    inside = (low <= mean) & (mean < high)
    return (
        np.where(at_once, np.where(inside, -np.inf, np.inf), (low - mean) / spread),
        np.where(at_once, np.inf, (high - mean) / spread),
    )


def log_mass(low: Floats, high: Floats) -> Floats:
    """Natural log of the share of a standard normal in low <= z < high, -inf where that is nothing."""
    low, high, _ = _lower_half(low, high)
    with np.errstate(divide="ignore", invalid="ignore"):
        upper = log_ndtr(high)
        found = upper + np.log(-np.expm1(log_ndtr(low) - upper))
        width, middle, narrow = _narrow(low, high)
        by_density = -0.5 * middle**2 - _LOG_ROOT + np.log(width) + (middle**2 - 1.0) * width**2 / 24.0
    return np.asarray(np.where(narrow, by_density, np.where(np.isnan(found), -np.inf, found)))


def inside(low: Floats, high: Floats, uniform: Floats) -> Floats:
    """The quantile `uniform`, 0 < uniform < 1, of a standard normal kept in low <= z < high (inverse cdf)."""
    low, high, uniform = np.broadcast_arrays(low, high, uniform)
    low, high, turned = _lower_half(low, high)
    rank = np.where(turned, 1.0 - uniform, uniform)
    below = ndtr(low)
    found = np.asarray(ndtri(below + rank * (ndtr(high) - below)))
    with np.errstate(divide="ignore", invalid="ignore"):
        width, _, narrow = _narrow(low, high)
    found = np.where(narrow, low + rank * np.where(narrow, width, 0.0), found)
    far = (high < _FAR) & ~narrow & (high > -np.inf)
    if far.any():
        part = rank[far]
        logs = np.logaddexp(log_ndtr(low[far]) + np.log1p(-part), log_ndtr(high[far]) + np.log(part))
        found[far] = ndtri_exp(logs)
    found = np.clip(found, low, high)
    return np.asarray(np.where(turned, -found, found))


def _lower_half(low: Floats, high: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Mirrored where the interval lies mostly above 0, for shares near 1 have no digits left for a tail."""
    turned = low > -high
    return np.where(turned, -high, low), np.where(turned, -low, high), turned


def _narrow(low: Floats, high: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    width, middle = high - low, 0.5 * (low + high)
    return width, middle, width * (1.0 + np.abs(middle)) < _NARROW
