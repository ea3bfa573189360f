"""The best model at every number of links, exactly."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from engine.learning.families import Candidates, Families
from engine.learning.mixed import FamilyScores
from engine.learning.scores import Floats
from engine.refusal import Refusal

WIDEST = 18  # columns in a stage that the exact search can take
_SETS = 1_024  # sets of a stage filled in together, few enough to stay in the processor's cache

Parents = tuple[tuple[int, ...], ...]  # one entry a column: positions of its parents


@dataclass(frozen=True, eq=False)
class SizeCurve:
    """Best score at every number of links, -inf where no model has that many.

    scores: (links + 1,) natural log.  parents: links -> one tuple of positions a column, for every feasible number.
    """

    scores: Floats
    parents: dict[int, Parents]


def check_widths(stages: Sequence[tuple[str, int]]) -> None:
    """Raises Refusal for a stage of more than WIDEST columns."""
    for name, width in stages:
        if width > WIDEST:
            raise Refusal(
                f"The stage “{name}” holds {width} columns; the exact search takes at most {WIDEST} in one stage.",
                where=name,
                do="Split the stage where you know what comes first, or leave some columns out.",
            )


def size_curve(
    stages: tuple[tuple[Candidates, ...], ...],
    scores: FamilyScores,
    part: int,
    max_parents: int,
    max_links: int | None = None,
    tick: Callable[[float], None] | None = None,
) -> SizeCurve:
    """Exact best models of one part of the records (see SetScores).

    Within a stage a dynamic programme over subsets (Koivisto & Sood 2004; Silander & Myllymaki 2006) with the number of
    links as a second axis; across stages, which are independent given the order, a max-plus convolution. Ties go to
    the model whose links follow the listing of the columns.
    """
    tick = tick or (lambda fraction: None)
    work = [max(1, len(stage)) * 2.0 ** len(stage) for stage in stages]
    done = 0.0
    searched = []
    totals = [np.zeros(1)]
    for stage, cost in zip(stages, work, strict=True):
        if not stage:
            continue
        within = partial(_tick_within, tick, done, cost, sum(work))
        searched.append(StageSearch(stage, scores, part, max_parents, within))
        done += cost
        totals.append(_convolved(totals[-1], searched[-1].curve, max_links))
    parents = {}
    for links in np.flatnonzero(np.isfinite(totals[-1])):
        left = int(links)
        found: list[tuple[int, ...]] = []
        for place in range(len(searched) - 1, -1, -1):
            used = _split(totals[place], searched[place].curve, left, totals[place + 1][left])
            found = [*searched[place].parents(used), *found]
            left -= used
        parents[int(links)] = tuple(found)
        tick(1.0)
    return SizeCurve(totals[-1], parents)


class StageSearch:
    """The dynamic programme of one stage.

    curve: (links + 1,) best score of the stage's families at every number of links, links from earlier stages included.
    """

    def __init__(
        self,
        stage: tuple[Candidates, ...],
        scores: FamilyScores,
        part: int,
        max_parents: int,
        tick: Callable[[float], None],
    ) -> None:
        self.width = len(stage)
        self.cap = min(max_parents, scores.size - 1)
        self.families = [Families(who, scores, part, max_parents) for who in stage]
        self.best = []
        for place, family in enumerate(self.families):
            self.best.append(family.best())
            tick(0.3 * (place + 1) / self.width)
        self.most = self.width * self.cap
        self.table = self._filled(tick)  # (sets of the stage, links + 1)
        self.curve = self.table[-1]
        self._walked: dict[int, list[tuple[int, ...]]] = {}
        self._found: dict[tuple[int, int, int], tuple[int, ...]] = {}

    def _filled(self, tick: Callable[[float], None]) -> Floats:
        sets = np.arange(1 << self.width, dtype=np.int64)
        members = np.zeros(sets.size, dtype=np.int64)
        for place in range(self.width):
            members += sets >> place & 1
        table = np.full((sets.size, self.most + 1), -np.inf)
        table[0, 0] = 0.0
        done = 0
        for count in range(1, self.width + 1):
            layer = sets[members == count]
            for low in range(0, layer.size, _SETS):
                some = layer[low : low + _SETS]
                table[some, : count * self.cap + 1] = self._layer(table, some, count)
                done += some.size * count
                tick(0.3 + 0.7 * done / (self.width << (self.width - 1)))
        return table

    def _layer(self, table: Floats, sets: NDArray[np.int64], count: int) -> Floats:
        """(sets, links + 1) best scores of sets of `count` columns, from those of `count` - 1."""
        reach = (count - 1) * self.cap + 1
        filled = np.full((sets.size, count * self.cap + 1), -np.inf)
        sums = np.empty((sets.size, reach))
        for last in range(self.width):
            holds = np.flatnonzero(sets >> last & 1)
            before = sets[holds] ^ (1 << last)
            earlier = table[before, :reach]
            best = self.best[last][:, _without(before, last)]
            mine = filled[holds]
            for links in range(self.cap + 1):
                reached = mine[:, links : links + reach]
                np.add(earlier, best[links][:, None], out=sums[: holds.size])
                np.maximum(reached, sums[: holds.size], out=reached)
            filled[holds] = mine
        return filled

    def parents(self, links: int) -> list[tuple[int, ...]]:
        """The parents of each column of the stage in its best choice of that many links, found by re-evaluation."""
        if links not in self._walked:
            chosen: list[tuple[int, ...]] = [()] * self.width
            left, members = links, (1 << self.width) - 1
            while members:
                last, used = self._last(members, left)
                members ^= 1 << last
                within = int(_without(np.asarray([members]), last)[0])
                if (last, used, within) not in self._found:
                    score = float(self.best[last][used, within])
                    self._found[last, used, within] = self.families[last].parents(used, within, score)
                chosen[last] = self._found[last, used, within]
                left -= used
            self._walked[links] = chosen
        return self._walked[links]

    def _last(self, members: int, links: int) -> tuple[int, int]:
        """The latest listed column that can stand last among `members`, and how many parents it has."""
        target = self.table[members, links]
        for last in range(self.width - 1, -1, -1):
            if not members >> last & 1:
                continue
            before = members ^ (1 << last)
            within = int(_without(np.asarray([before]), last)[0])
            for used in range(min(self.cap, links) + 1):
                if self.table[before, links - used] + self.best[last][used, within] == target:
                    return last, used
        raise AssertionError("a score without a model")


def _tick_within(tick: Callable[[float], None], began: float, cost: float, whole: float, done: float) -> None:
    tick((began + cost * done) / whole)


def _without(sets: NDArray[np.int64], place: int) -> NDArray[np.int64]:
    """Sets that do not hold `place`, numbered among the other columns."""
    low = (1 << place) - 1
    return np.asarray((sets & low) | (sets >> (place + 1) << place))


def _convolved(left: Floats, right: Floats, most: int | None) -> Floats:
    size = left.size + right.size - 1
    total = np.full(size, -np.inf)
    for links in range(right.size):
        reached = total[links : links + left.size]
        np.maximum(reached, left + right[links], out=reached)
    return total if most is None else total[: most + 1]


def _split(before: Floats, stage: Floats, links: int, target: float) -> int:
    """How many of `links` the stage takes in the best model."""
    for used in range(min(links, stage.size - 1) + 1):
        if links - used < before.size and before[links - used] + stage[used] == target:
            return used
    raise AssertionError("a score without a model")
