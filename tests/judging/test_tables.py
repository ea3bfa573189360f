"""Tables seen against foreseen: against general-purpose libraries and plain computation."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from engine.judging.tables import departure, false_discovery, raked


@given(st.lists(st.floats(0.0, 1.0), min_size=1, max_size=40))
def test_false_discovery_rates_agree_with_a_general_library(chances):
    assert false_discovery(chances) == pytest.approx(stats.false_discovery_control(chances), abs=1e-12)


@given(st.integers(0, 10_000))
def test_from_independence_the_statistic_is_that_of_a_general_library(seed):
    seen = np.random.default_rng(seed).integers(1, 40, (3, 4)).astype(float)
    found = departure(seen, np.ones((3, 4)))
    there = stats.chi2_contingency(seen, correction=False, lambda_="log-likelihood")
    assert found[0] == pytest.approx(there.statistic, abs=1e-6)
    assert found[1] == there.dof and found[2] == pytest.approx(there.pvalue, abs=1e-8)


def test_an_association_as_foreseen_departs_by_nothing_whatever_the_margins():
    rng = np.random.default_rng(1)
    seen = rng.integers(20, 90, (3, 3)).astype(float)
    stretched = seen * rng.random((3, 1)) * rng.random((1, 3))  # other margins, the same odds ratios
    assert departure(seen, stretched)[0] == pytest.approx(0.0, abs=1e-6)


def test_of_three_columns_only_what_they_do_together_is_judged():
    rng = np.random.default_rng(2)
    foreseen = rng.random((2, 3, 2)) + 0.5
    pairwise = (rng.random((2, 3, 1)) + 0.5) * (rng.random((1, 3, 2)) + 0.5) * (rng.random((2, 1, 2)) + 0.5)
    assert departure(500.0 * foreseen * pairwise, foreseen)[0] == pytest.approx(0.0, abs=1e-4)
    together = foreseen.copy()
    together[0, 0, 0] *= 3.0
    statistic, freedom, chance = departure(500.0 * together, foreseen)
    assert statistic > 20.0 and freedom == 2 and chance < 1e-4


def test_raking_keeps_the_odds_ratio_and_takes_the_margins():
    table, target = np.array([[4.0, 1.0], [2.0, 3.0]]), np.array([[30.0, 20.0], [10.0, 40.0]])
    found = raked(table, target, [(0,), (1,)])
    assert found.sum(axis=0) == pytest.approx(target.sum(axis=0)) and found.sum(axis=1) == pytest.approx([50, 50])
    assert found[0, 0] * found[1, 1] / found[0, 1] / found[1, 0] == pytest.approx(6.0)


def test_rows_invented_in_small_number_make_a_departure_less_sure():
    seen, foreseen = np.array([[60.0, 40.0], [40.0, 60.0]]), np.ones((2, 2))
    assert departure(seen, foreseen, 200.0)[0] == pytest.approx(departure(seen, foreseen)[0] / 2.0)


def test_a_level_that_nobody_has_costs_no_degree_of_freedom():
    seen = np.array([[10.0, 20.0], [0.0, 0.0], [15.0, 5.0]])
    assert departure(seen, np.ones((3, 2)))[1] == 1
