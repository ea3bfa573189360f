"""Counts of every set of columns equal those of plain grouping, whichever way they were counted."""

from itertools import combinations
from math import comb, prod

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.records import covering, products
from engine.records.counts import LARGEST, ArrayCounts, covering_seconds, rank, walking_seconds
from engine.records.covering import Cover
from engine.records.products import Walk


def some_records(seed, rows, levels):
    rng = np.random.default_rng(seed)
    codes = np.stack([rng.integers(0, count, rows) for count in levels], axis=1)
    return codes, rng.permutation(np.arange(rows) % 5)


WAYS = [Cover, Walk]


def by_way(way, codes, levels, fold, folds, size):
    """As `gathered`, in one way whatever is cheaper."""
    size = min(size, len(levels))
    return gathered(ArrayCounts(codes, levels, fold, folds), size, way(codes, levels, fold, folds, size, abs).blocks())


def gathered(counts, size, blocks=None):
    """Set -> sorted list of (count in each fold) over its occupied cells, from the blocks."""
    columns = len(counts.levels)
    names = {(each, rank(chosen)): chosen for each in range(size + 1) for chosen in combinations(range(columns), each)}
    found: dict[tuple[int, ...], list[tuple[int, ...]]] = {}
    for block in counts.blocks(size) if blocks is None else blocks:
        ends = [*block.starts[1:], block.counts.shape[2]]
        for place, (start, end) in enumerate(zip(block.starts, ends, strict=True)):
            chosen = names[block.size, int(block.ranks[place])]
            assert block.cells[place] == prod(counts.levels[column] for column in chosen)
            cells = block.counts[:, :, start:end].reshape(counts.folds, -1)
            found.setdefault(chosen, []).extend(tuple(map(int, cell)) for cell in cells.T if cell.any())
    return {chosen: sorted(cells) for chosen, cells in found.items()}


def grouped(codes, fold, folds, chosen):
    frame = pd.DataFrame(codes).assign(fold=fold, cell=0)
    seen = frame.groupby([*chosen, "cell", "fold"]).size().unstack("fold", fill_value=0)
    seen = seen.reindex(columns=range(folds), fill_value=0)
    return sorted(tuple(int(count) for count in row) for row in seen.to_numpy())


@settings(max_examples=14, deadline=None)
@given(
    st.integers(0, 2**32 - 1),
    st.integers(30, 90),
    st.lists(st.sampled_from([2, 3, 4, 7, 50]), min_size=1, max_size=6),
    st.integers(1, 6),
    st.sampled_from([1, 5]),
)
def test_every_set_is_counted_as_pandas_groups_it(seed, rows, levels, size, folds):
    codes, fold = some_records(seed, rows, levels)
    fold = fold if folds > 1 else np.zeros(rows, dtype=np.int64)
    wanted = [
        chosen
        for each in range(min(size, len(levels)) + 1)
        for chosen in combinations(range(len(levels)), each)
        if prod(levels[column] for column in chosen) <= LARGEST
    ]
    truth = {chosen: grouped(codes, fold, folds, list(chosen)) for chosen in wanted}
    assert gathered(ArrayCounts(codes, levels, fold, folds), size) == truth
    del truth[()]
    for way in WAYS:
        assert by_way(way, codes, levels, fold, folds, size) == truth


@pytest.mark.parametrize("limit", ["_BLOCK", "_HELD", "_ONE_HOT"])
def test_the_limits_of_products_do_not_change_the_counts(monkeypatch, limit):
    levels = [2, 3, 4, 5, 3]
    codes, fold = some_records(1, 400, levels)
    before = by_way(Walk, codes, levels, fold, 5, 4)
    monkeypatch.setattr(products, limit, 400 * 7)
    assert by_way(Walk, codes, levels, fold, 5, 4) == before


@pytest.mark.parametrize("cells", [2, 30, 200])
def test_the_size_of_a_block_of_columns_does_not_change_the_counts(monkeypatch, cells):
    levels = [2, 3, 4, 5, 3]
    codes, fold = some_records(1, 400, levels)
    before = by_way(Walk, codes, levels, fold, 5, 4)
    monkeypatch.setattr(covering, "BLOCK_CELLS", cells)
    monkeypatch.setattr(covering, "_ROWS", 37)
    assert by_way(Cover, codes, levels, fold, 5, 4) == before


@pytest.mark.parametrize("cells", [30, 65_536])
def test_rows_that_are_alike_are_added_up_first_and_counted_the_same(monkeypatch, cells):
    levels = [2, 2, 3, 2]
    codes, fold = some_records(6, 3_000, levels)
    monkeypatch.setattr(covering, "BLOCK_CELLS", cells)
    cover = Cover(codes, levels, fold, 5, 3, abs)
    assert cover.weights is not None and cover.weights.sum() == 3_000 and cover.weights.size <= 120
    assert by_way(Cover, codes, levels, fold, 5, 3) == by_way(Walk, codes, levels, fold, 5, 3)


def test_configurations_beyond_one_number_are_told_apart():
    levels = [50] * 12  # 50^12 is more than 2^62
    codes, fold = some_records(7, 60, levels)
    codes = np.concatenate([codes] * 4)
    fold = np.concatenate([fold] * 4)
    cover = Cover(codes, levels, fold, 5, 2, abs)
    assert cover.weights is not None and sorted(cover.weights) == [4] * 60
    assert by_way(Cover, codes, levels, fold, 5, 2) == by_way(Walk, codes, levels, fold, 5, 2)


def test_long_tables_are_covered_and_short_wide_ones_walked():
    long, wide = (400_000, 20, 4), (10_000, 37, 5)
    assert covering_seconds(*long, 8.8, 1) < walking_seconds(*long, 70, 1) / 2
    assert walking_seconds(*wide, 130, 1) < covering_seconds(*wide, 8.8, 1) / 2


def test_a_family_is_counted_as_crosstab_counts_it():
    levels = [2, 3, 4]
    codes, fold = some_records(2, 200, levels)
    by_fold = ArrayCounts(codes, levels, fold, 5).family((2, 0), 1)
    assert by_fold.shape == (5, 4, 2, 3)
    for held in range(5):
        rows = codes[fold == held]
        for configuration in np.ndindex(4, 2, 3):
            assert by_fold[(held, *configuration)] == (rows[:, [2, 0, 1]] == configuration).all(axis=1).sum()


def test_sets_of_one_size_are_ranked_without_gaps():
    for columns, size in [(7, 3), (6, 1), (5, 5), (9, 4)]:
        ranks = [rank(chosen) for chosen in combinations(range(columns), size)]
        assert sorted(ranks) == list(range(comb(columns, size)))


@pytest.mark.parametrize("way", WAYS)
def test_counting_says_how_far_it_is(monkeypatch, way):
    monkeypatch.setattr(covering, "BLOCK_CELLS", 16)
    codes, fold = some_records(3, 50, [2] * 6)
    heard = []
    for _ in way(codes, [2] * 6, fold, 5, 4, heard.append).blocks():
        pass
    assert heard == sorted(heard) and heard[-1] == 1.0 and len(heard) > 3
