"""Networks that several tests of answering ask."""

import numpy as np
import pytest

from engine.network.network import Category, network


@pytest.fixture(scope="session")
def chain_of_forty():
    """Forty columns, each led to by the two before it, with an uncertain table."""
    rng = np.random.default_rng(40)
    nodes = []
    for place in range(40):
        parents = [f"c{before}" for before in range(max(0, place - 2), place)]
        dirichlet = rng.gamma(1.0, 10.0, (2,) * (len(parents) + 1)) + 0.5
        table = dirichlet / dirichlet.sum(axis=-1, keepdims=True)
        nodes.append(Category(f"c{place}", ["a", "b"], parents, table, dirichlet=dirichlet))
    return network(nodes)
