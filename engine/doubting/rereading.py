"""An answer read anew beside unrecorded causes: what levers do, from the joint alone."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from engine.answering.answer import Answer, Marginal
from engine.answering.question import Question
from engine.answering.settings import AnySetting, MixSetting, RuleSetting, Setting
from engine.doubting.graph import Graph
from engine.doubting.identification import Hedge
from engine.doubting.takings import Asked, Way, shares, ways
from engine.network.network import Network, drawn_table

Settings = Mapping[str, AnySetting]


@dataclass(frozen=True, eq=False)
class Rereading:
    """A question beside unrecorded causes.

    graph: the links that are influences, and the causes.  network: of categories; its joint is what is seen.
    """

    graph: Graph
    network: Network
    asked: Question

    @cached_property
    def worlds(self) -> dict[str, Settings]:
        """The worlds in which something is set, by their name in a Reading."""
        every = {"set": self.asked.levers, "against": self.asked.against or {}}
        return {world: settings for world, settings in every.items() if settings}

    def read_by(self, world: str, columns: tuple[str, ...]) -> tuple[Asked, tuple[Way, ...] | Hedge] | None:
        """How columns together are read in a world, or what stands against it.

        None where there is nothing to identify: no lever moves any, or one is a lever or pinned itself.
        """
        settings = self.worlds[world]
        if {*columns} & {*settings, *self.asked.pins, *self.asked.after.positions}:
            return None
        # A lever counts when it leads to what is asked, also by ruling another lever.
        rules = [(each.ruler, lever) for lever, each in settings.items() if each.ruler is not None]
        led = Graph(self.graph.columns, self.graph.links | frozenset(rules), self.graph.pairs)
        leading = led.ancestors({*columns, *self.asked.after.positions})
        kept = {
            lever: each
            for lever, each in settings.items()
            if lever in leading and isinstance(each, Setting | MixSetting | RuleSetting)
        }
        levels = {node.name: len(node.levels) for node in self.network.nodes}
        asked = Asked(columns, kept, self.asked.pins, self.asked.after.positions, levels)
        key = (world, columns)
        if key not in self._known:
            self._known[key] = ways(self.graph, asked)
        return asked, self._known[key]

    @cached_property
    def _known(self) -> dict[tuple[str, tuple[str, ...]], tuple[Way, ...] | Hedge]:
        return {}

    def matters(self, world: str, column: str) -> bool:
        """Whether an identified answer would be read otherwise if nothing unrecorded were stated."""
        found = self.read_by(world, (column,))
        if found is None:
            return False
        asked, by = found
        links = self.graph.links | frozenset(self.network.links)
        return by != ways(Graph(self.graph.columns, links, frozenset()), asked)

    def of(self, answer: Answer, draws: int, seed: int) -> Answer:
        """The answer with what levers do read anew, wherever it follows; what does not stays as the links alone say it.

        draws, seed: of the parameters, as in `answer`, so that all worlds have them in common.
        """
        count = draws if self.network.drawable else 0
        tables = {name: drawn_table(self.network.category(name), count, seed) for name in self.network.names}
        readings = dict(answer.readings)
        for world in self.worlds:
            for column, reading in readings.items():
                found = self.read_by(world, (column,))
                if found is None or isinstance(found[1], Hedge):
                    continue
                values = shares(found[1], found[0], self.network, tables)
                told = Marginal(reading.recorded.levels, values[:, 0], _each(values[:, 1:], count))
                readings[column] = replace(readings[column], **{world: told})  # type: ignore[arg-type]

        def joints(columns: tuple[str, ...]) -> Mapping[str, tuple[np.ndarray, bool]]:
            """Those of worlds in which something is set are left out where they do not follow."""
            assert answer.joints is not None
            known = dict(answer.joints(columns))
            for world in self.worlds:
                known.pop(world, None)
                found = self.read_by(world, tuple(sorted(columns)))
                if found is None or isinstance(found[1], Hedge):
                    continue
                in_turn = self.graph.sorted(columns)
                values = shares(found[1], found[0], self.network, tables)
                turned = np.transpose(values, [*map(in_turn.index, columns), len(columns)])
                known[world] = turned, False
            return known

        return replace(answer, readings=readings, joints=joints)


def _each(values: np.ndarray, count: int) -> np.ndarray:
    """(levels, count): one draw that serves for all is repeated."""
    return np.broadcast_to(values, (values.shape[0], count)) if values.shape[-1] == 1 else values
