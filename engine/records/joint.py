"""Joint counts of sets of columns: how sets are numbered, and the blocks that their counts come in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import comb

import numpy as np
from numpy.typing import NDArray

LARGEST = 1_000_000  # joint levels of a set that is counted; larger ones are left out of learning

Ints = NDArray[np.int64]


def rank(columns: Sequence[int]) -> int:
    """Position of an ascending set of columns among all of its size, in colexicographic order (Knuth 2011, 7.2.1.3)."""
    return sum(comb(column, place + 1) for place, column in enumerate(columns))


def choose(columns: Ints, place: int) -> Ints:
    """What each column adds to the rank of a set in which it is the `place`-th smallest."""
    return np.asarray([comb(int(column), place) for column in columns], dtype=np.int64)


@dataclass(frozen=True)
class Block:
    """Counts of several sets of columns that have the same size.

    size: columns in each set.  ranks: (sets,) their `rank`.  cells: (sets,) joint levels of each, seen or not.
    starts: (sets,) where each set begins on the last axis of `counts`.
    counts: (folds, some cells, more cells) records; cells without any may be left out, and a set may come in
    several blocks, each with cells of its own.
    """

    size: int
    ranks: Ints
    cells: Ints
    starts: Ints
    counts: NDArray[np.int32]


def numbered(code: Ints, reach: int) -> tuple[Ints, Ints]:
    """Codes below `reach` renumbered without gaps, and the codes that there are, ascending."""
    if reach <= 8 * code.size + 1024:
        seen = np.flatnonzero(np.bincount(code, minlength=reach))
        number = np.zeros(reach, dtype=np.int64)
        number[seen] = np.arange(seen.size)
        return number[code], seen
    distinct, place = np.unique(code, return_inverse=True)
    return place.reshape(-1).astype(np.int64), distinct


def single(
    columns: Sequence[int],
    cells: int,
    number: Ints,
    occupied: int,
    fold: NDArray[np.integer],
    folds: int,
    weights: NDArray[np.integer] | None = None,
) -> Block:
    """The block of one set.

    number: (rows,) 0 to occupied - 1, which occupied cell each row is in.  fold: (rows,) 0 to folds - 1.
    weights: (rows,) whole numbers, how many records each row stands for; None for one each.
    """
    counts = np.bincount(fold * occupied + number, weights, minlength=folds * occupied)
    return one_set(columns, cells, counts.reshape(folds, occupied))


def one_set(columns: Sequence[int], cells: int, counts: NDArray[np.number]) -> Block:
    """The block of one set from (folds, occupied cells) whole numbers."""
    where, joint = np.asarray([rank(columns)], dtype=np.int64), np.asarray([cells], dtype=np.int64)
    return Block(len(columns), where, joint, np.zeros(1, dtype=np.int64), counts[:, None, :].astype(np.int32))
