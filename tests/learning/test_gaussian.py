"""Scores of numbers: one-step predictions, integration, folds, units, exact ties."""

from itertools import combinations, permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.stats import gamma, multivariate_normal

from engine.learning.families import Families, candidates
from engine.learning.gaussian import coarsened, number_scores
from engine.order import Order
from engine.records import moments as moments_room
from engine.records.counts import rank
from engine.records.moments import ArrayMoments, Numbers
from tests.learning import numbers_plainly as plainly


def at(found, columns, part=0):
    chosen = sorted(columns)
    return found.by_size[len(chosen)][part, rank(chosen)]


def family(found, child, parents, part=0):
    return at(found, (*parents, child), part) - at(found, parents, part)


def every_set(codes, places, size):
    for count in range(1, size + 1):
        for chosen in combinations(range(codes.shape[1]), count):
            yield [c for c in chosen if c not in places], [places.index(c) for c in chosen if c in places]


@settings(max_examples=12)
@given(
    st.integers(0, 2**32 - 1),
    st.integers(1, 25),
    st.lists(st.sampled_from([2, 3, 9]), min_size=0, max_size=3),
    st.integers(1, 4),
    st.integers(1, 4),
)
def test_a_set_scores_as_the_product_of_one_step_t_densities(seed, rows, levels, numbers, size):
    """Configurations of no record and of one are among them whenever there are more levels than records."""
    codes, values, places = plainly.mixed(rows, levels, numbers, seed)
    size = min(size, codes.shape[1])
    counts = [*plainly.all_levels(codes, places)]
    found = number_scores(ArrayMoments(codes, counts, plainly.as_given(places, values / 20)), size)
    for categories, chosen in every_set(codes, places, size):
        told = sum(
            plainly.set_score(values[np.ix_(rows, chosen)] / 20) if chosen else 0.0
            for rows in plainly.configurations(codes, categories)
        )
        columns = [*categories, *(places[place] for place in chosen)]
        assert at(found, columns) == pytest.approx(told, abs=1e-7, rel=1e-9)


def test_a_family_scores_as_its_regression_one_record_at_a_time():
    codes, values, places = plainly.mixed(60, [3, 2, 2], 3, seed=1)
    values = (values - values.mean(axis=0)) / values.std(axis=0)
    counts = plainly.all_levels(codes, places)
    found = number_scores(ArrayMoments(codes, counts, plainly.as_given(places, values)), 4)
    for child in range(3):
        others = [place for place in range(3) if place != child]
        for parents in [(), *combinations(others, 1), tuple(others)]:
            for categories in [(), (0,), (2,), (0, 2)]:
                if len(parents) + len(categories) > 3:
                    continue
                told = sum(
                    plainly.regression_score(values[np.ix_(rows, parents)], values[rows, child])
                    for rows in plainly.configurations(codes, categories)
                )
                columns = [*categories, *(places[parent] for parent in parents)]
                assert family(found, places[child], columns) == pytest.approx(told, abs=1e-9, rel=0)


def test_a_configuration_scores_as_brute_integration_over_mean_and_variance():
    values = np.asarray([0.4, -0.3, 1.1])

    mean, log_precision = np.meshgrid(np.linspace(-30.0, 30.0, 3_001), np.linspace(-14.0, 6.0, 2_001))
    precision = np.exp(log_precision)
    away = ((values[:, None, None] - mean) ** 2).sum(axis=0) + mean**2  # the prior mean counts as one record
    density = (precision / (2 * np.pi)) ** 2 * np.exp(-precision * away / 2) * gamma.pdf(precision, 1.5, scale=4.0)
    told = np.log((density * precision).sum() * 0.02 * 0.01)
    found = number_scores(ArrayMoments(np.zeros((3, 1)), [2], plainly.as_given((0,), values[:, None])), 1)
    assert at(found, [0]) == pytest.approx(told, abs=1e-6)


def test_a_mixed_family_scores_as_integration_in_each_configuration():
    codes = np.asarray([[0, 0, 0], [1, 0, 0], [0, 0, 0], [2, 0, 0], [1, 0, 0], [0, 0, 0]], dtype=np.int32)
    values = np.asarray([[0.3, 0.5], [-1.2, 0.4], [0.9, 1.3], [2.0, -0.7], [0.1, -0.9], [-0.4, 0.2]])
    found = number_scores(ArrayMoments(codes, [4, 2, 2], plainly.as_given((1, 2), values)), 3)
    told = 0.0
    for rows in plainly.configurations(codes, [0]):
        design = np.column_stack([np.ones(rows.size), values[rows, 0]])
        spread = np.eye(rows.size) + design @ np.diag([1.0, 2.0]) @ design.T

        def density(precision, rows=rows, spread=spread):
            given_variance = multivariate_normal.pdf(values[rows, 1], np.zeros(rows.size), spread / precision)
            return given_variance * gamma.pdf(precision, 2.0, scale=4.0)

        told += np.log(quad(density, 0.0, 200.0, epsabs=1e-13, limit=500)[0])
    assert family(found, 2, (0, 1)) == pytest.approx(told, abs=1e-7)


