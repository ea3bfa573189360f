"""One tree for every column against one elimination per column, on forty columns with sixty links."""

import statistics
import time

import numpy as np
import pytest

import engine
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
