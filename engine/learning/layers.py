"""The posterior over the graphs inside one stage, exactly, with every graph equally likely beforehand.

Every directed acyclic graph splits in one way into layers: the sources, then those whose parents are all earlier with
at least one in the layer before, and so on (Kuipers & Moffa 2017). A sum over layers therefore counts each graph once.
All terms are positive; they are kept as logs because scores differ by thousands of nats.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.learning.scores import Floats, Ints
from engine.learning.stage_weights import StageWeights

WIDEST_LAYERED = 10  # columns in a stage that this sum can take: 4 to the power of its columns


@dataclass(frozen=True, eq=False)
class Layers(StageWeights):
    """Graphs of a stage."""

    @cached_property
    def forward(self) -> Floats:
        """(sets, sets) natural log of the sum over graphs of the columns so far, by these and by the last layer."""
        size = 1 << self.width
        forward = np.full((size, size), -np.inf)
        sources = _sums(self.weights[:, 0], self.everything)
        every = np.arange(1, size)
        forward[every, every] = sources[1:]
        for done in self._by_size():
            self.still()
            last, following, step = self._step(done)
            reached = log_sum_of(forward[done, last][:, None] + step, axis=0)
            forward[done | following, following] = np.logaddexp(forward[done | following, following], reached)
        return forward

    @cached_property
    def log_sum(self) -> float:
        """Natural log of the sum over all graphs."""
        return float(log_sum_of(self.forward[self.everything, 1:], axis=0)) if self.width else 0.0

    def parents(self) -> Floats:
        """(width, 2^width) posterior probability that a column has exactly these parents in the stage."""
        size = 1 << self.width
        backward = np.full((size, size), -np.inf)
        backward[self.everything] = 0.0
        found = np.zeros((self.width, size))
        for done in reversed(self._by_size()):
            self.still()
            last, following, step = self._step(done)
            onward = step + backward[done | following, following][None, :]
            backward[done, last] = log_sum_of(onward, axis=1)
            mass = np.exp(self.forward[done, last][:, None] + onward - self.log_sum)
            for column in self._outside(done):
                joins = mass[:, (following >> column & 1) == 1].sum(axis=1)  # (last,)
                self._spread(found[column], column, done, last, joins)
        every = np.arange(1, size)
        first = np.exp(self.forward[every, every] + backward[every, every] - self.log_sum)
        for column in range(self.width):
            found[column, 0] += first[(every >> column & 1) == 1].sum()
        return found

    def draw(self, rng: np.random.Generator) -> tuple[int, ...]:
        """The parents, as a set, of each column in one graph drawn from the posterior."""
        chosen = [0] * self.width
        done = self.everything
        layer = pick(self.forward[done], rng)
        while done != layer:
            before = done ^ layer
            last = submasks(before)[1:]
            step = self.forward[before, last].copy()
            columns = [column for column in range(self.width) if layer >> column & 1]
            for column in columns:
                step += self._gain(column, before, last)
            under = int(last[pick(step, rng)])
            for column in columns:
                sets = self.families[column]
                fits = sets[((sets & ~before) == 0) & ((sets & under) != 0)]
                chosen[column] = int(fits[pick(self.weights[column, fits], rng)])
            done, layer = before, under
        return tuple(chosen)

    def _by_size(self) -> list[int]:
        """Every set but the empty and the full one, small ones first."""
        return sorted(range(1, self.everything), key=lambda done: (done.bit_count(), done))

    def _outside(self, done: int) -> list[int]:
        return [column for column in range(self.width) if not done >> column & 1]

    def _step(self, done: int) -> tuple[Ints, Ints, Floats]:
        """Last layers within `done`, layers that may follow, and (last, following) the log weight of that step."""
        last = submasks(done)[1:]
        step = np.zeros((last.size, 1))
        for column in self._outside(done):
            step = np.concatenate([step, step + self._gain(column, done, last)[:, None]], axis=1)
        return last, submasks(self.everything & ~done)[1:], step[:, 1:]

    def _gain(self, column: int, done: int, last: Ints) -> Floats:
        """(last,) log of the summed weights of parents within `done` of which one at least is in the last layer."""
        return log_difference(self.totals[column, done], self.totals[column, done & ~last])

    def _spread(self, found: Floats, column: int, done: int, last: Ints, joins: Floats) -> None:
        """Share out the probability that `column` follows each last layer among the parents it can have there."""
        kept = joins > 0.0
        if not kept.any():
            return
        last, share = last[kept], np.log(joins[kept]) - self._gain(column, done, last[kept])
        sets = self.families[column]
        within = sets[(sets & ~done) == 0]
        touch = (within[:, None] & last[None, :]) != 0
        terms = np.where(touch, self.weights[column, within][:, None] + share[None, :], -np.inf)
        found[within] += np.exp(terms).sum(axis=1)


def submasks(whole: int) -> Ints:
    """Every subset of a set, the empty one first."""
    found = np.zeros(1, dtype=np.int64)
    for place in range(whole.bit_length()):
        if whole >> place & 1:
            found = np.concatenate([found, found | 1 << place])
    return found


def log_difference(larger: Floats, smaller: Floats) -> Floats:
    """ln(e^larger - e^smaller) for larger >= smaller; -inf where they are equal."""
    with np.errstate(divide="ignore", invalid="ignore"):
        found = larger + np.log1p(-np.exp(np.minimum(smaller - larger, 0.0)))
    return np.where(np.isneginf(larger) | (smaller >= larger), -np.inf, found)


def _sums(each: Floats, whole: int) -> Floats:
    """(sets,) the sum of `each` over the members of every subset of `whole`, in the order of `submasks`."""
    found = np.zeros(1)
    for place in range(whole.bit_length()):
        found = np.concatenate([found, found + each[place]])
    return found


def log_sum_of(values: Floats, axis: int) -> Floats:
    top = values.max(axis=axis, keepdims=True)
    top = np.where(np.isneginf(top), 0.0, top)
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(np.exp(values - top).sum(axis=axis)) + np.squeeze(top, axis))


def pick(logs: Floats, rng: np.random.Generator) -> int:
    """A place drawn in proportion to e^logs."""
    shares = np.cumsum(np.exp(logs - logs.max()))
    return int(np.searchsorted(shares, rng.random() * shares[-1], side="right"))
