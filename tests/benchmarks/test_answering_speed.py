"""One tree for every column against one elimination per column, on forty columns with sixty links."""

import statistics
import time

import numpy as np
import opt_einsum
import pytest

import engine
from engine.answering.pins import Pins
from engine.answering.scenes import Scene
from engine.answering.summing import Summing, Work
from engine.model import Model
from engine.network.network import Category, network

COLUMNS, LINKS, DRAWS = 40, 60, 200


def generated(seed):
    """Forty columns of 2 to 4 levels, sixty links at random, up to three parents each, uncertain tables."""
    rng = np.random.default_rng(seed)
    sizes = rng.integers(2, 5, COLUMNS)
    parents = [set() for _ in range(COLUMNS)]
    while sum(map(len, parents)) < LINKS:
        source, target = sorted(int(place) for place in rng.choice(COLUMNS, 2, replace=False))
        if len(parents[target]) < 3:
            parents[target].add(source)
    nodes = []
    for place, before in enumerate(parents):
        shape = [*(sizes[parent] for parent in sorted(before)), sizes[place]]
        dirichlet = 20.0 * rng.gamma(1.0, 1.0, shape) + 0.5
        nodes.append(
            Category(
                f"c{place}",
                [f"level {level}" for level in range(sizes[place])],
                [f"c{parent}" for parent in sorted(before)],
                dirichlet / dirichlet.sum(axis=-1, keepdims=True),
                dirichlet=dirichlet,
            )
        )
    return network(nodes)


def questions(net, seed):
    """Six questions: three pins, one or two levers."""
    rng = np.random.default_rng(seed)
    for turn in range(6):
        levers = [f"c{place}" for place in rng.choice(np.arange(5, COLUMNS - 5), 1 + turn % 2, replace=False)]
        free = [name for name in net.names if name not in net.descendants(levers) and name not in levers]
        pins = rng.choice(free, 3, replace=False)
        yield {str(pin): "level 0" for pin in pins}, {lever: engine.Fix("level 1", 0.8) for lever in levers}


def milliseconds(ask):
    started = time.perf_counter()
    ask()
    return 1000.0 * (time.perf_counter() - started)


@pytest.mark.benchmark
def test_all_columns_at_once_cost_far_less_than_one_by_one(capsys):
    at_once, one_by_one = [], []
    for seed in range(5):
        net = generated(seed)
        model = Model(net)
        model.ask(draws=DRAWS)  # the draws and the recorded world are kept from here on
        for pins, levers in questions(net, seed):
            last = net.names[-1]
            at_once.append(milliseconds(lambda: model.ask(pins, levers, [last], net.names, DRAWS)))  # noqa: B023
            one_by_one.append(
                milliseconds(lambda: [model.ask(pins, levers, [name], draws=DRAWS) for name in net.names])  # noqa: B023
            )
    low, high = np.quantile(at_once, [0.5, 0.95])
    with capsys.disabled():
        print(
            f"\n40 columns, 60 links, 3 pins, 1 or 2 levers, 200 draws, a new question each time: all at once p50 "
            f"{low:.0f} ms, p95 {high:.0f} ms; one by one p50 {statistics.median(one_by_one):.0f} ms"
        )
    assert statistics.median(one_by_one) > 3.0 * statistics.median(at_once)


def contracted(net, column):
    """One column's shares by contracting all tables at once, with the path kept: what opt_einsum is made for."""
    tables = [node.table for node in net.nodes]
    scopes = [tuple(net.index[name] for name in (*node.parents, node.name)) for node in net.nodes]
    operands = [part for table, scope in zip(tables, scopes, strict=True) for part in (table, scope)]
    path, _ = opt_einsum.contract_path(*operands, (net.index[column],), optimize="greedy")
    return lambda: opt_einsum.contract(*operands, (net.index[column],), optimize=path)


@pytest.mark.benchmark
def test_all_points_at_once_cost_about_what_contracting_one_of_them_does(capsys):
    ours, theirs = [], []
    for seed in range(8):
        net = generated(seed)
        summing, scene, column = Summing(net), Scene(Pins(), {}, net.names), net.names[-1]
        every = lambda: summing.read(scene, 0, 0, Work()).shares  # noqa: E731, B023
        one = contracted(net, column)
        np.testing.assert_allclose(every()[column][:, 0], one(), rtol=0, atol=1e-12)
        ours.append(statistics.median(milliseconds(every) for _ in range(15)))
        theirs.append(statistics.median(milliseconds(one) for _ in range(15)))
    ratio = statistics.median(mine / other for mine, other in zip(ours, theirs, strict=True))
    with capsys.disabled():
        print(
            f"\n40 columns, 60 links, points alone: all columns {statistics.median(ours):.1f} ms; opt_einsum, one of "
            f"them, path known, {statistics.median(theirs):.1f} ms; {ratio:.2f} times as long"
        )
    assert ratio < 3.0
