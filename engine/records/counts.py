"""How often levels occur together: all that learning sees of the records.

`Counts` is the seam for tables that outgrow memory; `ArrayCounts` is the embedded implementation on numpy.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from engine.records.joint import LARGEST, Block, Ints, Walk, rank

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

    def family(self, parents: Sequence[int], child: int) -> Ints:
        """(folds, parent levels..., child levels) records."""
        ...


class ArrayCounts:
    """Counts of level positions held in memory.

    codes: (rows, columns) integers, each 0 to levels - 1.  fold: (rows,) 0 to folds - 1, or None for one fold.
    """

    def __init__(
        self, codes: NDArray[np.integer], levels: Sequence[int], fold: NDArray[np.integer] | None = None, folds: int = 1
    ) -> None:
        self.codes = np.asfortranarray(codes, dtype=np.int64)
        self.levels = tuple(int(level) for level in levels)
        self.rows = int(self.codes.shape[0])
        self.fold = np.zeros(self.rows, dtype=np.int64) if fold is None else np.asarray(fold, dtype=np.int64)
        self.folds = folds

    def family(self, parents: Sequence[int], child: int) -> Ints:
        code = self.fold.copy()
        shape = [self.folds]
        for column in (*parents, child):
            code = code * self.levels[column] + self.codes[:, column]
            shape.append(self.levels[column])
        return np.bincount(code, minlength=int(np.prod(shape))).reshape(shape)

    def blocks(self, size: int, tick: Callable[[float], None] | None = None) -> Iterator[Block]:
        one, nought = np.ones(1, dtype=np.int64), np.zeros(1, dtype=np.int64)
        everything = np.bincount(self.fold, minlength=self.folds).astype(np.int32)
        yield Block(0, nought, one, nought, everything[:, None, None])
        size = min(size, len(self.levels))
        if size:
            yield from Walk(self.codes, self.levels, self.fold, self.folds, size, tick or (lambda part: None)).blocks()
