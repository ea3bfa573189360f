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

_ROWS = 16_384  # rows scored at once, few enough to stay in the processor's cache


@dataclass(frozen=True, eq=False)
class HeldOut:
    """Held-out log score per record, natural log, at each of `links`.

    mean: (sizes,) mean over records, by weight.
    behind, behind_se: (sizes,) mean of the record-by-record difference to the best size, and its standard error, in
    which records that belong together count as one.
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


class Scoring:
    """Gathers the scores of held-out records fold by fold; keeps sums only, whatever the number of records.

    counts, moments: of the records, by fold; moments None without numbers.  links: sizes to score, ascending.
    """

    def __init__(self, coded: Coded, counts: ArrayCounts, moments: ArrayMoments | None, links: tuple[int, ...]) -> None:
        self.coded = coded
        self.counts = counts
        self.moments = None if moments is None else FamilyMoments(moments)
        self.links = links
        self.weight = 0.0  # of all records so far
        self.base = 0.0  # sum of the scores at the first size
        self.sums = np.zeros(len(links))  # of each size's score less that of the first size
        self.clusters = Clusters(len(links))

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
        group = self.coded.group
        rows = np.flatnonzero(self.counts.fold == held)
        if group is not None:
            rows = rows[np.argsort(group[rows], kind="stable")]
        for low in range(0, rows.size, _ROWS):
            some = rows[low : low + _ROWS]
            codes = self.coded.codes[some]
            values = self.coded.values[some] if self.coded.numbers else np.empty((some.size, 0))
            scores = np.zeros((len(self.links), some.size))
            for logs, places in predicting:
                scores[places] += logs(codes, values)
                still()
            self._add(scores, self.coded.weights[some], some if group is None else group[some])
            still()

    def result(self) -> HeldOut:
        """The curve over everything taken so far."""
        best = int(np.argmax(self.sums))
        behind = (self.sums - self.sums[best]) / self.weight
        spread = self.clusters.standard_errors(best, behind) / self.weight
        return HeldOut(self.links, (self.base + self.sums) / self.weight, behind, spread)

    def _add(self, scores: Floats, weights: Floats, group: NDArray[np.integer]) -> None:
        """scores: (sizes, rows).  group: (rows,) rows that belong together stand together."""
        scores *= weights
        self.weight += float(weights.sum())
        self.base += float(scores[0].sum())
        scores -= scores[0].copy()
        self.sums += scores.sum(axis=1)
        self.clusters.add(scores, weights, group)

    def _predictive(self, held: int, child: int, parents: tuple[int, ...]) -> LogPredictive:
        if self.moments is not None and child in self.coded.numbers:
            categories, numbers = self.moments.split(parents)
            places = [self.coded.numbers.index(number) for number in (*numbers, child)]
            return NumberPredictive(self.moments.regression(child, parents, 1 + held), categories, places)
        by_fold = self.counts.family(parents, child)
        shares = predictive(dirichlet_posterior(by_fold.sum(axis=0) - by_fold[held]))
        return CategoryPredictive(np.log(shares), (*parents, child))


class Clusters:
    """Sums over groups of records that belong together, for errors of means that allow for it (Liang & Zeger 1986)."""

    def __init__(self, sizes: int) -> None:
        self.count = 0
        self.products = np.zeros((sizes, sizes))  # of the groups' sums
        self.by_weight = np.zeros(sizes)  # of the groups' sums and their weights
        self.squares = 0.0  # of the groups' weights
        self._open: tuple[int, Floats, float] | None = None  # the group that the next records may belong to

    def add(self, sums: Floats, weights: Floats, group: NDArray[np.integer]) -> None:
        """sums: (sizes, rows) weighted.  weights, group: (rows,); a group's rows stand together, also across calls."""
        starts = np.flatnonzero(np.append(True, group[1:] != group[:-1]))
        if starts.size < group.size:
            sums, weights = np.add.reduceat(sums, starts, axis=1), np.add.reduceat(weights, starts)
        if self._open is not None:
            number, before, weight = self._open
            if number == group[0]:
                sums, weights = sums.copy(), weights.copy()
                sums[:, 0] += before
                weights[0] += weight
            else:
                self._close(before[:, None], np.asarray([weight]))
        self._open = (int(group[-1]), sums[:, -1].copy(), float(weights[-1]))
        self._close(sums[:, :-1], weights[:-1])

    def standard_errors(self, best: int, behind: Floats) -> Floats:
        """(sizes,) of the weighted sum of the difference to the size `best`, whose mean is `behind`; 0 there."""
        if self._open is not None:
            self._close(self._open[1][:, None], np.asarray([self._open[2]]))
            self._open = None
        squares = np.diag(self.products) - 2.0 * self.products[best] + self.products[best, best]
        squares = squares - 2.0 * behind * (self.by_weight - self.by_weight[best]) + behind**2 * self.squares
        squares[best] = 0.0
        return np.asarray(np.sqrt(np.maximum(squares, 0.0) * self.count / max(self.count - 1, 1)))

    def _close(self, sums: Floats, weights: Floats) -> None:
        self.count += weights.size
        self.products += sums @ sums.T
        self.by_weight += sums @ weights
        self.squares += float(weights @ weights)


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
