"""Learning from a table: its kinds and blanks reach the network, and an order that does not fit it is refused."""

import numpy as np
import pandas as pd
import pytest

from engine.learning.learn import learn, learn_coded
from engine.order import Order
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
