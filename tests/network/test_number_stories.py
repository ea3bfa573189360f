"""How a number comes about, sentence by sentence, and the table behind it."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import engine
from engine.network.conditional import number_rows
from engine.network.drawn import drawn
from engine.network.merging import MOST
from engine.network.number_rules import number_rules
from tests.network.mixed_made import mixed_networks, school
from tests.network.test_mixed_networks import DEPTH, FLOW, RAIN, WET

SHIFT = engine.Category("shift", ["days", "nights", "mixed"], [], [0.5, 0.3, 0.2])
SCHOOL = engine.Category("school", ["primary", "lower", "upper"], [], [0.3, 0.4, 0.3], kind="grade")
AGE = engine.Number("age", [], 45.0, [], 100.0)
SLOPES = [[[0.5]] * 3, [[0.5]] * 3, [[2.0]] * 3]


def story(column, *nodes):
    return engine.Model.from_network(nodes).story(column)


def told(node, *others):
    """What stands after the sentence on what the column comes from."""
    return story(node.name, *others, node).split(". ", 1)[1]


def test_a_number_without_parents_or_records_is_told_by_its_mean_and_where_the_model_expects_nine_in_ten():
    assert told(AGE) == "It is on average 45, and the model expects 9 in 10 within 16 of that."
    assert told(engine.Number("due", [], -2500.0, [], 1e6)) == (
        "It is on average −2,500, and the model expects 9 in 10 within 1,600 of that."
    )
    assert told(engine.Number("part", [], 0.125, [], 1e-4)) == (
        "It is on average 0.125, and the model expects 9 in 10 within 0.016 of that."
    )
    assert told(engine.Number("fee", [], 3.0, [], 0.0)) == "It is on average 3, and always exactly that."


def test_like_configurations_are_told_as_one_from_the_highest_mean_to_the_lowest():
    means = [[12.0, 12.1, 16.0], [12.0, 12.1, 16.0], [30.0, 30.1, 30.0]]
    assert told(engine.Number("hours", ["school", "shift"], means, [], np.full((3, 3), 4.0)), SCHOOL, SHIFT) == (
        "It is on average 30 where school is upper; 16 where school is lower or below and shift is mixed; "
        "12 where school is lower or below and shift is days or nights, the commonest case. "
        "In each case the model expects 9 in 10 within 3.3 of that."
    )


def test_parts_with_different_slopes_or_spreads_tell_their_own():
    assert told(engine.Number("pay", ["shift"], [10.0, 20.0, 20.0], [], [1.0, 9.0, 9.0]), SHIFT) == (
        "It is on average 20 where shift is nights or mixed, and the model expects 9 in 10 within 4.9 of that; "
        "10 where shift is days, and the model expects 9 in 10 within 1.6 of that."
    )


def test_slopes_are_told_for_a_step_that_suits_the_spread_of_their_number():
    pay = engine.Number("pay", ["age"], 1000.0, [50.0], 1e6)
    assert told(pay, AGE) == (
        "It is on average 3,300, 500 more for each 10 more of age, and the model expects 9 in 10 within 1,600 of that."
    )
    less = engine.Number("rest", ["age"], 20.0, [-0.05], 0.25)
    assert told(less, AGE) == (
        "It is on average 17.75, 0.5 less for each 10 more of age, and the model expects 9 in 10 within 0.82 of that."
    )
    none = engine.Number("rest", ["age"], 20.0, [0.0], 0.25)
    assert ", no more for each 10 more of age, and" in told(none, AGE)


def test_slopes_that_differ_inside_what_is_told_as_one_are_told_as_a_range():
    def differing(low, high):
        centred = engine.Number("age", [], 0.0, [], 400.0)
        return told(
            engine.Number("pay", ["shift", "age"], [5.0] * 3, [[low], [low], [high]], [4.0] * 3), SHIFT, centred
        )

    assert "With age at 0 (its mean) it is on average about 5, " in differing(1.0, 1.01)
    assert ", whatever shift is, 10 more for each 10 more of age, and" in differing(1.0, 1.01)
    assert ", 10 to 20 more for each 10 more of age, and" in differing(1.0, 2.0)
    assert ", 10 to 20 less for each 10 more of age, and" in differing(-1.0, -2.0)
    assert ", from 10 less to 20 more for each 10 more of age, and" in differing(-1.0, 2.0)


def test_means_that_differ_much_inside_a_part_are_told_as_a_range():
    sites = engine.Category("site", list("abcdef"), [], [1 / 6] * 6)
    assert "depending on site" in told(engine.Number("pay", ["site"], np.arange(6.0) * 10, [], np.full(6, 0.01)), sites)


def test_a_year_is_told_without_a_comma():
    assert told(engine.Number("born", [], 1984.0, [], 4.0, bands=[1980.0, 1990.0])) == (
        "It is on average 1984, and the model expects 9 in 10 within 3.3 of that."
    )


def test_configurations_are_told_at_one_value_of_the_number_parents_so_that_no_path_counts_twice():
    a = engine.Category("a", ["lo", "hi"], [], [0.5, 0.5])
    z = engine.Number("z", ["a"], [0.0, 4.0], [], [1.0, 1.0])
    w = engine.Number("w", ["a", "z"], [0.0, -3.0], [[2.0], [2.0]], [0.25, 0.25])
    model = engine.Model.from_network([a, z, w])
    assert model.story("w") == (
        "comes from a and z. With z at 2 (its mean) it is on average 4 where a is lo; 1 where a is hi. "
        "In each case 2 more for each 1 more of z, and the model expects 9 in 10 within 0.82 of that."
    )
    low, high = model.account("w").means
    assert low.mean - high.mean == pytest.approx(3.0)
    more = engine.Number("w", ["a", "z", "age"], [0.0, -9.0], [[2.0, 0.1], [2.0, 0.1]], [0.25, 0.25])
    assert "With z at 2 and age at 45 (their means) it is on average 8.5 where a is lo; " in story("w", a, z, AGE, more)


def test_records_tell_where_nine_in_ten_lie_of_a_number_without_parents():
    values = np.exp(np.random.default_rng(1).normal(1.0, 1.0, 2_000))
    frame = pd.DataFrame({"x": values, "g": ["a", "b"] * 1_000})
    model = engine.learn(engine.Table.from_frame(frame), engine.Order([("A", ["g", "x"])]), folds=False).model(0)
    low, high = np.quantile(values, [0.05, 0.95], method="inverted_cdf")
    assert f"and 9 in 10 records lie between {low:.1f} and {high:.1f}." in model.story("x")


@pytest.mark.parametrize(
    ("mean", "sd", "reach", "words"),
    [
        (1e9, 1e-3, (1e9 - 1.6e-3, 1e9 + 1.6e-3), "lie between 999,999,999.9984 and 1,000,000,000.0016"),
        (1e15, 1.0, (1e15 - 2.0, 1e15 + 1.0), "lie within 2 of that"),
        (3.0, 1.0, (3.0, 3.0), "are 3"),
    ],
)
def test_where_nine_in_ten_records_lie_is_told_to_what_their_spread_supports(mean, sd, reach, words):
    net = engine.Model.from_network([engine.Number("x", [], mean, [], sd**2)]).network
    assert number_rules(net, "x", np.ones(()), np.zeros(0), lambda name: sd, reach).text == (
        f"It is on average {mean:,.0f}, and 9 in 10 records {words}."
    )


def test_a_figure_far_from_0_has_no_more_digits_than_are_read():
    assert told(engine.Number("far", [], 1e15 + 1.0, [], 1.0)).startswith("It is on average 1,000,000,000,000,000, and")
    assert told(engine.Number("far", [], 1.6e9 + 1801.0, [], 1e6)).startswith("It is on average 1,600,001,800, and")


def test_a_category_tells_the_bands_of_its_number_parents():
    assert told(WET, RAIN, FLOW) == (
        "It is yes for 80 in 100 where rain is yes and flow is 4 and over; "
        "for 69 in 100 where rain is yes and flow is under 4; "
        "for 20 in 100 where rain is no and flow is 2 and over; "
        "for 10 in 100 where rain is no and flow is under 2, the commonest case."
    )


def test_a_story_says_what_a_number_comes_from():
    assert story("depth", RAIN, FLOW, DEPTH) == (
        "comes from flow and rain. With flow at 1.8 (its mean) it is on average 6.4 where rain is yes, "
        "3 more for each 1 more of flow, "
        "and always exactly that; 4.1 where rain is no, 2 more for each 1 more of flow, "
        "and the model expects 9 in 10 within 1.6 of that."
    )


@settings(max_examples=40, deadline=None)
@given(mixed_networks(), st.booleans())
def test_stories_of_every_network_repeat_give_no_formula_and_claim_no_cause(net, banded):
    found = engine.Model(net)
    for name in net.names:
        account = found.account(name)
        words = account.text
        assert words == engine.Model(net).story(name)
        assert not any(word in words for word in ("cause", "probab", "=", "%", "posterior", "conditional", "nan", "e-"))
        assert words.endswith(".") and ".." not in words and words.count(" where ") <= MOST
        assert bool(account.means) == (name in net.numbers) and bool(account.rows) != bool(account.means)


def test_rows_of_a_number_hold_its_mean_at_one_value_of_its_number_parents():
    frame, net = school()
    coded = engine.Table.from_frame(frame, kinds={"hours": "number", "score": "number"})
    model = engine.Model(net, coded=coded.coded(net.names, ("hours", "score")))
    rows = model.account("score").means
    assert [row.given for row in rows] == [("north",), ("south",), ("west",)]
    node = net.node("score")
    for place, row in enumerate(rows):
        here = frame[frame["site"] == row.given[0]]
        assert row.weight == pytest.approx(len(here) / len(frame))
        assert row.mean == pytest.approx(node.intercept[place] + node.slopes[place, 0] * frame["hours"].mean())
        assert row.sd == pytest.approx(np.sqrt(node.variance[place])) and row.slopes == (node.slopes[place, 0],)
        assert row.low < row.mean < row.high
    assert (
        "".join(part.text for part in model.account("score").held) == f"hours at {frame['hours'].mean():.1f} (its mean)"
    )
    few = model.account("score", most=1)
    assert [row.given for row in few.means] == [("north",)] and few.left_out == 2


def test_intervals_of_a_mean_hold_nine_of_ten_draws_with_a_twentieth_on_each_side():
    net = school(rows=200)[1]
    draws = drawn(net.node("score"), 40_000, 2)
    for at in (8.0, 12.0, 30.0):
        for place, row in enumerate(number_rows(net, "score", np.array([0.5, 0.3, 0.2]), np.array([at]), 24)):
            means = draws.intercept[place, 1:] + draws.slopes[place, 0, 1:] * at
            assert (means < row.low).mean() == pytest.approx(0.05, abs=0.01)
            assert (means > row.high).mean() == pytest.approx(0.05, abs=0.01)


def test_a_number_known_exactly_has_points():
    (row,) = number_rows(engine.Model.from_network([AGE]).network, "age", np.ones(()), np.zeros(0), 24)
    assert row.given == () and row.low == row.mean == row.high == 45.0 and row.sd == 10.0 and row.slopes == ()
