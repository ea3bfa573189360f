"""A column of many rows where all that bears on it is known: its own family and its children's (Pearl 1988)."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from engine.answering.normal import log_between, moments_between, standardised
from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.network.rows import Rows

Floats = NDArray[np.float64]

CERTAIN = 1e6  # what a number that follows exactly, and does, counts for beside any density, as a natural log
NEAR = 1e-9  # of the size of its terms: how near that is
BLOCK = 65_536  # rows at once


def shares_given_all(network: Network, rows: Rows, node: Category, families: Sequence[str]) -> Floats:
    """(rows, levels) shares of a category; nan where the row cannot be."""
    logs = np.zeros((rows.count, len(node.levels)))
    for family in families:
        child = network.node(family)
        if isinstance(child, Category):
            logs += _log_table(network, rows, child, node.name)
        else:
            logs += _log_densities(network, rows, child, node.name, len(node.levels))
    largest = logs.max(axis=1, keepdims=True)
    with np.errstate(invalid="ignore"):
        shares = np.exp(logs - largest)
        return np.asarray(shares / shares.sum(axis=1, keepdims=True))


def number_given_all(network: Network, rows: Rows, node: Number, families: Sequence[str]) -> Floats:
    """(rows, 2) mean and standard deviation of a number; nan where the row cannot be."""
    mean, _, variance = _family(network, rows, node, None)
    logs: Floats | None = None
    for family in families:
        child = network.node(family)
        if family == node.name:
            continue
        if isinstance(child, Category):
            found = _log_table(network, rows, child, node.name)
            logs = found if logs is None else logs + found
            continue
        rest, slope, left = _family(network, rows, child, node.name)
        away = rows.values[family] - rest - slope * mean  # one more value of x, as a Kalman update
        total = slope * slope * variance + left
        gain = np.where(total > 0.0, variance * slope / np.where(total > 0.0, total, 1.0), 0.0)
        mean = mean + gain * away
        variance = np.where(left > 0.0, variance * (1.0 - gain * slope), np.where(gain != 0.0, 0.0, variance))
    sd = np.sqrt(np.maximum(variance, 0.0))
    return np.column_stack([mean, sd]) if logs is None else _through_bands(node, mean, sd, logs)


def _through_bands(node: Number, mean: Floats, sd: Floats, logs: Floats) -> Floats:
    """A normal number whose bands weigh as `logs`, (rows, bands), say."""
    edges = np.array([-np.inf, *node.bands, np.inf])
    start, end = standardised(edges[:-1], edges[1:], mean[:, None], sd[:, None])
    logs = logs + log_between(start, end)
    with np.errstate(invalid="ignore"):
        weight = np.exp(logs - logs.max(axis=1, keepdims=True))
        weight /= weight.sum(axis=1, keepdims=True)
    middle, spread = moments_between(start, end)
    means = mean[:, None] + sd[:, None] * middle
    mean = (weight * means).sum(axis=1)
    variance = (weight * (sd[:, None] ** 2 * spread + (means - mean[:, None]) ** 2)).sum(axis=1)
    return np.column_stack([mean, np.sqrt(variance)])


def _log_table(network: Network, rows: Rows, child: Category, column: str) -> Floats:
    """(rows, levels or bands of `column`) log share of what each row's child is, for each level of `column`."""
    names = (*child.parents, child.name)
    table = np.moveaxis(np.asarray(child.table), names.index(column), -1)
    others = tuple(name for name in names if name != column)
    at = rows.configurations(network, others)
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(table.reshape(-1, table.shape[-1]))[at])


def _log_densities(network: Network, rows: Rows, child: Number, column: str, levels: int) -> Floats:
    """(rows, levels of `column`) log density of each row's child, for each level of a category `column`."""
    found = np.empty((rows.count, levels))
    value = rows.values[child.name]
    for level in range(levels):
        mean, _, variance = _family(network, rows, child, None, (column, level))
        size = np.abs(mean) + np.abs(value)
        away = value - mean
        safe = np.where(variance > 0.0, variance, 1.0)
        density = -0.5 * (np.log(2.0 * np.pi * safe) + away * away / safe)
        found[:, level] = np.where(variance > 0.0, density, np.where(np.abs(away) <= NEAR * size, CERTAIN, -np.inf))
    return found


def _family(
    network: Network, rows: Rows, node: Number, apart: str | None, at_level: tuple[str, int] | None = None
) -> tuple[Floats, Floats, Floats]:
    """(rows,) each: the mean without the term of the number `apart`, the slope on it, and the variance.

    at_level: a category and the level that it is taken to be at in every row.
    """
    intercept, variance = np.asarray(node.intercept), np.asarray(node.variance)
    at = np.zeros(rows.count, dtype=np.int64)
    for parent in network.category_parents(node.name):
        code = at_level[1] if at_level is not None and parent == at_level[0] else rows.codes[parent]
        at = at * len(network.node(parent).levels) + code
    numbers = network.number_parents(node.name)
    slopes = np.asarray(node.slopes).reshape(intercept.size, len(numbers))
    mean = intercept.reshape(-1)[at]
    slope = np.zeros(rows.count)
    for place, parent in enumerate(numbers):
        if parent == apart:
            slope = slopes[at, place]
        else:
            mean = mean + slopes[at, place] * rows.values[parent]
    return mean, slope, variance.reshape(-1)[at]
