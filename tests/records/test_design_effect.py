"""How alike the records of a group are, and what grouped records are worth as separate cases."""

from itertools import combinations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import f_oneway

from engine.learning.learn import learn
from engine.order import Order
from engine.records import Table
from engine.records.column import Column
from engine.records.design_effect import DesignEffect, design_effect, intraclass


def some_groups(seed, groups, most):
    rng = np.random.default_rng(seed)
    return rng, rng.permutation(np.repeat(np.arange(groups), rng.integers(1, most + 1, groups)))


def usual_size(group):
    sizes = np.bincount(group)
    return (group.size - (sizes**2).sum() / group.size) / (sizes.size - 1)


@given(st.integers(0, 2**32 - 1), st.integers(2, 12), st.integers(2, 9))
def test_the_correlation_is_that_of_an_analysis_of_variance(seed, groups, most):
    rng, group = some_groups(seed, groups, most)
    if group.size == groups:
        assert intraclass(group, rng.normal(size=group.size)) is None
        return
    values = rng.normal(size=groups)[group] * rng.choice([0, 0.5, 2]) + rng.normal(size=group.size) + 1e3
    ratio = f_oneway(*(values[group == each] for each in range(groups))).statistic
    wanted = (ratio - 1) / (ratio + usual_size(group) - 1)
    assert intraclass(group, values) == pytest.approx(wanted, abs=1e-9)


@given(st.integers(0, 2**32 - 1), st.integers(2, 8), st.integers(2, 6))
def test_of_levels_it_is_that_of_their_indicators_summed(seed, groups, most):
    rng, group = some_groups(seed, groups, most)
    levels = rng.integers(0, 4, group.size)
    if group.size == groups or np.unique(levels).size < 2:
        assert intraclass(group, levels=levels) is None
        return
    between = within = 0.0
    for level in range(4):
        hit = (levels == level).astype(float)
        for each in range(groups):
            own = hit[group == each]
            between += own.size * (own.mean() - hit.mean()) ** 2 / (groups - 1)
            within += ((own - own.mean()) ** 2).sum() / (group.size - groups)
    wanted = (between - within) / (between + (usual_size(group) - 1) * within)
    assert intraclass(group, levels=levels) == pytest.approx(wanted, abs=1e-9)


@given(st.integers(0, 2**32 - 1))
def test_two_levels_are_as_alike_as_the_number_of_one_of_them(seed):
    rng, group = some_groups(seed, 9, 6)
    levels = rng.integers(0, 2, group.size)
    assert intraclass(group, levels=levels) == pytest.approx(intraclass(group, levels.astype(float)), abs=1e-12)


@pytest.mark.parametrize("known", [0.0, 0.1, 0.5, 0.9])
def test_a_known_correlation_is_found_in_numbers_and_in_levels(known):
    rng, group = some_groups(3, 4_000, 9)
    values = np.sqrt(known) * rng.normal(size=4_000)[group] + np.sqrt(1 - known) * rng.normal(size=group.size)
    assert intraclass(group, values) == pytest.approx(known, abs=0.02)
    shares = [0.6, 0.3, 0.1]
    own = rng.random(group.size) < np.sqrt(known)  # takes the level of its group, so a pair does with share `known`
    levels = np.where(own, rng.choice(3, 4_000, p=shares)[group], rng.choice(3, group.size, p=shares))
    assert intraclass(group, levels=levels) == pytest.approx(known, abs=0.02)


def test_a_value_that_never_varies_in_a_group_is_wholly_alike_and_what_never_varies_says_nothing():
    _, group = some_groups(4, 30, 5)
    assert intraclass(group, group * 1.5) == pytest.approx(1.0)
    assert intraclass(group, levels=group % 3) == pytest.approx(1.0)
    assert intraclass(group, np.full(group.size, 7.0)) is None
    assert intraclass(group, levels=np.zeros(group.size, dtype=int)) is None


def test_groups_of_one_size_give_the_size_that_kish_gives():
    group = np.repeat(np.arange(50), 8)
    column = Column("x", "category", "", ("a", "b"), (group % 2).astype(np.int32))
    effect = design_effect(group, np.ones(group.size), [column])
    assert (effect.groups, effect.size) == (50, 8.0) and effect.same == ("x",)
    assert effect.factor() == pytest.approx(8.0)  # 400 records are worth the 50 groups that they stand in


def test_unequal_groups_count_by_their_squares():
    group = np.repeat([0, 1, 2], [1, 2, 5])
    effect = design_effect(group, np.ones(8), [])
    assert effect.size == pytest.approx((1 + 4 + 25) / 8) and effect.correlation() == 0.0 and effect.factor() == 1.0


def test_each_column_has_its_own_correlation_and_blanks_in_numbers_are_passed_over():
    rng, group = some_groups(5, 300, 6)
    values = rng.normal(size=300)[group] + rng.normal(size=group.size)
    seen = rng.random(group.size) < 0.7
    columns = [
        Column("x", "number", "", values=np.where(seen, values, np.nan)),
        Column("y", "category", "", ("a", "b"), rng.integers(0, 2, group.size).astype(np.int32)),
        Column("same", "category", "", ("a",), np.zeros(group.size, dtype=np.int32)),
    ]
    both = {"x": intraclass(group[seen], values[seen]), "y": intraclass(group, levels=columns[1].codes)}
    assert design_effect(group, np.ones(group.size), columns).alike == pytest.approx(both)


CORRELATIONS = st.dictionaries(st.sampled_from("abcdef"), st.floats(-0.5, 1.0), max_size=6)


