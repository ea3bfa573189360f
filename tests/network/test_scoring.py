"""How likely a row is: against the row-by-row truth, against sums and integrals, and what is refused."""

import time
from itertools import product

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import norm

import engine
from engine.network.drawn import drawn
from engine.network.scoring import log_score
from engine.refusal import Refusal
from tests.network import mixed_plainly as plainly
from tests.network.mixed_made import mixed_networks, school
from tests.network.test_mixed_networks import DEPTH, FLOW, RAIN, WET

MODEL = engine.Model.from_network([RAIN, FLOW, WET, DEPTH])
ROWS = pd.DataFrame(
    {"rain": ["no", "yes", "yes"], "flow": [0.5, 4.0, 1.99], "wet": ["no", "yes", "no"], "depth": [2.0, 13.0, 7.5]}
)


@settings(max_examples=60, deadline=None)
@given(mixed_networks(), st.integers(0, 99))
def test_every_row_scores_as_by_hand(net, seed):
    frame = engine.Model(net).sample(20, seed)
    moved = frame.copy()
    for name in net.numbers:
        moved[name] += 0.25
    for rows in (frame, moved):
        expected = [plainly.log_score(net, row) for row in rows.to_dict("records")]
        np.testing.assert_allclose(log_score(net, rows), expected, rtol=1e-10, atol=1e-10)


def test_a_learned_number_scores_by_students_t_and_a_category_by_its_posterior_mean():
    frame, net = school()
    found = engine.Model(net).log_score(frame)
    expected = [plainly.log_score(net, row) for row in frame.to_dict("records")]
    np.testing.assert_allclose(found, expected, rtol=1e-10, atol=1e-10)


def test_the_score_of_a_learned_number_is_its_density_averaged_over_the_posterior():
    frame, net = school(rows=200)
    draws = drawn(net.node("score"), 20_000, 1)
    row = frame.iloc[[0]].copy()
    site = ["north", "south", "west"].index(row["site"].iloc[0])
    mean = draws.intercept[site] + draws.slopes[site, 0] * row["hours"].iloc[0]
    others = {name: frame[name].iloc[0] for name in frame if name != "score"}
    for away in (-15.0, 0.0, 15.0):
        row["score"] = mean[0] + away
        averaged = norm.pdf(mean[0] + away, mean[1:], np.sqrt(draws.variance[site, 1:])).mean()
        rest = sum(
            plainly.log_factor(net, net.node(name), others | {"score": float(mean[0] + away)}) for name in others
        )
        assert np.exp(log_score(net, row)[0] - rest) == pytest.approx(averaged, rel=0.05)


def test_probabilities_and_densities_of_all_rows_sum_to_one():
    nodes, weights = np.polynomial.legendre.leggauss(60)
    total = 0.0
    for low, high in ((-12.0, 2.0), (2.0, 4.0), (4.0, 20.0)):  # smooth between the cuts
        half = 0.5 * (high - low)
        for rain, wet in product(("no", "yes"), repeat=2):
            rows = pd.DataFrame({"rain": rain, "wet": wet, "flow": low + half * (nodes + 1.0)})
            total += half * weights @ np.exp(engine.Model.from_network([RAIN, FLOW, WET]).log_score(rows))
    assert total == pytest.approx(1.0, abs=1e-9)


def test_a_number_that_follows_exactly_counts_one_where_it_is_as_it_must_be_and_none_elsewhere():
    rows = ROWS.iloc[[1, 1]].copy()  # rain: depth is 1 + 3 x flow, without any variance
    rows["depth"] = [13.0, 13.1]
    scores = MODEL.log_score(rows)
    rest = MODEL.from_network([RAIN, FLOW, WET]).log_score(rows.drop(columns="depth"))
    assert scores[0] == pytest.approx(rest[0]) and scores[1] == -np.inf


def test_a_level_that_cannot_be_scores_minus_infinity():
    never = engine.Category("wet", ["no", "yes"], ["rain"], [[1.0, 0.0], [0.5, 0.5]])
    found = engine.Model.from_network([RAIN, never]).log_score(pd.DataFrame({"rain": ["no"] * 2, "wet": ["no", "yes"]}))
    assert found[0] == pytest.approx(np.log(0.8)) and found[1] == -np.inf


