"""What a record counts for, and records that belong together: learning, folds, and errors of held-out scores."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.learning import held_out
from engine.learning.evidence import counts_of, moments_of
from engine.learning.folds import FOLDS, folds
from engine.learning.held_out import Scoring
from engine.learning.learn import learn_coded
from engine.refusal import Refusal
from tests.learning import mixed_plainly as plainly
from tests.learning.test_mixed import ORDERS, records

GRAPHS = {0: ((), (), (), ()), 2: ((), (0,), (), (1,)), 4: ((), (0,), (0, 1), (1,))}


def weighted(numbers, weights):
    return replace(records(rows=len(weights), seed=4, numbers=numbers), weights=np.asarray(weights, dtype=np.float64))


@pytest.mark.parametrize("numbers", [(), (1, 3), (0, 1, 2, 3)])
def test_a_weight_counts_as_that_many_records(numbers):
    weights = np.random.default_rng(1).integers(1, 4, 90)
    coded = weighted(numbers, weights)
    rows = np.repeat(np.arange(90), weights)
    repeated = replace(coded, codes=coded.codes[rows], values=coded.values[rows], weights=np.ones(rows.size))
    one, other = (learn_coded(each, ORDERS[0], folds=False) for each in (coded, repeated))
    assert one.chosen == other.chosen
    assert one.curve["score"].to_numpy() == pytest.approx(other.curve["score"].to_numpy(), abs=1e-7)
    assert one.posterior.support == pytest.approx(other.posterior.support, abs=1e-8)
    for left, right in zip(one.network().nodes, other.network().nodes, strict=True):
        for what in ("table", "dirichlet", "intercept", "slopes", "variance"):
            assert getattr(left, what, 0.0) == pytest.approx(getattr(right, what, 0.0), rel=1e-9, abs=1e-9)


@pytest.mark.parametrize("numbers", [(), (1, 3)])
def test_two_records_of_half_a_weight_are_learned_from_as_one(numbers):
    coded = records(rows=60, seed=3, numbers=numbers)
    twice = np.tile(np.arange(60), 2)
    halves = replace(coded, codes=coded.codes[twice], values=coded.values[twice], weights=np.full(120, 0.5))
    one, other, double = (
        learn_coded(each, ORDERS[1], folds=False).posterior.support
        for each in (coded, halves, replace(halves, weights=np.ones(120)))
    )
    assert other == pytest.approx(one, abs=1e-8)
    assert abs(double - one).max() > 0.01  # so the weights are looked at


@pytest.mark.parametrize("scale", [1e-3, 1.0])
def test_weights_that_make_the_records_worth_too_few_are_refused(scale):
    coded = weighted((), scale * np.r_[np.full(25, 100.0), np.full(75, 0.01)])
    with pytest.raises(Refusal, match="the 100 records are worth 25 of equal weight; at least 30") as refused:
        learn_coded(coded, ORDERS[0])
    assert refused.value.where and refused.value.do
    few = weighted((), np.r_[1e6, np.ones(99)])
    with pytest.raises(Refusal, match="worth under 10 of equal weight"):
        learn_coded(few, ORDERS[0])
    assert learn_coded(weighted((), scale * np.r_[np.full(30, 100.0), np.full(70, 0.01)]), ORDERS[0]).rows == 100


@pytest.mark.parametrize("block", [7, 16_384])
@pytest.mark.parametrize("grouped", [False, True])
def test_held_out_means_are_weighted_and_their_errors_count_a_group_once(monkeypatch, grouped, block):
    monkeypatch.setattr(held_out, "_ROWS", block)
    rng = np.random.default_rng(2)
    coded = weighted((1, 3), rng.uniform(0.2, 1.5, 120))
    group = rng.integers(0, 30, 120).astype(np.int32) if grouped else None
    coded = replace(coded, group=group)
    fold = folds(120, 1, group)
    scoring = Scoring(coded, counts_of(coded, fold, FOLDS), moments_of(coded, fold, FOLDS), tuple(GRAPHS))
    scores = np.zeros((len(GRAPHS), 120))
    for held in range(FOLDS):
        scoring.take(held, GRAPHS)
        rest, out = np.flatnonzero(fold != held), np.flatnonzero(fold == held)
        for place, graph in enumerate(GRAPHS.values()):
            scores[place, out] = plainly.log_scores(coded, rest, out, graph)
    told = scoring.result()
    share = coded.weights / coded.weights.sum()
    assert told.mean == pytest.approx(scores @ share, abs=1e-9)
    gaps = scores - scores[int((scores @ share).argmax())]
    assert told.behind == pytest.approx(gaps @ share, abs=1e-9)
    away = (gaps - (gaps @ share)[:, None]) * share
    belongs = np.arange(120) if group is None else group
    by_group = np.stack([away[:, belongs == each].sum(axis=1) for each in np.unique(belongs)], axis=1)
    groups = by_group.shape[1]
    assert told.behind_se == pytest.approx(np.sqrt((by_group**2).sum(axis=1) * groups / (groups - 1)), abs=1e-9)


@given(st.integers(0, 2**32 - 1), st.lists(st.integers(1, 12), min_size=FOLDS, max_size=60))
def test_a_group_is_held_out_whole_and_parts_are_even(seed, sizes):
    rng = np.random.default_rng(seed)
    group = rng.permutation(np.repeat(np.arange(len(sizes)), sizes))
    fold = folds(group.size, seed, group)
    for each in range(len(sizes)):
        assert np.unique(fold[group == each]).size == 1
    held = np.bincount(fold, minlength=FOLDS)
    assert held.min() > 0 and held.max() - held.min() <= max(sizes)
    assert np.array_equal(fold, folds(group.size, seed, group))


def test_other_seeds_hold_out_other_groups():
    group = np.repeat(np.arange(40), 3)
    assert not np.array_equal(folds(120, 0, group), folds(120, 1, group))


def test_learning_holds_groups_out_whole():
    group = np.repeat(np.arange(16, dtype=np.int32), 5)
    coded = records(rows=80, seed=1)
    whole = learn_coded(replace(coded, group=group), ORDERS[1], seed=2)
    fold = folds(80, 2, group)
    scoring = Scoring(coded, counts_of(coded, fold, FOLDS), moments_of(coded, fold, FOLDS), (0,))
    for held in range(FOLDS):
        scoring.take(held, GRAPHS)
    assert whole.curve["held_out"].iloc[0] == pytest.approx(scoring.result().mean[0], abs=1e-12)


def test_fewer_groups_than_parts_to_hold_out_are_refused():
    coded = replace(records(rows=80), group=np.arange(80, dtype=np.int32) % 4)
    with pytest.raises(Refusal, match="too few groups to hold out 5 parts") as refused:
        learn_coded(coded, ORDERS[0])
    assert refused.value.where and refused.value.do
    assert learn_coded(coded, ORDERS[0], folds=False).rows == 80
