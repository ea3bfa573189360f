"""How sure of each link: the posterior over the graphs that the order allows, and graphs drawn from it."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from engine.learning.families import Candidates, Families
from engine.learning.layers import WIDEST_LAYERED, Layers, pick
from engine.learning.scores import Floats, SetScores
from engine.learning.sinks import Sinks, linear_extensions


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
    scores: SetScores,
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
        self, stage: Sequence[Candidates], scores: SetScores, max_parents: int, still: Callable[[], None]
    ) -> None:
        self.stage = stage
        self.width = len(stage)
        self.families = []
        for who in stage:
            self.families.append(Families(who, scores, 0, max_parents).by_mates())
            still()
        weights = np.full((self.width, 1 << self.width), -np.inf)
        for place, family in enumerate(self.families):
            for own, (_, logs) in family.items():
                weights[place, self._stage_bits(place, own)] = np.logaddexp.reduce(logs)
        self.graphs = Layers(weights, still) if self.width <= WIDEST_LAYERED else Sinks(weights, still)

    def draw(self, rng: np.random.Generator, still: Callable[[], None]) -> tuple[int, ...]:
        """Parents within the stage, as sets, of one drawn graph."""
        still()
        return self.graphs.draw(rng)

    def _stage_bits(self, place: int, own: tuple[int, ...]) -> int:
        return sum(1 << (mate - self.stage[place].first) for mate in own)

    def add_support(self, support: Floats) -> None:
        held = self.graphs.parents()
        for place, (who, family) in enumerate(zip(self.stage, self.families, strict=True)):
            for own, (earlier, logs) in family.items():
                share = held[place, self._stage_bits(place, own)]
                if share <= 0.0:
                    continue
                for mate in own:
                    support[mate, who.child] += share
                each = share * np.exp(logs - np.logaddexp.reduce(logs))
                np.add.at(support[:, who.child], earlier[0], each[earlier[1]])

    def with_earlier(self, chosen: tuple[int, ...], rng: np.random.Generator) -> Iterator[list[int]]:
        """The parents of each column: those in the stage, chosen as sets, and a draw of those from earlier stages."""
        for who, family, own in zip(self.stage, self.families, chosen, strict=True):
            mates = tuple(who.first + bit for bit in range(self.width) if own >> bit & 1)
            (columns, belongs), logs = family[mates]
            yield [*mates, *columns[belongs == pick(logs, rng)].tolist()]
