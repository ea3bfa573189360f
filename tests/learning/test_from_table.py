"""Learning from a table: its kinds and blanks reach the network, and an order that does not fit it is refused."""

import numpy as np
import pandas as pd
import pytest

from engine.learning.learn import learn, learn_coded
from engine.order import LESS, MORE, Order
from engine.records.table import Table
from engine.refusal import Refusal


@pytest.fixture
def evening_school():
    rng = np.random.default_rng(4)
    shift = rng.choice(["days", "nights"], 300)
    hours = np.round(rng.normal(20, 6, 300), 1)
    passed = np.where(rng.random(300) < np.where(shift == "days", 0.8, 0.3), "yes", "no").astype(object)
    passed[:12] = None
    frame = pd.DataFrame({"shift": shift, "hours": hours, "passed": passed, "note": "same"})
    return Table.from_frame(frame, kinds={"note": "left out"})


def test_kinds_cuts_and_blanks_reach_the_network(evening_school):
    learned = learn(evening_school, Order([("Life", ["shift", "hours"]), ("Result", ["passed"])]))
    network = learned.network()
    hours, passed = network.node("hours"), network.node("passed")
    assert hours.kind == "number" and len(hours.cuts) == len(hours.levels) - 1
    assert passed.has_blank and passed.levels[-1] == "blank"
    assert ("shift", "passed") in network.links
    assert learned.digest == evening_school.digest and learned.rows == 300


def test_a_table_learns_as_its_coded_columns_do(evening_school):
    order = Order([("Result", ["passed"]), ("Life", ["shift"])])
    one = learn(evening_school, order, seed=2)
    other = learn_coded(evening_school.coded(order.columns), order, evening_school.digest, seed=2)
    assert one.curve.equals(other.curve) and one.chosen == other.chosen


@pytest.mark.parametrize(("column", "says"), [("weather", "do not have"), ("note", "left out")])
def test_an_order_with_a_column_that_cannot_be_learned_is_refused(evening_school, column, says):
    with pytest.raises(Refusal, match=says) as refused:
        learn(evening_school, Order([("Life", ["shift", column])]))
    assert refused.value.where == column and refused.value.do


@pytest.mark.parametrize(
    ("kind", "says", "do"),
    [
        (None, "It holds dates", "Take it out of the order."),
        ("left out", "You chose it. It holds dates", "Take it out of the order."),
    ],
)
def test_a_column_left_out_is_refused_with_the_reason(evening_school, kind, says, do):
    frame = evening_school.frame.assign(day=[f"2020-{1 + n % 12:02}-{1 + n % 28:02}" for n in range(300)])
    table = Table.from_frame(frame, kinds={} if kind is None else {"day": kind})
    with pytest.raises(Refusal, match=says) as refused:
        learn(table, Order([("Life", ["shift", "day"])]))
    assert refused.value.where == "day" and refused.value.do == do


def test_a_column_that_was_only_chosen_to_be_left_out_may_be_given_a_kind(evening_school):
    table = Table.from_frame(evening_school.frame, kinds={"shift": "left out"})
    with pytest.raises(Refusal, match=r"stands in the order\. You chose it\.") as refused:
        learn(table, Order([("Life", ["shift", "hours"])]))
    assert "give it a kind" in refused.value.do


@pytest.mark.parametrize("better", [MORE, LESS])
def test_more_or_less_of_a_plain_category_is_refused(evening_school, better):
    stages = [("Life", ["shift", "hours"]), ("Result", ["passed"])]
    with pytest.raises(Refusal, match="“shift” is a category: its levels have no order") as refused:
        learn(evening_school, Order(stages, outcomes={"shift": better}))
    assert refused.value.where == "shift" and "grade" in refused.value.do
    assert learn(evening_school, Order(stages, outcomes={"hours": better}), folds=False).rows == 300


def test_what_is_no_table_or_order_is_refused(evening_school):
    order = Order([("Life", ["shift", "hours"])])
    with pytest.raises(Refusal, match="no table of records") as refused:
        learn(evening_school.frame, order)
    assert "engine.Table.from_frame" in refused.value.do
    with pytest.raises(Refusal, match="The order is none") as refused:
        learn(evening_school, [("Life", ["shift", "hours"])])
    assert "engine.Order" in refused.value.do


@pytest.mark.parametrize(
    ("limits", "where"),
    [
        ({"max_links": 1.5}, "max_links"),
        ({"max_links": True}, "max_links"),
        ({"max_parents": 2.5}, "max_parents"),
        ({"max_parents": "3"}, "max_parents"),
        ({"seed": -1}, "seed"),
        ({"seed": 0.5}, "seed"),
        ({"graphs": -1}, "graphs"),
        ({"graphs": 10.5}, "graphs"),
    ],
)
def test_limits_that_are_no_whole_numbers_are_refused(evening_school, limits, where):
    with pytest.raises(Refusal) as refused:
        learn(evening_school, Order([("Life", ["shift", "hours"])]), **limits)
    assert refused.value.where == where and refused.value.do
