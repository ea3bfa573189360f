"""Worlds with categories and numbers, made up by hypothesis."""

from dataclasses import replace

import numpy as np
from hypothesis import assume
from hypothesis import strategies as st

from engine.answering.mixed import MixedWorld
from engine.network.nodes import Category, Number
from engine.network.regression import Coefficients


def levels_of(node):
    return len(node.bands) + 1 if isinstance(node, Number) else len(node.levels)


@st.composite
def mixed_nodes(draw, most=6, banded=True, exact_numbers=True):
    """2 to `most` columns, parents first: categories of 1 to 3 levels, numbers with up to 2 cuts.

    banded: numbers may lead to categories.  exact_numbers: some numbers follow their parents without noise.
    """
    count = draw(st.integers(2, most))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    nodes = []
    for place in range(count):
        name = f"column {place}"
        number = draw(st.booleans())
        allowed = [node for node in nodes if number or banded or isinstance(node, Category)]
        chosen = draw(st.sets(st.integers(0, len(allowed) - 1), max_size=3)) if allowed else set()
        parents = [allowed[parent] for parent in sorted(chosen, key=lambda at: (at * 7919) % 13)]  # kinds in any order
        named = tuple(parent.name for parent in parents)
        if not number:
            shape = (*map(levels_of, parents), draw(st.integers(1, 3)))
            table = rng.gamma(1.0, 1.0, shape) + 0.01
            nodes.append(
                Category(name, [f"{level}" for level in range(shape[-1])], named, table / table.sum(-1)[..., None])
            )
            continue
        shape = tuple(levels_of(parent) for parent in parents if isinstance(parent, Category))
        slopes = sum(isinstance(parent, Number) for parent in parents)
        variance = rng.gamma(2.0, 0.5, shape)
        if exact_numbers and draw(st.integers(0, 4)) == 0:
            variance = variance * 0.0
        nodes.append(
            Number(
                name,
                named,
                rng.normal(0.0, 1.5, shape),
                rng.normal(0.0, 1.0, (*shape, slopes)),
                variance,
                tuple(np.unique(np.round(rng.normal(0.0, 1.0, draw(st.integers(0, 2))), 1)).tolist()),
            )
        )
    return tuple(nodes)


@st.composite
def mixed_worlds(draw, most=6, banded=True, exact_numbers=True, values=2, boxes=2):
    """A world with pins, up to `values` values, up to `boxes` ranges or pins by bands, and a watch on some columns.

    Values are given to numbers that have some noise everywhere.
    """
    nodes = draw(mixed_nodes(most, banded, exact_numbers))
    names = [node.name for node in nodes]
    by_name = dict(zip(names, nodes, strict=True))
    pins, seen, ranges = {}, {}, {}
    for name in draw(st.lists(st.sampled_from(names), max_size=4, unique=True)):
        node = by_name[name]
        if isinstance(node, Category):
            pins[name] = draw(_positions(levels_of(node)))
        elif len(seen) < values and np.all(node.variance > 0.0) and draw(st.booleans()):
            seen[name] = round(draw(st.floats(-3.0, 3.0)), 2)
        elif len(ranges) + sum(isinstance(by_name[pin], Number) for pin in pins) < boxes:
            if node.bands and draw(st.booleans()):
                pins[name] = draw(_positions(levels_of(node)))
            else:
                low, high = sorted(round(draw(st.floats(-2.5, 2.5)), 2) for _ in range(2))
                ranges[name] = draw(st.sampled_from([(low, high + 0.5), (low, np.inf), (-np.inf, high)]))
    watch = draw(st.lists(st.sampled_from(names), min_size=1, max_size=4, unique=True))
    return MixedWorld(nodes, pins, seen, ranges, tuple(watch))


def _positions(levels):
    return st.frozensets(st.integers(0, levels - 1), min_size=1)


def own_parameters(world):
    """The nodes' own tables and coefficients as draws: an axis of length 1, the last."""
    return {node.name: _own(node) for node in world.nodes}


def shaken_parameters(world, draws, seed):
    """Different parameters in each of 1 + `draws` draws, the nodes' own first; what is 0 stays 0."""
    rng = np.random.default_rng(seed)
    found = {}
    for node in world.nodes:
        own = _own(node)
        if isinstance(node, Category):
            table = own * rng.gamma(5.0, 1.0, (*own.shape[:-1], 1 + draws))
            table /= table.sum(axis=-2, keepdims=True)
            table[..., :1] = own
            found[node.name] = table
            continue
        intercept = own.intercept + rng.normal(0.0, 0.3, (*own.intercept.shape[:-1], 1 + draws))
        slopes = own.slopes + rng.normal(0.0, 0.2, (*own.slopes.shape[:-1], 1 + draws))
        variance = own.variance * rng.gamma(10.0, 0.1, (*own.variance.shape[:-1], 1 + draws))
        for shaken, first in ((intercept, own.intercept), (slopes, own.slopes), (variance, own.variance)):
            shaken[..., :1] = first
        found[node.name] = Coefficients(intercept, slopes, variance)
    return found


def _own(node):
    if isinstance(node, Category):
        return node.table[..., None]
    return Coefficients(node.intercept[..., None], node.slopes[..., None], node.variance[..., None])


def watching(world, *names):
    """The same world with another watch."""
    return replace(world, watch=names)


@st.composite
def set_worlds(draw, **given):
    """A world in which one number is set: those who take it up get a fixed value or a shift."""
    world = draw(mixed_worlds(**given))
    numbers = [node.name for node in world.nodes if isinstance(node, Number)]
    assume(numbers)
    name = draw(st.sampled_from(numbers))
    reach = draw(st.sampled_from([0.0, 0.3, 1.0]))
    value = round(draw(st.floats(-1.5, 1.5)), 2)
    shift = draw(st.booleans())
    copy, takes = f"{name} set", f"{name} takes"
    nodes = []
    for node in world.nodes:
        parents = tuple(copy if parent == name else parent for parent in node.parents)
        nodes.append(replace(node, parents=parents))
        if node.name == name:
            slopes = [[1.0], [1.0 if shift else 0.0]]
            nodes.append(Category(takes, ["no", "yes"], (), [1.0 - reach, reach]))
            nodes.append(Number(copy, (takes, name), [0.0, value], slopes, [0.0, 0.0], node.bands))
    return replace(world, nodes=tuple(nodes), watch=(*world.watch, copy))
