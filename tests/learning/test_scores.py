"""Set scores: closed form, one-step predictions, folds, exact ties."""

from itertools import combinations, permutations

import numpy as np
import pytest
from scipy.special import gammaln

from engine.learning import scores as scoring
from engine.learning.scores import set_scores
from engine.records.counts import ArrayCounts, rank
from tests.learning import plainly


def some_records(seed=0, rows=150, levels=(2, 3, 4, 2)):
    rng = np.random.default_rng(seed)
    codes = np.stack([rng.integers(0, count, rows) for count in levels], axis=1)
    copied = rng.random(rows) < 0.5
    codes[copied, 3] = codes[copied, 0]
    return codes, levels


def family(found, child, parents, part=0):
    with_child, without = sorted((*parents, child)), sorted(parents)
    return found.by_size[len(with_child)][part, rank(with_child)] - found.by_size[len(without)][part, rank(without)]


def every_family(columns):
    for child in range(columns):
        others = [column for column in range(columns) if column != child]
        for count in range(columns):
            yield from ((child, parents) for parents in combinations(others, count))


@pytest.mark.parametrize("ess", [1.0, 10.0])
def test_a_family_scores_as_configuration_by_configuration(ess):
    codes, levels = some_records()
    found = set_scores(ArrayCounts(codes, levels), 4, ess)
    for child, parents in every_family(4):
        told = plainly.family_score(codes, levels, child, parents, ess)
        assert family(found, child, parents) == pytest.approx(told, abs=1e-9, rel=0)


def test_a_family_scores_as_the_product_of_one_step_predictions():
    codes, levels = some_records(rows=60)
    found = set_scores(ArrayCounts(codes, levels), 3, 1.0)
    for child, parents in [(0, ()), (1, (0,)), (2, (0, 3)), (3, (0,))]:
        configurations = int(np.prod([levels[parent] for parent in parents]))
        told = 0.0
        for row in range(len(codes)):
            same = np.all(codes[:row, list(parents)] == codes[row, list(parents)], axis=1)
            hits = (codes[:row, child][same] == codes[row, child]).sum()
            prior = 1.0 / (configurations * levels[child])
            told += np.log((hits + prior) / (same.sum() + 1.0 / configurations))
        assert family(found, child, parents) == pytest.approx(told, abs=1e-9, rel=0)


def test_scores_without_a_fold_are_those_of_the_other_records():
    codes, levels = some_records(seed=4)
    fold = np.random.default_rng(5).permutation(np.arange(150) % 5)
    found = set_scores(ArrayCounts(codes, levels, fold, 5), 3)
    assert [each.shape[0] for each in found.by_size] == [6] * 4
    for part in range(6):
        kept = codes if part == 0 else codes[fold != part - 1]
        again = set_scores(ArrayCounts(kept, levels), 3)
        for each, other in zip(found.by_size, again.by_size, strict=True):
            assert each[part] == pytest.approx(other[0], abs=1e-9, rel=0)


def test_counts_beyond_the_table_score_the_same(monkeypatch):
    codes, levels = some_records()
    fold = np.arange(150) % 5
    before = set_scores(ArrayCounts(codes, levels, fold, 5), 3)
    monkeypatch.setattr(scoring, "_TABULATED", 7)
    after = set_scores(ArrayCounts(codes, levels, fold, 5), 3)
    for one, other in zip(before.by_size, after.by_size, strict=True):
        assert one == pytest.approx(other, abs=1e-9, rel=0)


def test_equivalent_graphs_tie_to_the_last_bit():
    codes, levels = some_records(rows=3_000)
    found = set_scores(ArrayCounts(codes, levels), 4)
    chains = {family(found, 0, ()) + family(found, 1, (0,)) + family(found, 2, (1,)) + family(found, 3, (2,))}
    chains.add(family(found, 3, ()) + family(found, 2, (3,)) + family(found, 1, (2,)) + family(found, 0, (1,)))
    chains.add(family(found, 1, ()) + family(found, 0, (1,)) + family(found, 2, (1,)) + family(found, 3, (2,)))
    assert len(chains) == 1
    complete = {
        sum(family(found, child, order[:place]) for place, child in enumerate(order))
        for order in permutations(range(4))
    }
    assert len(complete) == 1


def test_a_set_of_too_many_levels_has_no_score():
    rng = np.random.default_rng(0)
    levels = (50, 50, 50, 50, 2)
    codes = np.stack([rng.integers(0, count, 300) for count in levels], axis=1)
    found = set_scores(ArrayCounts(codes, levels), 4, 1.0)
    for chosen in combinations(range(5), 4):
        too_large = np.prod([levels[column] for column in chosen]) > 1_000_000
        assert np.isneginf(found.by_size[4][0, rank(chosen)]) == too_large
    three = np.unique(codes[:, [0, 1, 2]], axis=0, return_counts=True)[1]
    told = (gammaln(three + 1 / 125_000) - gammaln(1 / 125_000)).sum()
    assert found.by_size[3][0, rank((0, 1, 2))] == pytest.approx(told, abs=1e-9, rel=0)
