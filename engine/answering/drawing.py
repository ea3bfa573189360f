"""Drawn parameters, kept for the next question, of all models together."""

from __future__ import annotations

from functools import partial

import numpy as np

from engine.answering.kept import Kept
from engine.network.drawn import drawn
from engine.network.nodes import Category, Node
from engine.network.regression import Coefficients

TABLES = 256e6  # bytes of drawn parameters that are kept

Parameters = np.ndarray | Coefficients


def _bytes(found: Parameters) -> float:
    arrays = (found,) if isinstance(found, np.ndarray) else (found.intercept, found.slopes, found.variance)
    return float(sum(array.nbytes for array in arrays))


_DRAWN: Kept[tuple[Node, int, int], Parameters] = Kept(TABLES, _bytes)


def parameters(node: Node, count: int, seed: int) -> Parameters:
    """As `engine.network.drawn.drawn`; what was drawn lately is found again."""
    make = partial(drawn, node, count, seed)
    return _DRAWN.get((node, count, seed), make) if cells_drawn(node) and count else make()


def table(node: Category, count: int, seed: int) -> np.ndarray:
    """`parameters` of a category: (parent levels..., own levels, 1 + count)."""
    found = parameters(node, count, seed)
    assert isinstance(found, np.ndarray)
    return found


def cells_drawn(node: Node) -> int:
    """Cells of its parameters that are uncertain, in each draw."""
    if isinstance(node, Category):
        return 0 if node.dirichlet is None else int(node.dirichlet.size)
    if node.regression is None:
        return 0
    return sum(np.asarray(array).size for array in (node.intercept, node.slopes, node.variance))
