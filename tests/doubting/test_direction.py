"""Links whose direction nobody settled."""

from dataclasses import replace

import engine
from tests.doubting.schools import settling
from tests.doubting.worlds import codes_of, only


def test_a_direction_nobody_settled_weakens_when_it_touches_the_lever():
    caution = only(settling([("x", "m"), ("m", "y")]).ask(levers={"x": engine.Fix("a")}), "direction")
    assert caution.rank == "weakens" and caution.figure == "2 links"
    assert "x goes with m and m goes with y" in caution.text
    assert caution.figures == {"links": 2, "at the lever": 1}


def test_a_direction_nobody_settled_away_from_the_lever_is_worth_knowing():
    stages = [("First", ["x", "z"]), ("Then", ["m", "y"])]
    caution = only(
        settling([("x", "m"), ("x", "y"), ("m", "y")], stages).ask(levers={"x": engine.Fix("a")}), "direction"
    )
    assert caution.rank == "know" and caution.figure == "1 link" and caution.columns == ("m", "y")


def test_a_direction_off_every_path_is_not_told():
    stages = [("First", ["x", "z"]), ("Then", ["m"]), ("Last", ["y"])]
    model = settling([("x", "z"), ("x", "m"), ("m", "y")], stages)
    assert codes_of(model.ask(levers={"x": engine.Fix("a")})) == []


def test_a_direction_is_not_told_of_a_column_that_no_lever_could_move():
    stages = [("Early", ["y"]), ("Late", ["x", "m", "z"])]
    model = settling([("y", "x"), ("y", "m"), ("x", "m")], stages)
    assert "direction" not in [code for _, code in codes_of(model.ask(levers={"x": engine.Fix("a")}, watch=["y"]))]
    twin = settling([("y", "x"), ("y", "m"), ("x", "m")])
    assert "direction" in [code for _, code in codes_of(twin.ask(levers={"x": engine.Fix("a")}, watch=["y"]))]


def test_a_direction_with_little_support_is_told_although_no_equivalent_model_turns_it():
    # x -> m <- z with m -> y: the meeting of two arrows settles every direction, as far as the graph goes.
    model = settling([("x", "m"), ("z", "m"), ("m", "y")])
    lever = {"x": engine.Fix("a")}
    assert "direction" not in [code for _, code in codes_of(model.ask(levers=lever))]
    doubtful = replace(model, unsettled=frozenset([("x", "m")]))
    assert only(doubtful.ask(levers=lever), "direction").columns == ("x", "m")


def test_an_order_that_settles_every_direction_leaves_nothing_to_tell():
    stages = [("1", ["z"]), ("2", ["x"]), ("3", ["m"]), ("4", ["y"])]
    model = settling([("x", "m"), ("m", "y")], stages)
    assert codes_of(model.ask(levers={"x": engine.Fix("a")})) == []
