"""What learning asks of the coded records: counts, moments, and the parameters of any family."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from engine.network.nodes import Category, Node, Number
from engine.network.parameters import dirichlet_posterior, predictive
from engine.network.regression import Regression, family_regression
from engine.records.counts import ArrayCounts, exactly_summed
from engine.records.moments import ArrayMoments, FamilySums, Numbers
from engine.records.table import Coded

_HELD = 4_000_000  # sums of families kept, 32 MB


def counts_of(coded: Coded, fold: NDArray[np.integer] | None = None, folds: int = 1) -> ArrayCounts:
    """Counts of all columns; a number is counted by its bands."""
    return ArrayCounts(coded.codes, [len(levels) for levels in coded.levels], fold, folds, coded.weights)


def moments_of(
    coded: Coded, fold: NDArray[np.integer] | None = None, folds: int = 1, still: Callable[[], None] = lambda: None
) -> ArrayMoments | None:
    """Moments of the numbers; None when there is none.  still: called often, a chance to cancel."""
    if not coded.numbers:
        return None
    weights = exactly_summed(coded.weights)
    numbers = Numbers.standardised(coded.numbers, coded.values, weights, still)
    return ArrayMoments(coded.codes, [len(levels) for levels in coded.levels], numbers, fold, folds, weights)


class FamilyMoments:
    """Regressions of number families from all records or all but a fold; the sums of the latest families are kept."""

    def __init__(self, moments: ArrayMoments) -> None:
        self.moments = moments
        self._known: OrderedDict[tuple[int, tuple[int, ...]], FamilySums] = OrderedDict()
        self._held = 0

    def split(self, parents: Sequence[int]) -> tuple[list[int], list[int]]:
        """Category parents and number parents, each in the order given."""
        numbers = self.moments.numbers.columns
        return [each for each in parents if each not in numbers], [each for each in parents if each in numbers]

    def regression(self, child: int, parents: tuple[int, ...], part: int = 0) -> Regression:
        """part: 0 for all records, 1 + f for all but fold f."""
        return family_regression(self._sums(child, parents), part)

    def _sums(self, child: int, parents: tuple[int, ...]) -> FamilySums:
        key = (child, parents)
        if key in self._known:
            self._known.move_to_end(key)
            return self._known[key]
        sums = self.moments.family(*self.split(parents), child)
        self._known[key] = sums
        self._held += sums.products.size
        while self._held > _HELD and len(self._known) > 1:
            self._held -= self._known.popitem(last=False)[1].products.size
        return sums


def family_node(
    coded: Coded, counts: ArrayCounts, moments: FamilyMoments | None, child: int, parents: tuple[int, ...]
) -> Node:
    """The column at `child` with the posterior of its parameters given the columns at `parents`."""
    names = tuple(coded.names[parent] for parent in parents)
    if child in coded.numbers:
        assert moments is not None
        regression = moments.regression(child, parents)
        means = regression.means
        return Number(
            coded.names[child],
            names,
            means.intercept,
            means.slopes,
            means.variance,
            coded.cuts[child],
            regression,
            coded.units[child],
        )
    posterior = dirichlet_posterior(counts.family(parents, child)[0])
    return Category(
        coded.names[child],
        coded.levels[child],
        names,
        predictive(posterior),
        posterior,
        coded.kinds[child],
        coded.cuts[child],
        coded.has_blank[child],
        coded.units[child],
    )
