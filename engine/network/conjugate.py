"""Regressions with a normal-inverse-gamma prior, many configurations at once (O'Hagan & Forster 2004, chapter 11)."""

from __future__ import annotations

from dataclasses import dataclass
from math import log, pi

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Posterior:
    """Coefficients given the variance are normal, the variance is inverse gamma, in each configuration.

    mean: (configurations, terms), the intercept first.  precision: (configurations, terms, terms), times the variance
    that of the coefficients.  shape, rate: (configurations,) of 1 / variance ~ Gamma.
    evidence: (configurations,) natural log marginal likelihood of the records.
    """

    mean: Floats
    precision: Floats
    shape: Floats
    rate: Floats
    evidence: Floats


def conjugate(
    products: Floats, centre: Floats, precision: Floats, shape: float | Floats, rate: float | Floats
) -> Posterior:
    """The posterior of each configuration.

    products: (configurations, terms + 1, terms + 1) sums of the products of (1, parents, child).
    The prior: coefficients ~ N(centre, variance x precision^-1), 1 / variance ~ Gamma(shape, rate); centre:
    (configurations, terms), precision: (terms, terms).
    """
    seen, moment, squares = products[:, :-1, :-1], products[:, :-1, -1], products[:, -1, -1]
    count = products[:, 0, 0]
    after = seen + precision
    fitted = np.einsum("cij,cj->ci", seen, centre)
    pull = moment - fitted
    moved = np.linalg.solve(after, pull[..., None])[..., 0]
    around = squares - 2.0 * (moment * centre).sum(axis=1) + (centre * fitted).sum(axis=1)
    left = np.maximum(around - (pull * moved).sum(axis=1), 0.0)
    more, above = shape + 0.5 * count, rate + 0.5 * left
    evidence = 0.5 * (np.linalg.slogdet(precision)[1] - np.linalg.slogdet(after)[1]) - 0.5 * count * log(2.0 * pi)
    evidence += gammaln(more) - gammaln(shape) + shape * np.log(rate) - more * np.log(above)
    broad = np.ones(count.size)
    return Posterior(centre + moved, after, more * broad, above * broad, evidence)
