"""A network given as it is: what is checked, and in which order its columns stand."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.network.network import Category, network
from engine.refusal import Refusal
from tests.answering.generated import networks

RAIN = Category("rain", ["no", "yes"], [], [0.8, 0.2])


def refused(nodes, message):
    with pytest.raises(Refusal, match=message) as refusal:
        network(nodes() if callable(nodes) else nodes)
    assert refusal.value.message.endswith(".") and (refusal.value.where or refusal.value.do)


@settings(max_examples=50, deadline=None)
@given(networks(), st.randoms(use_true_random=False))
def test_parents_stand_before_their_children_whatever_the_order_given(net, luck):
    nodes = list(net.nodes)
    luck.shuffle(nodes)
    sorted_nodes = network(nodes)
    assert sorted(sorted_nodes.names) == sorted(net.names)
    for source, target in sorted_nodes.links:
        assert sorted_nodes.index[source] < sorted_nodes.index[target]


@settings(max_examples=50, deadline=None)
@given(networks(), st.data())
def test_descendants_are_what_links_reach(net, data):
    start = data.draw(st.sets(st.sampled_from(sorted(net.names)), min_size=1))
    reached, waiting = set(), list(start)
    while waiting:
        here = waiting.pop()
        for source, target in net.links:
            if source == here and target not in reached:
                reached.add(target)
                waiting.append(target)
    assert net.descendants(start) == reached


def test_a_circle_is_refused_and_told():
    a = Category("a", ["0", "1"], ["c"], [[0.5, 0.5]] * 2)
    b = Category("b", ["0", "1"], ["a"], [[0.5, 0.5]] * 2)
    c = Category("c", ["0", "1"], ["b"], [[0.5, 0.5]] * 2)
    refused(
        [RAIN, a, b, c],
        r"circle: (“a”, “b”, “c” and back to “a”|“b”, “c”, “a” and back to “b”|“c”, “a”, “b” and back to “c”)",
    )
    refused([Category("a", ["0", "1"], ["a"], [[0.5, 0.5]] * 2)], "circle: “a” and back to “a”")


def test_an_unknown_parent_is_refused():
    refused([Category("wet", ["no", "yes"], ["rain"], [[0.9, 0.1], [0.2, 0.8]])], "parent “rain”, which is no column")


def test_a_column_a_level_or_a_parent_given_twice_is_refused():
    refused([RAIN, RAIN], "“rain” is given twice")
    refused([Category("a", ["x", "x"], [], [0.5, 0.5])], "a level twice")
    refused([RAIN, Category("a", ["x", "y"], ["rain", "rain"], np.full((2, 2, 2), 0.5))], "a parent twice")


@pytest.mark.parametrize("table", [[0.5, 0.5], [[0.5, 0.5]], [[0.5, 0.3, 0.2]] * 2, 0.5, [[[0.5, 0.5]] * 2] * 2])
def test_a_table_of_the_wrong_shape_is_refused(table):
    refused([RAIN, Category("wet", ["no", "yes"], ["rain"], table)], "has the shape .* ask for")


@pytest.mark.parametrize("row", [[0.5, 0.4], [0.5, 0.6], [0.0, 0.0]])
def test_a_row_that_does_not_sum_to_one_is_refused_where_it_stands(row):
    refused([RAIN, Category("wet", ["no", "yes"], ["rain"], [[0.9, 0.1], row])], "instead of 1 where “rain” = “yes”")


@pytest.mark.parametrize("row", [[1.5, -0.5], [float("nan"), 1.0], [float("inf"), 0.0]])
def test_an_entry_that_is_no_probability_is_refused(row):
    refused([Category("rain", ["no", "yes"], [], row)], "no probability")


def test_what_is_no_table_or_no_list_is_refused():
    refused(lambda: [Category("rain", ["no", "yes"], [], [[0.5], [0.5, 0.5]])], "not a regular table")
    refused(lambda: [Category("rain", ["no", "yes"], [], ["a", "b"])], "not a regular table")
    refused(lambda: [Category("rain", "no", [], [0.5, 0.5])], "levels of “rain” are one text")
    refused(lambda: [Category("rain", ["no", "yes"], "sun", [0.5, 0.5])], "parents of “rain” are one text")
    refused([Category("rain", [], [], [])], "needs levels")
    refused([Category("rain", [1, 2], [], [0.5, 0.5])], "needs levels")
    refused([], "at least one column")
    refused([("rain", ["no", "yes"])], "is no column of a network")


@pytest.mark.parametrize("name", [3, None, ("a", "b"), ["a"]])
def test_a_name_that_is_no_text_is_refused(name):
    refused([Category(name, ["no", "yes"], [], [0.5, 0.5])], "is not a text")
    refused([RAIN, Category("wet", ["no", "yes"], [name], [[0.9, 0.1], [0.2, 0.8]])], "parent of “wet” is not a text")


def test_draws_follow_the_posterior_and_repeat_with_the_seed():
    dirichlet = np.array([[3.0, 1.0, 0.001], [40.0, 10.0, 50.0]])
    table = dirichlet / dirichlet.sum(axis=1, keepdims=True)
    net = network([RAIN, Category("a", ["x", "y", "z"], ["rain"], table, dirichlet=dirichlet)])
    fixed, drawn = net.draws(20_000, seed=1)
    assert fixed.shape == (2, 20_001) and np.all(fixed[0] == 0.8)
    np.testing.assert_array_equal(drawn[..., 0], table)
    np.testing.assert_allclose(drawn.sum(axis=1), 1.0, atol=1e-12)
    assert np.all(drawn > 0.0)  # a possible cell never rounds to impossible
    # moments of the Dirichlet distribution: mean m, variance m (1 - m) / (total + 1)
    total = dirichlet.sum(axis=1, keepdims=True)
    variance = table * (1.0 - table) / (total + 1.0)
    np.testing.assert_allclose(drawn[..., 1:].mean(axis=-1), table, atol=6 * np.sqrt(variance.max() / 20_000))
    np.testing.assert_allclose(drawn[..., 1:].var(axis=-1), variance, rtol=0.1, atol=1e-5)
    np.testing.assert_array_equal(net.draws(5, seed=1)[1], net.draws(5, seed=1)[1])
    assert not np.array_equal(net.draws(5, seed=1)[1][..., 1:], net.draws(5, seed=2)[1][..., 1:])


def test_a_family_draws_the_same_in_every_network_that_holds_it():
    dirichlet = np.array([2.0, 3.0])
    node = Category("a", ["x", "y"], [], dirichlet / 5.0, dirichlet=dirichlet)
    alone, beside = network([node]).draws(50, seed=4), network([RAIN, node]).draws(50, seed=4)
    np.testing.assert_array_equal(alone[0], beside[1])
