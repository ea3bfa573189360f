"""Does a column want more parents than were allowed? An effect can be badly misjudged where one is left out."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from functools import partial
from itertools import combinations
from math import comb, prod
from typing import NamedTuple

import numpy as np

from engine.learning.families import Candidates, Families
from engine.learning.gaussian import family_score as number_score
from engine.learning.mixed import FamilyScores
from engine.learning.scores import ESS, Floats
from engine.learning.scores import family_score as category_score
from engine.learning.screening import Parts, number_family_scores
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
    at_cap = _at_cap(stages, chosen, max_parents)
    work = [_sets_at_most(who, max_parents) for who in at_cap]
    found = []
    trial = _Trial(coded, counts, moments, max_parents, ess) if at_cap else None
    for place, who in enumerate(at_cap):
        assert trial is not None
        within = partial(_within, tick, sum(work[:place]), work[place], sum(work))
        best = trial.best(who, chosen, scores, within)
        if best is not None and best[0] >= WORTH:
            gain, parents = best
            found.append(Capped(coded.names[who.child], gain, tuple(coded.names[parent] for parent in parents)))
    tick(1.0)
    return tuple(found)


def seconds(
    rows: int, numbers: Sequence[int], stages: Sequence[Sequence[Candidates]], chosen: Parents, max_parents: int
) -> float:
    """Roughly how long `capped` takes, for telling progress.  numbers: positions of the columns that are numbers."""
    screened, total = min(rows, SCREENED), 0.0
    for who in _at_cap(stages, chosen, max_parents):
        fixed, each = (3e-4, 6e-8) if who.child in numbers else (5e-5, 2e-8)
        total += _sets_at_most(who, max_parents) * (fixed + each * screened) + CONFIRMED * (fixed + each * rows)
    return total


def _at_cap(stages: Sequence[Sequence[Candidates]], chosen: Parents, max_parents: int) -> list[Candidates]:
    return [who for stage in stages for who in stage if len(chosen[who.child]) == max_parents]


def _sets_at_most(who: Candidates, max_parents: int) -> int:
    """How many sets of one parent more are tried, if the column leads to none of those that may lead to it."""
    free = len(who.mates) + len(who.earlier)
    every = comb(free - len(who.insisted), max_parents + 1 - len(who.insisted))
    return every if every <= EVERY else BEST * (free - max_parents)


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
        rows = np.arange(coded.codes.shape[0])
        if rows.size > SCREENED:
            rows = np.sort(np.random.default_rng(0).permutation(rows.size)[:SCREENED])
        self.some = ArrayCounts(coded.codes[rows], self.levels, weights=coded.weights[rows])
        self.of_some = None if moments is None else moments.part_of(rows)

    def best(
        self, who: Candidates, chosen: Parents, scores: FamilyScores, tick: Callable[[float], None]
    ) -> tuple[float, tuple[int, ...]] | None:
        """(gain, parents) of the best set of one parent more; None when there is none."""
        below = _descendants(chosen, who.child)
        mates, earlier = (
            tuple(column for column in columns if column not in below) for columns in (who.mates, who.earlier)
        )
        who = replace(who, mates=mates, earlier=earlier)
        sets = list(self._sets(who, scores, partial(tick, 0.0)))
        tried = self._tried(who.child, sets, tick)
        before = self._score(who.child, chosen[who.child], self.counts, self.moments)
        confirmed: list[tuple[float, tuple[int, ...]]] = []
        for place in np.argsort(-tried, kind="stable").tolist():
            tick(1.0)
            if len(confirmed) == CONFIRMED or np.isneginf(tried[place]):
                break
            score = self._score(who.child, sets[place], self.counts, self.moments)
            if np.isfinite(score):
                confirmed.append((score - before, sets[place]))
        return max(confirmed, key=lambda each: each[0], default=None)

    def _tried(self, child: int, sets: Sequence[tuple[int, ...]], tick: Callable[[float], None]) -> Floats:
        """(sets,) scores by some of the records."""
        if self.of_some is not None and child in self.coded.numbers:
            parts = [self._split(parents) for parents in sets]
            return number_family_scores(self.of_some, child, parts, partial(tick, 0.5))
        scores = np.empty(len(sets))
        for place, parents in enumerate(sets):
            scores[place] = self._score(child, parents, self.some, None)
            tick(place / len(sets))
        return scores

    def _sets(self, who: Candidates, scores: FamilyScores, still: Callable[[], None]) -> Iterator[tuple[int, ...]]:
        """Ascending sets of `max_parents` + 1 candidates that hold every insisted one.  still: called often."""
        count = self.max_parents + 1
        free = sorted((*who.earlier, *who.mates))
        loose = [column for column in free if column not in who.insisted]
        if comb(len(loose), count - len(who.insisted)) <= EVERY:
            yield from (
                tuple(sorted((*who.insisted, *others))) for others in combinations(loose, count - len(who.insisted))
            )
            return
        seen: set[tuple[int, ...]] = set()
        for smaller in _best_sets(who, scores, self.max_parents, still):
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
        categories, numbers = self._split(parents)
        if prod(self.levels[column] for column in categories) > LARGEST:
            return -np.inf
        sums = moments.family(categories, numbers, child)
        return -np.inf if sums.exact(CONSTANT, EXACT) else number_score(sums)

    def _split(self, parents: tuple[int, ...]) -> Parts:
        """Those that are categories, and those that are numbers."""
        numbers = self.coded.numbers
        return tuple(each for each in parents if each not in numbers), tuple(
            each for each in parents if each in numbers
        )


def _within(tick: Callable[[float], None], before: int, own: int, of: int, done: float) -> None:
    tick((before + own * done) / max(of, 1))


def _best_sets(who: Candidates, scores: FamilyScores, count: int, still: Callable[[], None]) -> list[tuple[int, ...]]:
    """The BEST sets of `count` candidates, by the scores that are known."""
    found: list[tuple[float, tuple[int, ...]]] = []
    for group in Families(who, scores, 0, count).groups(count):
        still()
        fits = group.scores.reshape(-1)
        leading = np.flatnonzero(fits >= np.partition(fits, -min(BEST, fits.size))[-min(BEST, fits.size)])
        for place in leading[np.argsort(-fits[leading], kind="stable")][:BEST].tolist():
            row, column = divmod(place, group.earlier.shape[0])
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
