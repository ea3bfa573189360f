"""A column of many rows where something else that bears on it is blank: summed out, exactly, group by group."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from engine.answering import exact_mixed
from engine.answering.drawing import Parameters
from engine.answering.mixed import MixedWorld
from engine.answering.summing import LIMIT
from engine.network.network import Network
from engine.network.nodes import Category, Node, Number
from engine.network.regression import Coefficients
from engine.network.rows import Rows
from engine.refusal import Refusal, quoted

Floats = NDArray[np.float64]


def given_some(network: Network, rows: Rows, column: str, families: Sequence[str], hidden: frozenset[str]) -> Floats:
    """(rows, levels) shares of a category, or (rows, 2) mean and standard deviation of a number.

    families: columns whose own tables or regressions bear on `column`.  hidden: columns that are unknown in every row.
    Raises Refusal where there is no exact route.
    """
    nodes = [network.node(family) for family in families]
    acting = {parent for node in nodes if isinstance(node, Category) for parent in node.parents}
    concerned = dict.fromkeys(name for node in nodes for name in (*node.parents, node.name) if name not in hidden)
    fixed = [name for name in concerned if isinstance(network.node(name), Category) or name in acting]
    codes = np.column_stack([np.empty((rows.count, 0), dtype=np.int64), *(rows.codes[name] for name in fixed)])
    groups, which = np.unique(codes, axis=0, return_inverse=True)
    found: Floats | None = None
    plan: exact_mixed.Plan | None = None
    for place, group in enumerate(groups):
        at = np.flatnonzero(which.ravel() == place)
        level = dict(zip(fixed, (int(code) for code in group), strict=True))
        values = {name: rows.values[name][at] for name in concerned if name in rows.values}
        world, drawn = _group(network, nodes, column, hidden, level, values)
        plan = plan or exact_mixed.plan(world)  # the same for every group
        read = _read(plan, world, drawn, column, values)
        if found is None:
            found = np.empty((rows.count, read.shape[1]))
        found[at] = read
    assert found is not None
    return found


def _group(
    network: Network,
    nodes: Sequence[Node],
    column: str,
    hidden: frozenset[str],
    level: dict[str, int],
    values: dict[str, Floats],
) -> tuple[MixedWorld, dict[str, Parameters]]:
    """One group of rows, alike in `level`: their numbers take the place of draws.

    A category that is known is left with its one level, as likely as that is; a number less its own value is 0.
    """
    made: list[Node] = []
    drawn: dict[str, Parameters] = {}
    seen: dict[str, float] = {}
    for node in nodes:
        if isinstance(node, Category):
            category = _category(node, hidden, level)
            made.append(category)
            drawn[node.name] = np.asarray(category.table)[..., None]
        else:
            number, drawn[node.name] = _number(network, node, hidden, level, values)
            made.append(number)
            if node.name not in hidden:
                seen[node.name] = 0.0
    pins = {node.name: frozenset([0]) for node in made if isinstance(node, Category) and node.name not in hidden}
    return MixedWorld(tuple(made), pins, seen, {}, (column,)), drawn


def _read(
    plan: exact_mixed.Plan, world: MixedWorld, drawn: dict[str, Parameters], column: str, values: dict[str, Floats]
) -> Floats:
    """(rows, ...) of one group. Raises Refusal where that costs too much."""
    rows = len(next(iter(values.values()))) if values else 1  # without numbers they all read the same
    if not plan.cells * rows <= LIMIT:
        why = plan.why or f"it would take {plan.cells * rows:.1e} table cells, where {LIMIT:.0e} is the most"
        raise Refusal(
            f"{quoted(column)} cannot be worked out exactly where other columns are blank: {why}.",
            where=column,
            do="Fill in those columns, or leave these rows out.",
        )
    read = plan.read(world, {name: _spread(each, rows) for name, each in drawn.items()}, rows - 1)
    if column in read.numbers:
        return np.column_stack([read.numbers[column].means, read.numbers[column].sds])
    return read.shares[column].T


def _category(node: Category, hidden: frozenset[str], level: dict[str, int]) -> Category:
    """The category with its table at what is known of its parents."""
    at = tuple(slice(None) if parent in hidden else level[parent] for parent in node.parents)
    parents = tuple(parent for parent in node.parents if parent in hidden)
    table = np.asarray(node.table)[at]
    if node.name in hidden:
        return Category(node.name, node.levels, parents, table)
    own = level[node.name]
    return Category(node.name, node.levels[own : own + 1], parents, table[..., own : own + 1])


def _number(
    network: Network, node: Number, hidden: frozenset[str], level: dict[str, int], values: dict[str, Floats]
) -> tuple[Number, Coefficients]:
    """The number, less its own value where that is known, at what is known of its parents; a draw for each row."""
    categories, numbers = network.category_parents(node.name), network.number_parents(node.name)
    at = tuple(slice(None) if parent in hidden else level[parent] for parent in categories)
    intercept, variance = np.asarray(node.intercept)[at], np.asarray(node.variance)[at]
    slopes = np.asarray(node.slopes)[at]
    moved = intercept[..., None] - (0.0 if node.name in hidden else values[node.name])
    for place, parent in enumerate(numbers):
        if parent not in hidden:
            moved = moved + slopes[..., place, None] * values[parent]
    left = [place for place, parent in enumerate(numbers) if parent in hidden]
    slopes = slopes[..., left]
    parents = tuple(parent for parent in node.parents if parent in hidden)
    bands = node.bands if node.name in hidden else ()
    return Number(node.name, parents, intercept, slopes, variance, bands), Coefficients(
        moved, slopes[..., None], variance[..., None]
    )


def _spread(own: Parameters, rows: int) -> Parameters:
    """The same in every row where it does not hang on the row."""
    if isinstance(own, np.ndarray):
        return np.broadcast_to(own, (*own.shape[:-1], rows))
    arrays = (own.intercept, own.slopes, own.variance)
    return Coefficients(*(np.broadcast_to(array, (*array.shape[:-1], rows)) for array in arrays))
