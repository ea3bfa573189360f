"""Weights and groups: what each record counts for, what is refused, and what is said of it."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records import Column, Table
from engine.records.standing import standing
from engine.refusal import Refusal


def frame(rows=40, **columns):
    rng = np.random.default_rng(2)
    return pd.DataFrame({"town": rng.choice(list("abc"), rows), "age": rng.normal(40, 9, rows), **columns})


def visits():
    """200 records of 25 sites that differ in town."""
    site = np.repeat(np.arange(25), 8)
    rng = np.random.default_rng(3)
    town = np.where(rng.random(200) < 0.6, np.array(list("abc"))[site % 3], rng.choice(list("abc"), 200))
    return frame(200, site=[f"site {n}" for n in site], region=np.where(site % 2, "east", "west"), town=town)


@given(st.lists(st.floats(1e-3, 1e3), min_size=2, max_size=30))
def test_weights_keep_their_proportions_and_sum_to_the_effective_size_of_kish(given_weights):
    table = Table.from_frame(frame(len(given_weights), w=given_weights), {"w": "weight"})
    w = np.array(given_weights)
    assert table.weights.sum() == pytest.approx(w.sum() ** 2 / (w**2).sum())
    assert np.allclose(table.weights / table.weights[0], w / w[0])
    assert table.weights.sum() <= len(w) * (1 + 1e-12)


@pytest.mark.parametrize("unit", [1e-200, 1.0, 1e200])
def test_the_unit_of_a_weight_does_not_matter(unit):
    w = np.array([1.0, 2.0, 4.0] * 5)
    assert Table.from_frame(frame(15, w=w * unit), {"w": "weight"}).weights.sum() == pytest.approx(35**2 / 105)


def test_equal_weights_change_nothing_and_without_them_every_record_counts_for_one():
    assert np.allclose(Table.from_frame(frame(w=3.5), {"w": "weight"}).weights, 1.0)
    bare = Table.from_frame(frame())
    assert bare.weights.tolist() == [1.0] * 40 and bare.group is None and bare.warnings == ()


def test_a_weight_in_words_of_digits_is_a_number():
    table = Table.from_frame(frame(4, w=["1", "2", "1", "2"]), {"w": "weight"})
    assert table.columns["w"].values.tolist() == [1.0, 2.0, 1.0, 2.0]


def test_neither_is_learned_from():
    table = Table.from_frame(visits().assign(w=1.5), {"site": "group", "w": "weight"})
    assert not table.columns["site"].used and not table.columns["w"].used and table.columns["town"].used
    for name in ("site", "w"):
        assert table.columns[name].levels == ()
        with pytest.raises(Refusal, match="which is not learned from") as refused:
            table.coded(["town", name])
        assert refused.value.where == name and refused.value.do
        with pytest.raises(Refusal):
            table.matches(name, "site 1")


@pytest.mark.parametrize(
    ("weights", "says"),
    [
        ([1.0, np.nan, 2.0, np.nan], "blank in records 2 and 4"),
        ([1.0, 0.0, 2.0, 3.0], "not over 0 in record 2"),
        ([-1.0, 1.0, 2.0, -3.0], "not over 0 in records 1 and 4"),
        ([-1.0] * 9, "not over 0 in records 1, 2, 3, 4, 5 and 4 more"),
        ([1.0, np.inf, 2.0, 3.0], "infinite in 1 of its cells; the first is record 2"),
        (["1", "two", "1", "3"], "record 2 holds “two”"),
    ],
)
def test_a_weight_that_is_no_number_over_nothing_is_refused_with_its_records(weights, says):
    with pytest.raises(Refusal, match=says) as refused:
        Table.from_frame(frame(len(weights), w=weights), {"w": "weight"})
    assert refused.value.where == "w" and refused.value.do


def test_records_are_named_by_their_place_in_the_file():
    cells = frame(6, w=[1.0, 1.0, 1.0, 1.0, -1.0, 1.0])
    cells.loc[[0, 2], "town"] = None
    with pytest.raises(Refusal, match="not over 0 in record 5"):
        Table.from_frame(cells, {"w": "weight", "town": "category"}, blanks={"town": "drop row"})


def test_a_blank_weight_may_be_a_reason_to_leave_the_row_out():
    cells = frame(6, w=[1.0, np.nan, 1.0, 2.0, 2.0, 2.0])
    table = Table.from_frame(cells, {"w": "weight"}, blanks={"w": "drop row"})
    assert table.rows == 5 and dict(table.dropped) == {"w": 1} and table.weights.sum() == pytest.approx(64 / 14)


@pytest.mark.parametrize("kind", ["weight", "group"])
def test_there_is_one_weight_and_one_group_at_most(kind):
    cells = frame(one=[1, 2] * 20, two=[2, 1] * 20)
    with pytest.raises(Refusal, match=f"“one” and “two” are taken as the {kind}, and there can only be one") as refused:
        Table.from_frame(cells, {"one": kind, "two": kind})
    assert refused.value.where == "two" and refused.value.do


@pytest.mark.parametrize(
    "cells", [["x", "y", "x", "z"] * 10, [7.5, 1.0, 7.5, 3.0] * 10, [True, False, True, True] * 10]
)
def test_rows_of_one_identifier_are_one_group(cells):
    group = Table.from_frame(frame(who=cells), {"who": "group"}).group
    assert group.dtype == np.int32 and group.min() == 0 and group.max() == np.unique(group).size - 1
    together = group[:, None] == group[None, :]
    assert (together == (np.array(cells)[:, None] == np.array(cells)[None, :])).all()


@given(st.lists(st.sampled_from(["a", "b", "<script>", None]), min_size=4, max_size=20), st.data())
def test_a_blank_group_is_a_case_by_itself_and_groups_are_numbered_without_gaps(who, data):
    town = data.draw(st.lists(st.sampled_from(["n", "s", None]), min_size=len(who), max_size=len(who)))
    kept = [each is not None for each in town]
    left = [each for each, keep in zip(who, kept, strict=True) if keep]
    cells = pd.DataFrame({"who": pd.Series(who, dtype=object), "town": pd.Series(town, dtype=object), "x": 1})
    wanted = {each for each in left if each is not None}
    alone = left.count(None)
    if len(left) < 2 or len(wanted) + alone < 2:
        with pytest.raises(Refusal):
            Table.from_frame(cells, {"who": "group", "town": "category"}, blanks={"town": "drop row"})
        return
    table = Table.from_frame(cells, {"who": "group", "town": "category"}, blanks={"town": "drop row"})
    assert sorted(set(table.group.tolist())) == list(range(len(wanted) + alone))
    for each, code in zip(left, table.group, strict=True):
        assert (table.group == code).sum() == (1 if each is None else left.count(each))


def test_one_group_for_everything_is_refused():
    with pytest.raises(Refusal, match="every record into one group"):
        Table.from_frame(frame(who="same"), {"who": "group"})


def test_what_weights_do_is_said():
    said = Table.from_frame(frame(w=[1.0, 3.0] * 20), {"w": "weight"}).warnings
    assert said == ("By their weights in “w” the 40 records are worth 32 of equal weight.",)


def test_what_groups_do_is_said_with_the_columns_that_rest_on_them_alone():
    table = Table.from_frame(visits(), {"site": "group"})
    said = " ".join(table.warnings)
    assert said.startswith("The records stand in 25 groups by “site”. Those of one group are alike")
    worth = table.coded(["town", "age", "region"], ["age"]).weights.sum()
    assert f"worth {round(worth)} separate cases when all columns are learned from" in said and worth < 200
    assert "“region” does not vary inside a group" in said and "rests on 25 groups alone" in said


def test_groups_that_are_no_more_alike_than_others_change_nothing():
    apart = frame(who=np.tile(np.arange(20), 2), came=["no"] * 20 + ["yes"] * 20)
    table = Table.from_frame(apart, {"who": "group", "town": "left out", "age": "left out"})
    assert table.weights.tolist() == [1.0] * 40
    assert table.warnings[0].endswith("no more alike than others, so each counts as a case of its own.")
    every = Table.from_frame(frame(who=np.arange(40)), {"who": "group"})
    assert every.weights.tolist() == [1.0] * 40
    assert every.warnings == ("Every record is a group of its own by “who”, so grouping changes nothing.",)


@pytest.mark.parametrize(
    ("away", "told"),
    [(10, "alike (intraclass correlation 0.03)"), (6, "a little alike"), (0, "no more alike than others")],
)
def test_a_correlation_that_rounds_to_nothing_is_told_in_words(away, told):
    ones = [50 + away, 50 - away] * 50  # of each 100 records of a group
    codes = np.concatenate([np.arange(100) < many for many in ones]).astype(np.int32)
    group = Column("who", "group", "", codes=np.repeat(np.arange(100), 100).astype(np.int32))
    made = standing({"who": group, "x": Column("x", "category", "", ("a", "b"), codes)}, 10_000)
    assert f"Those of one group are {told}, so " in made.said[0]
    assert (made.effect.factor() > 1.001) == (away > 0)


def test_blank_groups_are_counted_and_few_of_them_only_as_few():
    who = [f"p{n // 2}" for n in range(40)]
    some = [None] * 12 + who[12:]
    few = [None] * 3 + who[3:]
    assert "“who” is blank in 12 records; a record without a group is a case by itself." in said_of(some)
    assert "“who” is blank in under 10 records; a record without a group is a case by itself." in said_of(few)


def said_of(who):
    return Table.from_frame(frame(who=who), {"who": "group"}).warnings


def test_both_pass_into_what_is_learned_from():
    table = Table.from_frame(visits().assign(w=[1.0, 2.0] * 100), {"site": "group", "w": "weight"})
    coded = table.coded(["town", "region"])
    assert coded.group is table.group and np.allclose(coded.weights / coded.weights[0], [1.0, 2.0] * 100)
    assert coded.weights.sum() <= table.weights.sum() * (1 + 1e-12)


def test_the_digest_changes_with_the_kind_and_with_every_weight_and_group():
    cells = visits().assign(w=[1.0, 2.0] * 100)
    kinds = {"site": "group", "w": "weight"}
    digest = Table.from_frame(cells, kinds).digest
    assert Table.from_frame(cells, {"w": "weight"}).digest != digest
    assert Table.from_frame(cells, {"site": "group"}).digest != digest
    for column, value in (("w", 2.5), ("site", "site 24")):
        other = cells.copy()
        other.loc[0, column] = value
        assert Table.from_frame(other, kinds).digest != digest
    assert Table.from_frame(cells.copy(), kinds).digest == digest
