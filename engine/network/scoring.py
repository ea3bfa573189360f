"""How likely rows are under a network: the posterior predictive of each, its blanks summed out."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import replace
from itertools import product
from math import prod

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.special import ndtr

from engine.network.network import Network
from engine.network.nodes import Category, Node, Number
from engine.network.rows import Rows, read_with_blanks, refused_blank
from engine.refusal import quoted

Floats = NDArray[np.float64]

EXACTLY = 1e-9  # of the size of its terms: how near a number without variance must be to what it follows
BLOCK = 65_536  # rows scored at once
COMBINATIONS = 10_000  # of levels of blank categories, over which a row is summed


def log_score(network: Network, frame: pd.DataFrame) -> Floats:
    """(rows,) natural log of each row's probability or density, in the numbers' own units; -inf where it cannot be.

    A category counts its posterior predictive share, a number its predictive Student t density (a normal one where
    its parameters are known exactly). A number that follows its parents exactly, with variance 0, has no density: it
    counts as a category would, 1 where it is as it must be and 0 elsewhere. A blank that no level stands for is summed
    out, a number with categories that come from it over its bands: a row then has the probability or density of what
    it does hold. Columns that the network does not have are not looked at: none of its own may be missing, so that a
    name spelt wrongly is found all the same.
    Raises Refusal as engine.network.rows.read_with_blanks does, for a blank number that a known number comes from, and
    for blanks of too many combinations.
    """
    if isinstance(frame, pd.DataFrame):
        frame = frame.loc[:, [name in network.index for name in frame.columns]]
    rows, blanks = read_with_blanks(network, frame)
    if not blanks:
        return _all(network, network.nodes, rows)
    patterns, which = np.unique(np.column_stack(list(blanks.values())), axis=0, return_inverse=True)
    total = np.empty(rows.count)
    for place, pattern in enumerate(patterns):
        hidden = frozenset(name for name, blank in zip(blanks, pattern.tolist(), strict=True) if blank)
        here = which.ravel() == place
        total[here] = _summed(network, rows.some(np.flatnonzero(here)), hidden, here)
    return total


def _all(network: Network, nodes: Collection[Node], rows: Rows, hidden: Collection[str] = ()) -> Floats:
    """(rows,) natural log of the product of what each of `nodes` gives; a number of `hidden` counts by its band."""
    total = np.zeros(rows.count)
    for node in nodes:
        if isinstance(node, Category):
            total += log_shares(network, node, rows)
        else:
            total += (log_bands if node.name in hidden else log_densities)(network, node, rows)
    return total


def _summed(network: Network, rows: Rows, hidden: frozenset[str], here: NDArray[np.bool_]) -> Floats:
    """(rows,) the same, with the columns `hidden` summed out. here: where in the table these rows are, for refusals."""
    bearing = _bearing(network, hidden)
    total = _all(network, [node for node, unknown in bearing.items() if not unknown], rows)
    left = {node: unknown for node, unknown in bearing.items() if unknown}
    while left:
        together, nodes = _joined(left)
        for node in nodes:
            if isinstance(node, Number) and (moving := hidden & set(network.number_parents(node.name))):
                why = f"{quoted(node.name)} comes from it: a blank number is summed out only where no number does"
                raise refused_blank(min(moving), here, why)
        sizes = [len(network.node(name).levels) for name in together]
        if prod(sizes) > COMBINATIONS:
            why = f"with what else is blank that is {prod(sizes):,} combinations, more than {COMBINATIONS:,}"
            raise refused_blank(together[0], here, why)
        found = np.full(rows.count, -np.inf)
        for levels in product(*map(range, sizes)):
            filled = {name: np.full(rows.count, level) for name, level in zip(together, levels, strict=True)}
            found = np.logaddexp(found, _all(network, nodes, replace(rows, codes={**rows.codes, **filled}), hidden))
        total += found
        left = {node: unknown for node, unknown in left.items() if node not in nodes}
    return total


def _bearing(network: Network, hidden: frozenset[str]) -> Mapping[Node, frozenset[str]]:
    """Each column that bears on what is known, and which of it and its parents are hidden.

    A hidden column from which nothing known comes sums to one by itself.
    """
    bearing: dict[Node, frozenset[str]] = {}
    wanted: set[str] = set()
    for node in reversed(network.nodes):
        if node.name not in hidden or node.name in wanted:
            wanted.update(node.parents)
            bearing[node] = hidden & {node.name, *node.parents}
    return bearing


def _joined(left: Mapping[Node, frozenset[str]]) -> tuple[list[str], list[Node]]:
    """Hidden columns that have to be summed together, and the columns that hang on them."""
    together = set(next(iter(left.values())))
    while more := set().union(*(unknown for unknown in left.values() if unknown & together)) - together:
        together |= more
    return sorted(together), [node for node, unknown in left.items() if unknown & together]


def log_shares(network: Network, node: Category, rows: Rows) -> Floats:
    """(rows,) natural log of the share of each row's level of a category, given its parents."""
    shares = np.asarray(node.table).reshape(-1, len(node.levels))
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(shares[rows.configurations(network, node.parents), rows.codes[node.name]]))


