"""How likely rows are under a network: the posterior predictive of each."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.network.rows import Rows, read_rows

Floats = NDArray[np.float64]

EXACTLY = 1e-9  # of the size of its terms: how near a number without variance must be to what it follows
BLOCK = 65_536  # rows scored at once


def log_score(network: Network, frame: pd.DataFrame) -> Floats:
    """(rows,) natural log of each row's probability or density, in the numbers' own units; -inf where it cannot be.

    A category counts its posterior predictive share, a number its predictive Student t density (a normal one where
    its parameters are known exactly). A number that follows its parents exactly, with variance 0, has no density: it
    counts as a category would, 1 where it is as it must be and 0 elsewhere.
    Raises Refusal as engine.network.rows.read_rows does.
    """
    rows = read_rows(network, frame)
    total = np.zeros(rows.count)
    for node in network.nodes:
        total += log_shares(network, node, rows) if isinstance(node, Category) else log_densities(network, node, rows)
    return total


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


def _normal(node: Number, at: NDArray[np.integer], beside: Floats, values: Floats) -> Floats:
    intercept = np.asarray(node.intercept).reshape(-1)[at]
    terms = np.asarray(node.slopes).reshape(np.asarray(node.intercept).size, beside.shape[1])[at] * beside
    variance = np.asarray(node.variance).reshape(-1)[at]
    away = values - (intercept + terms.sum(axis=1))
    exact = np.abs(away) <= EXACTLY * (np.abs(intercept) + np.abs(terms).sum(axis=1) + np.abs(values))
    spread = np.where(variance > 0.0, variance, 1.0)
    density = -0.5 * (np.log(2.0 * np.pi * spread) + away * away / spread)
    return np.where(variance > 0.0, density, np.where(exact, 0.0, -np.inf))