def test_scores_without_a_fold_are_those_of_the_other_records():
    codes, values, places = plainly.mixed(150, [2, 3], 3, seed=4)
    fold = np.random.default_rng(5).permutation(np.arange(150) % 5)
    counts = plainly.all_levels(codes, places)
    numbers = Numbers.standardised(places, np.round(values, 1))
    found = number_scores(ArrayMoments(codes, counts, numbers, fold, 5), 4)
    assert [each.shape[0] for each in found.by_size] == [6] * 5
    for part in range(6):
        kept = np.full(150, True) if part == 0 else fold != part - 1
        few = Numbers(places, numbers.values[kept], numbers.centre, numbers.scale, numbers.step)
        again = number_scores(ArrayMoments(codes[kept], counts, few), 4)
        for each, other in zip(found.by_size, again.by_size, strict=True):
            assert each[part] == pytest.approx(other[0], abs=1e-8, rel=0)


@pytest.mark.parametrize(("limit", "value"), [("_ROWS", 13), ("_HELD", 40), ("_TOGETHER", 1)])
def test_the_route_does_not_change_the_scores(monkeypatch, limit, value):
    codes, values, places = plainly.mixed(120, [5, 4, 3], 3, seed=6)
    made = plainly.moments(codes, values, places, np.arange(120) % 5, 5)
    before = number_scores(made, 4)
    monkeypatch.setattr(moments_room, limit, value)
    after = number_scores(plainly.moments(codes, values, places, np.arange(120) % 5, 5), 4)
    for one, other in zip(before.by_size, after.by_size, strict=True):
        assert one == pytest.approx(other, abs=1e-8, rel=0)


@settings(max_examples=30)
@given(st.lists(st.tuples(st.floats(1e-3, 1e4), st.floats(-1e3, 1e3)), min_size=3, max_size=3), st.booleans())
def test_other_units_change_a_score_by_their_logarithm_alone(units, rounded):
    codes, values, places = plainly.mixed(80, [3], 3, seed=7)
    if rounded:
        values = np.round(values, 0)
    factor, shift = np.asarray(units).T
    one = number_scores(plainly.moments(codes, values, places), 4)
    other = number_scores(plainly.moments(codes, values * factor + shift * factor, places), 4)
    for categories, chosen in every_set(codes, places, 4):
        columns = [*categories, *(places[place] for place in chosen)]
        less = 80 * np.log(factor[chosen]).sum()
        assert at(other, columns) == pytest.approx(at(one, columns) - less, abs=2e-5, rel=0)


def test_renaming_levels_and_moving_records_changes_no_score():
    codes, values, places = plainly.mixed(90, [3, 4], 2, seed=8)
    rng = np.random.default_rng(9)
    order = rng.permutation(90)
    renamed = codes.copy()
    renamed[:, 0] = np.asarray([2, 0, 1])[codes[:, 0]]
    one = number_scores(plainly.moments(codes, values, places), 4)
    other = number_scores(plainly.moments(renamed[order], values[order], places), 4)
    for each, again in zip(one.by_size, other.by_size, strict=True):
        assert each == pytest.approx(again, abs=1e-8, rel=0)


def test_networks_with_the_same_skeleton_and_v_structures_tie_to_the_last_bit():
    """Verma & Pearl 1990; with and without a category that leads to every number."""
    codes, values, places = plainly.mixed(3_000, [3], 4, seed=10)
    found = number_scores(plainly.moments(codes, values, places), 5)
    a, b, c, d = places
    category = (set(range(5)) - set(places)).pop()
    for also in [(), (category,)]:

        def graph(families, also=also):
            return sum(family(found, child, (*parents, *also)) for child, parents in families.items())

        chains = {
            graph({a: (), b: (a,), c: (b,), d: (c,)}),
            graph({d: (), c: (d,), b: (c,), a: (b,)}),
            graph({b: (), a: (b,), c: (b,), d: (c,)}),
        }
        assert len(chains) == 1
        collider = graph({a: (), c: (), b: (a, c), d: (c,)})
        assert abs(collider - chains.pop()) > 1e-3
        complete = {
            graph({child: order[:place] for place, child in enumerate(order)}) for order in permutations(places)
        }
        assert len(complete) == 1