@given(CORRELATIONS, st.sets(st.sampled_from("abcdef")), st.sets(st.sampled_from(["ab", "ac", "bc", "de", "af"])))
def test_records_count_by_the_pair_of_columns_that_are_most_alike_among_those_that_may_be_linked(alike, names, pairs):
    def linked(one, other):
        return "".join(sorted((one, other))) in pairs

    told = DesignEffect(9, 4.0, alike).correlation(names, linked)
    held = {name: each for name, each in alike.items() if name in names}
    both = [(held[a], held[b]) for a, b in combinations(held, 2) if linked(a, b)]
    wanted = max([min(pair) for pair in both] if both else list(held.values()), default=0.0)
    assert told == max(0.0, wanted)
    assert all(told >= one * other for one, other in both if one > 0 and other > 0)
    assert DesignEffect(9, 4.0, alike).factor(names, linked) == 1.0 + 3.0 * told


def site_frame(noise, rng, groups=60, size=25, columns=("a", "b")):
    """Columns that never vary inside a site, each by itself, and others that know nothing of the sites."""
    site = np.repeat(np.arange(groups), size)
    frame = {"site": [f"s{each}" for each in site]}
    frame |= {name: rng.permutation(np.arange(groups) % 2)[site].astype(str) for name in columns}
    frame |= {f"n{place}": rng.choice(["k", "l"], site.size) for place in range(noise)}
    return Table.from_frame(pd.DataFrame(frame), {"site": "group"})


@pytest.mark.parametrize("noise", [0, 12])
def test_columns_that_do_not_follow_the_groups_do_not_make_those_that_do_worth_more(noise):
    table = site_frame(noise, np.random.default_rng(0))
    assert table.weights.tolist() == [1.0] * 1_500
    assert table.coded(["a", "b"]).weights.sum() == pytest.approx(60)
    assert table.coded([name for name in table.columns if name != "site"]).weights.sum() == pytest.approx(60)
    assert "worth 60 separate cases when all columns are learned from" in table.warnings[0]


def test_one_column_that_follows_the_groups_does_not_make_a_case_of_each():
    table = site_frame(12, np.random.default_rng(1), columns="a")
    names = [name for name in table.columns if name != "site"]
    assert table.coded(names).weights.sum() > 1_500 / 2
    both = site_frame(12, np.random.default_rng(1))
    apart = both.coded([name for name in both.columns if name != "site"], (), lambda a, b: {a, b} != {"a", "b"})
    assert apart.weights.sum() > 1_500 / 2  # no link between them may be drawn


@pytest.mark.parametrize("known", [0.1, 0.5])
def test_where_all_columns_are_as_alike_records_are_worth_what_kish_says(known):
    rng = np.random.default_rng(2)
    site = np.repeat(np.arange(1_000), 10)
    values = np.sqrt(known) * rng.normal(size=(1_000, 4))[site] + np.sqrt(1 - known) * rng.normal(size=(10_000, 4))
    frame = pd.DataFrame(values, columns=list("wxyz")).assign(site=[f"s{each}" for each in site])
    table = Table.from_frame(frame, {"site": "group"})
    assert table.coded(list("wxyz")).weights.sum() == pytest.approx(10_000 / (1 + 9 * known), rel=0.1)


@pytest.mark.parametrize("noise", [0, 12])
def test_independent_columns_that_follow_the_groups_are_rarely_surely_linked(noise):
    sure = 0
    for seed in range(30):
        table = site_frame(noise, np.random.default_rng(seed))
        learned = learn(table, Order([("One", ["a"]), ("Two", ["b"])]), folds=False, graphs=0)
        sure += learned.posterior.support[0, 1] > 0.9
    assert sure <= 1


def test_it_never_makes_records_worth_more():
    assert DesignEffect(9, 4.0, {"x": -0.2, "y": -0.1}).factor() == 1.0
    group = np.repeat(np.arange(40), 2)
    opposite = Column("x", "category", "", ("a", "b"), np.tile([0, 1], 40).astype(np.int32))
    effect = design_effect(group, np.ones(80), [opposite])
    assert effect.alike["x"] < -0.9 and effect.factor() == 1.0


@pytest.mark.parametrize("weighted", [False, True])
def test_the_effective_number_of_records_is_that_of_a_mean_over_them(weighted):
    rng, group = some_groups(6, 60, 12)
    weights = rng.choice([1.0, 2.0, 5.0], group.size) if weighted else np.ones(group.size)
    share = weights / weights.sum()
    known = 0.3
    between = rng.normal(size=(20_000, 60)) @ np.bincount(group, share) * np.sqrt(known)
    within = rng.normal(size=20_000) * np.sqrt((share**2).sum() * (1 - known))
    effective = weights.sum() ** 2 / (weights**2).sum()
    size = design_effect(group, weights, []).size
    told = effective / DesignEffect(groups=60, size=size, alike={"x": known}).factor()
    assert 1 / (between + within).var() == pytest.approx(told, rel=0.05)


def test_weights_and_groups_of_what_is_learned_sum_to_its_effective_size():
    rng, group = some_groups(7, 80, 6)
    passed = rng.integers(0, 2, 80)[group]
    frame = pd.DataFrame({"site": group, "passed": passed, "w": rng.uniform(1, 4, group.size)})
    table = Table.from_frame(frame, {"site": "group", "w": "weight", "passed": "category"})
    w = frame["w"].to_numpy()
    size = (np.bincount(group, w) ** 2).sum() / (w**2).sum()
    coded = table.coded(["passed"])
    assert table.weights.sum() == pytest.approx(w.sum() ** 2 / (w**2).sum())
    assert coded.weights.sum() == pytest.approx(w.sum() ** 2 / (w**2).sum() / size)
    assert np.allclose(coded.weights / coded.weights[0], w / w[0])
