"""Joint counts of sets of columns: how sets are numbered, and the blocks that their counts come in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import comb

import numpy as np
from numpy.typing import NDArray

LARGEST = 1_000_000  # joint levels of a set that is counted; larger ones are left out of learning

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]
Tally = NDArray[np.int32] | NDArray[np.float64]  # whole records, or what they count for


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
    counts: (folds, some cells, more cells) records, int32, or the sum of their weights, float64; cells without any may
    be left out, and a set may come in several blocks, each with cells of its own.
    """

    size: int
    ranks: Ints
    cells: Ints
    starts: Ints
    counts: Tally


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
    weights: Ints | Floats | None = None,
) -> Block:
    """The block of one set.

    number: (rows,) 0 to occupied - 1, which occupied cell each row is in.  fold: (rows,) 0 to folds - 1.
    weights: (rows,) whole numbers, how many records each row stands for, or what it counts for; None for one each.
    """
    counts = tallied(fold * occupied + number, weights, folds * occupied)
    return one_set(columns, cells, counts.reshape(folds, occupied))


def tallied(code: NDArray[np.integer], weights: Ints | Floats | None, reach: int) -> Ints | Floats:
    """(reach,) rows of each code, or the sum of their weights: int64 unless the weights are fractions."""
    counts = np.bincount(code, weights, minlength=reach)
    if weights is not None and weights.dtype.kind == "f":
        return counts.astype(np.float64, copy=False)  # of no rows bincount makes whole numbers all the same
    return counts.astype(np.int64, copy=False)  # whole numbers below 2^53: their sums are exact


def kept(counts: NDArray[np.number]) -> Tally:
    """Whole numbers as a block keeps them; sums of weights stay as they are."""
    if counts.dtype.kind == "f":
        return counts.astype(np.float64, copy=False)
    return counts.astype(np.int32, copy=False)


def one_set(columns: Sequence[int], cells: int, counts: NDArray[np.number]) -> Block:
    """The block of one set from (folds, occupied cells) records, whole numbers, or sums of their weights, floats."""
    where, joint = np.asarray([rank(columns)], dtype=np.int64), np.asarray([cells], dtype=np.int64)
    return Block(len(columns), where, joint, np.zeros(1, dtype=np.int64), kept(counts[:, None, :]))
