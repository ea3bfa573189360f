"""Intervals of shares, the Brier score, tenths: against published figures and general-purpose libraries."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from sklearn.metrics import brier_score_loss

from engine.judging.calibration import COVERAGE, brier, in_tenths, spread, tenths
from engine.records.intervals import wilson

FORECASTS = np.repeat([0.1, 0.3, 0.6, 0.9], [3, 4, 3, 5])
HAPPENED = np.array([0, 0, 1, 0, 1, 0, 0, 1, 0, 1, 1, 1, 1, 0, 1], dtype=float)


@pytest.mark.parametrize(
    ("successes", "trials", "low", "high"),
    [
        (81, 263, 0.255288519878, 0.366209576983),
        (15, 148, 0.0623863995307, 0.160487241723),
        (0, 20, 0.0, 0.161125158053),
        (1, 29, 0.00611321429276, 0.171755218793),
    ],
)
def test_score_intervals_are_those_newcombe_published(successes, trials, low, high):
    """Newcombe 1998, table I, method 3, to more decimals by the formula of Wilson 1927."""
    assert wilson(successes, trials, 0.95) == pytest.approx((low, high), abs=1e-9)


@given(st.integers(1, 500).flatmap(lambda n: st.tuples(st.integers(0, n), st.just(n))), st.floats(0.5, 0.999))
def test_score_intervals_agree_with_a_general_library(counted, coverage):
    successes, trials = counted
    low, high = wilson(successes, trials, coverage)
    there = stats.binomtest(successes, trials).proportion_ci(coverage, method="wilson")
    assert (low, high) == pytest.approx((there.low, there.high), abs=1e-12)


def test_without_trials_a_share_may_be_anything():
    assert wilson(0.0, 0.0) == (0.0, 1.0)


def test_the_parts_of_the_brier_score_are_those_of_murphy():
    found = brier(FORECASTS, HAPPENED)
    assert found.score == pytest.approx(0.208, abs=1e-12)
    assert found.score == pytest.approx(brier_score_loss(HAPPENED, FORECASTS), abs=1e-12)
    assert found.reliability == pytest.approx(0.0157777777778, abs=1e-12)
    assert found.resolution == pytest.approx(0.0566666666667, abs=1e-12)
    assert found.uncertainty == pytest.approx(0.248888888889, abs=1e-12)
    assert found.within == pytest.approx(0.0, abs=1e-12)


def test_what_is_said_differently_within_a_group_is_the_rest_of_the_score():
    """Stephenson, Coelho & Jolliffe 2008: variance within groups less twice the covariance there."""
    rng = np.random.default_rng(0)
    said = rng.random(500)
    happened = (rng.random(500) < said).astype(float)
    group = (said * 4).astype(int)
    found = brier(said, happened, groups=group)
    within = 0.0
    for each in range(4):
        held = group == each
        away = said[held] - said[held].mean()
        within += (away @ away - 2.0 * away @ (happened[held] - happened[held].mean())) / 500
    assert found.within == pytest.approx(within, abs=1e-12)
    assert found.score == pytest.approx(brier_score_loss(happened, said), abs=1e-12)


def test_a_record_of_weight_two_counts_as_two_records():
    once = brier(FORECASTS, HAPPENED, np.where(np.arange(15) == 4, 2.0, 1.0))
    twice = brier(np.append(FORECASTS, FORECASTS[4]), np.append(HAPPENED, HAPPENED[4]))
    assert once.score == pytest.approx(twice.score) and once.resolution == pytest.approx(twice.resolution)


@given(st.lists(st.sampled_from([0.1, 0.2, 0.2500001, 0.9]), min_size=1, max_size=80))
def test_tenths_hold_about_as_many_records_and_never_fall(said):
    part = in_tenths(np.array(said), np.random.default_rng(0))
    sizes = np.bincount(part, minlength=10)
    assert sizes.max() - sizes.min() <= 1
    by_part = np.array(said)[np.argsort(part, kind="stable")]
    means = [np.array(said)[part == each] for each in np.unique(part)]
    assert all(before.max() <= after.min() for before, after in pairwise(means)), by_part


def test_equal_forecasts_fall_into_tenths_by_lot_not_by_the_sequence_of_the_records():
    happened = np.repeat([0.0, 1.0], 1_000)  # records sorted by what happened
    part = in_tenths(np.full(2_000, 0.5), np.random.default_rng(1))
    found = tenths(np.full(2_000, 0.5), happened, np.ones(2_000), part)
    assert len(found) == 10 and all(each.agrees for each in found)


def test_a_tenth_tells_what_was_said_and_seen_in_it():
    rng = np.random.default_rng(3)
    said = rng.random(1_000)
    happened = (rng.random(1_000) < said).astype(float)
    part = in_tenths(said, rng)
    for place, each in enumerate(tenths(said, happened, np.ones(1_000), part)):
        held = part == place
        assert each.said == pytest.approx(said[held].mean()) and each.seen == pytest.approx(happened[held].mean())
        assert (each.low, each.high) == wilson(happened[held].sum(), held.sum(), COVERAGE)
        assert each.records == held.sum()


def test_values_that_come_as_foreseen_spread_evenly_over_the_tenths_and_others_do_not():
    rng = np.random.default_rng(4)
    values = rng.standard_normal(5_000)
    right = spread(stats.norm.cdf(values), np.ones(5_000))
    wide = spread(stats.norm.cdf(values / 2.0), np.ones(5_000))
    assert all(each.agrees for each in right)
    assert [each.agrees for each in wide].count(False) >= 6
    assert sum(each.records for each in right) == 5_000
