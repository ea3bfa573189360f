"""The route for categories: the tables of a world summed exactly over one tree."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import partial
from typing import cast

import numpy as np

from engine.answering import drawing
from engine.answering.kept import Kept
from engine.answering.pins import Pins
from engine.answering.scenes import Scene, Seen
from engine.answering.settings import OfCategory
from engine.answering.tree import Read, Tree, plan
from engine.answering.worlds import World, world
from engine.network.network import Network
from engine.network.nodes import Category

LIMIT = 1e9  # table cells times draws that are summed exactly
CHUNK = 16e6  # bytes of tables held at once, so many that they stay near the processor
AMONG = 16e6  # bytes of worlds without levers, kept for the next question
DRAWING = 20.0  # a drawn cell counts as so many summed ones: it takes 20 to 60 times as long, and room of its own
HEAVY = 1e6  # drawn cells of one table; a larger one is drawn only for what cannot be read without it
PLANS, DRAWS = 256, 3  # plans, and numbers of draws whose recorded world is kept


class TooWideError(Exception):
    """What is asked would cost more than LIMIT."""

    def __init__(self, cost: float) -> None:
        super().__init__(f"{cost:.1e} table cells")
        self.cost = cost


@dataclass
class Work:
    """What a question asks for: cells times draws to sum, and the families to draw."""

    summed: float = 0.0
    families: set[int] = field(default_factory=set)


Plans = Kept[Hashable, Tree]  # by what alone a plan hangs on: scopes, sizes, and what is read


class Summing:
    """Sums the worlds of one network of categories; keeps its plans and its recorded world.

    plans: kept together with other networks, whose worlds are alike in part; None: of its own.
    whole: whether the recorded world is read for all columns at once; else for those asked for, as is better where a
    network is asked little.
    """

    def __init__(self, network: Network, plans: Plans | None = None, whole: bool = True) -> None:
        self.network = network
        self._plans = Plans(PLANS) if plans is None else plans
        self._whole = whole
        self._worlds: Kept[Hashable, tuple[World, Tree]] = Kept(PLANS)
        self._among: Kept[Hashable, Seen] = Kept(AMONG, lambda seen: sum(each.nbytes for each in seen.shares.values()))
        self._grouped: Kept[int, list[dict[str, None]]] = Kept(DRAWS)
        self._recorded: Kept[tuple[int, int, tuple[str, ...]], tuple[Mapping[str, np.ndarray], Work]] = Kept(
            DRAWS * (1 + len(network.nodes))
        )

    def read(self, scene: Scene, count: int, seed: int, work: Work) -> Seen:
        """Sum one world. Raises TooWideError."""
        here, tree = self._planned(scene)
        cost = self._cost(here, tree, count)
        if cost > LIMIT:
            raise TooWideError(cost)
        work.summed += tree.cells * (1 + count)
        work.families.update(here.families)

        def make() -> Seen:
            read = self._run(here, tree, count, seed)
            shares = {column: here.spread_out(column, read.marginals, 1 + count) for column in here.reads}
            return Seen(shares, log_evidence=read.log_evidence)

        # the next question mostly has the same pins, and other levers
        return make() if scene.levers or not self._whole else self._among.get((scene.key, count, seed), make)

    def recorded(self, columns: Sequence[str], count: int, seed: int, work: Work) -> dict[str, np.ndarray]:
        """The world without pins: all columns in one tree where that can be, so that no digit hangs on what was asked
        before; those that need the same heavy tables in one of their own; else each column by itself.

        Raises TooWideError.
        """
        if not self._whole:
            part = tuple(columns)
            alone, needed = self._recorded.get((count, seed, part), partial(self._alone, part, count, seed))
            work.summed += needed.summed
            work.families |= needed.families
            return dict(alone)
        found: dict[str, np.ndarray] = {}
        for group in self._grouped.get(count, lambda: self._groups(count)):
            asked = [column for column in columns if column in group]
            if not asked:
                continue
            here, tree = self._planned(Scene(Pins(), {}, tuple(group)))
            parts = [tuple(group)]
            if self._cost(here, tree, count) > LIMIT:
                parts = [(column,) for column in asked]
            for part in parts:
                shares, needed = self._recorded.get((count, seed, part), partial(self._alone, part, count, seed))
                found.update(shares)
                work.summed += needed.summed
                work.families |= needed.families
        return found

    def joint(self, scene: Scene, count: int, seed: int) -> np.ndarray:
        """(levels of each column in order..., 1 + count) joint shares; each column once. Raises TooWideError."""
        here = self._world(scene)
        keep = tuple(sorted(here.watched))
        tree = plan(here.scopes, here.sizes, (), keep)
        cost = self._cost(here, tree, count)
        if cost > LIMIT:
            raise TooWideError(cost)
        nodes = [self.network.node(column) for column in scene.columns]
        table = np.zeros((*(len(node.levels) for node in nodes), 1 + count))
        read = self._run(here, tree, count, seed)
        if keep:
            assert read.joint is not None
            scope = tree.scopes[tree.roots[0]]
            ordered = [scope.index(here.reads[column]) for column in scene.columns if here.reads[column] >= 0]
            shares = np.transpose(read.joint, (*ordered, len(scope)))
        else:
            shares = np.ones(1 + count)
        rows: list[list[int]] = []
        for column, node in zip(scene.columns, nodes, strict=True):
            label = here.reads[column]
            rows.append([-1 - label] if label < 0 else list(here.kept.get(label, range(len(node.levels)))))
        table[np.ix_(*rows, range(1 + count))] = np.broadcast_to(
            shares.reshape(*map(len, rows), shares.shape[-1]), (*map(len, rows), 1 + count)
        )
        return np.asarray(table / table.reshape(-1, 1 + count).sum(axis=0))

    def cells_drawn(self, families: Iterable[int], count: int) -> float:
        """Cells times draws of the tables of these families that are uncertain."""
        return float(sum(drawing.cells_drawn(self.network.nodes[family]) for family in families) * count)

    def total(self, work: Work, count: int) -> float:
        """The cost of some work: cells times draws summed, and those drawn, each as DRAWING of them."""
        return work.summed + DRAWING * self.cells_drawn(work.families, count)

    def _groups(self, count: int) -> list[dict[str, None]]:
        """Columns that need the same heavy tables, group by group, each in the network's sequence."""
        needs: dict[str, frozenset[int]] = {}
        groups: dict[frozenset[int], dict[str, None]] = {}
        for place, node in enumerate(self.network.nodes):
            own = {place} if self.cells_drawn([place], count) > HEAVY else set()
            needs[node.name] = frozenset(own).union(*(needs[parent] for parent in node.parents))
            groups.setdefault(needs[node.name], {})[node.name] = None
        return list(groups.values())

    def _alone(self, columns: tuple[str, ...], count: int, seed: int) -> tuple[Mapping[str, np.ndarray], Work]:
        work = Work()
        return self.read(Scene(Pins(), {}, columns), count, seed, work).shares, work

    def _run(self, here: World, tree: Tree, count: int, seed: int) -> Read:
        drawn = self._tables(here, count, seed)
        width = max(1, int(CHUNK / (8.0 * max(tree.stored, 1.0))))
        reads = [
            tree.programme.run(
                here.tables({family: table[..., start : start + width] for family, table in drawn.items()})
            )
            for start in range(0, 1 + count, width)
        ]
        return reads[0] if len(reads) == 1 else _joined(reads)

    def _cost(self, here: World, tree: Tree, count: int) -> float:
        """Cells times draws to sum, and those to draw as so many more."""
        return tree.cells * (1 + count) + DRAWING * self.cells_drawn(here.families, count)

    def _tables(self, here: World, count: int, seed: int) -> dict[int, np.ndarray]:
        """The tables that a world needs, by family; another question finds them kept."""
        return {family: drawing.table(self._node(family), count, seed) for family in here.families}

    def _node(self, family: int) -> Category:
        node = self.network.nodes[family]
        assert isinstance(node, Category)
        return node

    def _planned(self, scene: Scene) -> tuple[World, Tree]:
        """The world and its tree, kept by what is pinned, set and watched."""
        return self._worlds.get(scene.key, lambda: self._plan(self._world(scene)))

    def _world(self, scene: Scene) -> World:
        levers = cast(Mapping[str, OfCategory], scene.levers)
        return world(self.network, scene.before.positions, levers, scene.columns, scene.after.positions)

    def _plan(self, here: World) -> tuple[World, Tree]:
        """Another level pinned or set in the same columns needs no new tree."""
        key = (here.scopes, tuple(here.sizes.items()), here.watched)
        return here, self._plans.get(key, lambda: plan(here.scopes, here.sizes, here.watched))


def _joined(reads: list[Read]) -> Read:
    joints = [read.joint for read in reads if read.joint is not None]
    return Read(
        np.concatenate([read.log_evidence for read in reads]),
        {label: np.concatenate([read.marginals[label] for read in reads], axis=-1) for label in reads[0].marginals},
        np.concatenate(joints, axis=-1) if joints else None,
    )
