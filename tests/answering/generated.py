"""Networks and questions made up by hypothesis."""

import numpy as np
from hypothesis import strategies as st

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
