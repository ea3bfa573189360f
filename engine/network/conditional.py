"""The table of a column given its parents, a row for each configuration, with intervals: shares, or means."""

from __future__ import annotations

from collections.abc import Sequence
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


@dataclass(frozen=True, eq=False)
class NumberRow:
    """One configuration of the category parents of a number.

    given: the level of each.  weight: how common it is, 0 to 1.
    mean: of the number, at values of its number parents that are the same in every row.  low, high: its interval.
    sd: around its line.  slopes: (number parents,) change in the mean for each 1 more of the parent.
    """

    given: tuple[str, ...]
    weight: float
    mean: float
    low: float
    high: float
    sd: float
    slopes: tuple[float, ...]


def rows(network: Network, column: str, weights: Floats, most: int, coverage: float = 0.90) -> tuple[Row, ...]:
    """The `most` commonest configurations of the parents of `column`, in the order of their levels.

    weights: (parent levels...) how common each is.  The intervals are equal-tailed credible ones of each share by
    itself: a share of a Dirichlet is a Beta. A table known exactly has points.
    """
    node = network.category(column)
    configurations, common, kept = _commonest(network, node.parents, weights, most)
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


def number_rows(
    network: Network, column: str, weights: Floats, at: Floats, most: int, coverage: float = 0.90
) -> tuple[NumberRow, ...]:
    """The `most` commonest configurations of the category parents of a number, in the order of their levels.

    weights: (category parents' levels...) how common each is.  at: (number parents,) the value of each at which all
    means are told, so that rows differ by their levels alone. What is known exactly has points.
    """
    node, categories = network.number(column), network.category_parents(column)
    configurations, common, kept = _commonest(network, categories, weights, most)
    slopes = np.asarray(node.slopes).reshape(common.size, at.size)[kept]
    mean = np.asarray(node.intercept).reshape(-1)[kept] + slopes @ at
    low = high = mean
    if node.regression is not None:
        codes = np.stack(np.unravel_index(kept, weights.shape), axis=1) if categories else np.empty((kept.size, 0), int)
        low, high = node.regression.mean_interval(codes, np.tile(at, (kept.size, 1)), coverage)
    sd = np.sqrt(np.asarray(node.variance)).reshape(-1)[kept]
    return tuple(
        NumberRow(
            configurations[place],
            float(common[place]),
            float(mean[each]),
            float(low[each]),
            float(high[each]),
            float(sd[each]),
            tuple(slopes[each].tolist()),
        )
        for each, place in enumerate(kept.tolist())
    )


def _commonest(
    network: Network, parents: Sequence[str], weights: Floats, most: int
) -> tuple[list[tuple[str, ...]], Floats, NDArray[np.intp]]:
    """Every configuration in levels, (configurations,) how common it is, and the places of the `most` commonest."""
    configurations = list(product(*(network.node(parent).levels for parent in parents)))
    common = weights.reshape(-1)
    return configurations, common, np.sort(np.argsort(-common, kind="stable")[:most])
