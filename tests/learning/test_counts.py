"""Counts of every set of columns equal those of plain grouping, whichever way they were counted."""

from itertools import combinations
from math import comb, prod

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.records import joint
from engine.records.counts import LARGEST, ArrayCounts, rank


def some_records(seed, rows, levels):
    rng = np.random.default_rng(seed)
    codes = np.stack([rng.integers(0, count, rows) for count in levels], axis=1)
    return codes, rng.permutation(np.arange(rows) % 5)


def gathered(counts, size):
    """Set -> sorted list of (count in each fold) over its occupied cells, from the blocks."""
    columns = len(counts.levels)
    names = {(each, rank(chosen)): chosen for each in range(size + 1) for chosen in combinations(range(columns), each)}
    found: dict[tuple[int, ...], list[tuple[int, ...]]] = {}
    for block in counts.blocks(size):
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


@settings(max_examples=25, deadline=None)
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
    found = gathered(ArrayCounts(codes, levels, fold, folds), size)
    wanted = [
        chosen
        for each in range(min(size, len(levels)) + 1)
        for chosen in combinations(range(len(levels)), each)
        if prod(levels[column] for column in chosen) <= LARGEST
    ]
    assert set(found) == set(wanted)
    for chosen in wanted:
        assert found[chosen] == grouped(codes, fold, folds, list(chosen))


@pytest.mark.parametrize("limit", ["_BLOCK", "_HELD", "_ONE_HOT"])
def test_the_route_does_not_change_the_counts(monkeypatch, limit):
    levels = [2, 3, 4, 5, 3]
    codes, fold = some_records(1, 400, levels)
    counts = ArrayCounts(codes, levels, fold, 5)
    before = gathered(counts, 4)
    monkeypatch.setattr(joint, limit, 400 * 7)
    assert gathered(counts, 4) == before


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


def test_counting_says_how_far_it_is():
    codes, _ = some_records(3, 50, [2] * 6)
    heard = []
    for _ in ArrayCounts(codes, [2] * 6).blocks(4, heard.append):
        pass
    assert heard == sorted(heard) and heard[-1] == 1.0 and len(heard) > 3
