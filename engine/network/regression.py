"""The parameters of a number given its parents: a regression in every configuration, and draws of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln, stdtr, stdtrit

from engine.network.additive import Additive, Sharing, by_configuration, from_configuration
from engine.network.conjugate import Posterior, conjugate
from engine.records.moments import FamilySums

Floats = NDArray[np.float64]

WEIGHTS = (1.0, 3.0, 10.0, 30.0, 100.0)  # records that the prior of each configuration counts for
_RIDGE = 1e-8  # keeps the prior of parents that hardly vary invertible


@dataclass(frozen=True, eq=False)
class Coefficients:
    """Means or draws, in the columns' own units.

    intercept, variance: (parent levels...,), slopes: (parent levels..., number parents); draws, if any, are on one
    more axis, the last.
    """

    intercept: Floats
    slopes: Floats
    variance: Floats


@dataclass(frozen=True, eq=False)
class Regression:
    """Normal-inverse-gamma posterior of a number's regression in each configuration of its category parents.

    levels: of each category parent.  weight: records that the prior counts for, of WEIGHTS.
    centre, scale: (terms,) of the number parents, then of the child, in their own units; all below is standardised.
    mean: (configurations, terms) intercept and slopes.  root: (configurations, terms, terms), its product with its
    transpose, times the variance, is the coefficients' covariance given what all configurations share.
    pull: (configurations, terms, terms), how far the coefficients follow the additive regression; shared_root:
    (unknowns, unknowns), its product with its transpose is the covariance of that regression, freedom that of its t.
    shape, rate: (configurations,) of 1 / variance ~ Gamma, shape above 1.  shared_rate: what of the rate comes from the
    additive regression's variance.
    """

    levels: tuple[int, ...]
    weight: float
    centre: Floats
    scale: Floats
    mean: Floats
    root: Floats
    pull: Floats
    shared_root: Floats
    freedom: float
    shape: Floats
    rate: Floats
    shared_rate: float

    @property
    def means(self) -> Coefficients:
        """Posterior means of intercepts, slopes and variances."""
        return self._in_units(self.mean, self.rate / (self.shape - 1.0))

    def draws(self, count: int, rng: np.random.Generator) -> Coefficients:
        """The posterior means, then `count` draws: arrays with 1 + count on the last axis."""
        configurations, terms = self.mean.shape
        wide = self.freedom / rng.chisquare(self.freedom, count)  # what the additive variance may be off by
        gammas = rng.standard_gamma(np.broadcast_to(self.shape[:, None], (configurations, count)))
        variance = (self.rate[:, None] + self.shared_rate * (wide - 1.0)) / gammas
        own = np.einsum("cij,cjb->cib", self.root, rng.standard_normal((configurations, terms, count)))
        unknowns = self.shared_root @ (rng.standard_normal((len(self.shared_root), count)) * np.sqrt(wide))
        together = np.einsum("cij,cjb->cib", self.pull, by_configuration(unknowns, terms, self.levels))
        drawn = self.mean[..., None] + own * np.sqrt(variance)[:, None] + together
        return self._in_units(
            np.concatenate([self.mean[..., None], drawn], axis=-1),
            np.concatenate([(self.rate / (self.shape - 1.0))[:, None], variance], axis=-1),
        )

    def log_density(self, codes: NDArray[np.integer], parents: Floats, values: Floats) -> Floats:
        """(rows,) natural log of the predictive Student t density of the child, in its own unit.

        codes: (rows, category parents) levels.  parents: (rows, number parents) and values: (rows,) in own units.
        """
        at, expected, own, common = self._expected(codes, parents)
        away = (values - self.centre[-1]) / self.scale[-1] - expected
        square = self.rate[at] / self.shape[at] * (1.0 + own) + common
        half = self.shape[at]
        return np.asarray(
            gammaln(half + 0.5)
            - gammaln(half)
            - 0.5 * np.log(2.0 * np.pi * half * square)
            - (half + 0.5) * np.log1p(away * away / (2.0 * half * square))
            - np.log(self.scale[-1])
        )

    def below(self, codes: NDArray[np.integer], parents: Floats, values: Floats) -> Floats:
        """(rows,) how much of the predictive Student t lies below each value; arguments as in `log_density`."""
        at, expected, own, common = self._expected(codes, parents)
        away = (values - self.centre[-1]) / self.scale[-1] - expected
        square = self.rate[at] / self.shape[at] * (1.0 + own) + common
        return np.asarray(stdtr(2.0 * self.shape[at], away / np.sqrt(square)))

    def mean_interval(
        self, codes: NDArray[np.integer], parents: Floats, coverage: float = 0.90
    ) -> tuple[Floats, Floats]:
        """(rows,) twice: the equal-tailed credible interval of the child's mean, in its own unit.

        codes: (rows, category parents) levels.  parents: (rows, number parents) in own units.
        """
        at, expected, own, common = self._expected(codes, parents)
        half = stdtrit(2.0 * self.shape[at], 0.5 + 0.5 * coverage) * np.sqrt(
            self.rate[at] / self.shape[at] * own + common
        )
        return self._child(expected - half), self._child(expected + half)

    def _child(self, standardised: Floats) -> Floats:
        return np.asarray(self.centre[-1] + self.scale[-1] * standardised)

    def _expected(
        self, codes: NDArray[np.integer], parents: Floats
    ) -> tuple[NDArray[np.integer], Floats, Floats, Floats]:
        """(rows,) each: the configuration, the child's mean, and what is not known of that mean, standardised: in
        units of the residual variance, and what all configurations share."""
        at = np.zeros(len(codes), dtype=np.int64)
        for place, count in enumerate(self.levels):
            at = at * count + codes[:, place]
        row = np.column_stack([np.ones(len(codes)), (parents - self.centre[:-1]) / self.scale[:-1]])
        own = np.einsum("rj,rji->ri", row, self.root[at])
        following = from_configuration(np.einsum("ri,rij->rj", row, self.pull[at]), codes, self.levels)
        common = ((following @ self.shared_root) ** 2).sum(axis=1)
        return at, (row * self.mean[at]).sum(axis=1), (own * own).sum(axis=1), common

    def _in_units(self, mean: Floats, variance: Floats) -> Coefficients:
        more = mean.shape[2:]
        stretch = (self.scale[-1] / self.scale[:-1]).reshape(-1, *[1] * len(more))
        slopes = mean[:, 1:] * stretch
        origin = self.centre[:-1].reshape(-1, *[1] * len(more))
        intercept = self.centre[-1] + self.scale[-1] * mean[:, 0] - (slopes * origin).sum(axis=1)
        return Coefficients(
            intercept.reshape((*self.levels, *more)),
            slopes.reshape((*self.levels, slopes.shape[1], *more)),
            (variance * self.scale[-1] ** 2).reshape((*self.levels, *more)),
        )


def family_regression(sums: FamilySums, part: int = 0) -> Regression:
    """The posterior of a family from all records when `part` is 0, else from all but fold `part` - 1."""
    places = list(sums.columns)
    numbers = sums.numbers
    rounding = float(numbers.rounding[places[-1]])
    return regression(sums.part(part), sums.levels, numbers.centre[places], numbers.scale[places], rounding)


def regression(
    products: Floats, levels: Sequence[int], centre: Floats, scale: Floats, rounding: float = 0.0
) -> Regression:
    """The posterior from sums, with the weight of the prior chosen by marginal likelihood (empirical Bayes).

    products: (configurations, terms + 1, terms + 1) sums of the products of (1, number parents, child), standardised
    by centre and scale, (number parents + 1,), the child's last; every configuration of `levels`, the last fastest.
    rounding: standardised variance that the child's rounding alone makes; no variance is taken to be less.

    Every configuration is centred on the additive regression of the family's own parents; the prior counts for
    `weight` records spread as all are, 1 / variance ~ Gamma(1 + weight/2, weight/2 x its residual variance). What the
    additive regression itself leaves open is part of the draws and of the predictive density, so that a heavy prior
    does not make an interval narrower than the records allow.
    """
    shape = tuple(int(count) for count in levels)
    whole = products.sum(axis=0)
    terms = products.shape[1] - 1
    spread = whole[:-1, :-1] / whole[0, 0] + _RIDGE * np.eye(terms)
    occupied = int((products[:, 0, 0] > 0.0).sum())
    ceiling = whole[0, 0] * (1.0 - 1.0 / occupied)  # a heavier prior would outweigh the records that it comes from
    tried = [weight for weight in WEIGHTS if weight <= max(ceiling, WEIGHTS[0])]
    sharing = Sharing(products, shape, rounding)
    found = [_tried(sharing, products, spread * weight, weight) for weight in tried]
    best = int(np.argmax([evidence for _, _, evidence in found]))
    shared, posterior, _ = found[best]
    inverse = np.linalg.inv(posterior.precision)
    # Each unknown of the additive regression costs the records that determine it a degree of freedom.
    cost = 0.5 * sharing.determined(shared, spread * tried[best])
    freed = np.maximum(posterior.shape - cost, 1.0 + 0.5 * tried[best])
    return Regression(
        levels=shape,
        weight=tried[best],
        centre=np.asarray(centre, dtype=np.float64),
        scale=np.asarray(scale, dtype=np.float64),
        mean=posterior.mean,
        root=np.asarray(np.linalg.cholesky(0.5 * (inverse + inverse.transpose(0, 2, 1))), dtype=np.float64),
        pull=inverse @ (spread * tried[best]),
        shared_root=np.asarray(np.linalg.cholesky(shared.spread * shared.variance), dtype=np.float64),
        freedom=shared.freedom,
        shape=freed,
        rate=np.maximum(posterior.rate, (freed - 1.0) * rounding),
        shared_rate=0.5 * tried[best] * shared.variance,
    )


def _tried(sharing: Sharing, products: Floats, precision: Floats, weight: float) -> tuple[Additive, Posterior, float]:
    """The additive regression, the posterior around it, and the log evidence of both."""
    shared = sharing.additive(precision)
    centre = by_configuration(shared.coefficients, sharing.terms, sharing.levels)
    posterior = conjugate(products, centre, precision, 1.0 + 0.5 * weight, 0.5 * weight * shared.variance)
    evidence = float(posterior.evidence.sum()) + 0.5 * float(np.linalg.slogdet(shared.spread * shared.variance)[1])
    return shared, posterior, evidence
