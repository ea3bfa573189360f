"""The parameters of a category given its parents, as posterior Dirichlet counts."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

Floats = NDArray[np.float64]

# Prior records per configuration that are tried. They are light for the sake of the intervals, at a price in error.
# Heavier priors pull sparse configurations, which lie to one side of the column as a whole, towards it: with up to 8
# records, 90% intervals of a change held 75 to 81 of 100 truths on tables of 1,000 and 4,000 rows; with at most one
# record 87 to 88. Where parents act additively a heavier prior is nearer the truth: with 48 configurations and 300 rows
# its Kullback-Leibler divergence from it was .043 against .133, but 90% intervals of a cell held .79 to .91 of the
# truths against .89 to .92.
WEIGHTS = (0.3, 0.5, 1.0)


def smoothed_shares(counts: NDArray[np.integer] | Floats) -> Floats:
    """(levels,) shares of a column's levels, with one record spread evenly over them so that none is 0 (Perks 1947)."""
    total = np.asarray(counts, dtype=np.float64)
    return np.asarray((total + 1.0 / total.size) / (total.sum() + 1.0))


def prior_weight(counts: NDArray[np.integer] | Floats, shares: Floats) -> float:
    """How many records the prior of each configuration counts for, by marginal likelihood (empirical Bayes).

    counts: (configurations, levels).  shares: (levels,), above 0.  One of WEIGHTS; 1 for a single configuration.
    """
    seen = np.asarray(counts, dtype=np.float64)
    seen = seen[seen.sum(axis=1) > 0]
    if len(seen) < 2:
        return 1.0
    rows = seen.sum(axis=1)
    logs = np.empty(len(WEIGHTS))
    for place, weight in enumerate(WEIGHTS):
        prior = weight * shares
        cells = gammaln(seen + prior) - gammaln(prior)
        logs[place] = cells.sum() - (gammaln(rows + weight) - gammaln(weight)).sum()
    return float(WEIGHTS[int(np.argmax(logs))])


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
