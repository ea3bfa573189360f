"""Columns that want one parent more than was allowed: found, told, and not told where nothing is gained."""

from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest

from engine.learning import cap
from engine.learning.evidence import counts_of, moments_of
from engine.learning.gaussian import family_score as number_score
from engine.learning.gaussian import number_scores
from engine.learning.learn import learn_coded
from engine.learning.learned import open_learned
from engine.learning.scores import family_score as category_score
from engine.learning.scores import set_scores
from engine.order import Order
from engine.records.counts import rank
from tests.learning import mixed_plainly as plainly
from tests.learning.test_mixed import records

NAMES = ("a", "b", "c", "x", "y", "result")


def late_result(rows=1_500, seed=0, number=True, causes=3):
    """The result leans on the first `causes` of three categories and two numbers."""
    rng = np.random.default_rng(seed)
    codes = np.zeros((rows, 6), dtype=np.int32)
    codes[:, :3] = rng.integers(0, 2, (rows, 3))
    values = rng.normal(size=(rows, 2))
    lean = np.column_stack([codes[:, :3] - 0.5, values])[:, :causes].sum(axis=1)
    if number:
        values = np.column_stack([values, lean + 0.7 * rng.normal(size=rows)])
        return plainly.coded_mixed(NAMES, codes, values, (3, 4, 5))
    codes[:, 5] = rng.random(rows) < 1.0 / (1.0 + np.exp(-3.0 * lean))
    return plainly.coded_mixed(NAMES, codes, values, (3, 4))


ORDER = Order([("Early", NAMES[:5]), ("Late", NAMES[5:])])


@pytest.mark.parametrize("every", [0, 1_500])
@pytest.mark.parametrize(("number", "causes"), [(True, 4), (True, 3), (False, 3)])
def test_a_column_at_the_cap_that_gains_is_told_with_its_parents_and_gain(monkeypatch, every, number, causes):
    monkeypatch.setattr(cap, "EVERY", every)
    coded = late_result(number=number, causes=causes)
    learned = learn_coded(coded, ORDER, max_parents=causes - 1)
    (told,) = learned.cap
    assert told.column == "result" and told.parents == NAMES[:causes]
    best = plainly.family_score(coded, 5, range(causes))
    chosen = plainly.family_score(coded, 5, learned.chosen[learned.recommended][5])
    assert told.gain == pytest.approx(best - chosen, abs=1e-6)
    assert learned.notes[-1] == (
        f"“result” is described better with {causes} parents than with {causes - 1} parents, the most allowed."
    )


@pytest.mark.parametrize("number", [True, False])
def test_enough_parents_leave_nothing_to_tell(number):
    learned = learn_coded(late_result(number=number), ORDER, max_parents=3)
    assert len(learned.parents_at()["result"]) == 3 and learned.cap == () and learned.notes == ()


def test_only_what_the_rest_of_the_model_allows_is_tried():
    """A parent more that the column itself leads to would close a circle."""
    rng = np.random.default_rng(0)
    a, b = rng.integers(0, 2, (2, 2_000))
    c = (rng.random(2_000) < 0.1 + 0.4 * a + 0.4 * b).astype(int)
    d = np.where(rng.random(2_000) < 0.9, c, 1 - c)
    coded = plainly.coded_mixed("abcd", np.column_stack([a, b, c, d]), np.empty((2_000, 0)), ())
    order = Order([("One", ["a", "b"]), ("Two", ["c", "d"])])
    learned = learn_coded(coded, order, max_parents=2)
    assert learned.chosen[learned.recommended][2:] == ((0, 1), (2,)) and learned.cap == ()


def test_many_records_are_screened_by_some_and_the_gain_is_that_of_all(monkeypatch):
    coded = late_result(causes=4, rows=3_000)
    whole = learn_coded(coded, ORDER, max_parents=3, folds=False).cap
    monkeypatch.setattr(cap, "SCREENED", 500)
    assert learn_coded(coded, ORDER, max_parents=3, folds=False).cap == whole != ()


def test_what_wants_more_parents_is_kept_with_the_model(tmp_path):
    learned = learn_coded(late_result(), ORDER, max_parents=2, folds=False)
    learned.save(tmp_path / "kept")
    assert open_learned(tmp_path / "kept").cap == learned.cap != ()


def test_an_exact_sum_of_more_columns_than_allowed_is_not_taken_for_a_gain():
    coded = late_result(causes=3)
    values = coded.values.copy()
    values[:, 2] = values[:, :2].sum(axis=1) + coded.codes[:, 2]  # exact given one category and two numbers
    learned = learn_coded(replace(coded, values=values), ORDER, max_parents=2, folds=False)
    assert not [each for each in learned.cap if set(each.parents) >= {"c", "x", "y"}]


@pytest.mark.parametrize("weights", [np.ones(80), np.random.default_rng(0).uniform(0.1, 1.0, 80)])
def test_a_single_family_scores_as_the_difference_of_two_sets(weights):
    coded = replace(records(), weights=weights)
    counts, moments = counts_of(coded), moments_of(coded)
    categories, numbers = set_scores(counts, 4, 2.5), number_scores(moments, 4)
    for child in range(4):
        found = numbers if child in coded.numbers else categories
        for count in range(4):
            for parents in combinations([column for column in range(4) if column != child], count):
                with_child = tuple(sorted((*parents, child)))
                told = found.by_size[count + 1][0, rank(with_child)] - found.by_size[count][0, rank(parents)]
                if child in coded.numbers:
                    split = [p for p in parents if p not in coded.numbers], [p for p in parents if p in coded.numbers]
                    score = number_score(moments.family(*split, child))
                else:
                    score = category_score(counts.family(parents, child).sum(axis=0), 2.5)
                assert score == pytest.approx(told, abs=1e-7)
