"""Counts of weighted records: sums of weights, the same to the last digit however they are counted."""

from itertools import combinations
from math import prod

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.records import covering, products
from engine.records.counts import LARGEST, ArrayCounts, exactly_summed, rank
from engine.records.covering import Cover
from engine.records.products import Walk

WAYS = (Cover, Walk)


def some_records(seed, rows, levels):
    rng = np.random.default_rng(seed)
    codes = np.column_stack([rng.integers(0, many, rows) * rng.integers(0, 2, rows) for many in levels])
    return codes, rng.integers(0, 5, rows), rng.gamma(0.7, size=rows)


def gathered(blocks, levels, folds, size):
    """Set of columns -> {joint level: (folds,) sums}, from every block; joint levels that come without one are 0."""
    names = {rank(chosen): chosen for chosen in combinations(range(len(levels)), size)}
    found = {chosen: [] for chosen in names.values()}
    for block in blocks:
        if block.size != size:
            continue
        assert block.counts.dtype == np.float64
        ends = np.append(block.starts[1:], block.counts.shape[2])
        for place, (start, end) in enumerate(zip(block.starts, ends, strict=True)):
            cells = block.counts[:, :, start:end].reshape(folds, -1)
            found[names[int(block.ranks[place])]] += [tuple(cell) for cell in cells.T if cell.any()]
    return {chosen: sorted(cells) for chosen, cells in found.items()}


def plainly(codes, levels, fold, folds, weights, size):
    found = {}
    for chosen in combinations(range(len(levels)), size):
        cells = prod(levels[column] for column in chosen)
        if cells > LARGEST:
            found[chosen] = []
            continue
        code = np.ravel_multi_index(tuple(codes[:, list(chosen)].T), [levels[column] for column in chosen])
        sums = np.bincount(code * folds + fold, weights, minlength=cells * folds).reshape(cells, folds)
        found[chosen] = sorted(tuple(cell) for cell in sums if cell.any())
    return found


@settings(max_examples=25, deadline=None)
@given(
    st.integers(0, 2**32 - 1),
    st.integers(2, 90),
    st.lists(st.sampled_from([1, 2, 3, 4, 7, 50]), min_size=1, max_size=5),
    st.integers(1, 4),
    st.sampled_from([1, 5]),
)
def test_every_set_has_the_sums_that_bincount_gives(seed, rows, levels, size, folds):
    codes, fold, weights = some_records(seed, rows, levels)
    fold = fold % folds
    counts = ArrayCounts(codes, levels, fold, folds, weights)
    size = min(size, len(levels))
    for each in range(1, size + 1):
        truth = plainly(codes, levels, fold, folds, counts.weights, each)
        assert gathered(counts.blocks(size), levels, folds, each) == truth
        for way in WAYS:
            made = way(counts.codes, levels, counts.fold, folds, size, abs, counts.weights).blocks()
            assert gathered(made, levels, folds, each) == truth


@pytest.mark.parametrize(
    ("module", "limit", "value"),
    [
        (products, "_BLOCK", 2_800),
        (products, "_HELD", 2_800),
        (products, "_ONE_HOT", 2_800),
        (products, "_AT_ONCE", 50),
        (covering, "BLOCK_CELLS", 30),
        (covering, "_ROWS", 37),
        (covering, "_WORTH", 10**9),
    ],
)
def test_the_limits_of_a_way_of_counting_do_not_change_the_sums(monkeypatch, module, limit, value):
    levels = [2, 3, 4, 5, 3]
    codes, fold, weights = some_records(1, 400, levels)
    weights = exactly_summed(weights)
    truth = plainly(codes, levels, fold, 5, weights, 4)
    monkeypatch.setattr(module, limit, value)
    way = Walk if module is products else Cover
    assert gathered(way(codes, levels, fold, 5, 4, abs, weights).blocks(), levels, 5, 4) == truth


def test_rows_that_are_alike_have_their_weights_added_up_first():
    levels = [2, 2, 3]
    codes, fold, weights = some_records(6, 3_000, levels)
    cover = Cover(codes, levels, fold, 5, 2, abs, weights)
    assert cover.weights.size <= 60 and cover.weights.sum() == pytest.approx(weights.sum())


def test_a_family_holds_the_sums_of_its_configurations():
    levels = [2, 3, 4]
    codes, fold, weights = some_records(2, 200, levels)
    counts = ArrayCounts(codes, levels, fold, 5, weights)
    found = counts.family((2, 0), 1)
    assert found.shape == (5, 4, 2, 3) and found.dtype == np.float64
    for place in np.ndindex(found.shape):
        rows = (fold == place[0]) & (codes[:, [2, 0, 1]] == place[1:]).all(axis=1)
        assert found[place] == pytest.approx(weights[rows].sum(), abs=1e-12)


def test_the_order_of_the_rows_does_not_show_in_the_last_digit():
    levels = [2, 3, 4]
    codes, fold, weights = some_records(3, 500, levels)
    order = np.random.default_rng(0).permutation(500)
    one = ArrayCounts(codes, levels, fold, 5, weights)
    other = ArrayCounts(codes[order], levels, fold[order], 5, weights[order])
    assert (one.family((0, 1), 2) == other.family((0, 1), 2)).all()
    for left, right in zip(one.blocks(3), other.blocks(3), strict=True):
        assert (left.ranks == right.ranks).all() and (left.counts == right.counts).all()


@given(st.lists(st.floats(1e-6, 1e6), min_size=1, max_size=40))
def test_every_sum_of_the_rounded_weights_is_exact(weights):
    weights = np.array(weights)
    rounded = exactly_summed(weights)
    assert np.abs(rounded - weights).max() <= 2e-16 * weights.sum() * 2
    assert rounded.sum() == rounded[::-1].sum() == sum(sorted(rounded.tolist()))


def test_weights_that_are_all_one_are_counted_in_whole_numbers():
    levels = [2, 3]
    codes, fold, _ = some_records(4, 50, levels)
    plain, ones = ArrayCounts(codes, levels, fold, 5), ArrayCounts(codes, levels, fold, 5, np.ones(50))
    assert ones.weights is None and ones.family((0,), 1).dtype == np.int64
    for left, right in zip(plain.blocks(2), ones.blocks(2), strict=True):
        assert right.counts.dtype == np.int32 and (left.counts == right.counts).all()
