"""Every family a column may have under the order, and its best parents within any set of its stage."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from itertools import combinations
from math import comb
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.learning.lattice import over_subsets
from engine.learning.mixed import FamilyScores
from engine.learning.scores import Floats, Ints
from engine.order import Order
from engine.refusal import Refusal


@dataclass(frozen=True)
class Candidates:
    """Who may lead to one column, as positions in the order's columns.

    first, width: the column's stage begins at `first` and holds `width` columns.
    mates: columns of its stage that may lead to it.  earlier: columns of earlier stages that may.
    insisted: those of them that always do.
    """

    child: int
    first: int
    width: int
    mates: tuple[int, ...]
    earlier: tuple[int, ...]
    insisted: frozenset[int]

    def bit(self, mate: int) -> int:
        """The mate's bit in a set of the stage's other columns."""
        place = mate - self.first
        return 1 << (place - (mate > self.child))


def candidates(order: Order, max_parents: int) -> tuple[tuple[Candidates, ...], ...]:
    """Stage by stage, the candidates of each column.

    Raises Refusal when a column is insisted to have more than `max_parents` parents.
    """
    names = order.columns
    found = []
    first = 0
    for stage in order.stages:
        width = len(stage.columns)
        members = []
        for child in range(first, first + width):
            leads = [place for place in range(first + width) if order.may_lead(names[place], names[child])]
            insisted = frozenset(names.index(source) for source, target in order.insist if target == names[child])
            if len(insisted) > max_parents:
                raise Refusal(
                    f"You insist on {len(insisted)} links to “{names[child]}”, but a column may have at most "
                    f"{max_parents} parents.",
                    where=names[child],
                    do="Insist on fewer links to it, or allow more parents.",
                )
            members.append(
                Candidates(
                    child,
                    first,
                    width,
                    tuple(place for place in leads if place >= first),
                    tuple(place for place in leads if place < first),
                    insisted,
                )
            )
        found.append(tuple(members))
        first += width
    return tuple(found)


class Group(NamedTuple):
    """Families of equally many mates and equally many earlier columns.

    own: sets of mates, a row each; sets: the same as bits.  earlier: sets of earlier columns, a row each.
    scores: (sets of mates, sets of earlier columns).
    """

    parents: int
    own: Ints
    earlier: Ints
    sets: Ints
    scores: Floats


class Families:
    """Scores of all families of one column, from one part of the records.

    They are taken up in groups of i parents of its own stage and o earlier ones. Earlier columns come first in every
    ascending set, so a set's rank is the sum of a part for either side, and a group is one indexed subtraction.
    """

    def __init__(self, who: Candidates, scores: FamilyScores, part: int, max_parents: int) -> None:
        self.who = who
        self.scores = scores.of(who.child)
        self.part = part
        self.max_parents = min(max_parents, scores.size - 1)

    def best(self) -> Floats:
        """(parents + 1, sets of the stage's other columns): best score with so many parents, mates from that set."""
        best = np.full((self.max_parents + 1, 1 << (self.who.width - 1)), -np.inf)
        for group in self.groups():
            row = best[group.parents]
            row[group.sets] = np.maximum(row[group.sets], group.scores.max(axis=1))
        for row in best:
            row[:] = over_subsets(row, np.maximum)
        return best

    def parents(self, count: int, within: int, score: float) -> tuple[int, ...]:
        """The first family of `count` parents that has `score`, its mates all in `within`."""
        for group in self.groups(count):
            inside = np.flatnonzero((group.sets & ~within) == 0)
            own, earlier = np.nonzero(group.scores[inside] == score)
            if own.size:
                return tuple(int(c) for c in (*group.earlier[earlier[0]], *group.own[inside[own[0]]]))
        raise AssertionError("a score without a family")

    def left_out(self) -> int:
        """Families too large to count."""
        return sum(int(np.isneginf(group.scores).sum()) for group in self.groups())

    def groups(self, only: int | None = None) -> Iterator[Group]:
        """All families, or those of `only` parents."""
        who = self.who
        for inner in range(self.max_parents + 1):
            own = _choices(who.mates, inner, who.insisted & set(who.mates))
            sets = np.zeros(own.shape[0], dtype=np.int64)
            for mate in who.mates:
                sets += who.bit(mate) * (own == mate).sum(axis=1)
            for outer in range(self.max_parents - inner + 1):
                if only is not None and inner + outer != only:
                    continue
                earlier = _choices(who.earlier, outer, who.insisted & set(who.earlier))
                if own.shape[0] and earlier.shape[0]:
                    yield Group(inner + outer, own, earlier, sets, self._scores(own, earlier))

    def _scores(self, own: Ints, earlier: Ints) -> Floats:
        child = self.who.child
        outer, count = earlier.shape[1], own.shape[1] + earlier.shape[1]
        before = _ranks(earlier, 0)
        without = _ranks(own, outer)
        below = (own < child).sum(axis=1)
        shifted = np.where(own < child, 0, 1)
        with_child = _ranks(own, outer, shifted) + _pick(np.full(below.size, child), outer + below)
        base = self.scores.by_size[count][self.part][before[None, :] + without[:, None]]
        family = self.scores.by_size[count + 1][self.part][before[None, :] + with_child[:, None]]
        return np.where(np.isneginf(family), -np.inf, family - np.where(np.isneginf(base), 0.0, base))


def _choices(columns: tuple[int, ...], count: int, insisted: frozenset[int] | set[int]) -> Ints:
    """(sets, count) ascending sets of `columns` that hold all insisted ones."""
    free = [column for column in columns if column not in insisted]
    if count < len(insisted):
        return np.empty((0, count), dtype=np.int64)
    more = count - len(insisted)
    drawn = np.fromiter(
        (column for chosen in combinations(free, more) for column in chosen), dtype=np.int64, count=-1
    ).reshape(comb(len(free), more), more)
    if not insisted:
        return drawn
    fixed = np.broadcast_to(np.asarray(sorted(insisted), dtype=np.int64), (drawn.shape[0], len(insisted)))
    return np.sort(np.concatenate([drawn, fixed], axis=1), axis=1)


@lru_cache(maxsize=8)
def _combs(columns: int, places: int) -> Ints:
    return np.asarray([[comb(n, k + 1) for k in range(places)] for n in range(columns)], dtype=np.int64)


def _pick(columns: NDArray[np.integer], places: NDArray[np.integer]) -> Ints:
    """comb(column, place + 1), element by element."""
    table = _combs(int(np.max(columns, initial=0)) + 1, int(np.max(places, initial=0)) + 1)
    return np.asarray(table[columns, places])


def _ranks(sets: Ints, offset: int, shifted: Ints | None = None) -> Ints:
    """(sets,) what these columns add to a rank when `offset` smaller ones, and one more where shifted, come before."""
    if sets.shape[1] == 0:
        return np.zeros(sets.shape[0], dtype=np.int64)
    places = np.arange(sets.shape[1]) + offset
    return np.asarray(_pick(sets, places + (0 if shifted is None else shifted)).sum(axis=1))
