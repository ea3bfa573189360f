"""How alike the records of a group are, and what grouped records are worth as separate cases."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import f_oneway

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
    assert effect.factor == pytest.approx(8.0)  # 400 records are worth the 50 groups that they stand in


def test_unequal_groups_count_by_their_squares():
    group = np.repeat([0, 1, 2], [1, 2, 5])
    effect = design_effect(group, np.ones(8), [])
    assert effect.size == pytest.approx((1 + 4 + 25) / 8) and effect.alike == 0.0 and effect.factor == 1.0


def test_the_correlation_is_the_mean_over_the_columns_and_blanks_in_numbers_are_passed_over():
    rng, group = some_groups(5, 300, 6)
    values = rng.normal(size=300)[group] + rng.normal(size=group.size)
    seen = rng.random(group.size) < 0.7
    columns = [
        Column("x", "number", "", values=np.where(seen, values, np.nan)),
        Column("y", "category", "", ("a", "b"), rng.integers(0, 2, group.size).astype(np.int32)),
        Column("same", "category", "", ("a",), np.zeros(group.size, dtype=np.int32)),
    ]
    both = [intraclass(group[seen], values[seen]), intraclass(group, levels=columns[1].codes)]
    assert design_effect(group, np.ones(group.size), columns).alike == pytest.approx(np.mean(both))


def test_it_never_makes_records_worth_more():
    assert DesignEffect(groups=9, size=4.0, alike=-0.2).factor == 1.0
    group = np.repeat(np.arange(40), 2)
    opposite = Column("x", "category", "", ("a", "b"), np.tile([0, 1], 40).astype(np.int32))
    effect = design_effect(group, np.ones(80), [opposite])
    assert effect.alike < -0.9 and effect.factor == 1.0


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
    told = effective / DesignEffect(groups=60, size=size, alike=known).factor
    assert 1 / (between + within).var() == pytest.approx(told, rel=0.05)


def test_weights_and_groups_of_a_table_sum_to_its_effective_size():
    rng, group = some_groups(7, 80, 6)
    passed = rng.integers(0, 2, 80)[group]
    frame = pd.DataFrame({"site": group, "passed": passed, "w": rng.uniform(1, 4, group.size)})
    table = Table.from_frame(frame, {"site": "group", "w": "weight", "passed": "category"})
    w = frame["w"].to_numpy()
    size = (np.bincount(group, w) ** 2).sum() / (w**2).sum()
    assert table.weights.sum() == pytest.approx(w.sum() ** 2 / (w**2).sum() / size)
    assert np.allclose(table.weights / table.weights[0], w / w[0])