def log_densities(network: Network, node: Number, rows: Rows) -> Floats:
    """(rows,) natural log of the density of each row's value of a number, given its parents."""
    categories, numbers = network.category_parents(node.name), network.number_parents(node.name)
    beside, values = rows.numbers(numbers), rows.values[node.name]
    if node.regression is None:
        return _normal(node, rows.configurations(network, categories), beside, values)
    codes = np.column_stack([np.empty((rows.count, 0), dtype=np.int64), *(rows.codes[name] for name in categories)])
    parts = [slice(start, start + BLOCK) for start in range(0, rows.count, BLOCK)]
    found = [node.regression.log_density(codes[part], beside[part], values[part]) for part in parts]
    return np.concatenate(found) if found else np.empty(0)


def log_bands(network: Network, node: Number, rows: Rows) -> Floats:
    """(rows,) natural log of the share of each row's band of a number, given its parents."""
    categories, beside = network.category_parents(node.name), rows.numbers(network.number_parents(node.name))
    ends = np.array([-np.inf, *node.bands, np.inf])
    low, high = ends[rows.codes[node.name]], ends[rows.codes[node.name] + 1]
    if node.regression is not None:
        codes = np.column_stack([np.empty((rows.count, 0), dtype=np.int64), *(rows.codes[name] for name in categories)])
        shares = node.regression.below(codes, beside, high) - node.regression.below(codes, beside, low)
    else:
        at = rows.configurations(network, categories)
        slopes = np.asarray(node.slopes).reshape(np.asarray(node.intercept).size, beside.shape[1])[at]
        mean = np.asarray(node.intercept).reshape(-1)[at] + (slopes * beside).sum(axis=1)
        sd = np.sqrt(np.asarray(node.variance).reshape(-1)[at])
        wide = np.where(sd > 0.0, sd, 1.0)
        inside = ((low <= mean) & (mean < high)).astype(np.float64)
        shares = np.where(sd > 0.0, ndtr((high - mean) / wide) - ndtr((low - mean) / wide), inside)
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(np.maximum(shares, 0.0)))


def _normal(node: Number, at: NDArray[np.integer], beside: Floats, values: Floats) -> Floats:
    intercept = np.asarray(node.intercept).reshape(-1)[at]
    terms = np.asarray(node.slopes).reshape(np.asarray(node.intercept).size, beside.shape[1])[at] * beside
    variance = np.asarray(node.variance).reshape(-1)[at]
    away = values - (intercept + terms.sum(axis=1))
    exact = np.abs(away) <= EXACTLY * (np.abs(intercept) + np.abs(terms).sum(axis=1) + np.abs(values))
    spread = np.where(variance > 0.0, variance, 1.0)
    density = -0.5 * (np.log(2.0 * np.pi * spread) + away * away / spread)
    return np.where(variance > 0.0, density, np.where(exact, 0.0, -np.inf))
