"""How sure of each link: the posterior over the graphs that the order allows, and graphs drawn from it."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from engine.learning.families import Candidates, Families, Group
from engine.learning.layers import WIDEST_LAYERED, Layers, log_sum_of
from engine.learning.mixed import FamilyScores
from engine.learning.scores import Floats, Ints
from engine.learning.sinks import Sinks, linear_extensions

_UNLIKELY = 50.0  # nats below the sum of all at which a set of parents would not be drawn in 10^20 graphs


@dataclass(frozen=True, eq=False)
class Posterior:
    """Every graph that the order and the parent cap allow is equally likely beforehand.

    support: (columns, columns) probability of the link from row to column.
    graphs: (graphs, columns, columns) True for a link from row to column.  weights: (graphs,) summing to 1.
    effective: how many independent draws the graphs are worth (Kish 1965); less than their number only where a stage
    was too wide to sum over its layers.
    """

    support: Floats
    graphs: NDArray[np.bool_]
    weights: Floats

    @property
    def effective(self) -> float:
        return float(1.0 / (self.weights**2).sum()) if self.weights.size else 0.0


def posterior(
    stages: Sequence[Sequence[Candidates]],
    scores: FamilyScores,
    max_parents: int,
    graphs: int,
    rng: np.random.Generator,
    tick: Callable[[float], None] | None = None,
) -> Posterior:
    """The posterior, stage by stage: stages are independent given the order.

    graphs: how many to draw.  tick hears the fraction done.
    """
    tick = tick or (lambda fraction: None)
    columns = sum(len(stage) for stage in stages)
    support = np.zeros((columns, columns))
    drawn = np.zeros((graphs, columns, columns), dtype=np.bool_)
    logs = np.zeros(graphs)
    for number, stage in enumerate(stages):
        here = _Stage(stage, scores, max_parents, partial(tick, number / len(stages)))
        here.add_support(support)
        tick((number + 0.7) / len(stages))
        still = partial(tick, (number + 0.7) / len(stages))
        inside = [here.draw(rng, still) for _ in range(graphs)]
        if isinstance(here.graphs, Sinks):
            orders: dict[tuple[int, ...], int] = {}
            for chosen in inside:
                if chosen not in orders:
                    orders[chosen] = linear_extensions(chosen)
                    still()
            logs -= np.asarray([np.log(float(orders[chosen])) for chosen in inside])
        for graph, chosen in zip(drawn, inside, strict=True):
            for who, parents in zip(stage, here.with_earlier(chosen, rng), strict=True):
                graph[parents, who.child] = True
        tick((number + 1) / len(stages))
    weights = np.exp(logs - logs.max()) if graphs else logs
    return Posterior(np.clip(support, 0.0, 1.0), drawn, weights / max(weights.sum(), 1.0))


class _Stage:
    """One stage: its graphs, and the parents from earlier stages that go with each set of parents inside."""

    def __init__(
        self, stage: Sequence[Candidates], scores: FamilyScores, max_parents: int, still: Callable[[], None]
    ) -> None:
        self.stage = stage
        self.width = len(stage)
        self.groups: list[list[tuple[Group, Ints]]] = []  # with the mates as sets of the stage, themselves included
        self.weights = np.full((self.width, 1 << self.width), -np.inf)
        for who, row in zip(stage, self.weights, strict=True):
            groups = []
            for group in Families(who, scores, 0, max_parents).groups():
                bits = np.asarray(np.sum(1 << (group.own - who.first), axis=1, dtype=np.int64))
                row[bits] = np.logaddexp(row[bits], log_sum_of(group.scores, axis=1))
                groups.append((group, bits))
            self.groups.append(groups)
            still()
        self._known: dict[tuple[int, int], tuple[list[list[int]], Floats]] = {}
        self.graphs = Layers(self.weights, still) if self.width <= WIDEST_LAYERED else Sinks(self.weights, still)

    def draw(self, rng: np.random.Generator, still: Callable[[], None]) -> tuple[int, ...]:
        """Parents within the stage, as sets, of one drawn graph."""
        still()
        return self.graphs.draw(rng)

    def add_support(self, support: Floats) -> None:
        held = self.graphs.parents()
        columns = support.shape[0]
        for place, (who, groups) in enumerate(zip(self.stage, self.groups, strict=True)):
            for group, bits in groups:
                kept = np.flatnonzero(held[place, bits] > 0.0)
                each = np.exp(group.scores[kept] - self.weights[place, bits[kept], None])
                each *= held[place, bits[kept], None]
                for sets, share in ((group.own[kept], each.sum(axis=1)), (group.earlier, each.sum(axis=0))):
                    parents, shares = sets.reshape(-1), np.repeat(share, sets.shape[1])
                    support[:, who.child] += np.bincount(parents, shares, minlength=columns)

    def with_earlier(self, chosen: tuple[int, ...], rng: np.random.Generator) -> Iterator[list[int]]:
        """The parents of each column: those in the stage, chosen as sets, and a draw of those from earlier stages."""
        for place, own in enumerate(chosen):
            if (place, own) not in self._known:
                self._known[place, own] = self._alternatives(place, own)
            parents, shares = self._known[place, own]
            yield parents[int(np.searchsorted(shares, rng.random() * shares[-1], side="right"))]

    def _alternatives(self, place: int, own: int) -> tuple[list[list[int]], Floats]:
        """Every set of parents of a column with these mates, and the running sum of how likely each is."""
        first = self.stage[place].first
        mates = [first + bit for bit in range(self.width) if own >> bit & 1]
        parents: list[list[int]] = []
        logs = []
        for group, bits in self.groups[place]:
            for row in np.flatnonzero(bits == own):
                likely = np.flatnonzero(group.scores[row] > self.weights[place, own] - _UNLIKELY)
                parents += [[*mates, *earlier] for earlier in group.earlier[likely].tolist()]
                logs.append(group.scores[row, likely])
        return parents, np.cumsum(np.exp(np.concatenate(logs) - self.weights[place, own]))
