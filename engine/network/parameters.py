"""The parameters of a category given its parents, as posterior Dirichlet counts."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

Floats = NDArray[np.float64]

# Prior records per configuration that are tried; the ends are far below and far above what tables of records need.
WEIGHTS = (0.3, 0.5, 1.0, 2.0, 4.0, 8.0, 16.0, 32.0, 64.0, 128.0, 256.0)
TOLERATED = 1.0  # nats; common practice, no source


def smoothed_shares(counts: NDArray[np.integer] | Floats) -> Floats:
    """(levels,) shares of a column's levels, with one record spread evenly over them so that none is 0 (Perks 1947)."""
    total = np.asarray(counts, dtype=np.float64)
    return np.asarray((total + 1.0 / total.size) / (total.sum() + 1.0))


def prior_weight(counts: NDArray[np.integer] | Floats, shares: Floats) -> float:
    """How many records the prior of each configuration counts for, by marginal likelihood (empirical Bayes).

    counts: (configurations, levels).  shares: (levels,), above 0.  One of WEIGHTS, or 1 for a single configuration.
    The smallest weight whose log marginal likelihood is within TOLERATED of the best is taken: few configurations
    say little about the weight, and a prior heavier than the records ask for hides differences between them.

    The shares come from the same records. So the weight is kept below rows x (1 - 1/occupied configurations): above
    it the interval of a configuration would be narrower than if all records were one configuration.
    """
    seen = np.asarray(counts, dtype=np.float64)
    seen = seen[seen.sum(axis=1) > 0]
    ceiling = seen.sum() * (1.0 - 1.0 / max(len(seen), 1))
    weights = np.asarray([weight for weight in WEIGHTS if weight <= max(ceiling, 1.0)])
    if len(seen) < 2:
        return 1.0
    rows = seen.sum(axis=1)
    logs = np.empty(weights.size)
    for place, weight in enumerate(weights):
        prior = weight * shares
        cells = gammaln(seen + prior) - gammaln(prior)
        logs[place] = cells.sum() - (gammaln(rows + weight) - gammaln(weight)).sum()
    return float(weights[np.argmax(logs >= logs.max() - TOLERATED)])


def dirichlet_posterior(counts: NDArray[np.integer] | Floats, shares: Floats | None = None) -> Floats:
    """Posterior Dirichlet counts, of the shape of `counts`: (parent levels..., own levels).

    Prior of every configuration: weight x shares; `shares` defaults to the column's own, summed over configurations.
    """
    seen = np.asarray(counts, dtype=np.float64)
    flat = seen.reshape(-1, seen.shape[-1])
    prior = smoothed_shares(flat.sum(axis=0)) if shares is None else shares
    return np.asarray(seen + prior_weight(flat, prior) * prior)


def predictive(posterior: Floats) -> Floats:
    """Posterior predictive shares: (parent levels..., own levels), the last axis sums to 1."""
    return np.asarray(posterior / posterior.sum(axis=-1, keepdims=True))
