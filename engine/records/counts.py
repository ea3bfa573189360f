"""How often levels occur together: all that learning sees of the records.

`Counts` is the seam for tables that outgrow memory; `ArrayCounts` is the embedded implementation on numpy.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from math import lgamma
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from engine.records.covering import BLOCK_CELLS, MOST_COLUMNS, Cover
from engine.records.joint import LARGEST, Block, Floats, Ints, kept, rank, tallied
from engine.records.products import Walk

__all__ = ["LARGEST", "ArrayCounts", "Block", "Counts", "rank"]


class Counts(Protocol):
    """What learning asks of the records. Columns are positions."""

    @property
    def rows(self) -> int: ...

    @property
    def levels(self) -> tuple[int, ...]: ...

    @property
    def folds(self) -> int: ...

    def blocks(self, size: int, tick: Callable[[float], None] | None = None) -> Iterator[Block]:
        """Every set of 0 to `size` columns with at most LARGEST joint levels; `tick` hears the fraction done."""
        ...

    def family(self, parents: Sequence[int], child: int) -> Ints | Floats:
        """(folds, parent levels..., child levels) records, or the sum of their weights."""
        ...


class ArrayCounts:
    """Counts of level positions held in memory.

    codes: (rows, columns) integers, each 0 to levels - 1.  fold: (rows,) 0 to folds - 1, or None for one fold.
    weights: (rows,) what each record counts for, 0 or more; None, or all 1, for whole records, which are counted in
    integers. Other weights are rounded to the fineness at which every sum of them is exact in float64 (about 1e-15 of
    their total), so that neither the order of the rows nor the way of counting shows in the last digit.
    """

    def __init__(
        self,
        codes: NDArray[np.integer],
        levels: Sequence[int],
        fold: NDArray[np.integer] | None = None,
        folds: int = 1,
        weights: NDArray[np.floating] | None = None,
    ) -> None:
        self.codes = np.asfortranarray(codes, dtype=np.int64)
        self.levels = tuple(int(level) for level in levels)
        self.rows = int(self.codes.shape[0])
        self.fold = np.zeros(self.rows, dtype=np.int64) if fold is None else np.asarray(fold, dtype=np.int64)
        self.folds = folds
        self.weights = None if weights is None or bool((weights == 1.0).all()) else exactly_summed(weights)

    def family(self, parents: Sequence[int], child: int) -> Ints | Floats:
        code = self.fold.copy()
        shape = [self.folds]
        for column in (*parents, child):
            code = code * self.levels[column] + self.codes[:, column]
            shape.append(self.levels[column])
        return tallied(code, self.weights, int(np.prod(shape))).reshape(shape)

    def blocks(self, size: int, tick: Callable[[float], None] | None = None) -> Iterator[Block]:
        one, nought = np.ones(1, dtype=np.int64), np.zeros(1, dtype=np.int64)
        everything = kept(tallied(self.fold, self.weights, self.folds))
        yield Block(0, nought, one, nought, everything[:, None, None])
        size = min(size, len(self.levels))
        if size:
            way = Cover if self._covering_is_cheaper(size) else Walk
            hear = tick or (lambda part: None)
            yield from way(self.codes, self.levels, self.fold, self.folds, size, hear, self.weights).blocks()

    def _covering_is_cheaper(self, size: int) -> bool:
        covering, walking = self._seconds(size)
        return covering < walking

    def seconds(self, size: int) -> float:
        """Roughly how long `blocks` takes, for telling progress."""
        return min(self._seconds(min(size, len(self.levels))))

    def _seconds(self, size: int) -> tuple[float, float]:
        """Of covering and of walking."""
        columns = len(self.levels)
        fits = np.log(BLOCK_CELLS) / float(np.mean(np.log(np.maximum(self.levels, 2))))  # columns of a block
        covering = covering_seconds(self.rows, columns, size, fits, self.folds)
        walking = walking_seconds(self.rows, columns, size, sum(self.levels), self.folds)
        return covering if columns <= MOST_COLUMNS else np.inf, walking


def exactly_summed(weights: NDArray[np.floating]) -> Floats:
    """(rows,) the weights as multiples of a power of two so small that the total is under 2^53 of it."""
    _, exponent = np.frexp(float(np.sum(weights)))
    fineness = np.ldexp(1.0, int(exponent) - 52)
    return np.asarray(np.rint(np.asarray(weights, dtype=np.float64) / fineness) * fineness)


# Rough seconds of either way, as measured from 10 to 37 columns and from 10,000 to 400,000 rows. They only choose.


def covering_seconds(rows: int, columns: int, size: int, fits: float, folds: int) -> float:
    """fits: columns that a block can hold. A cover takes about three times the fewest blocks there could be."""
    blocks = max(1.0, _choose(columns, size) / max(1.0, _choose(min(fits, columns), size) / 3.0))
    return blocks * (0.004 * (1.4 if folds > 1 else 1.0) + 14e-9 * rows)


def walking_seconds(rows: int, columns: int, size: int, levels: int, folds: int) -> float:
    """levels: of all columns together."""
    wide = levels**2 * 2.0 / (size * (size + 1.0))  # one-hot columns after a prefix, squared
    return _choose(columns, max(size - 2, 0)) * (0.001 * (2.0 if folds > 1 else 1.0) + rows * (60e-9 + 4e-11 * wide))


def _choose(n: float, k: int) -> float:
    """n choose k for any real n; 0 below k."""
    return float(np.exp(lgamma(n + 1) - lgamma(k + 1) - lgamma(n - k + 1))) if n >= k else 0.0
