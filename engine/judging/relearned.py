"""The model learned again without each part of the records, and what it foresees of the part left out."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from engine.learning.checks import check_groups
from engine.learning.evidence import FamilyMoments, counts_of, moments_of
from engine.learning.families import candidates
from engine.learning.folds import FOLDS, folds
from engine.learning.gaussian import number_scores
from engine.learning.learned import Learned
from engine.learning.mixed import mixed_scores
from engine.learning.scores import set_scores
from engine.learning.search import Parents, size_curve
from engine.network.network import Network, network
from engine.network.nodes import Category, Node, Number
from engine.network.parameters import dirichlet_posterior, predictive
from engine.network.regression import Regression
from engine.records.counts import ArrayCounts
from engine.records.table import Coded

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Relearned:
    """One model for every part of the records, learned from all the other parts.

    fold: (rows,) the part that each record is held out in.  parents: part -> the model's parents, as positions.
    """

    coded: Coded
    fold: Ints
    parents: tuple[Parents, ...]
    counts: ArrayCounts
    moments: FamilyMoments | None

    def held(self, part: int) -> Ints:
        """The records of one part."""
        return np.flatnonzero(self.fold == part)

    def shares(self, part: int, child: int, parents: tuple[int, ...]) -> Floats:
        """(parent levels..., levels) posterior predictive of a category from all but that part."""
        by_fold = self.counts.family(parents, child)
        return predictive(dirichlet_posterior(by_fold.sum(axis=0) - by_fold[part]))

    def regression(self, part: int, child: int, parents: tuple[int, ...]) -> Regression:
        """A number's regression from all but that part."""
        assert self.moments is not None
        return self.moments.regression(child, parents, 1 + part)

    def foreseen(self, child: int) -> Floats:
        """(rows, levels) shares of a category foreseen for each record while it was held out."""
        found = np.empty((len(self.fold), len(self.coded.levels[child])))
        for part, chosen in enumerate(self.parents):
            rows = self.held(part)
            found[rows] = self.shares(part, child, chosen[child])[self._at(rows, chosen[child])]
        return found

    def scores(self, child: int, linked: bool = True) -> Floats:
        """(rows,) log score of each record while it was held out, natural log, in the column's own unit.

        linked: by the model; False: by the base rate alone, as if nothing led to the column.
        """
        found = np.empty(len(self.fold))
        for part, chosen in enumerate(self.parents):
            rows = self.held(part)
            parents = chosen[child] if linked else ()
            if child in self.coded.numbers:
                found[rows] = self.regression(part, child, parents).log_density(*self._given(rows, child, parents))
            else:
                shares = self.shares(part, child, parents)
                found[rows] = np.log(shares[(*self._at(rows, parents), self.coded.codes[rows, child])])
        return found

    def below(self, child: int) -> Floats:
        """(rows,) how much of what was foreseen for a number lies below what was recorded, 0 to 1."""
        found = np.empty(len(self.fold))
        for part, chosen in enumerate(self.parents):
            rows = self.held(part)
            regression = self.regression(part, child, chosen[child])
            found[rows] = regression.below(*self._given(rows, child, chosen[child]))
        return found

    def network(self, part: int) -> Network:
        """The model without that part, at its posterior predictive shares and posterior means."""
        return network(self._node(part, child, parents) for child, parents in enumerate(self.parents[part]))

    def after(self, part: int, column: int) -> frozenset[int]:
        """Every column that `column` leads to in that part's model, at any distance."""
        parents = self.parents[part]
        reached: set[int] = set()
        ahead = [column]
        while ahead:
            here = ahead.pop()
            for child, of_child in enumerate(parents):
                if here in of_child and child not in reached:
                    reached.add(child)
                    ahead.append(child)
        return frozenset(reached)

    def _node(self, part: int, child: int, parents: tuple[int, ...]) -> Node:
        coded = self.coded
        names = tuple(coded.names[parent] for parent in parents)
        if child in coded.numbers:
            means = self.regression(part, child, parents).means
            return Number(coded.names[child], names, means.intercept, means.slopes, means.variance, coded.cuts[child])
        table = self.shares(part, child, parents)
        return Category(
            coded.names[child], coded.levels[child], names, table, None, coded.kinds[child], coded.cuts[child]
        )

    def _at(self, rows: Ints, parents: tuple[int, ...]) -> tuple[NDArray[np.integer], ...]:
        return tuple(self.coded.codes[rows, parent] for parent in parents)

    def _given(self, rows: Ints, child: int, parents: tuple[int, ...]) -> tuple[NDArray[np.integer], Floats, Floats]:
        """Levels of the category parents, values of the number parents, and own values, of some records."""
        assert self.moments is not None
        categories, numbers = self.moments.split(parents)
        values = self.coded.values[rows][:, [self.coded.numbers.index(each) for each in (*numbers, child)]]
        return self.coded.codes[rows][:, categories], values[:, :-1], values[:, -1]


def relearned(learned: Learned, links: int, tick: Callable[[float], None] = lambda part: None) -> Relearned:
    """Learn the best model of `links` links again without each part of the records, the parts that learning held out.

    Where the rest of the records allow no model of that size, the nearest smaller one is taken.
    Raises Refusal for fewer groups of records than parts.
    """
    coded = learned.coded
    check_groups(coded.group)
    fold = folds(learned.rows, learned.seed, coded.group)
    counts, moments = counts_of(coded, fold, FOLDS), moments_of(coded, fold, FOLDS, partial(tick, 0.0))
    stages = candidates(learned.order, learned.max_parents)
    size = learned.max_parents + 1
    categories = set_scores(counts, size, tick=lambda part: tick(0.3 * part))
    numbers = None
    if moments is not None:
        numbers = number_scores(moments, size, categories.grain, lambda part: tick(0.3 + 0.3 * part))
    scores = mixed_scores(categories, numbers, () if moments is None else moments.numbers.columns)
    parents = []
    for part in range(FOLDS):

        def searching(done: float, before: int = part) -> None:
            tick(0.6 + 0.4 * (before + done) / FOLDS)

        found = size_curve(stages, scores, 1 + part, learned.max_parents, links, searching).parents
        parents.append(found[max((each for each in found if each <= links), default=min(found))])
    return Relearned(coded, fold, tuple(parents), counts, None if moments is None else FamilyMoments(moments))
