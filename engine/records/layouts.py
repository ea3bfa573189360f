"""Where the counts of one and of two columns stand in a product of one-hot columns."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from engine.records.joint import Ints, choose


@dataclass(frozen=True, eq=False)
class Further:
    """Sets of one or of two later columns inside a product.

    ranks: (sets,) what the columns add to the rank of the prefix.

    columns: (1 or 2, sets).  levels: (sets,) joint levels of those columns.  entries: where their counts are in a
    flattened product, set by set.  starts: (sets,) where each set begins among the entries.
    """

    columns: Ints
    levels: Ints
    entries: Ints
    starts: Ints
    ranks: Ints


@dataclass(frozen=True, eq=False)
class Layout:
    """places: one-hot columns that make up a product; used: the same, as a slice where it can be.

    one, two: what to read off it.
    """

    places: Ints
    used: slice | Ints
    one: Further
    two: Further

    @cached_property
    def _begins(self) -> dict[int, int]:
        return dict(zip(self.one.columns[0].tolist(), self.one.starts.tolist(), strict=True))

    def own(self, column: int) -> NDArray[np.int64]:
        """Where the one-hot columns of `column` stand in the product."""
        levels = int(self.one.levels[np.searchsorted(self.one.columns[0], column)])
        return np.arange(levels) + self._begins[column]

    def holds(self, column: int) -> bool:
        return column in self._begins


def laid_out(all_levels: Ints, begins: Ints, later: Ints, limit: int, depth: int) -> Layout:
    """limit: most joint levels of two columns.  depth: columns in the prefix."""
    levels = all_levels[later]
    first = np.cumsum(levels) - levels
    wide = int(levels.sum())
    places = np.concatenate([np.arange(begins[column], begins[column] + all_levels[column]) for column in later])
    together = int(places[-1] - places[0] + 1) == wide
    used = slice(int(places[0]), int(places[-1]) + 1) if together else places
    one = Further(later[None, :], levels, np.arange(wide) * (wide + 1), first, choose(later, depth + 1))
    a, b = np.triu_indices(later.size, 1)
    small = levels[a] * levels[b] <= limit
    a, b = a[small], b[small]
    joint = levels[a] * levels[b]
    starts = np.cumsum(joint) - joint
    within = np.arange(joint.sum()) - np.repeat(starts, joint)
    width = np.repeat(levels[b], joint)
    entries = (np.repeat(first[a], joint) + within // width) * wide + np.repeat(first[b], joint) + within % width
    ranks = choose(later[a], depth + 1) + choose(later[b], depth + 2)
    two = Further(np.stack([later[a], later[b]]), joint, entries, starts, ranks)
    return Layout(places, used, one, two)
