"""Weighted particles, all at once, against sampling the same columns particle by particle."""

import statistics
import time

import numpy as np
import pytest

from engine.answering.mixed import MixedWorld
from engine.answering.weighting import weigh
from engine.network.drawn import drawn
from engine.network.nodes import Category, Number

COLUMNS, DRAWS, PARTICLES = 37, 200, 100_000


def school(seed=1):
    """Categories and numbers in turn, up to three parents each, four things seen of four columns."""
    rng = np.random.default_rng(seed)
    nodes = []
    for place in range(COLUMNS):
        chosen = rng.choice(place, min(place, int(rng.integers(0, 4))), replace=False) if place else []
        parents = [nodes[parent] for parent in sorted(chosen)]
        named = tuple(parent.name for parent in parents)
        sizes = [len(parent.levels) for parent in parents]
        if place % 2 == 0:
            dirichlet = rng.gamma(1.0, 20.0, (*sizes, int(rng.integers(2, 5)))) + 0.5
            table = dirichlet / dirichlet.sum(axis=-1, keepdims=True)
            levels = [f"level {level}" for level in range(table.shape[-1])]
            nodes.append(Category(f"c{place}", levels, named, table, dirichlet=dirichlet))
        else:
            shape = [size for parent, size in zip(parents, sizes, strict=True) if isinstance(parent, Category)]
            slopes = rng.normal(0.0, 0.5, (*shape, len(parents) - len(shape)))
            intercept, variance = rng.normal(0.0, 1.0, shape), rng.gamma(4.0, 0.25, shape)
            nodes.append(Number(f"c{place}", named, intercept, slopes, variance, bands=(-0.7, 0.0, 0.7)))
    return nodes


def one_by_one(nodes, tables, particles, rng):
    """The same columns sampled particle by particle, nothing weighed or read."""
    names = {node.name: node for node in nodes}
    for _ in range(particles):
        values, levels = {}, {}
        for node in nodes:
            at = tuple(levels[parent] for parent in node.parents if isinstance(names[parent], Category))
            if isinstance(node, Category):
                at = tuple(levels[parent] for parent in node.parents)
                row = np.cumsum(tables[node.name][at][:, 0])
                levels[node.name] = min(int(np.searchsorted(row, rng.random())), len(row) - 1)
            else:
                numbers = [values[parent] for parent in node.parents if parent in values]
                found = tables[node.name]
                mean = found.intercept[at][0] + float(found.slopes[at][:, 0] @ np.array(numbers))
                values[node.name] = mean + np.sqrt(found.variance[at][0]) * rng.standard_normal()
                levels[node.name] = int(np.searchsorted(node.bands, values[node.name], side="right"))


def seconds(ask):
    started = time.perf_counter()
    ask()
    return time.perf_counter() - started


@pytest.mark.benchmark
def test_particles_all_at_once_cost_far_less_than_one_by_one(capsys):
    nodes = school()
    tables = {node.name: drawn(node, DRAWS, 0) for node in nodes}
    watch = tuple(node.name for node in nodes)
    world = MixedWorld(
        tuple(nodes), {"c8": frozenset([0]), "c9": frozenset([1, 3])}, {"c21": 0.5}, {"c25": (0.0, 1.0)}, watch
    )
    at_once = statistics.median(seconds(lambda: weigh(world, tables, DRAWS, 0, PARTICLES, 0)) for _ in range(5))
    each = seconds(lambda: one_by_one(nodes, tables, 100, np.random.default_rng(0))) / 100
    with capsys.disabled():
        print(
            f"\n{COLUMNS} mixed columns, {PARTICLES:,} particles, {DRAWS} draws, all watched: {1000 * at_once:.0f} ms; "
            f"particle by particle, without weighing, {each * PARTICLES:.0f} s"
        )
    assert at_once < each * PARTICLES / 10.0
