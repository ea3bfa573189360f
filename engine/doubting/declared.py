"""The graph of a model whose user has stated unrecorded causes."""

from __future__ import annotations

from collections.abc import Sequence

from engine.doubting.graph import Graph, graph
from engine.network.network import Network
from engine.order import Unrecorded
from engine.refusal import Refusal, quoted


def declared(network: Network, unrecorded: Sequence[Unrecorded]) -> Graph | None:
    """The links of a network and the unrecorded causes beside them; None when none is stated.

    A pair that does not lead there directly has no link in the graph, though the later of the two has the earlier in
    its table: what ties them is seen there, and is no influence.
    Raises Refusal for a column that the network does not have, for a pair whose second column leads to the first, and
    for numbers, which have to be taken as bands here.
    """
    if not unrecorded:
        return None
    for pair in unrecorded:
        for column in (pair.first, pair.second):
            if column not in network.index:
                raise Refusal(
                    f"The unrecorded cause of {quoted(column)} is stated, but there is no such column.",
                    where="unrecorded",
                    do="Name two columns of the model.",
                )
        if pair.first == pair.second or pair.first in network.descendants([pair.second]):
            raise Refusal(
                f"{quoted(pair.first)} is said to come before {quoted(pair.second)}, but follows from it.",
                where="unrecorded",
                do="Name the two in the other sequence.",
            )
    if network.numbers:
        raise Refusal(
            f"Beside unrecorded causes the number {quoted(network.numbers[0])} has to be taken as bands.",
            where=network.numbers[0],
            do="Give it as a category with its bands as levels.",
        )
    apart = {(pair.first, pair.second) for pair in unrecorded if not pair.direct}
    links = [link for link in network.links if link not in apart]
    return graph(network.names, links, [(pair.first, pair.second) for pair in unrecorded])
