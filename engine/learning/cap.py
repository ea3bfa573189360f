"""Does a column want more parents than were allowed? An effect can be badly misjudged where one is left out."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from functools import partial
from itertools import combinations
from math import comb, prod
from typing import NamedTuple

import numpy as np

from engine.learning.families import Candidates, Families
from engine.learning.gaussian import family_score as number_score
from engine.learning.mixed import FamilyScores
from engine.learning.scores import ESS
from engine.learning.scores import family_score as category_score
from engine.learning.search import Parents
from engine.records.counts import LARGEST, ArrayCounts
from engine.records.moments import ArrayMoments
from engine.records.spikes import CONSTANT, EXACT
from engine.records.table import Coded

WORTH = 3.0  # nats, odds of 20 to 1: strong evidence by Kass & Raftery (1995)
SCREENED = 5_000  # records by which sets of parents are compared; the best few by all records
EVERY = 500  # sets of parents up to which all are tried
BEST = 5  # else those that hold one of so many best smaller sets
CONFIRMED = 5


class Capped(NamedTuple):
    """A column that would gain from one parent more than was allowed.

    gain: nats, log marginal likelihood.  parents: with which.
    """

    column: str
    gain: float
    parents: tuple[str, ...]


def capped(
    coded: Coded,
    counts: ArrayCounts,
    moments: ArrayMoments | None,
    stages: Sequence[Sequence[Candidates]],
    chosen: Parents,
    scores: FamilyScores,
    max_parents: int,
    ess: float = ESS,
    tick: Callable[[float], None] = lambda part: None,
) -> tuple[Capped, ...]:
    """Columns of the model `chosen` that have `max_parents` parents and gain WORTH or more from another one.

    One column at a time, the others as chosen, so no circle can close. All sets of one parent more are tried where
    there are at most EVERY; else those that hold one of the BEST sets of `max_parents`, by up to SCREENED records
    drawn at random. The gain is that of all records. So a set of which no part of that size shows is not found, and
    neither is an effect so small that only more records than SCREENED show it.
    counts, moments: of all records, by fold or not.  tick: hears the fraction done.
    """
    at_cap = [who for stage in stages for who in stage if len(chosen[who.child]) == max_parents]
    found = []
    trial = _Trial(coded, counts, moments, max_parents, ess) if at_cap else None
    for place, who in enumerate(at_cap):
        assert trial is not None
        best = trial.best(who, chosen, scores, partial(_within, tick, place, len(at_cap)))
        if best is not None and best[0] >= WORTH:
            gain, parents = best
            found.append(Capped(coded.names[who.child], gain, tuple(coded.names[parent] for parent in parents)))
    tick(1.0)
    return tuple(found)


class _Trial:
    """Scores of single families, by some of the records and by all."""

    def __init__(
        self, coded: Coded, counts: ArrayCounts, moments: ArrayMoments | None, max_parents: int, ess: float
    ) -> None:
        self.levels = [len(levels) for levels in coded.levels]
        self.coded = coded
        self.max_parents = max_parents
        self.ess = ess
        self.counts, self.moments = counts, moments
        self.some, self.of_some = counts, moments
        rows = coded.codes.shape[0]
        if rows > SCREENED:
            chosen = np.sort(np.random.default_rng(0).permutation(rows)[:SCREENED])
            self.some = ArrayCounts(coded.codes[chosen], self.levels, weights=coded.weights[chosen])
            self.of_some = None if moments is None else moments.part_of(chosen)

    def best(
        self, who: Candidates, chosen: Parents, scores: FamilyScores, tick: Callable[[float], None]
    ) -> tuple[float, tuple[int, ...]] | None:
        """(gain, parents) of the best set of one parent more; None when there is none."""
        child = who.child
        below = _descendants(chosen, child)
        free = [column for column in sorted((*who.earlier, *who.mates)) if column not in below]
        sets = list(self._sets(who, free, scores))
        if not sets:
            return None
        tried = []
        for place, parents in enumerate(sets):
            tried.append(self._score(child, parents, self.some, self.of_some))
            tick(place / len(sets))
        leading = np.argsort(-np.asarray(tried), kind="stable")[:CONFIRMED]
        before = self._score(child, chosen[child], self.counts, self.moments)
        confirmed = []
        for place in leading:
            confirmed.append((self._score(child, sets[place], self.counts, self.moments) - before, sets[place]))
            tick(1.0)
        return max(confirmed, key=lambda each: each[0])

    def _sets(self, who: Candidates, free: Sequence[int], scores: FamilyScores) -> Iterator[tuple[int, ...]]:
        """Ascending sets of `max_parents` + 1 of the columns in `free` that hold every insisted one."""
        count = self.max_parents + 1
        loose = [column for column in free if column not in who.insisted]
        if comb(len(loose), count - len(who.insisted)) <= EVERY:
            yield from (
                tuple(sorted((*who.insisted, *others))) for others in combinations(loose, count - len(who.insisted))
            )
            return
        seen: set[tuple[int, ...]] = set()
        for smaller in _best_sets(who, free, scores, self.max_parents):
            for another in free:
                parents = tuple(sorted((*smaller, another)))
                if another not in smaller and parents not in seen:
                    seen.add(parents)
                    yield parents

    def _score(self, child: int, parents: tuple[int, ...], counts: ArrayCounts, moments: ArrayMoments | None) -> float:
        """-inf for a family that is too large, or in which a number does not vary."""
        if moments is None or child not in self.coded.numbers:
            if prod(self.levels[column] for column in (*parents, child)) > LARGEST:
                return -np.inf
            return category_score(counts.family(parents, child).sum(axis=0), self.ess)
        categories = [parent for parent in parents if parent not in self.coded.numbers]
        numbers = [parent for parent in parents if parent in self.coded.numbers]
        if prod(self.levels[column] for column in categories) > LARGEST:
            return -np.inf
        sums = moments.family(categories, numbers, child)
        return -np.inf if sums.exact(CONSTANT, EXACT) else number_score(sums)


def _within(tick: Callable[[float], None], place: int, of: int, done: float) -> None:
    tick((place + done) / of)


def _best_sets(who: Candidates, free: Sequence[int], scores: FamilyScores, count: int) -> list[tuple[int, ...]]:
    """The BEST sets of `count` of the columns in `free`, by the scores that are known."""
    found: list[tuple[float, tuple[int, ...]]] = []
    for group in Families(who, scores, 0, count).groups(count):
        own, earlier = (np.asarray(np.isin(sets, free).all(axis=1)) for sets in (group.own, group.earlier))
        fits = np.where(own[:, None] & earlier, group.scores, -np.inf).reshape(-1)
        for place in np.argsort(-fits, kind="stable")[:BEST].tolist():
            row, column = divmod(place, earlier.size)
            parents: tuple[int, ...] = (*group.earlier[column].tolist(), *group.own[row].tolist())
            if np.isfinite(fits[place]):
                found.append((float(fits[place]), parents))
    found.sort(key=lambda each: -each[0])
    return [parents for _, parents in found[:BEST]]


def _descendants(chosen: Parents, child: int) -> set[int]:
    """The column and all that it leads to, however far."""
    below = {child}
    while True:
        more = {column for column, parents in enumerate(chosen) if below.intersection(parents)} - below
        if not more:
            return below
        below |= more
