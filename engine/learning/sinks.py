"""The posterior over the graphs of a wider stage, by orders: each (order, graph) pair is equally likely beforehand.

The recursion over subsets, forward and backward, in logs (Koivisto & Sood 2004; Koivisto 2006). A graph that fits many
orders counts that often; draws are put right by 1 / (its number of linear extensions) (Ellis & Wong 2008).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.learning.layers import log_sum_of, pick, subset_totals
from engine.learning.scores import Floats, Ints


@dataclass(frozen=True, eq=False)
class Sinks:
    """Orders and graphs of a stage of `width` columns; `weights` as in engine.learning.layers.Layers."""

    weights: Floats

    @property
    def width(self) -> int:
        return int(self.weights.shape[0])

    @property
    def everything(self) -> int:
        return (1 << self.width) - 1

    @cached_property
    def totals(self) -> Floats:
        return subset_totals(self.weights)

    @cached_property
    def forward(self) -> Floats:
        """(sets,) natural log of the sum over the orders and graphs of each set, its columns coming first."""
        forward = np.full(1 << self.width, -np.inf)
        forward[0] = 0.0
        for layer in self._layers()[1:]:
            terms = np.full((self.width, layer.size), -np.inf)
            for column in range(self.width):
                holds = np.flatnonzero(layer >> column & 1)
                before = layer[holds] ^ (1 << column)
                terms[column, holds] = forward[before] + self.totals[column, before]
            forward[layer] = log_sum_of(terms, axis=0)
        return forward

    @cached_property
    def backward(self) -> Floats:
        """(sets,) natural log of the sum over the orders and graphs of the columns that come after each set."""
        backward = np.full(1 << self.width, -np.inf)
        backward[-1] = 0.0
        for layer in reversed(self._layers()[:-1]):
            terms = np.full((self.width, layer.size), -np.inf)
            for column in range(self.width):
                lacks = np.flatnonzero((layer >> column & 1) == 0)
                terms[column, lacks] = self.totals[column, layer[lacks]] + backward[layer[lacks] | 1 << column]
            backward[layer] = log_sum_of(terms, axis=0)
        return backward

    @property
    def log_sum(self) -> float:
        return float(self.forward[-1])

    def parents(self) -> Floats:
        """(width, 2^width) probability, over orders and graphs, that a column has just these parents in the stage."""
        sets = np.arange(1 << self.width)
        found = np.zeros(self.weights.shape)
        for column in range(self.width):
            before = np.where(sets >> column & 1, -np.inf, self.forward + self.backward[sets | 1 << column])
            for place in range(self.width):  # sum over every set of earlier columns that holds the parents
                halves = before.reshape(-1, 2, 1 << place)
                np.logaddexp(halves[:, 0], halves[:, 1], out=halves[:, 0])
            found[column] = np.exp(self.weights[column] + before - self.log_sum)
        return found

    def draw(self, rng: np.random.Generator) -> tuple[int, ...]:
        """The parents, as a set, of each column in one graph drawn together with an order."""
        chosen = [0] * self.width
        left = self.everything
        while left:
            columns = [column for column in range(self.width) if left >> column & 1]
            logs = [self.forward[left ^ (1 << c)] + self.totals[c, left ^ (1 << c)] for c in columns]
            column = columns[pick(np.asarray(logs), rng)]
            left ^= 1 << column
            sets = self._families[column]
            fits = sets[(sets & ~left) == 0]
            chosen[column] = int(fits[pick(self.weights[column, fits], rng)])
        return tuple(chosen)

    @cached_property
    def _families(self) -> tuple[Ints, ...]:
        return tuple(np.flatnonzero(np.isfinite(row)) for row in self.weights)

    def _layers(self) -> list[Ints]:
        sets = np.arange(1 << self.width, dtype=np.int64)
        sizes = np.asarray([int(each).bit_count() for each in sets])
        return [sets[sizes == size] for size in range(self.width + 1)]


def linear_extensions(parents: tuple[int, ...]) -> int:
    """In how many orders every column comes after its parents."""
    ways = {0: 1}
    for _ in parents:
        longer: dict[int, int] = {}
        for placed, count in ways.items():
            for column, own in enumerate(parents):
                if not placed >> column & 1 and not own & ~placed:
                    longer[placed | 1 << column] = longer.get(placed | 1 << column, 0) + count
        ways = longer
    return ways[(1 << len(parents)) - 1]
