"""Many rows at once: one column of each, given the others.

Where all that bears on a row's column is known, its shares or its normal come from its own family and its children's,
over all rows together. Where something that bears on it is blank, that is summed out: rows alike in what is known of
the categories share one exact reading, their numbers in the place of parameter draws.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.answering.blanket import number_given_all, shares_given_all
from engine.answering.hidden import given_some
from engine.answering.naming import known
from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.network.rows import Rows, read_rows
from engine.records.cells import cells
from engine.refusal import Refusal

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Known:
    """Rows, and which of their cells are known.

    known: column -> (rows,) whether the cell is; what `rows` holds elsewhere means nothing.
    """

    rows: Rows
    known: Mapping[str, NDArray[np.bool_]]


def predict(network: Network, frame: pd.DataFrame, column: str) -> pd.DataFrame:
    """A row per row of `frame`: the shares of `column`, by level, or its "mean" and "sd" when it is a number.

    All is at the posterior means. What `frame` holds of the column itself is not looked at; a column that it does not
    hold, or a blank that no level stands for, is summed out. A row that cannot be is nan.
    Raises Refusal for an unknown column or level, and for blanks that cannot be summed out exactly.
    """
    node = known(network, column)
    given = _known(network, frame, column)
    count = given.rows.count
    names = list(node.levels) if isinstance(node, Category) else ["mean", "sd"]
    found = np.full((count, len(names)), np.nan)
    held = np.column_stack([given.known[name] for name in network.names])
    patterns, which = np.unique(held, axis=0, return_inverse=True)
    for place, pattern in enumerate(patterns):
        at = np.flatnonzero(which.ravel() == place)
        bearing = _bearing(network, column, dict(zip(network.names, pattern.tolist(), strict=True)))
        rows = _some(given.rows, at)
        if bearing.hidden != (column,):
            found[at] = given_some(network, rows, column, bearing.families, frozenset(bearing.hidden))
        elif isinstance(node, Category):
            found[at] = shares_given_all(network, rows, node, bearing.families)
        else:
            found[at] = number_given_all(network, rows, node, bearing.families)
    return pd.DataFrame(found, index=frame.index, columns=names)


@dataclass(frozen=True)
class Bearing:
    """What bears on a column when some columns are known: the unknown ones, and the columns whose families matter."""

    hidden: tuple[str, ...]
    families: tuple[str, ...]


def _bearing(network: Network, column: str, held: Mapping[str, bool]) -> Bearing:
    """All unknown columns that are joined to `column` by families, without those that only lead nowhere."""
    children: dict[str, list[str]] = {name: [] for name in network.names}
    for source, target in network.links:
        children[source].append(target)
    live: set[str] = set()
    for name in reversed(network.names):
        if held[name] or name == column or live & set(children[name]):
            live.add(name)
    hidden, families, waiting = {column}, set(), [column]
    while waiting:
        name = waiting.pop()
        for family in (name, *children[name]):
            if family not in live or family in families:
                continue
            families.add(family)
            for other in (family, *network.node(family).parents):
                if not held[other] and other not in hidden:
                    hidden.add(other)
                    waiting.append(other)
    return Bearing(*(tuple(name for name in network.names if name in some) for some in (hidden, families)))


def _known(network: Network, frame: pd.DataFrame, column: str) -> Known:
    """Read the rows with something in the place of every blank."""
    if not isinstance(frame, pd.DataFrame):
        raise Refusal("The rows are no DataFrame.", where="rows", do="Bring them as a pandas DataFrame.")
    filled: dict[str, object] = {}
    held: dict[str, NDArray[np.bool_]] = {}
    every = list(frame.columns)
    for node in network.nodes:
        name = node.name
        blank = np.ones(len(frame), dtype=bool)
        if name != column and every.count(name) == 1:
            blank = cells(name, frame[name]).blank
        if blank.all() and not (node.has_blank and name != column and name in every):
            filled[name] = np.full(len(frame), 0.0 if isinstance(node, Number) else node.levels[0])
            held[name] = np.zeros(len(frame), dtype=bool)
        elif node.has_blank or not blank.any():
            filled[name], held[name] = frame[name].to_numpy(), np.ones(len(frame), dtype=bool)
        else:
            filled[name] = frame[name].where(~blank, frame[name].iloc[int(np.argmin(blank))]).to_numpy()
            held[name] = ~blank
    others = frame.loc[:, [name not in network.index or every.count(name) > 1 for name in every]]
    read = read_rows(network, pd.concat([pd.DataFrame(filled, index=frame.index), others], axis=1))
    return Known(read, held)


def _some(rows: Rows, at: NDArray[np.integer]) -> Rows:
    return replace(
        rows,
        count=len(at),
        codes={name: codes[at] for name, codes in rows.codes.items()},
        values={name: values[at] for name, values in rows.values.items()},
    )
