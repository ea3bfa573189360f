"""Sums inside configurations equal those of plain grouping."""

from itertools import combinations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.records import moments as room
from engine.records.moments import ArrayMoments, Numbers


def some(seed, rows, levels, numbers):
    rng = np.random.default_rng(seed)
    codes = np.stack([rng.integers(0, count, rows) for count in [*levels, *[1] * numbers]], axis=1)
    fold = rng.permutation(np.arange(rows) % 3)
    held = Numbers.standardised(range(len(levels), len(levels) + numbers), rng.normal(size=(rows, numbers)))
    return codes, held, fold


def gathered(made, size):
    """Set of categories -> sorted sums (fold, count, numbers..., products...) of each fold and configuration."""
    found = {}
    for sums in made.blocks(size):
        ends = [*sums.starts[1:], sums.count.shape[-1]]
        for columns, start, end in zip(sums.sets.tolist(), sums.starts, ends, strict=True):
            terms = np.concatenate([sums.count[None], sums.first, sums.second])[:, :, start:end]
            for fold in range(terms.shape[1]):
                rows = [(fold, *each) for each in terms[:, fold].T.tolist() if each[0] > 0]
                found.setdefault((tuple(columns), sums.pairs), []).extend(rows)
    return {key: np.asarray(sorted(rows)) for key, rows in found.items()}


def grouped(made, columns, pairs):
    values = made.numbers.values
    rows = []
    for fold in range(made.folds):
        for configuration in np.unique(made.codes[:, columns], axis=0):
            inside = values[(made.codes[:, columns] == configuration).all(axis=1) & (made.fold == fold)]
            if len(inside):
                products = inside.T @ inside
                second = products[np.triu_indices(len(products))] if pairs else np.diag(products)
                rows.append((fold, len(inside), *inside.sum(axis=0), *second))
    return np.asarray(sorted(rows))


@settings(max_examples=20)
@given(
    st.integers(0, 2**32 - 1),
    st.integers(5, 60),
    st.lists(st.sampled_from([2, 3, 40]), max_size=4),
    st.integers(1, 3),
    st.integers(1, 4),
)
def test_every_set_sums_as_plain_grouping_does(seed, rows, levels, numbers, size):
    codes, held, fold = some(seed, rows, levels, numbers)
    made = ArrayMoments(codes, [*levels, *[2] * numbers], held, fold, 3)
    found = gathered(made, size)
    wanted = [
        (chosen, size - count >= 2)
        for count in range(min(size - 1, len(levels)) + 1)
        for chosen in combinations(range(len(levels)), count)
    ]
    assert set(found) == set(wanted)
    for columns, pairs in wanted:
        assert found[columns, pairs] == pytest.approx(grouped(made, list(columns), pairs), abs=1e-9)


@pytest.mark.parametrize(("limit", "value"), [("_ROWS", 7), ("_HELD", 30), ("_TOGETHER", 1), ("LARGEST", 20)])
def test_limits_of_memory_change_no_sum(monkeypatch, limit, value):
    codes, held, fold = some(1, 60, [2, 5, 4], 2)
    made = ArrayMoments(codes, [2, 5, 4, 2, 2], held, fold, 3)
    before = gathered(made, 4)
    monkeypatch.setattr(room, limit, value)
    after = gathered(ArrayMoments(codes, [2, 5, 4, 2, 2], held, fold, 3), 4)
    assert set(before) - set(after) == ({((0, 1, 2), False)} if limit == "LARGEST" else set())
    for key, sums in after.items():
        assert sums == pytest.approx(before[key], abs=1e-9)


def test_a_family_sums_every_configuration_the_last_parent_fastest():
    codes, held, fold = some(2, 80, [2, 3], 3)
    made = ArrayMoments(codes, [2, 3, 2, 2, 2], held, fold, 3)
    sums = made.family((1, 0), (4, 2), 3)
    assert sums.levels == (3, 2) and sums.columns == (2, 0, 1)
    rows = np.column_stack([np.ones(80), held.values[:, [2, 0, 1]]])
    for part in range(4):
        kept = np.full(80, True) if part == 0 else fold != part - 1
        for place, (one, other) in enumerate(np.ndindex(3, 2)):
            inside = rows[kept & (codes[:, 1] == one) & (codes[:, 0] == other)]
            assert sums.part(part)[place] == pytest.approx(inside.T @ inside, abs=1e-9)


def test_numbers_are_measured_from_their_mean_in_their_standard_deviation():
    rng = np.random.default_rng(3)
    values = np.round(rng.normal([50.0, -3.0], [10.0, 0.5], (400, 2)), 1)
    held = Numbers.standardised((4, 7), values)
    assert held.columns == (4, 7)
    assert held.values * held.scale + held.centre == pytest.approx(values)
    assert (held.centre, held.scale) == (pytest.approx(values.mean(axis=0)), pytest.approx(values.std(axis=0)))
    assert held.step == pytest.approx([0.1, 0.1], rel=1e-9)
    assert held.rounding == pytest.approx(0.01 / 12 / values.var(axis=0), rel=1e-9)


def test_adding_up_may_be_cancelled_and_says_how_far_it_is():
    codes, held, fold = some(4, 60, [2, 3, 2], 2)
    heard = []
    for _ in ArrayMoments(codes, [2, 3, 2, 2, 2], held, fold, 3).blocks(4, heard.append):
        pass
    assert heard == sorted(heard) and heard[-1] == 1.0

    def cancel(part):
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        next(ArrayMoments(codes, [2, 3, 2, 2, 2], held, fold, 3).blocks(4, cancel))
