"""Joint counts of every set of columns up to a size, by blocks of columns counted once and summed down."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations
from math import comb, prod

import numpy as np
from numpy.typing import NDArray

from engine.records.joint import LARGEST, Block, Floats, Ints, Tally, kept, numbered, rank, single, tallied

BLOCK_CELLS = 65_536  # joint levels of the columns in a block
MOST_COLUMNS = 62  # sets are bits of one integer
_ROWS = 524_288  # rows coded at once
_WORTH = 3  # rows to a distinct configuration that make it worth adding them up first


@dataclass(frozen=True)
class _Set:
    """columns: ascending.  mask: the same as bits.  cells: joint levels."""

    columns: tuple[int, ...]
    mask: int
    cells: int


class Cover:
    """Blocks of columns that hold every set between them; smaller sets are sums over a block's other columns.

    codes: (rows, columns).  levels: of each column.  fold: (rows,) 0 to folds - 1.
    size: of the largest sets, 1 or more.  tick: hears the fraction done.
    weights: (rows,) what each row counts for, None for one each.
    """

    def __init__(
        self,
        codes: Ints,
        levels: Sequence[int],
        fold: Ints,
        folds: int,
        size: int,
        tick: Callable[[float], None],
        weights: Floats | None = None,
    ) -> None:
        self.levels = tuple(levels)
        self.folds = folds
        self.size = size
        self.tick = tick
        self.total = sum(comb(len(self.levels), each) for each in range(1, size + 1))
        self.done = 0
        self.columns, self.fold, self.weights = self._compressed(codes, fold, weights)

    def _compressed(
        self, codes: Ints, fold: Ints, weights: Floats | None
    ) -> tuple[list[NDArray[np.int32]], NDArray[np.int32], Ints | Floats | None]:
        """The columns and the fold of every row, or of every distinct configuration with the rows that have it.

        Last what each of them counts for.
        """
        number, reach = fold, self.folds
        for column, levels in enumerate(self.levels):
            if reach * levels >= 2**62:
                number, seen = numbered(number, reach)
                reach = seen.size
            number = number * levels + codes[:, column]
            reach *= levels
            self.tick(0.0)
        together: Ints | Floats
        if weights is None:
            _, first, together = np.unique(number, return_index=True, return_counts=True)
        else:
            _, first, place = np.unique(number, return_index=True, return_inverse=True)
            together = np.bincount(place, weights)
        self.tick(0.0)
        few = first.size * _WORTH <= fold.size
        chosen = first if few else slice(None)
        columns = [codes[chosen, column].astype(np.int32) for column in range(len(self.levels))]
        return columns, fold[chosen].astype(np.int32), together if few else weights

    def blocks(self) -> Iterator[Block]:
        """Every set of 1 to `size` columns with at most LARGEST joint levels."""
        sets: list[_Set] = []
        for size in range(self.size, 0, -1):
            for columns in combinations(range(len(self.levels)), size):
                cells = prod(self.levels[column] for column in columns)
                if cells <= LARGEST:
                    sets.append(_Set(columns, sum(1 << column for column in columns), cells))
            self.tick(0.0)
        masks = np.asarray([each.mask for each in sets], dtype=np.int64)
        self.done = self.total - len(sets)
        left = np.arange(len(sets))
        while left.size:
            first = sets[left[0]]
            if first.cells > BLOCK_CELLS:
                yield self._alone(first)
                left = left[1:]
                self.done += 1
            else:
                chosen, inside = self._grown(first, masks[left])
                yield from self._summed_down(chosen, [sets[place] for place in left[inside]])
                left = left[~inside]
                self.done += int(inside.sum())
            self.tick(self.done / self.total)

    def _grown(self, first: _Set, masks: Ints) -> tuple[tuple[int, ...], NDArray[np.bool_]]:
        """A block around `first`: columns are added that complete most sets for the cells they cost.

        masks: of the sets not yet counted.  Returns the block's columns and which of the sets it holds.
        """
        block, cells = first.mask, first.cells
        outside = masks & ~block
        while True:
            lacking = outside[(outside != 0) & (outside & (outside - 1) == 0)]
            completed = np.bincount(np.log2(lacking).astype(np.int64), minlength=len(self.levels))
            fits = [c for c, levels in enumerate(self.levels) if completed[c] and cells * levels <= BLOCK_CELLS]
            if not fits:
                columns = tuple(column for column in range(len(self.levels)) if block >> column & 1)
                return columns, outside == 0
            best = max(fits, key=lambda column: float(completed[column] / np.log(self.levels[column] + 0.5)))
            block |= 1 << best
            cells *= self.levels[best]
            outside &= ~np.int64(1 << best)

    def _coded(self, columns: Sequence[int]) -> Ints | Floats:
        """(joint levels x folds,) what every cell counts; the last column and the fold vary fastest."""
        reach = prod(self.levels[column] for column in columns) * self.folds
        counts = tallied(np.empty(0, dtype=np.int32), None if self.weights is None else self.weights[:0], reach)
        for low in range(0, self.fold.size, _ROWS):
            part = slice(low, low + _ROWS)
            code = self.columns[columns[0]][part].copy()
            for column in columns[1:]:
                code *= self.levels[column]
                code += self.columns[column][part]
            if self.folds > 1:
                code *= self.folds
                code += self.fold[part]
            counts += tallied(code, None if self.weights is None else self.weights[part], reach)
            self.tick(self.done / self.total)
        return counts

    def _summed_down(self, columns: tuple[int, ...], sets: list[_Set]) -> Iterator[Block]:
        ordered = sorted(columns, key=lambda column: -self.levels[column])  # the first are summed out first
        table = kept(self._coded(ordered))
        found: list[tuple[_Set, Tally]] = []
        self._margins(table.reshape(1, -1, self.folds), ordered, sets, found)
        for size in sorted({len(each.columns) for each, _ in found}):
            members = [(each, counts) for each, counts in found if len(each.columns) == size]
            cells = np.asarray([each.cells for each, _ in members], dtype=np.int64)
            together = np.concatenate([counts for _, counts in members]).T
            yield Block(
                size,
                np.asarray([rank(each.columns) for each, _ in members], dtype=np.int64),
                cells,
                np.cumsum(cells) - cells,
                np.ascontiguousarray(together)[:, None, :],
            )

    def _margins(
        self,
        table: Tally,
        undecided: list[int],
        sets: list[_Set],
        found: list[tuple[_Set, Tally]],
    ) -> None:
        """Sum columns out one by one.

        table: (cells of the columns kept, cells of the undecided ones, folds).
        sets: those that hold every column kept, none that is summed out.
        """
        if not undecided:
            found.extend((each, table.reshape(-1, self.folds)) for each in sets)
            return
        column, rest = undecided[0], undecided[1:]
        keep = [each for each in sets if each.mask >> column & 1]
        drop = [each for each in sets if not each.mask >> column & 1]
        above, levels = table.shape[0], self.levels[column]
        if keep:
            self._margins(table.reshape(above * levels, -1, self.folds), rest, keep, found)
        if drop:
            parts = table.reshape(above, levels, -1)
            summed = parts[:, 0] + parts[:, 1] if levels > 1 else parts[:, 0]
            for level in range(2, levels):
                summed += parts[:, level]
            self._margins(summed.reshape(above, -1, self.folds), rest, drop, found)

    def _alone(self, chosen: _Set) -> Block:
        """A set too large for a block: number its occupied cells and count them."""
        code = self.columns[chosen.columns[0]].astype(np.int64)
        for column in chosen.columns[1:]:
            code *= self.levels[column]
            code += self.columns[column]
        number, seen = numbered(code, chosen.cells)
        return single(chosen.columns, chosen.cells, number, seen.size, self.fold, self.folds, self.weights)
