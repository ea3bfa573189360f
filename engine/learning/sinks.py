"""The posterior over the graphs of a wider stage, by orders: each (order, graph) pair is equally likely beforehand.

The recursion over subsets, forward and backward, in logs (Koivisto & Sood 2004; Koivisto 2006). A graph that fits many
orders counts that often; draws are put right by 1 / (its number of linear extensions) (Ellis & Wong 2008).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import comb

import numpy as np

from engine.learning.lattice import superset_shares
from engine.learning.layers import log_sum_of, pick
from engine.learning.scores import Floats, Ints
from engine.learning.stage_weights import StageWeights


@dataclass(frozen=True, eq=False)
class Sinks(StageWeights):
    """Orders and graphs of a stage."""

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
            self.still()
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
            self.still()
        return backward

    @property
    def log_sum(self) -> float:
        return float(self.forward[-1])

    def parents(self) -> Floats:
        """(width, 2^width) probability, over orders and graphs, that a column has just these parents in the stage."""
        sets = np.arange(1 << self.width)
        found = np.zeros(self.weights.shape)
        for column in range(self.width):
            outside = np.flatnonzero((sets >> column & 1) == 0)
            around = self.forward[outside] + self.backward[outside | 1 << column] - self.log_sum
            shares = superset_shares(self.weights[column, outside], around, self.totals[column, outside])
            found[column, outside] = shares
            self.still()
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
            sets = self.families[column]
            fits = sets[(sets & ~left) == 0]
            chosen[column] = int(fits[pick(self.weights[column, fits], rng)])
        return tuple(chosen)

    def _layers(self) -> list[Ints]:
        sets = np.arange(1 << self.width, dtype=np.int64)
        sizes = np.zeros(sets.size, dtype=np.int64)
        for place in range(self.width):
            sizes += sets >> place & 1
        return [sets[sizes == size] for size in range(self.width + 1)]


def linear_extensions(parents: tuple[int, ...]) -> int:
    """In how many orders every column comes after its parents.

    Unconnected parts are interleaved freely; a lone source or sink of a part has its place given; otherwise each
    source in turn goes first.
    """
    children = [
        sum(1 << child for child, own in enumerate(parents) if own >> column & 1) for column in range(len(parents))
    ]
    known: dict[int, int] = {0: 1}

    def ways(left: int) -> int:
        if left not in known:
            part = _connected(left, parents, children)
            if part != left:
                apart = comb(left.bit_count(), part.bit_count())
                known[left] = apart * ways(part) * ways(left ^ part)
            else:
                columns = [column for column in range(len(parents)) if left >> column & 1]
                sources = [1 << column for column in columns if not parents[column] & left]
                sinks = [1 << column for column in columns if not children[column] & left]
                given = sources if len(sources) <= len(sinks) else sinks
                known[left] = sum(ways(left ^ end) for end in given)
        return known[left]

    return ways((1 << len(parents)) - 1)


def _connected(left: int, parents: tuple[int, ...], children: list[int]) -> int:
    """The columns of `left` that are connected to its lowest one by links inside it."""
    part = new = left & -left
    while new:
        column = (new & -new).bit_length() - 1
        new &= new - 1
        more = (parents[column] | children[column]) & left & ~part
        part |= more
        new |= more
    return part
