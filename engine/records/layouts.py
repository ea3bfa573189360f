"""Where the counts of one and of two columns stand in a product of one-hot columns."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from engine.records.joint import Ints


@dataclass(frozen=True)
class Further:
    """Sets of one or of two later columns inside a product.

    columns: (1 or 2, sets).  levels: (sets,) joint levels of those columns.  entries: where their counts are in a
    flattened product, set by set.  starts: (sets,) where each set begins among the entries.
    """

    columns: Ints
    levels: Ints
    entries: Ints
    starts: Ints


@dataclass(frozen=True)
class Layout:
    """places: one-hot columns that make up a product; used: the same, as a slice where it can be.

    one, two: what to read off it.
    """

    places: Ints
    used: slice | Ints
    one: Further
    two: Further


def laid_out(all_levels: Ints, begins: Ints, later: Ints, limit: int) -> Layout:
    """limit: most joint levels of two columns."""
    levels = all_levels[later]
    first = np.cumsum(levels) - levels
    wide = int(levels.sum())
    places = np.concatenate([np.arange(begins[column], begins[column] + all_levels[column]) for column in later])
    together = int(places[-1] - places[0] + 1) == wide
    used = slice(int(places[0]), int(places[-1]) + 1) if together else places
    one = Further(later[None, :], levels, np.arange(wide) * (wide + 1), first)
    a, b = np.triu_indices(later.size, 1)
    small = levels[a] * levels[b] <= limit
    a, b = a[small], b[small]
    joint = levels[a] * levels[b]
    starts = np.cumsum(joint) - joint
    within = np.arange(joint.sum()) - np.repeat(starts, joint)
    width = np.repeat(levels[b], joint)
    entries = (np.repeat(first[a], joint) + within // width) * wide + np.repeat(first[b], joint) + within % width
    return Layout(places, used, one, Further(np.stack([later[a], later[b]]), joint, entries, starts))
