"""Dependences in the records that the model does not have."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import combinations
from math import prod

import numpy as np
from numpy.typing import NDArray

from engine.judging.relearned import Relearned
from engine.judging.tables import departure, false_discovery
from engine.network.sampling import drawn_rows
from engine.order import Order, better_levels
from engine.records.column import SMALL_COUNT, Coded

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

RATE = 0.05  # of false discoveries
_FEWEST = 25.0  # records at a level that is compared by itself; smaller ones are taken together
_CELL = 5.0  # records per cell of a table, on average, under which it is not judged
_INVENTED = (20, 20_000, 400_000)  # rows invented per record, at least, at most


@dataclass(frozen=True)
class Missed:
    """A dependence of two columns, or one that differs by a third, that the model misses.

    columns: the earlier and the later one, then the one it differs by, if any.
    when: (column, level) of the records that show it best, and `levels`, of the later column, whose share among them
    is `seen` while the model foresees `said`; all empty and nan where only fewer than the small-count limit show it.
    records: of those.  statistic, freedom, chance: G, its degrees of freedom and p value.
    counts: whether it is between a changeable column and an outcome.
    """

    columns: tuple[str, ...]
    when: tuple[tuple[str, str], ...]
    levels: tuple[str, ...]
    seen: float
    said: float
    records: int
    statistic: float
    freedom: int
    chance: float
    counts: bool


@dataclass(frozen=True)
class Dependences:
    """pairs: how many pairs of columns were judged.  triples: how many pairs by a third.  missed: surest first."""

    pairs: int
    triples: int
    missed: tuple[Missed, ...]


def dependences(again: Relearned, order: Order, seed: int, tick: Callable[[float], None]) -> Dependences:
    """Every pair of columns, and every changeable column and outcome by each column that is no later, judged.

    What is foreseen comes from rows invented by the models that were learned without each part of the records.
    """
    coded = again.coded
    looking = _Looking(again, order, seed, tick)
    sets = [*combinations(range(len(coded.names)), 2), *_triples(coded, order)]
    judged: list[tuple[tuple[int, ...], float, int, float]] = []
    for place, columns in enumerate(sets):
        if place % 16 == 0:
            tick(0.3 + 0.7 * place / len(sets))
        found = looking.judged(columns)
        if found is not None:
            judged.append((columns, *found))
    rates = false_discovery([chance for _, _, _, chance in judged])
    held = [each for each, rate in zip(judged, rates, strict=True) if rate <= RATE]
    held.sort(key=lambda each: (each[3], -each[1] / each[2], each[0]))
    pairs = sum(len(columns) == 2 for columns, _, _, _ in judged)
    return Dependences(pairs, len(judged) - pairs, tuple(looking.told(*each) for each in held))


def _triples(coded: Coded, order: Order) -> list[tuple[int, ...]]:
    names = coded.names
    found: list[tuple[int, ...]] = []
    for lever in order.changeable:
        for outcome in order.outcomes:
            if lever != outcome and order.stage_of(lever) <= order.stage_of(outcome):
                for other in names:
                    if other not in (lever, outcome) and order.stage_of(other) <= order.stage_of(outcome):
                        found.append((names.index(lever), names.index(outcome), names.index(other)))
    return found


class _Looking:
    """The records and the rows invented beside them."""

    def __init__(self, again: Relearned, order: Order, seed: int, tick: Callable[[float], None]) -> None:
        self.coded = again.coded
        self.order = order
        self.invented = self._rows(again, seed, tick)
        pools = [self._pool(place) for place in range(len(self.coded.names))]
        self.sizes = [int(pool.max()) + 1 for pool in pools]
        self.pooled = [
            np.asfortranarray(np.column_stack([pool[of[:, at]] for at, pool in enumerate(pools)]))
            for of in (self.coded.codes, self.invented)
        ]

    def judged(self, columns: tuple[int, ...]) -> tuple[float, int, float] | None:
        """As `departure`; None where the table is too thin, or has nothing to depend on."""
        sizes = [self.sizes[column] for column in columns]
        if min(sizes) < 2 or self.coded.weights.sum() < _CELL * prod(sizes):
            return None
        seen = _table(columns, sizes, self.pooled[0], self.coded.weights)
        foreseen = _table(columns, sizes, self.pooled[1])
        found = departure(seen, foreseen + 0.5, float(len(self.invented)))
        return found if found[1] > 0 else None

    def told(self, columns: tuple[int, ...], statistic: float, freedom: int, chance: float) -> Missed:
        """The records that show it best: by how many standard errors their share is off."""
        earlier, later, *others = columns
        names = self.coded.names
        given = (earlier, *others)
        order = (*given, later)
        sizes = [len(self.coded.levels[column]) for column in order]
        seen = _table(order, sizes, self.coded.codes, self.coded.weights)
        foreseen, people = (_table(order, sizes, of) for of in (self.invented, self.coded.codes))
        best: tuple[float, tuple[int, ...], tuple[int, ...], float, float, int] | None = None
        for levels in self._compared(later):
            yes, all_of, said_of = (part[..., list(levels)].sum(axis=-1) for part in (people, seen, foreseen))
            rows, worth, said = people.sum(axis=-1), seen.sum(axis=-1), foreseen.sum(axis=-1)
            shown = (yes >= SMALL_COUNT) & (rows - yes >= SMALL_COUNT) & (said > 0.0)
            for at in zip(*np.nonzero(shown), strict=True):
                p, q = float(all_of[at] / worth[at]), float(said_of[at] / said[at])
                off = abs(p - q) * np.sqrt(worth[at] / max(q * (1.0 - q), 1e-6))
                if best is None or off > best[0]:
                    best = (float(off), tuple(int(each) for each in at), levels, p, q, int(rows[at]))
        counts = names[earlier] in self.order.changeable and names[later] in self.order.outcomes
        told = tuple(names[column] for column in columns)
        if best is None:
            return Missed(told, (), (), np.nan, np.nan, 0, statistic, freedom, chance, counts)
        _, at, levels, p, q, records = best
        when = tuple((names[column], self.coded.levels[column][level]) for column, level in zip(given, at, strict=True))
        picked = tuple(self.coded.levels[later][level] for level in levels)
        return Missed(told, when, picked, p, q, records, statistic, freedom, chance, counts)

    def _compared(self, column: int) -> list[tuple[int, ...]]:
        """Levels whose share is told: the better ones of an outcome, else each."""
        levels, name = self.coded.levels[column], self.coded.names[column]
        better = better_levels(self.order.outcomes.get(name), levels, self.coded.has_blank[column])
        if better:
            return [tuple(levels.index(level) for level in better)]
        return [(level,) for level in range(len(levels))]

    def _pool(self, column: int) -> Ints:
        """(levels,) which part of the table each level belongs to: those with few records share the last."""
        count = len(self.coded.levels[column])
        held = np.bincount(self.coded.codes[:, column], self.coded.weights, count)
        rising = np.argsort(held, kind="stable")
        few = int((held < _FEWEST).sum())
        while 0 < few < count and held[rising[:few]].sum() < _FEWEST:
            few += 1
        alone = np.sort(rising[few:])
        found = np.full(count, alone.size, dtype=np.int64)
        found[alone] = np.arange(alone.size)
        return found

    def _rows(self, again: Relearned, seed: int, tick: Callable[[float], None]) -> NDArray[np.int32]:
        each, least, most = _INVENTED
        count = min(max(each * len(self.coded.codes), least), most)
        parts = len(again.parents)
        found = np.empty((count // parts * parts, len(self.coded.names)), dtype=np.int32, order="F")
        for part in range(parts):
            tick(0.3 * part / parts)
            rows = drawn_rows(again.network(part), count // parts, seed * parts + part)
            for column, name in enumerate(self.coded.names):
                found[part * (count // parts) : (part + 1) * (count // parts), column] = rows.codes[name]
        return found


def _table(
    columns: tuple[int, ...], sizes: list[int], codes: NDArray[np.integer], weights: Floats | None = None
) -> Floats:
    """(levels of each column...) rows in every combination, or the sum of their weights."""
    at = codes[:, columns[0]].astype(np.int64)
    for column, size in zip(columns[1:], sizes[1:], strict=True):
        at = at * size + codes[:, column]
    return np.bincount(at, weights, prod(sizes)).astype(np.float64).reshape(sizes)
