"""The additive regression of a number on its parents: where the regression of every configuration is centred."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

FAR = 1e8  # prior variance of intercept and slopes, in units of the child and the parents: flat in effect
LEVEL = 1.0  # prior variance of what a level of a category parent adds; only levels with hardly a record feel it
LEAST = 1e-10  # of the child's variance: the least that a residual is taken to vary


@dataclass(frozen=True, eq=False)
class Additive:
    """One intercept, one slope per number parent and one step per level of each category parent.

    coefficients: (unknowns,) intercept, slopes, then the levels.  spread: (unknowns, unknowns), times the variance
    their posterior covariance.  variance: residual.  freedom: records less unknowns that they determine.
    """

    coefficients: Floats
    spread: Floats
    variance: float
    freedom: float


def by_configuration(unknowns: Floats, terms: int, levels: tuple[int, ...]) -> Floats:
    """(configurations, terms, ...) the intercept and slopes of each from `unknowns`, (unknowns, ...)."""
    more = unknowns.shape[1:]
    intercept = np.broadcast_to(unknowns[0], (*levels, *more))
    begin = terms
    for axis, count in enumerate(levels):
        along = [1] * len(levels)
        along[axis] = count
        intercept = intercept + unknowns[begin : begin + count].reshape(*along, *more)
        begin += count
    first = np.reshape(intercept, (-1, *more))
    slopes = np.broadcast_to(unknowns[1:terms], (first.shape[0], terms - 1, *more))
    return np.concatenate([first[:, None], slopes], axis=1)


def from_configuration(weights: Floats, codes: NDArray[np.integer], levels: tuple[int, ...]) -> Floats:
    """(rows, unknowns) the transpose of `by_configuration`: what each row's sum, `weights` (rows, terms) times the
    coefficients of its configuration, makes of the unknowns.  codes: (rows, category parents)."""
    rows, terms = weights.shape
    found = np.zeros((rows, terms + sum(levels)))
    found[:, :terms] = weights
    begin = terms
    for place, count in enumerate(levels):
        found[np.arange(rows), begin + codes[:, place]] = weights[:, 0]
        begin += count
    return found


class Sharing:
    """The additive regression of one family, for any strength with which its configurations hold together.

    products: (configurations, terms + 1, terms + 1) sums of the products of (1, number parents, child), standardised,
    every configuration of `levels`, the last fastest.  least: the least residual variance.
    """

    def __init__(self, products: Floats, levels: tuple[int, ...], least: float = 0.0) -> None:
        self.configurations = len(products)
        self.terms = products.shape[1] - 1
        self.levels = levels
        self.least = max(least, LEAST)
        self.occupied = np.flatnonzero(products[:, 0, 0] > 0.0)
        held = products[self.occupied]
        self.seen, self.moment = held[:, :-1, :-1], held[:, :-1, -1]
        self.records, self.squares = float(held[:, 0, 0].sum()), float(held[:, -1, -1].sum())
        codes = np.unravel_index(self.occupied, levels) if levels else ()
        self.codes = np.stack(codes, axis=1) if levels else np.empty((self.occupied.size, 0), dtype=np.intp)
        ones = np.zeros((self.occupied.size, self.terms))
        ones[:, 0] = 1.0
        self.intercepts = from_configuration(ones, self.codes, levels)
        self.least_squares = self._together(self.seen), self._right(self.moment)

    def additive(self, precision: Floats) -> Additive:
        """Each configuration departs from what all share by N(0, variance x precision^-1), precision (terms, terms).

        Generalised least squares: a configuration of few records counts by its records, one of many by how far
        configurations depart (Lindley & Smith 1972). With a single configuration these are least squares.
        """
        pooled = self._pooled(precision)
        information = self._together(self._weight(pooled))
        right = self._right(np.einsum("cji,cj->ci", pooled, self.moment))
        prior = np.concatenate([np.full(self.terms, 1.0 / FAR), np.full(sum(self.levels), 1.0 / LEVEL)])
        square, side = self.least_squares
        variance = 1.0
        for _ in range(3):  # the prior is in the child's units, so it weighs by the variance that is being found
            spread = np.asarray(np.linalg.inv(information + np.diag(variance * prior)), dtype=np.float64)
            found = spread @ right
            freedom = max(self.records - float((spread * information).sum()), 1.0)
            away = self.squares - 2.0 * float(found @ side) + float(found @ square @ found)
            variance = max(away / freedom, self.least)
        return Additive(found, spread, variance, freedom)

    def determined(self, found: Additive, precision: Floats) -> Floats:
        """(configurations,) how many of the unknowns each configuration's records determine."""
        weight = self._weight(self._pooled(precision))
        share = np.zeros(self.configurations)
        for term in range(self.terms):
            row = from_configuration(np.ascontiguousarray(weight[:, term]), self.codes, self.levels)
            if term == 0:
                share[self.occupied] += ((row @ found.spread) * self.intercepts).sum(axis=1)
            else:
                share[self.occupied] += row @ found.spread[:, term]
        return share

    def _pooled(self, precision: Floats) -> Floats:
        """(S + P)^-1 P of each occupied configuration."""
        solved = np.linalg.solve(self.seen + precision, np.broadcast_to(precision, self.seen.shape))
        return np.asarray(solved, dtype=np.float64)

    def _weight(self, pooled: Floats) -> Floats:
        """S (S + P)^-1 P: what each configuration tells of its own coefficients' centre."""
        weight = self.seen @ pooled
        return np.asarray(0.5 * (weight + weight.transpose(0, 2, 1)))

    def _together(self, weight: Floats) -> Floats:
        """(unknowns, unknowns) from (occupied, terms, terms)."""
        whole = self.intercepts.T @ (self.intercepts * weight[:, 0, 0, None])
        side = self.intercepts.T @ weight[:, 0, 1:]
        whole[:, 1 : self.terms] += side
        whole[1 : self.terms] += side.T
        whole[1 : self.terms, 1 : self.terms] += weight[:, 1:, 1:].sum(axis=0)
        return np.asarray(whole)

    def _right(self, moment: Floats) -> Floats:
        """(unknowns,) from (occupied, terms)."""
        right = self.intercepts.T @ moment[:, 0]
        right[1 : self.terms] += moment[:, 1:].sum(axis=0)
        return np.asarray(right)
