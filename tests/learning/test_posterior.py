"""Support and drawn graphs are those of every graph weighed one by one."""

from collections import Counter
from itertools import permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.learning import lattice
from engine.learning.families import candidates
from engine.learning.layers import Layers
from engine.learning.posterior import posterior
from engine.learning.scores import set_scores
from engine.learning.sinks import Sinks, linear_extensions
from engine.order import Order
from engine.records.counts import ArrayCounts
from tests.learning import plainly
from tests.learning.test_search import problems


def every_graph(width):
    order = Order([("All", [str(place) for place in range(width)])])
    return [
        tuple(sum(1 << parent for parent in parents) for parents in graph) for graph in plainly.graphs(order, width)
    ]


def weighed(weights, graphs, times=None):
    """(graphs,) posterior of each graph, and (columns, sets) of each column's parents."""
    width = weights.shape[0]
    logs = np.asarray([sum(weights[column, own] for column, own in enumerate(graph)) for graph in graphs])
    logs += np.log(times) if times is not None else 0.0
    shares = np.exp(logs - np.logaddexp.reduce(logs))
    parents = np.zeros(weights.shape)
    for graph, share in zip(graphs, shares, strict=True):
        for column in range(width):
            parents[column, graph[column]] += share
    return shares, parents


def weights_of(width, spread, seed):
    weights = np.random.default_rng(seed).normal(size=(width, 1 << width)) * spread
    for column in range(width):
        for own in range(1 << width):
            if own >> column & 1 or (own and (own + column + seed) % 7 == 0):
                weights[column, own] = -np.inf
    return weights


@pytest.mark.parametrize("spread", [1.0, 40.0, 4000.0])
@pytest.mark.parametrize("width", [1, 2, 3, 4])
def test_layers_count_every_graph_once(width, spread):
    weights = weights_of(width, spread, seed=width)
    graphs = every_graph(width)
    logs = [sum(weights[column, own] for column, own in enumerate(graph)) for graph in graphs]
    layers = Layers(weights)
    assert layers.log_sum == pytest.approx(np.logaddexp.reduce(logs), rel=1e-12)
    assert layers.parents() == pytest.approx(weighed(weights, graphs)[1], abs=1e-10)


@pytest.mark.parametrize("spread", [3.0, 400.0, 4000.0])
@pytest.mark.parametrize("width", [1, 2, 3, 4])
def test_orders_count_a_graph_as_often_as_it_fits_them(width, spread):
    weights = weights_of(width, spread, seed=width)
    graphs = every_graph(width)
    times = [linear_extensions(graph) for graph in graphs]
    assert Sinks(weights).parents() == pytest.approx(weighed(weights, graphs, times)[1], abs=1e-10)


@pytest.mark.parametrize("windows", [0, 3, 10**6])
@pytest.mark.parametrize("spread", [1.0, 300.0, 30_000.0])
def test_sums_over_subsets_are_those_of_plain_sums_whatever_the_spread(monkeypatch, windows, spread):
    monkeypatch.setattr(lattice, "MOST_WINDOWS", windows)
    rng = np.random.default_rng(3)
    weights = np.where(rng.random((2, 32)) < 0.7, rng.normal(size=(2, 32)) * spread, -np.inf)
    for row in weights:
        totals = lattice.subset_total(row)
        told = [np.logaddexp.reduce([row[own] for own in range(32) if not own & ~whole]) for whole in range(32)]
        assert totals == pytest.approx(told, rel=1e-13, abs=1e-12)
        shares = rng.dirichlet(np.ones(32))
        seen = np.isfinite(totals)
        around = np.where(seen, np.log(shares) - np.where(seen, totals, 0.0), -np.inf)
        told = [sum(np.exp(row[own] + around[whole]) for whole in range(32) if not own & ~whole) for own in range(32)]
        assert lattice.superset_shares(row, around, totals) == pytest.approx(told, abs=1e-12 + 2e-15 * spread)


