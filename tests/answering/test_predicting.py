"""Predictions of many rows against the slow truth of each row by itself."""

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import engine
from engine.answering.mixed import MixedWorld
from engine.model import Model
from engine.network.network import network
from engine.network.nodes import Category, Number
from tests.answering.mixed_generated import mixed_nodes
from tests.answering.mixed_plainly import truth
from tests.answering.test_mixed_questions import acting_through_bands


@st.composite
def rows_of(draw, most=5, blanks=True):
    """(network, frame): a few rows with some cells blank."""
    net = network(acting_through_bands(draw(mixed_nodes(most, exact_numbers=False))))
    count = draw(st.integers(1, 4))
    data = {}
    for node in net.nodes:
        values = st.sampled_from(node.levels if isinstance(node, Category) else [-1.7, -0.3, 0.4, 1.9])
        blank = None if isinstance(node, Category) else np.nan
        cell = st.one_of(values, st.just(blank)) if blanks else values
        data[node.name] = draw(st.lists(cell, min_size=count, max_size=count))
    return net, pd.DataFrame(data, index=[f"row {place}" for place in range(count)])


def slowly(net, row, column):
    """The truth of one row: everything that is not blank is seen."""
    pins, values = {}, {}
    for node in net.nodes:
        cell = row[node.name]
        if node.name == column or cell is None or (isinstance(cell, float) and math.isnan(cell)):
            continue
        if isinstance(node, Category):
            pins[node.name] = frozenset([node.levels.index(cell)])
        else:
            values[node.name] = cell
    return truth(MixedWorld(net.nodes, pins, values, {}, (column,)))


@settings(max_examples=60, deadline=None)
@given(rows_of(), st.data())
def test_every_row_agrees_with_the_slow_truth_of_that_row(case, data):
    net, frame = case
    column = data.draw(st.sampled_from(net.names))
    acting = {parent for node in net.nodes if isinstance(node, Category) for parent in node.parents} & set(net.numbers)
    assume(sum(frame[name].isna().any() or name == column for name in acting) < 2)
    found = Model(net).predict(frame, column)
    assert list(found.index) == list(frame.index)
    for place, (_, row) in enumerate(frame.iterrows()):
        expected = slowly(net, row, column)
        if isinstance(net.node(column), Category):
            assert list(found.columns) == list(net.node(column).levels)
            np.testing.assert_allclose(found.iloc[place], expected.shares[column], rtol=0, atol=1e-8)
        else:
            assert list(found.columns) == ["mean", "sd"]
            means = expected.mean(column), expected.sd(column)
            np.testing.assert_allclose(found.iloc[place], means, rtol=1e-6, atol=1e-7)


@settings(max_examples=40, deadline=None)
@given(rows_of(blanks=False), st.data())
def test_rows_without_blanks_read_as_asking_with_every_other_column_pinned(case, data):
    net, frame = case
    column = data.draw(st.sampled_from(net.names))
    found = Model(net).predict(frame, column)
    row = frame.iloc[0]
    answer = Model(net).ask({name: row[name] for name in net.names if name != column}, watch=[column], draws=0)
    assume(answer.method.startswith("exact"))
    if isinstance(net.node(column), Category):
        np.testing.assert_allclose(found.iloc[0], answer[column].among.point, rtol=0, atol=1e-9)
    else:
        means = answer[column].among.mean, answer[column].among.sd
        np.testing.assert_allclose(found.iloc[0], means, rtol=1e-7, atol=1e-8)


@pytest.fixture(scope="module")
def model():
    return engine.Model.from_network(
        [
            engine.Category("site", ["a", "b"], [], [0.4, 0.6]),
            engine.Number("hours", ["site"], [10.0, 14.0], (), [4.0, 9.0], [12.0]),
            engine.Category(
                "passed", ["no", "yes", "blank"], ["hours"], [[0.6, 0.3, 0.1], [0.1, 0.8, 0.1]], has_blank=True
            ),
        ]
    )


def test_columns_left_out_and_blanks_are_summed_out(model):
    left_out = model.predict(pd.DataFrame({"hours": [10.0, 15.0]}), "site")
    blank = model.predict(pd.DataFrame({"hours": [10.0, 15.0], "site": [None, "b"], "passed": ["yes", "no"]}), "site")
    pd.testing.assert_frame_equal(left_out, blank)  # passed hangs on hours alone, and the site itself is not looked at
    every = model.predict(pd.DataFrame({"site": [None, None]}), "hours")
    assert every["mean"].tolist() == pytest.approx([12.4, 12.4])


def test_a_blank_that_a_level_stands_for_is_that_level(model):
    found = model.predict(pd.DataFrame({"passed": [None, "blank", "no"]}), "hours")
    assert found["mean"][0] == found["mean"][1] != found["mean"][2]


def test_a_row_that_cannot_be_is_nan():
    nodes = [
        engine.Category("a", ["n", "y"], [], [0.5, 0.5]),
        engine.Category("b", ["n", "y"], ["a"], [[1.0, 0.0], [1.0, 0.0]]),
    ]
    found = engine.Model.from_network(nodes).predict(pd.DataFrame({"b": ["n", "y"]}), "a")
    assert found.iloc[0].tolist() == [0.5, 0.5] and found.iloc[1].isna().all()


def test_what_cannot_be_predicted_is_refused(model):
    def refused(message, do, frame, column="site"):
        with pytest.raises(engine.Refusal, match=message) as refusal:
            model.predict(frame, column)
        assert do in (refusal.value.do or "")

    refused("no column “sight”", "Did you mean “site”", pd.DataFrame({"hours": [1.0]}), "sight")
    refused("no column “ours”", "Take it out", pd.DataFrame({"ours": [1.0]}))
    refused("no such level", "no, yes", pd.DataFrame({"passed": ["no", "maybe"]}), "hours")
    refused("no DataFrame", "DataFrame", [{"hours": 1.0}])
    twice = pd.DataFrame([[1.0, 2.0]], columns=["hours", "hours"])
    refused("“hours” twice", "once", twice)


def test_no_rows_give_no_rows(model):
    found = model.predict(pd.DataFrame({"hours": np.empty(0)}), "site")
    assert found.shape == (0, 2)


def test_a_number_of_tied_bands_that_are_blank_is_refused_in_words():
    numbers = [engine.Number(name, [], 0.0, (), 1.0, [0.0]) for name in "ab"]
    tied = engine.Number("c", ["a", "b"], 0.0, [1.0, 1.0], 1.0, [0.5])
    after = [engine.Category(f"after {name}", ["n", "y"], [name], [[0.8, 0.2], [0.3, 0.7]]) for name in "abc"]
    model = engine.Model.from_network([*numbers, tied, *after])
    frame = pd.DataFrame({"after a": ["y"], "after b": ["y"], "after c": ["n"]})
    with pytest.raises(engine.Refusal, match="cannot be worked out exactly where other columns are blank"):
        model.predict(frame, "c")
    both = model.predict(frame.assign(a=[0.3], b=[-0.2]), "c")
    expected = truth(
        MixedWorld(
            tuple(replace(node) for node in model.network.nodes),
            {"after a": frozenset([1]), "after b": frozenset([1]), "after c": frozenset([0])},
            {"a": 0.3, "b": -0.2},
            {},
            ("c",),
        )
    )
    np.testing.assert_allclose(both.iloc[0], [expected.mean("c"), expected.sd("c")], atol=1e-8)
    assert isinstance(model.network.node("c"), Number)
