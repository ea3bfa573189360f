"""How often levels occur together: all that learning sees of the records.

`Counts` is the seam for tables that outgrow memory; `ArrayCounts` is the embedded implementation on numpy.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from math import comb
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

LARGEST = 1_000_000  # configurations of a family; larger ones are left out of learning
_BLOCK = 2_000_000  # counts in a block at most, to keep memory flat
_ONE_HOT_BYTES = 256_000_000

Ints = NDArray[np.int64]


def rank(columns: Sequence[int]) -> int:
    """Position of an ascending set of columns among all of its size, in colexicographic order (Knuth 2011, 7.2.1.3)."""
    return sum(comb(column, place + 1) for place, column in enumerate(columns))


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
        size = min(size, len(self.levels))
        walk = _Walk(self, size, tick or (lambda fraction: None))
        yield Block(
            0,
            _ints([0]),
            _ints([1]),
            _ints([0]),
            np.bincount(self.fold, minlength=self.folds).astype(np.int32)[:, None, None],
        )
        if size == 1:
            for column in range(len(self.levels)):
                yield walk.alone(column)
        elif size > 1:
            yield from walk.below((), np.zeros(self.rows, dtype=np.int64), 1, 1)


class _Walk:
    """Depth-first over prefixes of size - 2 columns; the last two columns of every set come from Gram matrices.

    The rows of each cell of a prefix (and fold) give one matrix product of one-hot columns: it holds the counts of
    all pairs of later columns within that cell. Products of 0 and 1 in float32 are exact below 2^24 rows.
    """

    def __init__(self, records: ArrayCounts, size: int, tick: Callable[[float], None]) -> None:
        self.records = records
        self.size = size
        self.tick = tick
        self.columns = len(records.levels)
        self.levels = np.asarray(records.levels, dtype=np.int64)
        self.kept = _within_budget(self.levels, records.rows)
        self.first = np.full(self.columns + 1, 0, dtype=np.int64)  # where a column begins in `one_hot`
        self.first[1:] = np.cumsum(np.where(self.kept, self.levels, 0))
        self.exact = np.float32 if records.rows < 2**24 else np.float64
        self.one_hot = np.zeros((records.rows, int(self.first[-1])), dtype=np.uint8)
        for column in np.flatnonzero(self.kept):
            self.one_hot[np.arange(records.rows), self.first[column] + records.codes[:, column]] = 1
        self.choose = [
            np.asarray([comb(n, k) for n in range(self.columns + 1)], dtype=np.int64) for k in range(size + 1)
        ]
        self.layouts: dict[tuple[bytes, int], _Layout] = {}
        self.done = 0
        self.total = comb(self.columns, max(size - 2, 0))

    def below(self, prefix: tuple[int, ...], code: Ints, cells: int, occupied: int) -> Iterator[Block]:
        """Blocks of every set that begins with `prefix`, itself excepted. code: (rows,) occupied cells by number."""
        if len(prefix) == self.size - 2:
            yield from self._ends(prefix, code, cells, occupied)
            self.done += 1
            self.tick(self.done / self.total)
            return
        for column in range(prefix[-1] + 1 if prefix else 0, self.columns):
            wider = cells * int(self.levels[column])
            if wider > LARGEST:
                continue
            within = code * self.levels[column] + self.records.codes[:, column]
            number, seen = _numbered(within, occupied * int(self.levels[column]))
            yield self._single((*prefix, column), wider, number, seen)
            yield from self.below((*prefix, column), number, wider, seen)

    def alone(self, column: int) -> Block:
        number, seen = _numbered(self.records.codes[:, column], int(self.levels[column]))
        return self._single((column,), int(self.levels[column]), number, seen)

    def _single(self, columns: tuple[int, ...], cells: int, number: Ints, seen: int) -> Block:
        """One set, from the numbers of its occupied cells."""
        folds = self.records.folds
        counts = np.bincount(self.records.fold * seen + number, minlength=folds * seen)
        counted: NDArray[np.int32] = counts.reshape(folds, 1, seen).astype(np.int32)
        return Block(len(columns), _ints([rank(columns)]), _ints([cells]), _ints([0]), counted)

    def _ends(self, prefix: tuple[int, ...], code: Ints, cells: int, occupied: int) -> Iterator[Block]:
        """Sets of `prefix` and one or two later columns."""
        later = np.arange(prefix[-1] + 1 if prefix else 0, self.columns)
        later = later[cells * self.levels[later] <= LARGEST]
        dense_limit = min(max(4 * self.records.rows, 10_000), 65_536)
        dense = self.kept[later] & (occupied * self.levels[later] ** 2 <= dense_limit)
        if dense.any():
            yield from self._by_products(prefix, code, cells, occupied, later[dense])
        for column in later[~dense]:
            yield from self._by_codes(prefix, code, cells, occupied, int(column), later[later > column])
        for column in later[dense]:
            others = later[(later > column) & ~dense]
            if others.size:
                yield from self._by_codes(prefix, code, cells, occupied, int(column), others, pairs_only=True)

    def _by_products(
        self, prefix: tuple[int, ...], code: Ints, cells: int, occupied: int, later: Ints
    ) -> Iterator[Block]:
        folds = self.records.folds
        layout = self._layout(later, cells)
        places = layout.places
        together = int(places[-1] - places[0] + 1) == places.size
        used = slice(int(places[0]), int(places[-1]) + 1) if together else places
        group = code * folds + self.records.fold
        if occupied * folds <= 2**15:
            group = group.astype(np.int16)  # numpy sorts these by radix, ten times faster
        by_group = np.argsort(group, kind="stable")
        bounds = np.concatenate([[0], np.cumsum(np.bincount(group, minlength=occupied * folds))])
        step = max(1, _BLOCK // (folds * places.size**2))
        for low in range(0, occupied, step):
            high = min(low + step, occupied)
            products = np.zeros((folds, high - low, places.size, places.size), dtype=self.exact)
            rows = by_group[bounds[low * folds] : bounds[high * folds]]
            hot = self.one_hot.take(rows, axis=0)[:, used]
            for cell in range(low, high):
                for fold in range(folds):
                    start, stop = bounds[cell * folds + fold : cell * folds + fold + 2] - bounds[low * folds]
                    if start < stop:
                        part = hot[start:stop].astype(self.exact)
                        np.matmul(part.T, part, out=products[fold, cell - low])
            flat = products.reshape(folds, high - low, -1)
            for more in (layout.one, layout.two):
                if more.levels.size:
                    yield Block(
                        len(prefix) + more.columns.shape[0],
                        rank(prefix) + self._further(len(prefix), more.columns),
                        cells * more.levels,
                        more.starts,
                        np.take(flat, more.entries, axis=2).astype(np.int32),
                    )

    def _further(self, depth: int, columns: Ints) -> Ints:
        """What each column of (more columns, sets) adds to the rank of a prefix of `depth` smaller ones."""
        added = sum(self.choose[depth + 1 + place][column] for place, column in enumerate(columns))
        return np.asarray(added, dtype=np.int64)

    def _layout(self, later: Ints, cells: int) -> _Layout:
        limit = LARGEST // cells
        widest = np.sort(self.levels[later])[-2:]
        key = (later.tobytes(), 0 if int(np.prod(widest)) <= limit else limit)
        if key not in self.layouts:
            self.layouts[key] = _layout(self.levels, self.first, later, limit)
        return self.layouts[key]

    def _by_codes(
        self,
        prefix: tuple[int, ...],
        code: Ints,
        cells: int,
        occupied: int,
        column: int,
        others: Ints,
        pairs_only: bool = False,
    ) -> Iterator[Block]:
        """Sets too sparse for products: number the occupied cells and count them."""
        wider = code * self.levels[column] + self.records.codes[:, column]
        reach = cells * int(self.levels[column])
        number, seen = _numbered(wider, occupied * int(self.levels[column]))
        if not pairs_only:
            yield self._single((*prefix, column), reach, number, seen)
        for other in others:
            joint = reach * int(self.levels[other])
            if joint <= LARGEST:
                both = number * self.levels[other] + self.records.codes[:, other]
                yield self._single(
                    (*prefix, column, int(other)), joint, *_numbered(both, seen * int(self.levels[other]))
                )


@dataclass(frozen=True)
class _Further:
    """Sets of one or of two later columns inside a product.

    columns: (1 or 2, sets).  levels: (sets,) joint levels of those columns.  entries: where their counts are in a
    flattened product, set by set.  starts: (sets,) where each set begins among the entries.
    """

    columns: Ints
    levels: Ints
    entries: Ints
    starts: Ints


@dataclass(frozen=True)
class _Layout:
    """places: one-hot columns that make up a product.  one, two: what to read off it."""

    places: Ints
    one: _Further
    two: _Further


def _layout(all_levels: Ints, begins: Ints, later: Ints, limit: int) -> _Layout:
    """limit: most joint levels of two columns."""
    levels = all_levels[later]
    first = np.cumsum(levels) - levels
    wide = int(levels.sum())
    places = np.concatenate([np.arange(begins[column], begins[column] + all_levels[column]) for column in later])
    one = _Further(later[None, :], levels, np.arange(wide) * (wide + 1), first)
    a, b = np.triu_indices(later.size, 1)
    small = levels[a] * levels[b] <= limit
    a, b = a[small], b[small]
    joint = levels[a] * levels[b]
    starts = np.cumsum(joint) - joint
    within = np.arange(joint.sum()) - np.repeat(starts, joint)
    width = np.repeat(levels[b], joint)
    entries = (np.repeat(first[a], joint) + within // width) * wide + np.repeat(first[b], joint) + within % width
    return _Layout(places, one, _Further(np.stack([later[a], later[b]]), joint, entries, starts))


def _ints(values: Sequence[int]) -> Ints:
    return np.asarray(values, dtype=np.int64)


def _within_budget(levels: Ints, rows: int) -> NDArray[np.bool_]:
    """Columns that are held one-hot: all, or the narrowest that fit."""
    narrow = np.argsort(levels, kind="stable")
    fits = np.cumsum(levels[narrow]) * rows <= _ONE_HOT_BYTES
    kept = np.zeros(levels.size, dtype=np.bool_)
    kept[narrow[fits]] = True
    return kept


def _numbered(code: Ints, reach: int) -> tuple[Ints, int]:
    """Codes below `reach` renumbered without gaps, and how many there are."""
    if reach <= 8 * code.size + 1024:
        seen = np.bincount(code, minlength=reach) > 0
        number = np.cumsum(seen) - 1
        return number[code], int(number[-1]) + 1
    distinct, number = np.unique(code, return_inverse=True)
    return number.reshape(-1).astype(np.int64), int(distinct.size)
