"""What was learned: the best model at every number of links, and which size to take."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property, lru_cache, partial
from math import prod
from typing import Self

import numpy as np
import pandas as pd

from engine.learning import archive
from engine.learning.cap import Capped
from engine.learning.evidence import FamilyMoments, counts_of, family_node, moments_of
from engine.learning.posterior import Posterior
from engine.learning.search import Parents
from engine.network.equivalence import unsettled_links
from engine.network.network import Network
from engine.network.nodes import Node
from engine.order import Order
from engine.records.table import Coded
from engine.refusal import Refusal

FORMAT = "steelyard learned"
VERSION = 3
_FAMILIES = 2_048  # kept with their posterior
SURE = 0.9  # support from which a direction counts as settled by the data; common practice, no source
_CURVE = ("links", "score", "bound", "held_out", "held_out_se")


@dataclass(frozen=True, eq=False)
class Learned:
    """The best model at every number of links that the order allows.

    order, coded: what it was learned from.  digest: of the table; seed: of the folds.  max_parents: the cap used.
    chosen: links -> for each column of `coded` the positions of its parents.
    posterior: how sure of each link, over every graph that the order allows, and graphs drawn from that.
    curve: one row a number of links: links; score, the log marginal likelihood, nats; bound, what no model of that
    size can exceed; held_out, the log score per record of records left out of learning; held_out_se, the standard
    error of its record-by-record difference to the best size, 0 there.
    recommended: the smallest number of links within one standard error of the best (paired).
    notes: sentences worth knowing about how it was learned.
    cap: columns that, in the recommended model, would gain from one parent more than `max_parents`.
    """

    order: Order
    coded: Coded
    curve: pd.DataFrame
    recommended: int
    chosen: Mapping[int, Parents]
    posterior: Posterior
    max_parents: int
    seed: int
    digest: str
    notes: tuple[str, ...] = ()
    cap: tuple[Capped, ...] = ()

    @property
    def rows(self) -> int:
        """Records it was learned from."""
        return int(self.coded.codes.shape[0])

    def parents_at(self, links: int | None = None) -> dict[str, tuple[str, ...]]:
        """Column -> its parents in the best model with that many links; None: the recommended number.

        Raises Refusal for a number that the curve does not hold.
        """
        names = self.coded.names
        return {
            name: tuple(names[place] for place in parents)
            for name, parents in zip(names, self._chosen(links), strict=True)
        }

    def network(self, links: int | None = None) -> Network:
        """That model as a network, with the posterior of its parameters. Raises Refusal as `parents_at`."""
        return self.network_of(self._chosen(links))

    def network_of(self, chosen: Parents) -> Network:
        """Any graph without a circle as a network.  chosen: for each column of `coded` the positions of its parents."""
        return Network(tuple(self.family(child, chosen[child]) for child in _parents_first(chosen)))

    def family(self, child: int, parents: tuple[int, ...]) -> Node:
        """One column with the posterior of its parameters given any parents; positions in `coded`.

        The latest families are kept, so that graphs that share them do not count again.
        """
        return self._family(child, tuple(int(parent) for parent in parents))

    @cached_property
    def _family(self) -> Callable[[int, tuple[int, ...]], Node]:
        counts, moments = counts_of(self.coded), moments_of(self.coded)
        sums = None if moments is None else FamilyMoments(moments)
        return lru_cache(maxsize=_FAMILIES)(partial(family_node, self.coded, counts, sums))

    @cached_property
    def support(self) -> pd.DataFrame:
        """Each link that any graph has, surest first: source, target, support, settled.

        support: posterior probability.  settled: as `settled` says of the recommended model; a link that it does not
        have was settled by "your order" or by "nobody".
        """
        names = self.coded.names
        known = self.settled()
        by = {(s, t): who for s, t, who in zip(known["source"], known["target"], known["settled"], strict=True)}
        rows = []
        for source, target in np.argwhere(self.posterior.support > 0.0):
            link = (names[source], names[target])
            other = "nobody" if self.order.may_lead(link[1], link[0]) else "your order"
            rows.append((*link, float(self.posterior.support[source, target]), by.get(link, other)))
        rows.sort(key=lambda row: -row[2])
        return pd.DataFrame(rows, columns=["source", "target", "support", "settled"])

    @property
    def graphs(self) -> tuple[tuple[tuple[tuple[str, str], ...], float], ...]:
        """Graphs drawn from the posterior: (links, weight), the weights summing to 1."""
        names = self.coded.names
        return tuple(
            (tuple((names[source], names[target]) for source, target in np.argwhere(graph)), float(weight))
            for graph, weight in zip(self.posterior.graphs, self.posterior.weights, strict=True)
        )

    def support_of(self, source: str, target: str) -> float:
        """Posterior probability of one link, 0 to 1."""
        names = self.coded.names
        return float(self.posterior.support[names.index(source), names.index(target)])

    def settled(self, links: int | None = None) -> pd.DataFrame:
        """Each link of that model and who settled its direction: source, target, settled.

        settled: "your order"; "the data", when every equivalent graph that the order allows agrees and the support is
        over SURE; else "nobody". Between a category and a number of one stage it is always "nobody", as is what rests
        on such a link: there the shape of the number decides, not the data.
        """
        names, may_lead = self.coded.names, self.order.may_lead
        numbers = {names[place] for place in self.coded.numbers}
        pairs = [(parent, child) for child, parents in self.parents_at(links).items() for parent in parents]
        pairs.sort(key=lambda link: (names.index(link[0]), names.index(link[1])))
        free = [link for link in pairs if may_lead(link[1], link[0])]
        by_shape = {(source, target) for source, target in free if (source in numbers) != (target in numbers)}
        # What rests on such a link is open as well: it must be settled without them, too.
        without = [link for link in pairs if link not in by_shape]
        unsettled = by_shape | unsettled_links(pairs, may_lead) | unsettled_links(without, may_lead)
        rows = []
        for source, target in pairs:
            sure = (source, target) not in unsettled and self.support_of(source, target) > SURE
            settled = "your order" if (source, target) not in free else "the data" if sure else "nobody"
            rows.append((source, target, settled))
        return pd.DataFrame(rows, columns=["source", "target", "settled"])

    def save(self, path: str | os.PathLike[str]) -> None:
        """Write it to one file. The same table, order and seed give the same bytes."""
        described = {
            "format": FORMAT,
            "version": VERSION,
            "order": archive.order_described(self.order),
            "coded": archive.coded_described(self.coded),
            "recommended": self.recommended,
            "chosen": [[links, self.chosen[links]] for links in sorted(self.chosen)],
            "max_parents": self.max_parents,
            "seed": self.seed,
            "digest": self.digest,
            "notes": self.notes,
            "cap": self.cap,
        }
        curve = {f"curve_{name}": self.curve[name].to_numpy() for name in _CURVE}
        posterior: dict[str, np.ndarray] = {
            "support": self.posterior.support,
            "graphs": np.packbits(self.posterior.graphs),
            "graph_weights": self.posterior.weights,
        }
        archive.write(path, described, {**archive.coded_arrays(self.coded), **curve, **posterior})

    @classmethod
    def open(cls, path: str | os.PathLike[str]) -> Self:
        """Read what `save` wrote; it answers as before to the last digit. Raises Refusal for any other file."""
        described, arrays = archive.read(path, FORMAT, VERSION)
        shape = (arrays["graph_weights"].size, *arrays["support"].shape)
        graphs = np.unpackbits(arrays["graphs"], count=prod(shape)).reshape(shape).astype(np.bool_)
        return cls(
            order=archive.order_from(described["order"]),
            coded=archive.coded_from(described["coded"], arrays),
            curve=pd.DataFrame({name: arrays[f"curve_{name}"] for name in _CURVE}),
            recommended=described["recommended"],
            chosen={links: tuple(tuple(parents) for parents in model) for links, model in described["chosen"]},
            posterior=Posterior(arrays["support"], graphs, arrays["graph_weights"]),
            max_parents=described["max_parents"],
            seed=described["seed"],
            digest=described["digest"],
            notes=tuple(described["notes"]),
            cap=tuple(Capped(column, gain, tuple(parents)) for column, gain, parents in described["cap"]),
        )

    def _chosen(self, links: int | None) -> Parents:
        size = self.recommended if links is None else links
        if size not in self.chosen:
            low, high = min(self.chosen), max(self.chosen)
            raise Refusal(
                f"No model with {size} links was learned.",
                where="links",
                do=f"Choose from {low} to {high} links." if low < high else f"The only size learned is {low}.",
            )
        return self.chosen[size]


def open_learned(path: str | os.PathLike[str]) -> Learned:
    """As `Learned.open`."""
    return Learned.open(path)


def _parents_first(chosen: Parents) -> list[int]:
    """Columns so that parents stand before their children, otherwise as listed."""
    placed: list[int] = []
    waiting = list(range(len(chosen)))
    while waiting:
        ready = next(child for child in waiting if set(chosen[child]) <= set(placed))
        placed.append(ready)
        waiting.remove(ready)
    return placed
