"""From a question to readings: which worlds, which route, what it costs, what is already known."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import partial
from itertools import combinations

import numpy as np

from engine.answering.kept import Kept
from engine.answering.question import Question, Setting
from engine.answering.tree import Read, Tree, plan
from engine.answering.worlds import World, world
from engine.network.network import Category, Network, drawn_table
from engine.refusal import Refusal, quoted

LIMIT = 1e9  # table cells times draws that are summed exactly; beyond this a question is refused
CHUNK = 64e6  # bytes of tables held at once
DRAWING = 20.0  # a drawn cell counts as so many summed ones: it takes 20 to 60 times as long, and room of its own
HEAVY = 1e6  # drawn cells of one table; a larger one is drawn only for what cannot be read without it
TABLES = 256e6  # bytes of drawn tables kept for the next question, of all models together
PLANS, DRAWS = 256, 3  # plans, and numbers of draws whose recorded world is kept
SUBSETS = 400  # sets of pins tried, at most, when looking for the smallest that contradicts itself

_DRAWN: Kept[tuple[Category, int, int], np.ndarray] = Kept(TABLES, lambda table: table.nbytes)


@dataclass(frozen=True)
class Worlds:
    """Shares in every world: column -> (levels, 1 + draws), the posterior mean first.

    set: None without levers.  had: None without levers or where nobody can have the levers' values.
    log_evidence: of the pins, at the posterior mean.  cost: table cells times draws that were summed, and those of
    the tables that had to be drawn, each weighed by DRAWING.
    """

    recorded: Mapping[str, np.ndarray]
    among: Mapping[str, np.ndarray]
    set: Mapping[str, np.ndarray] | None
    had: Mapping[str, np.ndarray] | None
    log_evidence: float
    cost: float


@dataclass
class Work:
    """What a question asks for: cells times draws to sum, and the families to draw."""

    summed: float = 0.0
    families: set[int] = field(default_factory=set)


class Planner:
    """Answers questions of one network; keeps its plans and its recorded world."""

    def __init__(self, network: Network) -> None:
        self.network = network
        self._plans: Kept[Hashable, Tree] = Kept(PLANS)
        self._worlds: Kept[Hashable, tuple[World, Tree]] = Kept(PLANS)
        self._grouped: Kept[int, list[dict[str, None]]] = Kept(DRAWS)
        self._recorded: Kept[tuple[int, int, tuple[str, ...]], tuple[Mapping[str, np.ndarray], Work]] = Kept(
            DRAWS * (1 + len(network.nodes))
        )

    def worlds(self, asked: Question, draws: int, seed: int) -> Worlds:
        """Every world that `asked` needs, exactly.

        Raises Refusal when the pins contradict each other, or when the cost is beyond what is summed at once.
        """
        count = draws if self.network.drawable else 0
        work = Work()
        recorded = self._recorded_world(asked.columns, count, seed, work)
        among: Mapping[str, np.ndarray]
        among, log_evidence = recorded, 0.0
        if asked.pins:
            found, read = self._read(asked.pins, {}, asked.columns, count, seed, work)
            log_evidence = min(float(read.log_evidence[0]), 0.0)  # rounding may lift certainty above it
            if log_evidence == -np.inf:
                raise self._contradiction(asked)
            among = found
        set_world, had = None, None
        if asked.levers:
            levers = asked.working
            moved = self.network.descendants(levers) | levers.keys()
            columns = [column for column in asked.columns if column in moved]
            found = self._read(asked.pins, levers, columns, count, seed, work)[0] if columns else {}
            set_world = {column: found.get(column, among[column]) for column in asked.columns}
            had = self._had(asked, count, seed, work)
        cost = work.summed + DRAWING * self._cells_drawn(work.families, count)
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
        read = tree.programme.run(here.tables(self._tables(here, 0, 0)))
        sizes = [len(self.network.node(column).levels) for column in columns]
        if read.joint is None or not keep:
            return np.ones(sizes)
        scope = tree.scopes[tree.roots[0]]
        ordered = [scope.index(here.reads[column]) for column in columns if here.reads[column] >= 0]
        table = np.transpose(read.joint[..., 0], ordered).reshape(sizes)
        return np.asarray(table / table.sum())

    def _recorded_world(self, columns: Sequence[str], count: int, seed: int, work: Work) -> Mapping[str, np.ndarray]:
        """The world without pins: all columns in one tree where that can be, so that no digit hangs on what was asked
        before; those that need the same heavy tables in one of their own; else each column by itself."""
        found: dict[str, np.ndarray] = {}
        for group in self._grouped.get(count, lambda: self._groups(count)):
            asked = [column for column in columns if column in group]
            if not asked:
                continue
            here, tree = self._planned({}, {}, tuple(group))
            parts = [tuple(group)]
            if self._cost(here, tree, count) > LIMIT:
                parts = [(column,) for column in asked]
            for part in parts:
                shares, needed = self._recorded.get((count, seed, part), partial(self._alone, part, count, seed))
                found.update(shares)
                work.summed += needed.summed
                work.families |= needed.families
        return found

    def _groups(self, count: int) -> list[dict[str, None]]:
        """Columns that need the same heavy tables, group by group, each in the network's sequence."""
        needs: dict[str, frozenset[int]] = {}
        groups: dict[frozenset[int], dict[str, None]] = {}
        for place, node in enumerate(self.network.nodes):
            own = {place} if self._cells_drawn([place], count) > HEAVY else set()
            needs[node.name] = frozenset(own).union(*(needs[parent] for parent in node.parents))
            groups.setdefault(needs[node.name], {})[node.name] = None
        return list(groups.values())

    def _alone(self, columns: tuple[str, ...], count: int, seed: int) -> tuple[Mapping[str, np.ndarray], Work]:
        work = Work()
        return self._read({}, {}, columns, count, seed, work)[0], work

    def _had(self, asked: Question, count: int, seed: int, work: Work) -> Mapping[str, np.ndarray] | None:
        """The columns in question among those who had the levers' values anyway."""
        pins = dict(asked.pins)
        for column, setting in asked.levers.items():
            pins[column] = pins.get(column, frozenset([setting.position])) & {setting.position}
            if not pins[column]:
                return None
        found, read = self._read(pins, {}, asked.watch, count, seed, work)
        return found if read.log_evidence[0] > -np.inf else None

    def _read(
        self,
        pins: Mapping[str, frozenset[int]],
        levers: Mapping[str, Setting],
        columns: Iterable[str],
        count: int,
        seed: int,
        work: Work,
    ) -> tuple[dict[str, np.ndarray], Read]:
        here, tree = self._planned(pins, levers, columns)
        cost = self._cost(here, tree, count)
        if cost > LIMIT:
            raise _too_wide(cost)
        work.summed += tree.cells * (1 + count)
        work.families.update(here.families)
        drawn = self._tables(here, count, seed)
        width = max(1, int(CHUNK / (8.0 * max(tree.stored, 1.0))))
        reads = [
            tree.programme.run(
                here.tables({family: table[..., start : start + width] for family, table in drawn.items()})
            )
            for start in range(0, 1 + count, width)
        ]
        read = reads[0] if len(reads) == 1 else _joined(reads)
        return {column: here.spread_out(column, read.marginals, 1 + count) for column in here.reads}, read

    def _cost(self, here: World, tree: Tree, count: int) -> float:
        """Cells times draws to sum, and those to draw as so many more."""
        return tree.cells * (1 + count) + DRAWING * self._cells_drawn(here.families, count)

    def _cells_drawn(self, families: Iterable[int], count: int) -> float:
        """Cells times draws of the tables of these families that are uncertain."""
        nodes = [self._category(family) for family in families]
        return float(sum(node.dirichlet.size for node in nodes if node.dirichlet is not None) * count)

    def _tables(self, here: World, count: int, seed: int) -> dict[int, np.ndarray]:
        """The tables that a world needs, by family; another question finds them kept."""
        found = {}
        for family in here.families:
            node = self._category(family)
            make = partial(drawn_table, node, count, seed)
            uncertain = node.dirichlet is not None and count > 0
            found[family] = _DRAWN.get((node, count, seed), make) if uncertain else make()
        return found

    def _category(self, family: int) -> Category:
        return self.network.category(self.network.names[family])

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
        _, read = self._read(pins, {}, (), 0, 0, Work())
        return bool(read.log_evidence[0] > -np.inf)


def _joined(reads: list[Read]) -> Read:
    return Read(
        np.concatenate([read.log_evidence for read in reads]),
        {label: np.concatenate([read.marginals[label] for read in reads], axis=-1) for label in reads[0].marginals},
    )


def _impossible(network: Network, asked: Question, columns: list[str]) -> Refusal:
    def told(column: str) -> str:
        levels = network.node(column).levels
        return f"{quoted(column)} = {' or '.join(quoted(levels[place]) for place in sorted(asked.pins[column]))}"

    pins = [told(column) for column in columns]
    if len(pins) == 1:
        return Refusal(f"No record in this model can have {pins[0]}.", where=columns[0], do="Take this pin out.")
    together = f"{', '.join(pins[:-1])} and {pins[-1]}"
    return Refusal(
        f"No record in this model can have {together} together.",
        where=", ".join(columns),
        do=f"Take out one of these: {', '.join(map(quoted, columns))}.",
    )


def _too_wide(cost: float) -> Refusal:
    return Refusal(
        f"This question is too wide to sum exactly: {cost:.1e} table cells, where {LIMIT:.0e} is the most.",
        do="Watch fewer columns, pin more of them, or accept a model with fewer links.",
    )
