"""How well models of every size predict records that they were not learned from."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.learning.evidence import FamilyMoments
from engine.learning.scores import Floats
from engine.learning.search import Parents
from engine.network.parameters import dirichlet_posterior, predictive
from engine.network.regression import Regression
from engine.records.counts import ArrayCounts
from engine.records.moments import ArrayMoments
from engine.records.table import Coded

FOLDS = 5
_ROWS = 16_384  # rows scored at once, few enough to stay in the processor's cache

Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class HeldOut:
    """Held-out log score per record, natural log, at each of `links`.

    mean: (sizes,) mean over records.
    behind, behind_se: (sizes,) mean of the record-by-record difference to the best size, and its standard error.
    """

    links: tuple[int, ...]
    mean: Floats
    behind: Floats
    behind_se: Floats

    @property
    def recommended(self) -> int:
        """The smallest size within one standard error, of the paired difference, of the best."""
        close = self.behind + self.behind_se >= 0.0
        return self.links[int(np.flatnonzero(close)[0])]


def folds(rows: int, seed: int) -> Ints:
    """(rows,) which of FOLDS parts holds each record out, at random, as even as can be."""
    return np.random.default_rng([seed, FOLDS]).permutation(np.arange(rows, dtype=np.int64) % FOLDS)


class Scoring:
    """Gathers the scores of held-out records fold by fold; keeps sums only, whatever the number of records.

    counts, moments: of the records, by fold; moments None without numbers.  links: sizes to score, ascending.
    """

    def __init__(self, coded: Coded, counts: ArrayCounts, moments: ArrayMoments | None, links: tuple[int, ...]) -> None:
        self.coded = coded
        self.counts = counts
        self.moments = None if moments is None else FamilyMoments(moments)
        self.links = links
        self.rows = 0
        self.base = 0.0  # sum of the scores at the first size
        self.sums = np.zeros(len(links))  # of each size's score less that of the first size
        self.products = np.zeros((len(links), len(links)))

    def take(self, held: int, models: Mapping[int, Parents], still: Callable[[], None] = lambda: None) -> None:
        """Score the records of fold `held` by the models learned from the others."""
        families: dict[tuple[int, tuple[int, ...]], list[int]] = {}
        for place, size in enumerate(self.links):
            for child, parents in enumerate(models[size]):
                families.setdefault((child, parents), []).append(place)
        predicting = []
        for (child, parents), places in families.items():
            predicting.append((self._predictive(held, child, parents), places))
            still()
        rows = np.flatnonzero(self.counts.fold == held)
        for low in range(0, rows.size, _ROWS):
            some = rows[low : low + _ROWS]
            codes = self.coded.codes[some]
            values = self.coded.values[some] if self.coded.numbers else np.empty((some.size, 0))
            scores = np.zeros((len(self.links), some.size))
            for logs, places in predicting:
                scores[places] += logs(codes, values)
                still()
            self._add(scores)
            still()

    def result(self) -> HeldOut:
        """The curve over everything taken so far."""
        best = int(np.argmax(self.sums))
        behind = (self.sums - self.sums[best]) / self.rows
        squares = np.diag(self.products) - 2.0 * self.products[best] + self.products[best, best]
        spread = np.sqrt(np.maximum(squares / self.rows - behind**2, 0.0))
        spread[best] = 0.0
        return HeldOut(self.links, (self.base + self.sums) / self.rows, behind, spread / np.sqrt(self.rows - 1))

    def _add(self, scores: Floats) -> None:
        self.rows += scores.shape[1]
        self.base += float(scores[0].sum())
        scores -= scores[0].copy()
        self.sums += scores.sum(axis=1)
        self.products += scores @ scores.T

    def _predictive(self, held: int, child: int, parents: tuple[int, ...]) -> LogPredictive:
        if self.moments is not None and child in self.coded.numbers:
            categories, numbers = self.moments.split(parents)
            places = [self.coded.numbers.index(number) for number in (*numbers, child)]
            return NumberPredictive(self.moments.regression(child, parents, 1 + held), categories, places)
        by_fold = self.counts.family(parents, child)
        shares = predictive(dirichlet_posterior(by_fold.sum(axis=0) - by_fold[held]))
        return CategoryPredictive(np.log(shares), (*parents, child))


class CategoryPredictive(NamedTuple):
    """Log shares of a category: (parent levels..., own levels).  columns: its parents, then itself."""

    logs: Floats
    columns: tuple[int, ...]

    def __call__(self, codes: NDArray[np.integer], values: Floats) -> Floats:
        """(rows,) log probability of each record's level."""
        return np.asarray(self.logs[tuple(codes[:, column] for column in self.columns)])


class NumberPredictive(NamedTuple):
    """Student t of a number.  categories: its category parents.  places: its number parents, then itself, in values."""

    regression: Regression
    categories: list[int]
    places: list[int]

    def __call__(self, codes: NDArray[np.integer], values: Floats) -> Floats:
        """(rows,) log density of each record's value, in the column's own unit."""
        own = values[:, self.places]
        return self.regression.log_density(codes[:, self.categories], own[:, :-1], own[:, -1])


LogPredictive = CategoryPredictive | NumberPredictive