def test_rounding_adds_a_twelfth_of_the_squared_step_for_each_record():
    values = np.asarray([1.0, 1.0, 3.0, 2.0, 5.0])
    fine = number_scores(ArrayMoments(np.zeros((5, 1)), [2], plainly.as_given((0,), values[:, None])), 1)
    coarse = number_scores(ArrayMoments(np.zeros((5, 1)), [2], plainly.as_given((0,), values[:, None], 1.0)), 1)
    scatter = 0.5 + (values**2).sum() - values.sum() ** 2 / 6.0
    less = -4.0 * (np.log(scatter + 5.0 / 12.0) - np.log(scatter))
    assert at(coarse, [0]) - at(fine, [0]) == pytest.approx(less, abs=1e-9)


def test_a_set_of_too_many_configurations_has_no_score():
    rng = np.random.default_rng(0)
    levels = [50, 50, 50, 50, 2, 2]
    codes = np.stack([rng.integers(0, count, 200) for count in levels], axis=1)
    numbers = Numbers.standardised((5,), rng.normal(size=(200, 1)))
    found = number_scores(ArrayMoments(codes, levels, numbers), 5)
    for chosen in combinations(range(5), 4):
        too_large = np.prod([levels[column] for column in chosen]) > 1_000_000
        assert np.isneginf(at(found, (*chosen, 5))) == too_large
    assert not any(np.isnan(each).any() for each in found.by_size)


def test_weights_of_one_half_score_as_half_the_sums():
    codes, values, places = plainly.mixed(50, [2], 2, seed=11)
    numbers = Numbers.standardised(places, values)
    twice = Numbers(places, np.repeat(numbers.values, 2, axis=0), numbers.centre, numbers.scale, 0 * numbers.step)
    once = Numbers(places, numbers.values, numbers.centre, numbers.scale, 0 * numbers.step)
    counts = plainly.all_levels(codes, places)
    one = number_scores(ArrayMoments(codes, counts, once), 3)
    other = number_scores(ArrayMoments(np.repeat(codes, 2, axis=0), counts, twice, weights=np.full(100, 0.5)), 3)
    for each, again in zip(one.by_size, other.by_size, strict=True):
        assert each == pytest.approx(again, abs=1e-8, rel=0)


def test_a_coarser_grain_moves_no_score_by_more_than_half_of_it():
    codes, values, places = plainly.mixed(50, [2], 2, seed=12)
    found = number_scores(plainly.moments(codes, values, places), 3)
    coarse = coarsened(found, 2.0**-20)
    assert coarse.grain == 2.0**-20 and coarsened(coarse, 2.0**-30) is coarse
    for each, again in zip(found.by_size, coarse.by_size, strict=True):
        assert np.abs(each - again).max() <= 2.0**-21
        assert np.all(again / 2.0**-20 == np.rint(again / 2.0**-20))
    assert number_scores(plainly.moments(codes, values, places), 3, grain=2.0**-20).grain == 2.0**-20


def test_scoring_says_how_far_it_is():
    codes, values, places = plainly.mixed(50, [2, 3, 2], 2, seed=13)
    heard = []
    number_scores(plainly.moments(codes, values, places), 4, tick=heard.append)
    assert heard == sorted(heard) and heard[-1] == 1.0 and len(heard) > 3


def test_families_of_numbers_are_taken_up_as_those_of_categories():
    codes, values, places = plainly.mixed(120, [2, 3, 2], 3, seed=14)
    found = number_scores(plainly.moments(codes, values, places), 4)
    names = [f"c{place}" for place in range(6)]
    order = Order([("First", names[:2]), ("Then", names[2:])], rule_out=[(names[0], names[5])])
    for who in (each for stage in candidates(order, 3) for each in stage if each.child in places):
        best = Families(who, found, 0, 3).best()
        leads = (*who.mates, *who.earlier)
        for count in range(min(3, len(leads)) + 1):
            told = max(family(found, who.child, parents) for parents in combinations(leads, count))
            assert best[count, -1] == told
            parents = Families(who, found, 0, 3).parents(count, (1 << who.width) - 1, told)
            assert family(found, who.child, parents) == told


def test_a_link_that_is_there_gains_and_one_that_is_not_loses():
    rng = np.random.default_rng(15)
    group = rng.integers(0, 3, 1_000)
    cause, idle = rng.normal(size=1_000), rng.normal(size=1_000)
    effect = 2.0 * cause + group + rng.normal(size=1_000)
    codes = np.column_stack([group, np.zeros((1_000, 3))])
    found = number_scores(plainly.moments(codes, np.column_stack([cause, idle, effect]), (1, 2, 3)), 4)
    assert family(found, 3, (1,)) > family(found, 3, ()) + 100
    assert family(found, 3, (0, 1)) > family(found, 3, (1,)) + 100
    assert family(found, 3, (0, 1)) > family(found, 3, (0, 1, 2)) + 1
