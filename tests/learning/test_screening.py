"""Many families of one number scored at once: the same scores as one at a time."""

from itertools import combinations

import numpy as np
import pytest

from engine.learning import screening
from engine.learning.evidence import moments_of
from engine.learning.gaussian import family_score
from engine.learning.screening import number_family_scores
from tests.learning import mixed_plainly as plainly


def some_records(rows=120, weighted=False):
    """Three categories and four numbers, one of them recorded to whole units."""
    rng = np.random.default_rng(1)
    codes = np.zeros((rows, 7), dtype=np.int32)
    codes[:, :3] = rng.integers(0, [2, 3, 4], (rows, 3))
    values = rng.normal(size=(rows, 4)) @ rng.normal(size=(4, 4)) + codes[:, :1]
    values[:, 1] = np.round(10.0 * values[:, 1])
    coded = plainly.coded_mixed("abcwxyz", codes, values, (3, 4, 5, 6))
    return coded, rng.uniform(0.1, 1.0, rows) if weighted else np.ones(rows)


@pytest.mark.parametrize("weighted", [False, True])
@pytest.mark.parametrize("shared", [1, 3, 1_000])
@pytest.mark.parametrize("together", [1, 24])
def test_families_scored_together_score_as_each_alone(monkeypatch, weighted, shared, together):
    monkeypatch.setattr(screening, "_SHARED", shared)
    monkeypatch.setattr(screening, "_TOGETHER", together)
    coded, weights = some_records(weighted=weighted)
    moments = moments_of(type(coded)(**{**vars(coded), "weights": weights}))
    others = [column for column in range(7) if column != 5]
    sets = [parents for count in range(5) for parents in combinations(others, count)]
    split = [(tuple(p for p in each if p < 3), tuple(p for p in each if p >= 3)) for each in sets]
    alone = [family_score(moments.family(*each, 5)) for each in split]
    assert number_family_scores(moments, 5, split) == pytest.approx(alone, abs=1e-8)


def test_a_family_too_large_to_count_has_no_score(monkeypatch):
    monkeypatch.setattr(screening, "LARGEST", 6)
    coded, _ = some_records()
    told = number_family_scores(moments_of(coded), 5, [((0, 1), (3,)), ((0, 2), (3,)), ((0, 2), (4,))])
    assert np.isfinite(told).tolist() == [True, False, False]


def test_every_sum_is_a_chance_to_cancel():
    def cancel():
        raise KeyboardInterrupt

    coded, _ = some_records()
    with pytest.raises(KeyboardInterrupt):
        number_family_scores(moments_of(coded), 5, [((0,), (3,))], cancel)