@settings(max_examples=60, deadline=None)
@given(st.integers(1, 8), st.floats(0.0, 0.7), st.integers(0, 2**32 - 1))
def test_linear_extensions_are_counted_as_by_placing_one_column_after_another(width, share, seed):
    linked = np.random.default_rng(seed).random((width, width)) < share
    graph = tuple(sum(1 << other for other in range(column) if linked[column, other]) for column in range(width))
    ways = {0: 1}
    for placed in range(1 << width):
        for column in range(width):
            if placed in ways and not placed >> column & 1 and not graph[column] & ~placed:
                ways[placed | 1 << column] = ways.get(placed | 1 << column, 0) + ways[placed]
    assert linear_extensions(graph) == ways[(1 << width) - 1]


def test_linear_extensions_are_the_orders_that_fit():
    for graph in every_graph(4)[::7]:
        fits = sum(
            all(not graph[column] & ~sum(1 << other for other in order[:place]) for place, column in enumerate(order))
            for order in permutations(range(4))
        )
        assert linear_extensions(graph) == fits


@pytest.mark.parametrize("way", [Layers, Sinks])
def test_graphs_are_drawn_as_often_as_they_are_likely(way):
    weights = weights_of(3, 1.0, seed=5)
    graphs = every_graph(3)
    times = [linear_extensions(graph) for graph in graphs] if way is Sinks else None
    shares, _ = weighed(weights, graphs, times)
    rng = np.random.default_rng(2)
    drawn = 4000
    held = way(weights)
    found = Counter(held.draw(rng) for _ in range(drawn))
    assert set(found) <= set(graphs)
    for graph, share in zip(graphs, shares, strict=True):
        assert abs(found[graph] / drawn - share) < 4.5 * np.sqrt(share * (1 - share) / drawn) + 1e-9


@settings(max_examples=40, deadline=None)
@given(problems())
def test_support_is_that_of_enumeration(problem):
    order, levels, codes, max_parents = problem
    graphs = list(plainly.graphs(order, max_parents))
    if not graphs or any(sum(target == name for _, target in order.insist) > max_parents for name in order.columns):
        return
    scores = set_scores(ArrayCounts(codes, levels), max_parents + 1)
    found = posterior(candidates(order, max_parents), scores, max_parents, 20, np.random.default_rng(0))
    logs = np.asarray(
        [sum(plainly.family_score(codes, levels, child, own) for child, own in enumerate(graph)) for graph in graphs]
    )
    shares = np.exp(logs - np.logaddexp.reduce(logs))
    support = np.zeros((len(levels), len(levels)))
    for graph, share in zip(graphs, shares, strict=True):
        for child, parents in enumerate(graph):
            support[list(parents), child] += share
    assert found.support == pytest.approx(support, abs=1e-9)
    drawn = {tuple(tuple(np.flatnonzero(graph[:, child])) for child in range(len(levels))) for graph in found.graphs}
    assert drawn <= {tuple(tuple(sorted(own)) for own in graph) for graph in graphs}
    assert found.effective == pytest.approx(20.0)


def test_drawn_graphs_of_a_wide_stage_are_put_right_for_their_orders(monkeypatch):
    monkeypatch.setattr("engine.learning.posterior.WIDEST_LAYERED", 2)
    rng = np.random.default_rng(4)
    codes = rng.integers(0, 2, (60, 3))
    codes[:, 2] = np.where(rng.random(60) < 0.7, codes[:, 0], codes[:, 2])
    order = Order([("All", ["a", "b", "c"])])
    scores = set_scores(ArrayCounts(codes, [2, 2, 2]), 3)
    drawn = posterior(candidates(order, 2), scores, 2, 6000, np.random.default_rng(1))
    monkeypatch.undo()
    exact = posterior(candidates(order, 2), scores, 2, 0, np.random.default_rng(1)).support
    share = np.tensordot(drawn.weights, drawn.graphs, axes=1)
    assert share == pytest.approx(exact, abs=4.5 / np.sqrt(drawn.effective))
    assert drawn.effective < 6000
