"""Joint counts of every set of columns up to a size, by products of one-hot columns."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import comb

import numpy as np
from numpy.typing import NDArray

from engine.records.joint import LARGEST, Block, Floats, Ints, Tally, numbered, one_set, rank, single, tallied
from engine.records.layouts import Layout, laid_out

_BLOCK = 2_000_000  # counts in a block, so that memory stays flat
_HELD = 16_000_000  # entries of a prefix's products that are kept for the prefixes below it
_AT_ONCE = 8_000_000  # one-hot entries turned into floats together
_SHORT = 500  # rows to a product below which two copies multiply faster than one by itself
_ONE_HOT = 256_000_000  # bytes of one-hot columns; the widest columns beyond it are counted by their codes

Products = NDArray[np.floating]


@dataclass(frozen=True)
class _Node:
    """The records split by the levels of a prefix of columns.

    number: (rows,) which occupied cell each record is in; empty at the ends of prefixes that are read off products.
    occupied: how many cells hold a record.  cells: joint levels.
    layout: the later columns that are counted by products, None when there are none.
    products: (folds, occupied cells, one-hot columns, the same), None when they are not kept.
    """

    prefix: tuple[int, ...]
    number: Ints
    occupied: int
    cells: int
    layout: Layout | None
    products: Products | None


class Walk:
    """Depth first over prefixes of size - 2 columns; the last two columns of every set come from matrix products.

    The records of one cell of a prefix, one-hot, times themselves give the counts of all pairs of later columns in
    that cell. Products of 0 and 1 in float32 are exact below 2^24 rows. The cell of a column's commonest level is the
    cell above it less its other cells, so most records are never multiplied again.

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
        self.codes = codes
        self.fold = fold
        self.folds = folds
        self.size = size
        self.tick = tick
        self.weights = weights
        self.rows, self.columns = codes.shape
        self.levels = np.asarray(levels, dtype=np.int64)
        self.kept = _within_budget(self.levels, self.rows)
        self.first = np.zeros(self.columns + 1, dtype=np.int64)  # where a column begins in `one_hot`
        self.first[1:] = np.cumsum(np.where(self.kept, self.levels, 0))
        self.exact = np.float32 if self.rows < 2**24 and weights is None else np.float64
        self.one_hot = np.zeros((self.rows, int(self.first[-1])), dtype=np.uint8)
        for column in np.flatnonzero(self.kept):
            self.one_hot[np.arange(self.rows), self.first[column] + codes[:, column]] = 1
        self.commonest = [int(np.bincount(codes[:, column]).argmax()) for column in range(self.columns)]
        self.others = [np.flatnonzero(codes[:, column] != self.commonest[column]) for column in range(self.columns)]
        self.other_codes = [codes[rows, column] for column, rows in enumerate(self.others)]
        self.layouts: dict[tuple[bytes, int], Layout] = {}
        self.done = 0
        self.total = comb(self.columns, max(size - 2, 0))

    def blocks(self) -> Iterator[Block]:
        """Every set of 1 to `size` columns with at most LARGEST joint levels."""
        if self.size == 1:
            for column in range(self.columns):
                number, seen = numbered(self.codes[:, column], int(self.levels[column]))
                yield self._single((column,), int(self.levels[column]), number, seen.size)
            return
        number = np.zeros(self.rows, dtype=np.int64)
        layout = self._layout((), 1, 1)
        products = None
        if layout is not None and self._holds(layout, 1):
            products = self._multiplied(layout, number, np.arange(self.rows), 0, 1)
        yield from self._below(_Node((), number, 1, 1, layout, products))

    def _below(self, node: _Node) -> Iterator[Block]:
        """Every set that begins with the node's prefix, itself excepted."""
        if len(node.prefix) == self.size - 2:
            yield from self._ends(node)
            self.done += 1
            self.tick(self.done / self.total)
            return
        for column in range(node.prefix[-1] + 1 if node.prefix else 0, self.columns):
            if node.cells * self.levels[column] <= LARGEST:
                lower, counts = self._lower(node, column)
                yield one_set(lower.prefix, lower.cells, counts)
                yield from self._below(lower)

    def _lower(self, node: _Node, column: int) -> tuple[_Node, NDArray[np.number]]:
        """The node's cells split by one more column, and (folds, occupied cells) what they count."""
        levels = int(self.levels[column])
        prefix, cells = (*node.prefix, column), node.cells * levels
        if node.products is None or node.layout is None or not node.layout.holds(column):
            number, seen = numbered(node.number * levels + self.codes[:, column], node.occupied * levels)
            layout = self._layout(prefix, cells, seen.size)
            products = None
            if layout is not None and self._holds(layout, seen.size):
                products = self._multiplied(layout, number, np.arange(self.rows), 0, seen.size)
            counts = tallied(self.fold * seen.size + number, self.weights, self.folds * seen.size)
            return _Node(prefix, number, seen.size, cells, layout, products), counts.reshape(self.folds, -1)
        own = node.layout.own(column)
        every = node.products[:, :, own, own].reshape(self.folds, -1)
        seen = np.flatnonzero(every.any(axis=0))
        place = np.zeros(every.shape[1], dtype=np.int64)
        place[seen] = np.arange(seen.size)
        layout = self._layout(prefix, cells, seen.size)
        held = layout is not None and self._holds(layout, seen.size)
        number = np.empty(0, dtype=np.int64)
        if not held or len(prefix) < self.size - 2 or not self._all_dense(layout, prefix, cells):
            number = place[node.number * levels + self.codes[:, column]]
        products = None
        if layout is not None and held:
            others = self.others[column]
            into = place[node.number[others] * levels + self.other_codes[column]]
            products = self._multiplied(layout, into, others, 0, seen.size)
            self._subtract(products, layout, node.products, node.layout, seen, column)
        return _Node(prefix, number, seen.size, cells, layout, products), self._tally(every[:, seen])

    def _all_dense(self, layout: Layout | None, prefix: tuple[int, ...], cells: int) -> bool:
        return layout is not None and layout.one.columns.shape[1] == self._later(prefix, cells).size

    def _ends(self, node: _Node) -> Iterator[Block]:
        """Sets of the prefix and one or two later columns."""
        later = self._later(node.prefix, node.cells)
        dense = np.zeros(later.size, dtype=np.bool_)
        if node.layout is not None:
            dense = np.isin(later, node.layout.one.columns[0])
            yield from self._by_products(node, node.layout)
        for column in later[~dense]:
            yield from self._by_codes(node, int(column), later[later > column], alone=True)
            self.tick(self.done / self.total)
        for column in later[dense]:
            yield from self._by_codes(node, int(column), later[(later > column) & ~dense], alone=False)
            self.tick(self.done / self.total)

    def _by_products(self, node: _Node, layout: Layout) -> Iterator[Block]:
        step = max(1, _BLOCK // (self.folds * layout.places.size**2))
        for low in range(0, node.occupied, step):
            high = min(low + step, node.occupied)
            if low:
                self.tick(self.done / self.total)
            if node.products is None:
                products = self._multiplied(layout, node.number, np.arange(self.rows), low, high)
            else:
                products = node.products[:, low:high]
            flat = products.reshape(self.folds, high - low, -1)
            for more in (layout.one, layout.two):
                if more.levels.size:
                    yield Block(
                        len(node.prefix) + more.columns.shape[0],
                        rank(node.prefix) + more.ranks,
                        node.cells * more.levels,
                        more.starts,
                        self._tally(np.take(flat, more.entries, axis=2)),
                    )

    def _by_codes(self, node: _Node, column: int, others: Ints, alone: bool) -> Iterator[Block]:
        """Sets too sparse for products: number the occupied cells and count them."""
        if not alone and not others.size:
            return
        levels = int(self.levels[column])
        prefix, cells = (*node.prefix, column), node.cells * levels
        number, seen = numbered(node.number * levels + self.codes[:, column], node.occupied * levels)
        if alone:
            yield self._single(prefix, cells, number, seen.size)
        for other in others:
            more = int(self.levels[other])
            if cells * more <= LARGEST:
                both, found = numbered(number * more + self.codes[:, other], seen.size * more)
                yield self._single((*prefix, int(other)), cells * more, both, found.size)

    def _single(self, columns: tuple[int, ...], cells: int, number: Ints, occupied: int) -> Block:
        """One set, from the numbers of its occupied cells."""
        return single(columns, cells, number, occupied, self.fold, self.folds, self.weights)

    def _tally(self, products: Products) -> Tally:
        """Products are floats also where they count whole records."""
        return products.astype(np.int32) if self.weights is None else products.astype(np.float64, copy=False)

    def _multiplied(self, layout: Layout, number: Ints, rows: Ints, low: int, high: int) -> Products:
        """(folds, high - low, one-hot columns, the same) products of the given rows, numbered, in cells low to high."""
        products = np.zeros((self.folds, high - low, layout.places.size, layout.places.size), dtype=self.exact)
        group = number * self.folds + self.fold[rows]
        if high * self.folds <= 2**15:
            group = group.astype(np.int16)  # numpy sorts these by radix, ten times faster
        by_group = rows[np.argsort(group, kind="stable")]
        bounds = np.concatenate([[0], np.cumsum(np.bincount(group, minlength=high * self.folds))])
        begin, end = int(bounds[low * self.folds]), int(bounds[high * self.folds])
        edges = (bounds[low * self.folds : high * self.folds + 1] - begin).tolist()
        hot: NDArray[np.number] = self.one_hot.take(by_group[begin:end], axis=0)[:, layout.used]
        whole = hot.size <= _AT_ONCE
        if whole:
            hot = hot.astype(self.exact)
        twin = hot
        if whole and self.weights is not None:
            twin = hot * self.weights[by_group[begin:end], None]
        elif whole and hot.shape[0] < _SHORT * len(edges):
            twin = hot.copy()
        for place, (start, stop) in enumerate(pairwise(edges)):
            if start < stop:
                part, same = hot[start:stop], twin[start:stop]
                if not whole:
                    part = same = part.astype(self.exact)
                    if self.weights is not None:
                        same = part * self.weights[by_group[begin + start : begin + stop], None]
                np.matmul(part.T, same, out=products[place % self.folds, place // self.folds])
        return products

    def _subtract(
        self, products: Products, layout: Layout, above: Products, wider: Layout, seen: Ints, column: int
    ) -> None:
        """Fill in the cells of the column's commonest level: the cell above less its other cells.

        products: nothing yet in those cells.  seen: (occupied cells,) cell above x levels + level, ascending.
        """
        owner, level = np.divmod(seen, int(self.levels[column]))
        cells = np.flatnonzero(level == self.commonest[column])
        inside = np.searchsorted(wider.places, layout.places)
        together = int(inside[-1] - inside[0] + 1) == inside.size
        used = slice(int(inside[0]), int(inside[-1]) + 1)
        first = np.searchsorted(owner, owner[cells])
        last = np.searchsorted(owner, owner[cells], side="right")
        for cell, low, high in zip(cells.tolist(), first.tolist(), last.tolist(), strict=True):
            whole = above[:, owner[cell], used, used] if together else above[:, owner[cell], inside[:, None], inside]
            others = products[:, low:high].sum(axis=1) if high - low > 2 else products[:, low + high - 1 - cell]
            np.subtract(whole, others, out=products[:, cell])

    def _holds(self, layout: Layout, occupied: int) -> bool:
        return self.folds * occupied * layout.places.size**2 <= _HELD

    def _later(self, prefix: tuple[int, ...], cells: int) -> Ints:
        later = np.arange(prefix[-1] + 1 if prefix else 0, self.columns)
        return later[cells * self.levels[later] <= LARGEST]

    def _layout(self, prefix: tuple[int, ...], cells: int, occupied: int) -> Layout | None:
        """The later columns whose products have fewer entries than the codes would have work, or None."""
        later = self._later(prefix, cells)
        most = min(max(4 * self.rows, 10_000), 65_536)
        dense = later[self.kept[later] & (occupied * self.levels[later] ** 2 <= most)]
        if not dense.size:
            return None
        limit = LARGEST // cells
        widest = np.sort(self.levels[dense])[-2:]
        key = (dense.tobytes(), 0 if int(np.prod(widest)) <= limit else limit)
        if key not in self.layouts:
            self.layouts[key] = laid_out(self.levels, self.first, dense, limit, self.size - 2)
        return self.layouts[key]


def _within_budget(levels: Ints, rows: int) -> NDArray[np.bool_]:
    """Columns that are held one-hot: all, or the narrowest that fit."""
    narrow = np.argsort(levels, kind="stable")
    fits = np.cumsum(levels[narrow]) * rows <= _ONE_HOT
    kept = np.zeros(levels.size, dtype=np.bool_)
    kept[narrow[fits]] = True
    return kept
