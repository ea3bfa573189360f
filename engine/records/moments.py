"""Sums, squares and products of number columns inside every configuration of the categories."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import combinations
from math import comb, prod

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix

from engine.records.joint import LARGEST
from engine.records.steps import recording_step

_ROWS = 16_384  # rows whose products are laid out at once
_HELD = 2_000_000  # sums held at once, so that memory stays flat
_TOGETHER = 60_000  # sums that one sparse product fills: they and a row of products stay in a core's own cache

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Numbers:
    """Number columns, measured from `centre` in units of `scale`.

    columns: (numbers,) positions among all columns, ascending.  values: (rows, numbers) float64, standardised.
    centre, scale, step: (numbers,) in each column's own units; `step` is what it was recorded to, 0 for finely.
    """

    columns: tuple[int, ...]
    values: Floats
    centre: Floats
    scale: Floats
    step: Floats

    @classmethod
    def standardised(
        cls,
        columns: Sequence[int],
        values: Floats,
        weights: Floats | None = None,
        still: Callable[[], None] = lambda: None,
    ) -> Numbers:
        """(rows, numbers) `values` in their own units, finite, each column of more than one value.

        weights: (rows,) what each record counts for, None for 1.  still: called often, a chance to cancel.
        """
        values = np.asfortranarray(np.asarray(values, dtype=np.float64).reshape(-1, len(columns)))
        if not np.isfinite(values).all():
            raise AssertionError("a number with blanks is taken as bands before it comes here")
        equal = weights is None or bool((weights == weights[0]).all())
        standard = np.empty_like(values)
        centre, scale, step = (np.empty(len(columns)) for _ in range(3))
        for place in range(len(columns)):
            column = values[:, place]
            centre[place] = column.mean() if equal else np.average(column, weights=weights)
            away = column - centre[place]
            scale[place] = np.sqrt((away * away).mean() if equal else np.average(away * away, weights=weights))
            standard[:, place] = away
            step[place] = recording_step(column, still)
            still()
        if not (scale > 0.0).all():
            raise AssertionError("a number with a single value is refused before it comes here")
        standard /= scale
        return cls(tuple(columns), standard, centre, scale, step)

    @property
    def rounding(self) -> Floats:
        """(numbers,) variance that rounding to the step adds, standardised: step^2 / 12 (Sheppard 1898)."""
        return np.asarray((self.step / self.scale) ** 2 / 12.0)


@dataclass(frozen=True, eq=False)
class Sums:
    """Sums over the records of each configuration, for several sets of equally many categories.

    sets: (sets, categories) positions among all columns.  starts: (sets,) where each begins on the last axis.
    count: (folds, configurations) records.  first: (numbers, folds, configurations) sums.
    second: (products, folds, configurations): all pairs i <= j, a row of the upper triangle after the other, when
    `pairs`; else the squares only.
    Configurations without records are left out, and a set may come in several pieces, each with its own.
    """

    sets: Ints
    starts: Ints
    pairs: bool
    count: Floats
    first: Floats
    second: Floats


@dataclass(frozen=True, eq=False)
class FamilySums:
    """Sums of one family: a number, its category parents and its number parents.

    levels: of each category parent.  columns: the number parents, then the child, as positions among `Numbers`.
    products: (folds, configurations, terms, terms) sums of the products of (1, number parents, child), standardised;
    every configuration, the last category parent fastest.
    """

    levels: tuple[int, ...]
    columns: tuple[int, ...]
    products: Floats
    numbers: Numbers

    def part(self, part: int) -> Floats:
        """(configurations, terms, terms) from all records when `part` is 0, else from all but fold `part` - 1."""
        whole = self.products.sum(axis=0)
        return np.asarray(whole if part == 0 else whole - self.products[part - 1])

    def exact(self, records: int, tolerance: float) -> bool:
        """Whether the child follows its number parents exactly throughout a configuration of so many records more.

        tolerance: of the standard deviation, what rounding to float leaves.
        """
        whole = self.part(0)
        large = whole[whole[:, 0, 0] >= records + whole.shape[1] - 2]
        if not large.size:
            return False
        inner = large[:, :-1, :-1] / large[:, :1, :1] + tolerance**2 * np.eye(large.shape[1] - 1)
        across = large[:, :-1, -1] / large[:, 0, :1]
        slopes = np.linalg.solve(inner, across[..., None])[..., 0]
        left = large[:, -1, -1] / large[:, 0, 0] - (slopes * across).sum(axis=1)
        return bool((left <= 4.0 * tolerance**2 * (1.0 + (slopes**2).sum(axis=1))).any())


@dataclass(frozen=True, eq=False)
class _Piece:
    """A set of categories with some of its configurations, those numbered `low` to under `high` in `number`."""

    columns: tuple[int, ...]
    number: NDArray[np.int32]  # (joint levels,) which occupied configuration each is
    held: NDArray[np.int32] | None  # (rows,) the same for each record, kept when all rows are one block
    low: int
    high: int
    whole: bool
    last: bool


class ArrayMoments:
    """Moments of records held in memory.

    codes: (rows, columns) level positions; those of number columns are not looked at.  levels: of each column.
    fold: (rows,) 0 to folds - 1, or None for one fold.  weights: (rows,) what each record counts for, or None for 1.
    """

    def __init__(
        self,
        codes: NDArray[np.integer],
        levels: Sequence[int],
        numbers: Numbers,
        fold: NDArray[np.integer] | None = None,
        folds: int = 1,
        weights: Floats | None = None,
    ) -> None:
        self.codes = np.asfortranarray(codes, dtype=np.int32)
        self.levels = tuple(int(level) for level in levels)
        self.numbers = numbers
        self.rows = int(numbers.values.shape[0])
        self.fold = np.zeros(self.rows, dtype=np.int32) if fold is None else np.asarray(fold, dtype=np.int32)
        self.folds = folds
        self.weights = np.ones(self.rows) if weights is None else np.asarray(weights, dtype=np.float64)
        self.categories = tuple(place for place in range(len(self.levels)) if place not in set(numbers.columns))
        self._laid: dict[bool, Floats] = {}

    def blocks(self, size: int, tick: Callable[[float], None] | None = None) -> Iterator[Sums]:
        """Sums for every set of up to `size` - 1 categories, with pairs where two numbers more still fit into `size`.

        Sets with more than LARGEST joint levels are left out. `tick` hears the fraction done.
        """
        numbers = len(self.numbers.columns)
        if numbers == 0:
            return
        hear = tick or (lambda part: None)
        sets = [list(combinations(self.categories, count)) for count in range(min(size - 1, len(self.categories)) + 1)]
        pairs = [size - count >= 2 for count in range(len(sets))]
        costs = [len(each) * (1 + _terms(numbers, wide)) for each, wide in zip(sets, pairs, strict=True)]
        for count, (chosen, wide) in enumerate(zip(sets, pairs, strict=True)):
            before, per_set = sum(costs[:count]), costs[count] / max(len(chosen), 1)
            waiting: list[_Piece] = []
            held, begun = 0, before / sum(costs)
            at = begun
            for piece in self._pieces(chosen, wide):
                hear(begun)
                more = (piece.high - piece.low) * self.folds * _terms(numbers, wide)
                if waiting and held + more > _HELD:
                    yield self._summed(waiting, wide, hear, begun, at)
                    waiting, held, begun = [], 0, at
                waiting.append(piece)
                held += more
                at += per_set / sum(costs) if piece.last else 0.0
            if waiting:
                yield self._summed(waiting, wide, hear, begun, at)
        hear(1.0)

    def part_of(self, rows: Ints) -> ArrayMoments:
        """The same of some rows, standardised as all are, without folds."""
        numbers = replace(self.numbers, values=self.numbers.values[rows])
        return ArrayMoments(self.codes[rows], self.levels, numbers, weights=self.weights[rows])

    def seconds(self, size: int) -> float:
        """Roughly how long `blocks` and the scores of its sums take, for telling progress."""
        numbers, typical = len(self.numbers.columns), 1.0
        if self.categories:
            typical = float(np.exp(np.mean(np.log([self.levels[column] for column in self.categories]))))
        products, cells = 0.0, 0.0
        for count in range(min(size - 1, len(self.categories)) + 1):
            sets = comb(len(self.categories), count)
            products += sets * (1 + _terms(numbers, size - count >= 2))
            subsets = sum(comb(numbers, held) for held in range(1, size - count + 1))
            cells += sets * subsets * min(typical**count, float(self.rows))
        return 1.3e-9 * self.rows * products + 4e-8 * cells * (1 + self.folds)

    def family(self, categories: Sequence[int], numbers: Sequence[int], child: int) -> FamilySums:
        """Sums of the number column `child` and its parents; all three as positions among all columns."""
        places = tuple(self.numbers.columns.index(column) for column in (*numbers, child))
        shape = tuple(self.levels[column] for column in categories)
        configurations = prod(shape)
        if configurations > LARGEST:
            raise AssertionError("a family of so many configurations is left out of learning")
        terms = len(places) + 1
        one, other = np.triu_indices(terms)
        sums = np.zeros((self.folds * configurations, one.size))
        for low in range(0, self.rows, _ROWS):
            high = min(low + _ROWS, self.rows)
            code = self._joint(categories, low, high) + np.int32(configurations) * self.fold[low:high]
            term = np.empty((terms, high - low))
            term[0] = 1.0
            term[1:] = self.numbers.values[low:high, places].T
            laid = np.ascontiguousarray((term[one] * term[other]).T)
            ends = np.arange(high - low + 1, dtype=np.int32)
            sums += csc_matrix((self.weights[low:high], code, ends), shape=(sums.shape[0], high - low)) @ laid
        products = np.empty((sums.shape[0], terms, terms))
        products[:, one, other] = products[:, other, one] = sums
        return FamilySums(shape, places, products.reshape(self.folds, configurations, terms, terms), self.numbers)

    def _joint(self, columns: Sequence[int], low: int, high: int) -> NDArray[np.int32]:
        """(rows low to high,) the joint level of `columns`."""
        code = np.zeros(high - low, dtype=np.int32)
        for column in columns:
            code *= np.int32(self.levels[column])
            code += self.codes[low:high, column]
        return code

    def _pieces(self, sets: Sequence[tuple[int, ...]], pairs: bool) -> Iterator[_Piece]:
        most = max(1, _HELD // (self.folds * _terms(len(self.numbers.columns), pairs)))
        for columns in sets:
            joint = prod(self.levels[column] for column in columns)
            if joint > LARGEST:
                continue
            seen = np.zeros(joint, dtype=np.bool_)
            code = np.empty(0, dtype=np.int32)
            for low in range(0, self.rows, _ROWS):
                code = self._joint(columns, low, min(low + _ROWS, self.rows))
                seen[code] = True
            number = np.cumsum(seen, dtype=np.int32) - np.int32(1)
            occupied = int(number[-1]) + 1
            held = number[code] if self.rows <= _ROWS else None
            for low in range(0, occupied, most):
                high = min(low + most, occupied)
                yield _Piece(columns, number, held, low, high, occupied <= most, high == occupied)

    def _summed(
        self, pieces: Sequence[_Piece], pairs: bool, hear: Callable[[float], None], begun: float, at: float
    ) -> Sums:
        """One pass over the rows for all `pieces`; `hear` is told of fractions from `begun` to `at`."""
        numbers = len(self.numbers.columns)
        sizes = [piece.high - piece.low for piece in pieces]
        starts = np.concatenate([[0], np.cumsum(sizes)])
        sums = np.zeros((int(starts[-1]) * self.folds, _terms(numbers, pairs)))
        for low in range(0, self.rows, _ROWS):
            high = min(low + _ROWS, self.rows)
            laid = self._products(low, high, pairs)
            for first, last in _together(sizes, self.folds * sums.shape[1]):
                begin, end = int(starts[first]) * self.folds, int(starts[last]) * self.folds
                sums[begin:end] += self._placed(pieces[first:last], low, high, end - begin) @ laid
                hear(min(begun + (at - begun) * (low + (high - low) * last / len(pieces)) / self.rows, 1.0))
        by_term = np.ascontiguousarray(sums.reshape(-1, self.folds, sums.shape[1]).transpose(2, 1, 0))
        sets = np.asarray([piece.columns for piece in pieces], dtype=np.int64).reshape(len(pieces), -1)
        return Sums(
            sets, starts[:-1].astype(np.int64), pairs, by_term[0], by_term[1 : 1 + numbers], by_term[1 + numbers :]
        )

    def _placed(self, pieces: Sequence[_Piece], low: int, high: int, places: int) -> csc_matrix:
        """(places, rows) sparse: which sums each record adds to, one a piece."""
        rows = high - low
        where = np.empty((rows, len(pieces)), dtype=np.int32)
        weights = np.repeat(self.weights[low:high], len(pieces)).reshape(rows, len(pieces))
        before = 0
        for place, piece in enumerate(pieces):
            number = piece.number[self._joint(piece.columns, low, high)] if piece.held is None else piece.held
            if not piece.whole:
                outside = (number < piece.low) | (number >= piece.high)
                weights[outside, place] = 0.0
                number = np.where(outside, 0, number - piece.low).astype(np.int32)
            number = (number + np.int32(before)) * np.int32(self.folds)
            number += self.fold[low:high]
            where[:, place] = number
            before += piece.high - piece.low
        ends = np.arange(0, rows * len(pieces) + 1, len(pieces), dtype=np.int32)
        return csc_matrix((weights.reshape(-1), where.reshape(-1), ends), shape=(places, rows))

    def _products(self, low: int, high: int, pairs: bool) -> Floats:
        """(rows, terms): 1, the numbers, their products; kept when they are those of all rows."""
        if pairs in self._laid:
            return self._laid[pairs]
        values = self.numbers.values[low:high]
        numbers = values.shape[1]
        laid = np.empty((high - low, _terms(numbers, pairs)))
        laid[:, 0] = 1.0
        laid[:, 1 : 1 + numbers] = values
        if not pairs:
            np.multiply(values, values, out=laid[:, 1 + numbers :])
        else:
            _pairs(values, laid[:, 1 + numbers :])
        if high - low == self.rows:
            self._laid = {pairs: laid}
        return laid


def _pairs(row: Floats, out: Floats) -> None:
    """Products of all pairs of columns i <= j of `row`, a row of the upper triangle after the other."""
    begin = 0
    for place in range(row.shape[1]):
        end = begin + row.shape[1] - place
        np.multiply(row[:, place : place + 1], row[:, place:], out=out[:, begin:end])
        begin = end


def _terms(numbers: int, pairs: bool) -> int:
    return 1 + numbers + (numbers * (numbers + 1) // 2 if pairs else numbers)


def _together(sizes: Sequence[int], each: int) -> Iterator[tuple[int, int]]:
    """Runs of pieces whose sums, `each` a configuration, fit a core's own cache."""
    first, held = 0, 0
    for place, size in enumerate(sizes):
        if place > first and held + size * each > _TOGETHER:
            yield first, place
            first, held = place, 0
        held += size * each
    if sizes:
        yield first, len(sizes)
