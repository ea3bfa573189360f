"""The table of a column given its parents, a row for each configuration, with intervals."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray
from scipy.special import betaincinv

from engine.network.network import Network

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Row:
    """One configuration.

    given: the level of each parent.  weight: how common it is, 0 to 1, by the model.
    shares: (levels,).  low, high: (levels,) the interval of each.
    """

    given: tuple[str, ...]
    weight: float
    shares: Floats
    low: Floats
    high: Floats


def rows(network: Network, column: str, weights: Floats, most: int, coverage: float = 0.90) -> tuple[Row, ...]:
    """The `most` commonest configurations of the parents of `column`, in the order of their levels.

    weights: (parent levels...) how common each is.  The intervals are equal-tailed credible ones of each share by
    itself: a share of a Dirichlet is a Beta. A table known exactly has points.
    """
    node = network.node(column)
    configurations = list(product(*(network.node(parent).levels for parent in node.parents)))
    common = weights.reshape(-1)
    kept = np.sort(np.argsort(-common, kind="stable")[:most])
    shares = np.asarray(node.table).reshape(-1, len(node.levels))[kept]
    low = high = shares
    if node.dirichlet is not None:
        alpha = node.dirichlet.reshape(-1, len(node.levels))[kept]
        rest = alpha.sum(axis=1, keepdims=True) - alpha
        tail = (1.0 - coverage) / 2.0
        open_ended = (alpha > 0.0) & (rest > 0.0)  # else the share is known: none or all
        a, b = np.where(open_ended, alpha, 1.0), np.where(open_ended, rest, 1.0)
        low = np.where(open_ended, betaincinv(a, b, tail), shares)
        high = np.where(open_ended, betaincinv(a, b, 1.0 - tail), shares)
    return tuple(
        Row(configurations[place], float(common[place]), shares[at], low[at], high[at])
        for at, place in enumerate(kept.tolist())
    )