BANDED = engine.Category(
    "hours", ["under 5", "5 and over", "blank"], [], [0.3, 0.6, 0.1], kind="number", cuts=(5.0,), has_blank=True
)


@pytest.mark.parametrize(
    "cells",
    [
        [4.999, 5.0, np.nan],
        ["under 5", "5 and over", None],
        ["−3", "17", "  "],
        ["under 5", 7.0, "blank"],
        pd.Categorical(["under 5", "5 and over", None]),
    ],
)
def test_a_number_taken_as_bands_is_a_number_or_the_name_of_a_band(cells):
    found = engine.Model.from_network([BANDED]).log_score(pd.DataFrame({"hours": cells}))
    np.testing.assert_allclose(np.exp(found), [0.3, 0.6, 0.1])


def test_levels_that_look_like_numbers_are_found_whatever_holds_them():
    model = engine.Model.from_network([engine.Category("room", ["1", "2.5"], [], [0.25, 0.75])])
    for cells in ([1, 2.5], ["1", "2.5"]):
        np.testing.assert_allclose(np.exp(model.log_score(pd.DataFrame({"room": cells}))), [0.25, 0.75])
    yes = engine.Model.from_network([engine.Category("new", ["False", "True"], [], [0.25, 0.75])])
    np.testing.assert_allclose(np.exp(yes.log_score(pd.DataFrame({"new": [False, True]}))), [0.25, 0.75])


@pytest.mark.parametrize(
    ("change", "message", "where"),
    [
        (lambda rows: rows.drop(columns="flow"), "The rows have no column “flow”", "flow"),
        (lambda rows: pd.concat([rows, rows["wet"]], axis=1), "have the column “wet” twice", "wet"),
        (lambda rows: rows.assign(rain=["no", "hail", "sleet"]), "holds “hail” and “sleet” in rows 2 and 3", "rain"),
        (
            lambda rows: rows.assign(flow=[1.0, np.nan, np.nan]),
            "“flow” is blank in rows 2 and 3, and “depth” co",
            "flow",
        ),
        (lambda rows: rows.assign(flow=["1", "fast", "2"]), "cannot be a number: record 2 holds “fast”", "flow"),
        (lambda rows: rows.assign(flow=[1.0, np.inf, 2.0]), "“flow” holds a number that is infinite", "flow"),
        (lambda rows: rows.to_dict("list"), "no DataFrame", "rows"),
    ],
)
def test_rows_that_cannot_be_read_are_refused_where_they_stand(change, message, where):
    with pytest.raises(Refusal, match=message) as refusal:
        MODEL.log_score(change(ROWS))
    assert refusal.value.where == where and refusal.value.do


@settings(max_examples=60, deadline=None)
@given(mixed_networks(), st.integers(0, 99), st.data())
def test_blank_categories_and_last_numbers_are_summed_out(net, seed, data):
    """Against the sum, by hand, over every way of filling them in."""
    parents = {source for source, _ in net.links}
    can = [name for name in net.names if name not in net.numbers or name not in parents]
    rows = engine.Model(net).sample(6, seed).astype(object)
    blank = [data.draw(st.sets(st.sampled_from(can)) if can else st.just(set())) for _ in range(len(rows))]
    expected = []
    for place, (row, gone) in enumerate(zip(rows.to_dict("records"), blank, strict=True)):
        categories = [name for name in net.names if name in gone and name not in net.numbers]
        ways = product(*(net.node(name).levels for name in categories))
        rest = [node for node in net.nodes if node.name not in gone or node.name in categories]
        filled = [row | dict(zip(categories, way, strict=True)) for way in ways]
        scores = [sum(plainly.log_factor(net, node, each) for node in rest) for each in filled]
        expected.append(np.logaddexp.reduce(scores))
        for name in gone:
            rows.iloc[place, list(rows.columns).index(name)] = None
    np.testing.assert_allclose(log_score(net, rows), expected, rtol=1e-9, atol=1e-9)


