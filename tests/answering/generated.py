"""Networks and questions made up by hypothesis."""

import numpy as np
from hypothesis import strategies as st

import engine
from engine.network.network import Category, network


@st.composite
def networks(draw, certain=None, most=6, holes=None):
    """2 to `most` columns of 1 to 4 levels, some cells 0 (`holes`), tables known or with a posterior."""
    count = draw(st.integers(2, most))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    known = draw(st.booleans()) if certain is None else certain
    zeros = known and (draw(st.booleans()) if holes is None else holes)
    sizes = [draw(st.integers(1, 4)) for _ in range(count)]
    nodes = []
    for place in range(count):
        parents = sorted(draw(st.sets(st.integers(0, place - 1), max_size=3))) if place else []
        shape = (*(sizes[parent] for parent in parents), sizes[place])
        dirichlet = rng.gamma(1.0, 3.0, shape) + 0.01
        if zeros:
            dirichlet = dirichlet * (rng.random(shape) < 0.6)
            empty = dirichlet.sum(axis=-1) == 0.0
            dirichlet[empty, rng.integers(sizes[place])] = 1.0
        nodes.append(
            Category(
                f"column {place}",
                [f"level {level}" for level in range(sizes[place])],
                [f"column {parent}" for parent in parents],
                dirichlet / dirichlet.sum(axis=-1, keepdims=True),
                dirichlet=None if known else dirichlet,
            )
        )
    order = draw(st.permutations(nodes))
    return network(order)


@st.composite
def pins(draw, net, among=None, most=3):
    """Pins on up to `most` of the columns `among`: one level or a set, possibly all."""
    columns = sorted(net.names if among is None else among)
    if not columns:
        return {}
    chosen = draw(st.lists(st.sampled_from(columns), max_size=most, unique=True))
    return {
        column: draw(st.sets(st.sampled_from(net.node(column).levels), min_size=1, max_size=4)) for column in chosen
    }


@st.composite
def questions(draw, most=6, certain=None):
    """(network, pins, levers): up to 3 levers with reach, pins on columns that no lever moves."""
    net = draw(networks(certain, most))
    chosen = draw(st.lists(st.sampled_from(sorted(net.names)), max_size=3, unique=True))
    levers = {
        column: (draw(st.sampled_from(net.node(column).levels)), draw(st.sampled_from([0.0, 0.25, 0.8, 1.0])))
        for column in chosen
    }
    free = set(net.names) - net.descendants(chosen)
    return net, draw(pins(net, free)), levers


@st.composite
def levers(draw, net, columns):
    """A Fix, Mix or Rule with reach on each of the columns; a rule goes by a column that none of this follows from."""
    found = {}
    for column in columns:
        levels = net.node(column).levels
        reach = draw(st.sampled_from([0.0, 0.25, 0.8, 1.0, 1.0]))
        before = [name for name in net.names if name != column and name not in net.descendants([column])]
        kind = draw(st.sampled_from(["fix", "mix", "rule"] if before else ["fix", "mix"]))
        if kind == "fix":
            found[column] = engine.Fix(draw(st.sampled_from(levels)), reach)
        elif kind == "mix":
            weights = [draw(st.integers(0, 4)) for _ in levels]
            total = sum(weights) or 1
            shares = {level: weight / total for level, weight in zip(levels, weights, strict=True) if weight}
            found[column] = engine.Mix(shares or {levels[0]: 1.0}, reach)
        else:
            ruler = draw(st.sampled_from(before))
            named = draw(st.sets(st.sampled_from(net.node(ruler).levels), min_size=1))
            found[column] = engine.Rule(ruler, {level: draw(st.sampled_from(levels)) for level in sorted(named)}, reach)
    return found


@st.composite
def lever_questions(draw, most=5, certain=None):
    """(network, pins, levers, levers against or None, pins after): two set worlds with every kind of lever."""
    net = draw(networks(certain, most))
    columns = st.lists(st.sampled_from(sorted(net.names)), min_size=1, max_size=3, unique=True)
    first = draw(columns)
    second = draw(st.one_of(st.none(), columns))
    free = set(net.names) - net.descendants([*first, *(second or [])])
    moved = set(first) | net.descendants(first)
    after = draw(pins(net, moved, 2)) if draw(st.booleans()) else {}
    return (
        net,
        draw(pins(net, free)),
        draw(levers(net, first)),
        None if second is None else draw(levers(net, second)),
        after,
    )
