"""Invented rows, drawn from a network at its posterior means."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.network.rows import Rows
from engine.records.bands import band_codes
from engine.refusal import whole

Floats = NDArray[np.float64]

BLOCK = 65_536  # rows of a category drawn at once


def sample(network: Network, count: int, seed: int) -> pd.DataFrame:
    """`count` rows: levels as texts, numbers as floats, a number taken as bands as the name of its band.

    The same network and seed draw the same rows. Raises Refusal unless count is 1 or more and seed 0 or more.
    """
    rows = drawn_rows(network, count, seed)
    return pd.DataFrame(
        {
            node.name: rows.values[node.name]
            if isinstance(node, Number)
            else np.array(node.levels, dtype=object)[rows.codes[node.name]]
            for node in network.nodes
        }
    )


def drawn_rows(network: Network, count: int, seed: int) -> Rows:
    """The same rows as level positions and values. Raises Refusal as `sample`."""
    size = whole(count, "rows", 1, "Ask for one row or more.")
    rng = np.random.default_rng(whole(seed, "seed", 0, "Give a whole number; the same one draws the same rows."))
    codes: dict[str, NDArray[np.integer]] = {}
    values: dict[str, Floats] = {}
    rows = Rows(size, codes, values)
    for node in network.nodes:
        if isinstance(node, Category):
            codes[node.name] = _levels(node, rows.configurations(network, node.parents), rng.random(size))
        else:
            values[node.name] = _values(network, node, rows, rng.standard_normal(size))
            codes[node.name] = band_codes(values[node.name], node.bands)
    return rows


def _levels(node: Category, at: NDArray[np.integer], chance: Floats) -> NDArray[np.integer]:
    upto = np.asarray(node.table).reshape(-1, len(node.levels)).cumsum(axis=1)
    found = np.empty(at.size, dtype=np.int32)
    for start in range(0, at.size, BLOCK):
        part = slice(start, start + BLOCK)
        here = upto[at[part]]
        found[part] = ((chance[part] * here[:, -1])[:, None] >= here[:, :-1]).sum(axis=1)
    return found


def _values(network: Network, node: Number, rows: Rows, away: Floats) -> Floats:
    at = rows.configurations(network, network.category_parents(node.name))
    beside = rows.numbers(network.number_parents(node.name))
    slopes = np.asarray(node.slopes).reshape(np.asarray(node.intercept).size, beside.shape[1])[at]
    mean = np.asarray(node.intercept).reshape(-1)[at] + (slopes * beside).sum(axis=1)
    return np.asarray(mean + np.sqrt(np.asarray(node.variance).reshape(-1)[at]) * away)
