"""Means over records with their standard errors."""

import numpy as np
import pytest
from scipy import stats

from engine.judging.gains import WIDE, gain


def test_records_that_count_alike_have_the_plain_standard_error():
    difference = np.random.default_rng(0).normal(0.3, 1.0, 200)
    found = gain(difference, np.full(200, 0.7))
    assert found.mean == pytest.approx(difference.mean())
    assert found.se == pytest.approx(stats.sem(difference))
    assert (found.low, found.high) == pytest.approx((found.mean - WIDE * found.se, found.mean + WIDE * found.se))
    assert pytest.approx(stats.norm.ppf(0.95)) == WIDE


def test_a_group_of_copies_counts_as_one_record():
    difference = np.random.default_rng(1).normal(0.0, 1.0, 60)
    once = gain(difference, np.ones(60))
    copied = gain(np.repeat(difference, 5), np.ones(300), np.repeat(np.arange(60), 5))
    assert (copied.mean, copied.se) == pytest.approx((once.mean, once.se))
    assert gain(np.repeat(difference, 5), np.ones(300)).se < 0.5 * once.se


def test_weights_shift_the_mean_and_widen_its_error():
    difference = np.array([0.0] * 50 + [1.0] * 50)
    weights = np.array([1.0] * 50 + [3.0] * 50)
    found = gain(difference, weights)
    assert found.mean == 0.75
    away = weights * (difference - 0.75)
    assert found.se == pytest.approx(np.sqrt(100 / 99 * (away**2).sum()) / 200.0)
