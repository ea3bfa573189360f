"""Names in a question: columns and levels that a network has, and the nearest to one that it does not."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from difflib import get_close_matches

from engine.network.network import Network
from engine.network.nodes import Node
from engine.refusal import Refusal, quoted

SHOWN = 12  # levels or columns named in a refusal; more are counted
NEAREST = 3


def known(network: Network, column: object) -> Node:
    """The node of that name. Raises Refusal, with the nearest names, when there is none."""
    if not isinstance(column, str) or column not in network.index:
        raise Refusal(
            f"There is no column {quoted(column)} in this model.",
            where=str(column),
            do=f"{nearest(column, network.names)}Its columns are {listed(network.names)}.",
        )
    return network.node(column)


def position(node: Node, level: str) -> int:
    """The place of a level. Raises Refusal, with the nearest levels, when there is none of that name."""
    if level not in node.levels:
        raise Refusal(
            f"{quoted(node.name)} has no level {quoted(level)}.",
            where=node.name,
            do=f"{nearest(level, node.levels)}Its levels are {listed(node.levels)}.",
        )
    return node.levels.index(level)


def nearest(given: object, names: Sequence[str]) -> str:
    """A sentence, with a blank after it, that names what may have been meant; empty when nothing is near."""
    lower = {name.lower(): name for name in reversed(names)}
    close = [lower[name] for name in get_close_matches(str(given).lower(), list(lower), NEAREST)]
    return f"Did you mean {' or '.join(map(quoted, close))}? " if close else ""


def listed(names: Iterable[str]) -> str:
    """Names in a row for a sentence: the first dozen, the others counted."""
    every = list(names)
    shown = ", ".join(every[:SHOWN])
    return shown if len(every) <= SHOWN else f"{shown} and {len(every) - SHOWN} more"
