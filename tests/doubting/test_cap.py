"""Columns on the way that want more parents than learning allowed."""

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import engine
from engine.learning.cap import Capped
from tests.doubting.schools import settling
from tests.doubting.worlds import codes_of, only

STAGES = [("1", ["x"]), ("2", ["m"]), ("3", ["y"]), ("4", ["z"])]
CHAIN = [("x", "m"), ("m", "y"), ("y", "z")]
SET = {"x": engine.Fix("a")}


def capped(*columns, gain=5.0, links=CHAIN):
    """x -> m -> y -> z, learned with at most one parent, where some columns would gain from another."""
    found = tuple(Capped(column, gain, ("w", "x" if column != "m" else "z")) for column in columns)
    return replace(settling(links, STAGES), capped=found)


@pytest.mark.parametrize("column", ["x", "m", "y"])
def test_a_column_at_the_limit_weakens_as_the_lever_as_watched_and_between(column):
    caution = only(capped(column).ask(levers=SET, watch=["y"]), "cap")
    assert caution.rank == "weakens" and caution.columns == (column,)
    assert caution.figure == "148 to 1" and caution.figures == {"columns": 1.0, "gain": 5.0, "parents": 1.0}
    assert caution.text.startswith(f"are the odds, by these records, that {column} comes from ")
    assert caution.text.endswith("What is left out may be taken for what x does.")
    assert caution.do == "On the Model page, learn again with up to 2 parents, and ask again."


def test_a_column_at_the_limit_off_the_way_is_not_told():
    assert codes_of(capped("z").ask(levers=SET, watch=["y"])) == []
    beside = capped("z", links=[("x", "m"), ("m", "y"), ("x", "z")])
    assert codes_of(beside.ask(levers=SET, watch=["y"])) == []
    assert "cap" in [code for _, code in codes_of(beside.ask(levers=SET, watch=["z"]))]


def test_no_column_at_the_limit_is_a_check_made_and_none_known_is_not():
    made = replace(capped(), capped=()).ask(levers=SET, watch=["y"])
    unknown = replace(capped(), capped=None).ask(levers=SET, watch=["y"])
    assert codes_of(made) == codes_of(unknown) == []
    assert made.checks_made == unknown.checks_made + 1


def test_the_limit_is_looked_at_only_where_something_is_set():
    model, unknown = capped("x", "m"), replace(capped(), capped=None)
    assert "cap" not in [code for _, code in codes_of(model.ask(watch=["y"]))]
    assert model.ask(watch=["y"]).checks_made == unknown.ask(watch=["y"]).checks_made
    assert "cap" not in [code for _, code in codes_of(model.ask(levers={"m": engine.Fix("a")}, watch=["x"]))]


def test_a_lever_that_the_limit_itself_left_out_is_told_of():
    parted = replace(capped(links=[("m", "y")]), capped=(Capped("y", 9.0, ("m", "x")),))
    assert only(parted.ask(levers=SET, watch=["y"]), "cap").columns == ("y",)
    twin = replace(parted, capped=(Capped("y", 9.0, ("m", "z")),))
    assert "cap" not in [code for _, code in codes_of(twin.ask(levers=SET, watch=["y"]))]


def test_a_lever_held_against_is_on_the_way_too():
    found = capped("m").ask(levers={"z": engine.Fix("a")}, against={"x": engine.Fix("b")}, watch=["y"])
    assert only(found, "cap").columns == ("m",)


def test_one_missing_column_is_named_and_several_columns_are_told_surest_first():
    model = replace(settling(CHAIN, STAGES), capped=(Capped("y", 3.0, ("m", "x")), Capped("m", 99.0, ("x", "w"))))
    caution = only(model.ask(levers=SET, watch=["y"]), "cap")
    assert caution.columns == ("m", "y") and caution.figure == "over 1,000 to 1"
    assert "for the surest of m and y: each comes from more than the one column" in caution.text
    one = replace(model, capped=model.capped[:1]).ask(levers=SET, watch=["y"])
    assert "that y comes from x, too, besides the one column that learning allowed" in only(one, "cap").text
    assert only(one, "cap").figure == "20 to 1"


def test_where_no_more_parents_can_be_learned_the_way_on_is_another():
    wide = replace(settling(CHAIN, STAGES), capped=(Capped("m", 4.0, tuple("abcdef")),))
    assert "Order page" in only(wide.ask(levers=SET, watch=["y"]), "cap").do


def test_a_learned_model_knows_its_columns_at_the_limit_and_more_parents_take_the_caution_away():
    rng = np.random.default_rng(4)
    rows = 1_500
    one, two, three = rng.random((3, rows)) < 0.5
    passed = rng.random(rows) < 1.0 / (1.0 + np.exp(-3.0 * (one * 1.0 + two + three - 1.5)))
    frame = pd.DataFrame({"one": one, "two": two, "three": three, "passed": passed})
    table = engine.Table.from_frame(frame.replace({True: "yes", False: "no"}))
    order = engine.Order(
        [("Before", ["one", "two", "three"]), ("After", ["passed"])], changeable=["one"], outcomes={"passed": ["yes"]}
    )
    least = engine.learn(table, order, max_parents=2, folds=False)
    (found,) = least.cap
    assert found.column == "passed" and least.model().capped == (found,)
    assert only(least.model().ask(levers={"one": engine.Fix("yes")}), "cap").columns == ("passed",)
    assert least.model(0).capped == ()  # there the budget holds it back, not the limit of parents
    more = engine.learn(table, order, max_parents=3, folds=False)
    assert more.model().capped == ()
    assert "cap" not in [code for _, code in codes_of(more.model().ask(levers={"one": engine.Fix("yes")}))]
