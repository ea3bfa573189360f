"""A number's regression in every configuration: closed forms, one record at a time, draws, coverage."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.stats import linregress, multivariate_t, norm
from scipy.stats import t as student_t

from engine.network.additive import Sharing, by_configuration, from_configuration
from engine.network.conjugate import conjugate
from engine.network.regression import family_regression
from engine.records.moments import ArrayMoments, Numbers


def products(design, child):
    """(terms + 1, terms + 1) as the sums of one configuration."""
    rows = np.column_stack([np.ones(len(child)), design, child])
    return rows.T @ rows


def moments(codes, parents, child, fold=None, folds=1):
    """Categories first, then the number parents, the child last."""
    values = np.column_stack([parents, child])
    categories = codes.shape[1]
    levels = [*(codes.max(axis=0) + 1).tolist(), *[2] * values.shape[1]]
    padded = np.column_stack([codes, np.zeros(values.shape, dtype=int)])
    numbers = Numbers.standardised(range(categories, categories + values.shape[1]), values)
    return ArrayMoments(padded, levels, numbers, fold, folds)


def learned(codes, parents, child):
    categories, numbers = codes.shape[1], parents.shape[1]
    made = moments(codes, parents, child)
    return family_regression(
        made.family(range(categories), range(categories, categories + numbers), categories + numbers)
    )


def some(rows, levels=(2, 3), parents=1, seed=0, differ=0.0, noise=1.0):
    """(codes, parents, child, intercepts, slopes): slopes of 1.5 that differ between configurations by `differ`."""
    rng = np.random.default_rng(seed)
    codes = np.column_stack([*(rng.integers(0, count, rows) for count in levels), np.zeros((rows, 0), dtype=int)])
    drawn = rng.normal(3.0, 2.0, (rows, parents))
    intercepts = np.full(levels, 5.0)
    for axis, count in enumerate(levels):
        along = [count if place == axis else 1 for place in range(len(levels))]
        intercepts = intercepts + rng.normal(size=count).reshape(along)
    slopes = 1.5 + differ * rng.normal(size=(*levels, parents))
    at = tuple(codes.astype(int).T)
    child = intercepts[at] + (slopes[at] * drawn).sum(axis=1) + noise * rng.normal(size=rows)
    return codes.astype(int), drawn, child, intercepts, slopes


# The conjugate step (O'Hagan & Forster 2004, chapter 11).


@settings(max_examples=25)
@given(st.integers(0, 2**32 - 1), st.integers(0, 12), st.integers(0, 3), st.floats(0.1, 9.0), st.floats(0.1, 9.0))
def test_evidence_is_the_product_of_one_step_t_densities(seed, rows, parents, shape, rate):
    rng = np.random.default_rng(seed)
    design, child = rng.normal(size=(rows, parents)), rng.normal(size=rows)
    centre, half = rng.normal(size=1 + parents), rng.normal(size=(1 + parents, 1 + parents))
    precision = half @ half.T + 0.1 * np.eye(1 + parents)
    found = conjugate(products(design, child)[None], centre[None], precision, shape, rate)
    told, a, b, p, m = 0.0, shape, rate, precision, precision @ centre
    for row, value in zip(np.column_stack([np.ones(rows), design]), child, strict=True):
        mean = row @ np.linalg.solve(p, m)
        wide = 1.0 + row @ np.linalg.solve(p, row)
        told += student_t.logpdf(value, 2 * a, mean, np.sqrt(b / a * wide))
        a, b, p, m = a + 0.5, b + 0.5 * (value - mean) ** 2 / wide, p + np.outer(row, row), m + row * value
    assert found.evidence[0] == pytest.approx(told, abs=1e-8, rel=1e-8)
    assert found.mean[0] == pytest.approx(np.linalg.solve(p, m), abs=1e-8, rel=1e-6)
    assert (found.shape[0], found.rate[0]) == pytest.approx((a, b), abs=1e-8, rel=1e-8)


def test_evidence_is_a_multivariate_t_density():
    rng = np.random.default_rng(3)
    design, child = rng.normal(size=(6, 2)), rng.normal(size=6)
    row = np.column_stack([np.ones(6), design])
    centre, precision = np.asarray([0.3, -1.0, 0.5]), np.diag([2.0, 0.5, 1.0])
    found = conjugate(products(design, child)[None], centre[None], precision, 1.7, 0.8)
    spread = 0.8 / 1.7 * (np.eye(6) + row @ np.linalg.inv(precision) @ row.T)
    assert found.evidence[0] == pytest.approx(multivariate_t(row @ centre, spread, 3.4).logpdf(child), abs=1e-10)


# What configurations share.


@given(st.integers(0, 2**32 - 1), st.lists(st.integers(1, 4), max_size=3), st.integers(1, 3))
def test_spreading_out_and_collecting_are_transposes(seed, levels, terms):
    rng = np.random.default_rng(seed)
    levels = tuple(levels)
    unknowns = rng.normal(size=terms + sum(levels))
    every = by_configuration(unknowns, terms, levels)
    codes = np.stack(np.unravel_index(np.arange(len(every)), levels), axis=1) if levels else np.empty((1, 0), dtype=int)
    weights = rng.normal(size=every.shape)
    collected = from_configuration(weights, codes, levels)
    assert (collected @ unknowns) == pytest.approx((weights * every).sum(axis=1), abs=1e-12)


def test_configurations_that_may_not_depart_share_the_least_squares_of_indicators():
    codes, parents, child, _, _ = some(400, seed=1)
    made = moments(codes, parents, child)
    sums = made.family((0, 1), (2,), 3).part(0)
    shared = Sharing(sums, (2, 3)).additive(1e9 * np.eye(2))
    values = made.numbers.values
    indicators = np.column_stack([codes[:, 0] == 1, codes[:, 1] == 1, codes[:, 1] == 2]).astype(float)
    design = np.column_stack([np.ones(400), values[:, 0], indicators])
    told, left, _, _ = np.linalg.lstsq(design, values[:, 1], rcond=None)
    every = by_configuration(shared.coefficients, 2, (2, 3))
    assert every[:, 1] == pytest.approx(told[1], abs=1e-3)
    assert every[5, 0] - every[0, 0] == pytest.approx(told[2] + told[4], abs=5e-3)
    assert shared.variance == pytest.approx(left[0] / 395, rel=1e-3)


def test_the_unknowns_cost_as_many_degrees_of_freedom_as_they_take():
    codes, parents, child, _, _ = some(300, seed=2)
    sums = moments(codes, parents, child).family((0, 1), (2,), 3).part(0)
    sharing = Sharing(sums, (2, 3))
    shared = sharing.additive(10.0 * np.eye(2))
    assert sharing.determined(shared, 10.0 * np.eye(2)).sum() == pytest.approx(300 - shared.freedom, abs=1e-9)
    assert 4.0 < 300 - shared.freedom < 5.0  # 1 intercept, 1 slope, 1 + 2 levels, a little less for the prior


# The posterior.


def test_without_category_parents_it_is_least_squares():
    _, parents, child, _, _ = some(80, levels=(), seed=3)
    found = learned(np.empty((80, 0), dtype=int), parents, child)
    told = linregress(parents[:, 0], child)
    variance = ((child - told.intercept - told.slope * parents[:, 0]) ** 2).sum() / 78
    assert found.means.slopes == pytest.approx([told.slope], rel=1e-7)
    assert found.means.intercept == pytest.approx(told.intercept, rel=1e-7)
    assert found.means.variance == pytest.approx(variance, rel=1e-6)
    drawn = found.draws(40_000, np.random.default_rng(0))
    assert drawn.slopes[0, 1:].std() == pytest.approx(told.stderr, rel=0.02)
    assert drawn.intercept[1:].std() == pytest.approx(told.intercept_stderr, rel=0.02)
    low, high = student_t.interval(0.9, 78, told.slope, told.stderr)
    assert np.quantile(drawn.slopes[0, 1:], [0.05, 0.95]) == pytest.approx([low, high], abs=0.03 * (high - low))


def test_draws_stand_on_the_last_axis_and_begin_with_the_means():
    codes, parents, child, _, _ = some(300, parents=2, seed=4, differ=0.5)
    found = learned(codes, parents, child)
    drawn = found.draws(4_000, np.random.default_rng(1))
    assert drawn.slopes.shape == (2, 3, 2, 4_001)
    assert drawn.intercept.shape == drawn.variance.shape == (2, 3, 4_001)
    for name in ("intercept", "slopes", "variance"):
        mean, every = getattr(found.means, name), getattr(drawn, name)
        assert np.array_equal(every[..., 0], mean)
        error = every[..., 1:].std(axis=-1) / np.sqrt(4_000)
        assert np.all(np.abs(every[..., 1:].mean(axis=-1) - mean) < 5 * error + 0.01 * np.abs(mean))
    again = found.draws(4_000, np.random.default_rng(1))
    assert np.array_equal(again.slopes, drawn.slopes)


def test_a_configuration_without_records_follows_what_the_others_share():
    codes, parents, child, intercepts, _ = some(2_000, seed=5)
    kept = ~((codes[:, 0] == 1) & (codes[:, 1] == 2))
    one = np.flatnonzero((codes[:, 0] == 0) & (codes[:, 1] == 1))
    kept[one[1:]] = False  # and a configuration of one record
    found = learned(codes[kept], parents[kept], child[kept])
    told = intercepts + 3.0 * 1.5
    means = found.means.intercept + 3.0 * found.means.slopes[..., 0]
    assert means == pytest.approx(told, abs=0.5)
    drawn = found.draws(500, np.random.default_rng(2))
    spread = (drawn.intercept + 3.0 * drawn.slopes[..., 0, :]).std(axis=-1)
    assert spread[1, 2] > 2 * spread[0, 0] and spread[0, 1] > 2 * spread[0, 0]


def test_the_prior_weighs_more_where_configurations_agree():
    alike = learned(*some(1_500, levels=(4, 4), seed=6)[:3])
    different = learned(*some(1_500, levels=(4, 4), seed=6, differ=1.0)[:3])
    assert alike.weight >= 30.0 and different.weight <= 3.0


def test_a_prior_never_outweighs_the_records_that_it_comes_from():
    found = learned(*some(40, levels=(3,), seed=7)[:3])
    assert found.weight <= 40 * 2 / 3


@given(st.floats(1e-3, 1e3), st.floats(-1e3, 1e3), st.floats(1e-3, 1e3), st.floats(-1e3, 1e3))
@settings(max_examples=20)
def test_units_go_with_the_columns(parent_unit, parent_origin, unit, origin):
    codes, parents, child, _, _ = some(200, seed=8, differ=0.3)
    one = learned(codes, parents, child)
    other = learned(codes, parents * parent_unit + parent_origin, child * unit + origin)
    slopes = one.means.slopes * unit / parent_unit
    assert other.means.slopes == pytest.approx(slopes, rel=1e-5, abs=1e-9 * unit / parent_unit)
    assert other.means.variance == pytest.approx(one.means.variance * unit**2, rel=1e-5)
    told = one.log_density(codes, parents, child) - np.log(unit)
    found = other.log_density(codes, parents * parent_unit + parent_origin, child * unit + origin)
    assert found == pytest.approx(told, abs=1e-4)


def test_renaming_levels_changes_nothing_else():
    codes, parents, child, _, _ = some(200, seed=9, differ=0.3)
    one = learned(codes, parents, child).means
    renamed = np.column_stack([1 - codes[:, 0], np.asarray([2, 0, 1])[codes[:, 1]]])
    other = learned(renamed, parents, child).means
    assert other.slopes[1][[2, 0, 1]] == pytest.approx(one.slopes[0], rel=1e-9)


def test_a_part_is_learned_from_the_other_folds_alone():
    codes, parents, child, _, _ = some(300, seed=10)
    fold = np.arange(300) % 5
    sums = moments(codes, parents, child, fold, 5).family((0, 1), (2,), 3)
    kept = fold != 2
    few = learned(codes[kept], parents[kept], child[kept]).means
    found = family_regression(sums, 3).means
    assert found.slopes == pytest.approx(few.slopes, abs=1e-4)
    assert found.variance == pytest.approx(few.variance, rel=1e-4)


# The predictive density.


def test_the_predictive_density_has_the_mass_of_one():
    codes, parents, child, _, _ = some(60, seed=11)
    found = learned(codes, parents, child)

    def density(value):
        return np.exp(found.log_density(np.asarray([[1, 2]]), np.asarray([[4.0]]), np.asarray([value]))[0])

    assert quad(density, -200.0, 200.0, points=[10.0], limit=400)[0] == pytest.approx(1.0, abs=1e-5)


def test_the_predictive_density_is_that_of_the_draws():
    codes, parents, child, _, _ = some(60, seed=12, differ=0.5)
    found = learned(codes, parents, child)
    drawn = found.draws(40_000, np.random.default_rng(3))
    for configuration, parent in [((0, 0), 3.0), ((1, 2), 9.0)]:
        mean = drawn.intercept[configuration] + drawn.slopes[configuration][0] * parent
        for away in (-2.0, 0.0, 1.0):
            value = mean[0] + away
            told = norm.pdf(value, mean[1:], np.sqrt(drawn.variance[configuration][1:])).mean()
            density = found.log_density(np.asarray([configuration]), np.asarray([[parent]]), np.asarray([value]))
            assert np.exp(density[0]) == pytest.approx(told, rel=0.05)


def test_rounding_keeps_the_variance_of_a_copied_column_above_its_own():
    rng = np.random.default_rng(13)
    fine = rng.normal(0.0, 10.0, 500)
    found = learned(np.empty((500, 0), dtype=int), fine.round()[:, None], fine.round())
    assert found.means.variance == pytest.approx(1.0 / 12.0, rel=0.05)


# Coverage: intervals of 100 simulated tables.


@pytest.mark.parametrize(
    ("rows", "levels", "differ"),
    [(60, (), 0.0), (40, (3,), 0.0), (300, (2, 3), 0.0), (300, (2, 3), 1.0), (1_000, (5, 5, 4), 1.0)],
)
def test_nine_in_ten_intervals_of_a_slope_hold_it(rows, levels, differ):
    each, average = [], []
    for seed in range(100):
        codes, parents, child, _, slopes = some(rows, levels, 1, seed, differ, noise=2.0)
        padded = learned(codes, parents, child)
        drawn = padded.draws(400, np.random.default_rng(seed)).slopes[..., 0, 1:]
        seen = slopes[tuple(slice(0, count) for count in padded.levels)][..., 0]
        low, high = np.quantile(drawn, [0.05, 0.95], axis=-1)
        each.append(((low <= seen) & (seen <= high)).mean())
        low, high = np.quantile(drawn.reshape(-1, 400).mean(axis=0), [0.05, 0.95])
        average.append(low <= seen.mean() <= high)
    assert np.mean(each) >= 0.85
    assert np.mean(average) >= 0.83
    if differ or not levels:
        assert np.mean(each) <= 0.97
