"""From a question to readings: which worlds, which route, what it costs, what is already known."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Mapping
from dataclasses import dataclass
from functools import partial
from itertools import combinations

import numpy as np

from engine.answering.kept import Kept
from engine.answering.question import Question, Setting
from engine.answering.tree import Read, Tree, plan
from engine.answering.worlds import World, world
from engine.network.network import Network
from engine.refusal import Refusal

LIMIT = 1e9  # table cells times draws that are summed exactly; beyond this a question is refused
CHUNK = 64e6  # bytes of tables held at once
PLANS, DRAWS = 256, 3  # plans and sets of drawn tables kept for the next question
SUBSETS = 400  # sets of pins tried, at most, when looking for the smallest that contradicts itself


@dataclass(frozen=True)
class Worlds:
    """Shares in every world: column -> (levels, 1 + draws), the posterior mean first.

    set: None without levers.  had: None without levers or where nobody can have the levers' values.
    log_evidence: of the pins, at the posterior mean.  cost: table cells times draws that were summed.
    """

    recorded: Mapping[str, np.ndarray]
    among: Mapping[str, np.ndarray]
    set: Mapping[str, np.ndarray] | None
    had: Mapping[str, np.ndarray] | None
    log_evidence: float
    cost: float


class Planner:
    """Answers questions of one network; keeps its plans, its drawn tables and its recorded world."""

    def __init__(self, network: Network) -> None:
        self.network = network
        self._plans: Kept[Hashable, Tree] = Kept(PLANS)
        self._worlds: Kept[Hashable, tuple[World, Tree]] = Kept(PLANS)
        self._drawn: Kept[tuple[int, int], tuple[np.ndarray, ...]] = Kept(DRAWS)
        self._recorded: Kept[tuple[int, int, str | None], tuple[Mapping[str, np.ndarray], float]] = Kept(
            DRAWS * (1 + len(network.nodes))
        )

    def worlds(self, asked: Question, draws: int, seed: int) -> Worlds:
        """Every world that `asked` needs, exactly.

        Raises Refusal when the pins contradict each other, or when the cost is beyond what is summed at once.
        """
        count = draws if self.network.drawable else 0
        recorded, cost = self._recorded_world(asked.columns, count, seed)
        among: Mapping[str, np.ndarray]
        among, log_evidence = recorded, 0.0
        if asked.pins:
            found, read, more = self._read(asked.pins, {}, asked.columns, count, seed)
            cost += more
            log_evidence = float(read.log_evidence[0])
            if log_evidence == -np.inf:
                raise self._contradiction(asked)
            among = found
        set_world, had = None, None
        if asked.levers:
            levers = asked.working
            moved = self.network.descendants(levers) | levers.keys()
            columns = [column for column in asked.columns if column in moved]
            found, more = {}, 0.0
            if columns:
                found, _, more = self._read(asked.pins, levers, columns, count, seed)
            set_world = {column: found.get(column, among[column]) for column in asked.columns}
            had, extra = self._had(asked, count, seed)
            cost += more + extra
        return Worlds(recorded, among, set_world, had, log_evidence, cost)

    def joint(self, columns: tuple[str, ...]) -> np.ndarray:
        """(levels of each column in order...) joint shares at the posterior mean, as recorded.

        Raises Refusal when the cost is beyond what is summed at once.
        """
        here = world(self.network, {}, {}, columns)
        keep = tuple(sorted(here.watched))
        tree = plan(here.scopes, here.sizes, (), keep)
        if tree.cells > LIMIT:
            raise _too_wide(tree.cells)
        read = tree.programme.run(here.tables(self._tables(0, 0)))
        sizes = [len(self.network.node(column).levels) for column in columns]
        if read.joint is None or not keep:
            return np.ones(sizes)
        scope = tree.scopes[tree.roots[0]]
        ordered = [scope.index(here.reads[column]) for column in columns if here.reads[column] >= 0]
        table = np.transpose(read.joint[..., 0], ordered).reshape(sizes)
        return np.asarray(table / table.sum())

    def _recorded_world(self, columns: Iterable[str], count: int, seed: int) -> tuple[Mapping[str, np.ndarray], float]:
        """The world without pins, and its cost: all columns in one tree where that can be, so that no digit hangs on
        what was asked before; else each column by itself."""
        _, tree = self._planned({}, {}, self.network.names)
        parts: list[tuple[str | None, tuple[str, ...]]] = [(None, self.network.names)]
        if tree.cells * (1 + count) > LIMIT:
            parts = [(column, (column,)) for column in columns]
        found: dict[str, np.ndarray] = {}
        cost = 0.0
        for key, together in parts:
            shares, more = self._recorded.get((count, seed, key), partial(self._alone, together, count, seed))
            found.update(shares)
            cost += more
        return found, cost

    def _alone(self, columns: tuple[str, ...], count: int, seed: int) -> tuple[Mapping[str, np.ndarray], float]:
        shares, _, cost = self._read({}, {}, columns, count, seed)
        return shares, cost

    def _had(self, asked: Question, count: int, seed: int) -> tuple[Mapping[str, np.ndarray] | None, float]:
        """The columns in question among those who had the levers' values anyway."""
        pins = dict(asked.pins)
        for column, setting in asked.levers.items():
            pins[column] = pins.get(column, frozenset([setting.position])) & {setting.position}
            if not pins[column]:
                return None, 0.0
        found, read, cost = self._read(pins, {}, asked.watch, count, seed)
        return (found if read.log_evidence[0] > -np.inf else None), cost

    def _read(
        self,
        pins: Mapping[str, frozenset[int]],
        levers: Mapping[str, Setting],
        columns: Iterable[str],
        count: int,
        seed: int,
    ) -> tuple[dict[str, np.ndarray], Read, float]:
        here, tree = self._planned(pins, levers, columns)
        cost = tree.cells * (1 + count)
        if cost > LIMIT:
            raise _too_wide(cost)
        drawn = self._tables(count, seed)
        width = max(1, int(CHUNK / (8.0 * max(tree.stored, 1.0))))
        reads = [
            tree.programme.run(here.tables([table[..., start : start + width] for table in drawn]))
            for start in range(0, 1 + count, width)
        ]
        read = reads[0] if len(reads) == 1 else _joined(reads)
        return {column: here.spread_out(column, read.marginals, 1 + count) for column in here.reads}, read, cost

    def _tables(self, count: int, seed: int) -> tuple[np.ndarray, ...]:
        return self._drawn.get((count, seed if count else 0), lambda: self.network.draws(count, seed))

    def _planned(
        self, pins: Mapping[str, frozenset[int]], levers: Mapping[str, Setting], columns: Iterable[str]
    ) -> tuple[World, Tree]:
        """The world and its tree, kept by what is pinned, set and watched."""
        watched = tuple(columns)
        asked = (tuple(pins.items()), tuple(levers.items()), watched)
        return self._worlds.get(asked, lambda: self._plan(world(self.network, pins, levers, watched)))

    def _plan(self, here: World) -> tuple[World, Tree]:
        """Another level pinned or set in the same columns needs no new tree."""
        key = (here.scopes, tuple(here.sizes.items()), here.watched)
        return here, self._plans.get(key, lambda: plan(here.scopes, here.sizes, here.watched))

    def _contradiction(self, asked: Question) -> Refusal:
        """Name the smallest set of pins that no record can have together, as far as it is sought."""
        found = list(asked.pins)
        for column in list(found):  # leave out what the contradiction does not need
            rest = [other for other in found if other != column]
            if rest and not self._possible(asked, rest):
                found = rest
        tried = 0
        for size in range(1, len(found)):
            for columns in combinations(asked.pins, size):
                tried += 1
                if tried > SUBSETS:
                    break
                if not self._possible(asked, columns):
                    return _impossible(self.network, asked, list(columns))
        return _impossible(self.network, asked, found)

    def _possible(self, asked: Question, columns: Iterable[str]) -> bool:
        pins = {column: asked.pins[column] for column in columns}
        _, read, _ = self._read(pins, {}, (), 0, 0)
        return bool(read.log_evidence[0] > -np.inf)


def _joined(reads: list[Read]) -> Read:
    return Read(
        np.concatenate([read.log_evidence for read in reads]),
        {label: np.concatenate([read.marginals[label] for read in reads], axis=-1) for label in reads[0].marginals},
    )


def _impossible(network: Network, asked: Question, columns: list[str]) -> Refusal:
    def told(column: str) -> str:
        levels = network.node(column).levels
        return f"{column} = {' or '.join(levels[place] for place in sorted(asked.pins[column]))}"

    pins = [told(column) for column in columns]
    if len(pins) == 1:
        return Refusal(f"No record in this model can have {pins[0]}.", where=columns[0], do="Take this pin out.")
    together = f"{', '.join(pins[:-1])} and {pins[-1]}"
    return Refusal(
        f"No record in this model can have {together} together.",
        where=", ".join(columns),
        do=f"Take out one of these: {', '.join(columns)}.",
    )


def _too_wide(cost: float) -> Refusal:
    return Refusal(
        f"This question is too wide to sum exactly: {cost:.1e} table cells, where {LIMIT:.0e} is the most.",
        do="Watch fewer columns, pin more of them, or accept a model with fewer links.",
    )