def test_a_blank_number_with_categories_that_come_from_it_is_summed_over_its_bands():
    found = MODEL.log_score(ROWS.assign(flow=None, depth=None))
    for place, (rain, wet) in enumerate(zip(ROWS["rain"], ROWS["wet"], strict=True)):
        r, w = ["no", "yes"].index(rain), ["no", "yes"].index(wet)
        upto = norm.cdf([-np.inf, 2.0, 4.0, np.inf], FLOW.intercept[r], np.sqrt(FLOW.variance[r]))
        assert np.exp(found[place]) == pytest.approx(RAIN.table[r] * np.diff(upto) @ WET.table[r, :, w])
    exact = engine.Number("flow", ["rain"], [1.0, 4.0], [], [0.0, 0.0], bands=[2.0, 4.0])
    rows = ROWS.assign(flow=None).drop(columns="depth")
    told = engine.Model.from_network([RAIN, exact, WET]).log_score(rows)
    np.testing.assert_allclose(np.exp(told), [0.8 * 0.9, 0.2 * 0.8, 0.2 * 0.2])


def test_a_blank_learned_number_is_summed_out_of_its_predictive_density():
    frame, net = school()
    row = frame.iloc[:1]
    values = np.linspace(-100.0, 250.0, 350_001)
    every = log_score(net, pd.concat([row] * len(values), ignore_index=True).assign(score=values))
    assert np.exp(log_score(net, row.assign(score=None))) == pytest.approx(
        np.exp(every).sum() * (values[1] - values[0]), rel=1e-3
    )
    with pytest.raises(Refusal, match="“hours” is blank in row 1, and “score” comes from it"):
        log_score(net, row.assign(hours=None))


def test_a_blank_with_a_level_of_its_own_is_that_level_and_is_not_summed_out():
    told = engine.Model.from_network([BANDED]).log_score(pd.DataFrame({"hours": [np.nan]}))
    assert np.exp(told) == pytest.approx([0.1])


def test_blank_learned_categories_sum_to_what_every_level_gives():
    frame, net = school()
    row = frame.iloc[[0, 0, 0]].assign(site=["north", "south", "west"])
    expected = np.logaddexp.reduce(log_score(net, row))
    assert log_score(net, row.iloc[:1].assign(site=None, passed="yes"))[0] == pytest.approx(
        np.logaddexp.reduce(log_score(net, row.assign(passed="yes")))
    )
    assert log_score(net, row.iloc[:1].assign(site=None))[0] == pytest.approx(expected)


def test_blanks_of_too_many_combinations_are_refused():
    levels = [f"l{place}" for place in range(101)]
    even = np.full(101, 1 / 101)
    nodes = [engine.Category("a", levels, [], even), engine.Category("b", levels, [], even)]
    child = engine.Category("c", ["no", "yes"], ["a", "b"], np.full((101, 101, 2), 0.5))
    rows = pd.DataFrame({"a": [None, "l1"], "b": [None, "l1"], "c": ["yes", "no"]})
    with pytest.raises(Refusal, match="“a” is blank in row 1, and with what else is blank that is 10,201 combinations"):
        engine.Model.from_network([*nodes, child]).log_score(rows)
    np.testing.assert_allclose(np.exp(engine.Model.from_network(nodes).log_score(rows)), [1.0, 1 / 101**2])


def test_columns_that_the_model_does_not_have_are_not_looked_at():
    more = ROWS.assign(weight=[1, None, 3], name=["x", "y", "z"])
    np.testing.assert_array_equal(MODEL.log_score(more), MODEL.log_score(ROWS))


def test_a_refusal_names_the_first_few_rows_and_counts_the_others():
    many = pd.concat([ROWS.assign(rain="hail")] * 400)
    with pytest.raises(Refusal, match="in rows 1, 2, 3, 4, 5 and 1,195 more;"):
        MODEL.log_score(many)


def test_no_rows_have_no_scores():
    assert MODEL.log_score(ROWS.iloc[:0]).shape == (0,)


@pytest.mark.benchmark
def test_rows_are_scored_many_at_once():
    net = school(rows=2_000)[1]
    rows = engine.Model(net).sample(20_000, 1)

    def seconds(score):
        start = time.perf_counter()
        score()
        return time.perf_counter() - start

    at_once = min(seconds(lambda: log_score(net, rows)) for _ in range(3))
    few = rows.to_dict("records")[:100]
    by_hand = seconds(lambda: [plainly.log_score(net, row) for row in few]) * len(rows) / len(few)
    assert at_once < by_hand / 50
