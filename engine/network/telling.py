"""What is told of a network in words: how each column comes about, and how far each link moves its child."""

from __future__ import annotations

from collections.abc import Callable, Collection
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.network import conditional
from engine.network.network import Network
from engine.network.number_rules import held_at, number_rules
from engine.network.story import Story, rules, touches
from engine.network.strength import category_strength, number_strength
from engine.network.typical import Typical, invented, recorded
from engine.order import Order, better_levels
from engine.records.column import Coded
from engine.refusal import Refusal, quoted

Joint = Callable[[tuple[str, ...]], np.ndarray]


@dataclass(frozen=True, eq=False)
class Telling:
    """A network and what stands for all its cases.

    order, coded, unsettled: as in engine.model.Model.  exact: columns -> their joint shares by the network; asked for
    only where the records do not tell them.  keep: what keeps joint shares, for a page asks for the same ones again.
    """

    network: Network
    order: Order | None
    coded: Coded | None
    unsettled: Collection[tuple[str, str]]
    exact: Joint
    keep: Callable[[tuple[str, ...], Callable[[], np.ndarray]], np.ndarray]

    def strength(self, source: str, target: str) -> float:
        """As engine.model.Model.strength, of a link that there is."""
        if target in self.network.numbers:
            return number_strength(self.network, source, target, self._joint, lambda: self._typical)
        return category_strength(self.network, source, target, self.better(target), self._joint)

    def account(self, column: str, most: int) -> Story:
        """As engine.model.Model.account. Raises Refusal for an unknown column."""
        if column not in self.network.index:
            raise Refusal(
                f"This model has no column {quoted(column)}.", where=column, do="Ask for one of model.network.names."
            )
        said = touches(self.network, column, self.unsettled)
        if column in self.network.numbers:
            return self._number(column, most)
        common = self._joint(self.network.node(column).parents)
        better = self.better(column) if self.order is not None and column in self.order.outcomes else None
        rows = conditional.rows(self.network, column, common, most)
        return Story(said, rules(self.network, column, common, better), rows, common.size - len(rows))

    def _number(self, column: str, most: int) -> Story:
        common = self._joint(self.network.category_parents(column))
        at = np.array([self._typical.mean(parent) for parent in self.network.number_parents(column)])
        means = conditional.number_rows(self.network, column, common, at, most)
        reach = None if self.coded is None else self._typical.reach(column)
        told = number_rules(self.network, column, common, at, self._spread, reach)
        said, held = touches(self.network, column, self.unsettled), held_at(self.network, column, at, self._spread)
        return Story(said, told, (), common.size - len(means), means, held)

    def _spread(self, number: str) -> float:
        return self._typical.sd(number)

    def better(self, column: str) -> list[int]:
        """Positions of the better levels of an outcome, else of the commonest level."""
        node = self.network.node(column)
        better = None if self.order is None else self.order.outcomes.get(column)
        found = better_levels(better, node.levels, node.has_blank)
        return [node.levels.index(level) for level in found] or [int(np.argmax(self._joint((column,))))]

    def _joint(self, columns: tuple[str, ...]) -> np.ndarray:
        """(levels, or bands, of each column...) joint shares.

        By the model; where it has numbers and there are records, by the records, which need no working out.
        """
        return self.keep(columns, lambda: self._common(columns))

    def _common(self, columns: tuple[str, ...]) -> np.ndarray:
        if self.network.numbers and self.coded is not None:
            return self._typical.joint(self.network, columns)
        return self.exact(columns)

    @cached_property
    def _typical(self) -> Typical:
        """What stands for all cases where values of numbers come in: the records, else rows always invented alike."""
        return invented(self.network) if self.coded is None else recorded(self.coded)
