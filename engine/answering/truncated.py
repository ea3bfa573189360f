"""A number drawn from a normal inside an interval, also far out in a tail; and what single values weigh."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr, ndtri, ndtri_exp

from engine.answering.normal import HALF_LOG_TWO_PI

Floats = NDArray[np.float64]
Interval = tuple[float, float]
WHOLE: Interval = (-np.inf, np.inf)

_NARROW = 1e-4  # in an interval this narrow beside 1 / its distance from 0 the density hardly falls
_FAR = -5.0  # below this shares are kept as logarithms


def log_density(away: Floats, sd: Floats) -> Floats:
    """Natural log of the normal density `away` from its mean; sd 0 is all at the mean: 0 there, else -inf."""
    at_once = sd == 0.0
    spread = np.where(at_once, 1.0, sd)
    found = -0.5 * (away / spread) ** 2 - np.log(spread) - HALF_LOG_TWO_PI
    return np.asarray(np.where(at_once, np.where(away == 0.0, 0.0, -np.inf), found))


def band_shares(cuts: Floats, mean: Floats, sd: Floats) -> Floats:
    """(..., bands) share of each normal in each band between ascending cuts; sd 0 is all in one band."""
    shares = np.ones((*np.shape(mean), cuts.size + 1))
    certain = sd == 0.0
    spread = np.where(certain, 1.0, sd) if certain.any() else sd
    before: Floats | float = 0.0
    for place, cut in enumerate(cuts):
        below = ndtr((cut - mean) / spread)
        if spread is not sd:
            below = np.where(certain, mean < cut, below)
        shares[..., place] = below - before
        before = below
    shares[..., -1] -= before
    return shares


def inside(low: Floats, high: Floats, uniform: Floats) -> Floats:
    """The quantile `uniform`, 0 < uniform < 1, of a standard normal kept in low <= z < high (inverse cdf)."""
    low, high, uniform = np.broadcast_arrays(low, high, uniform)
    turned = low > -high  # mirrored when mostly above 0: shares near 1 have no digits left for a tail
    low, high = np.where(turned, -high, low), np.where(turned, -low, high)
    rank = np.where(turned, 1.0 - uniform, uniform)
    below = ndtr(low)
    found = np.asarray(ndtri(below + rank * (ndtr(high) - below)))
    with np.errstate(divide="ignore", invalid="ignore"):
        width = high - low
        narrow = width * (1.0 + np.abs(0.5 * (low + high))) < _NARROW
    found = np.where(narrow, low + rank * np.where(narrow, width, 0.0), found)
    far = (high < _FAR) & ~narrow & (high > -np.inf)
    if far.any():
        part = rank[far]
        logs = np.logaddexp(log_ndtr(low[far]) + np.log1p(-part), log_ndtr(high[far]) + np.log(part))
        found[far] = ndtri_exp(logs)
    found = np.clip(found, low, high)
    return np.asarray(np.where(turned, -found, found))
