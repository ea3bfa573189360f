"""The routes for worlds with numbers: exact where there is a plan for it, else weighting."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from functools import partial

import numpy as np

from engine.answering import drawing, exact_mixed, weighting
from engine.answering.kept import Kept
from engine.answering.mixed import MixedRead, MixedWorld
from engine.answering.scenes import Scene, Seen
from engine.answering.splitting import Split, split
from engine.answering.summing import DRAWING, LIMIT
from engine.network.network import Network
from engine.network.nodes import Category
from engine.refusal import Refusal

AT_ONCE = 2e7  # cells times draws: the recorded world is read at once up to here, else column by column
PLANS, RECORDED = 256, 64  # plans and split worlds, and readings of the recorded world, that are kept


class NotExactError(Exception):
    """Why some column cannot be read exactly: no route, or a cost in cells times draws beyond LIMIT."""

    def __init__(self, columns: tuple[str, ...], cost: float, why: str) -> None:
        super().__init__(why)
        self.columns, self.cost, self.why = columns, cost, why

    def refusal(self) -> Refusal:
        what = (
            f"it would take {self.cost:.1e} table cells, where {LIMIT:.0e} is the most."
            if np.isfinite(self.cost)
            else self.why
        )
        return Refusal(
            f"This question is too wide to sum exactly: {what}",
            where=", ".join(self.columns) or None,
            do="Watch fewer columns, pin more of them, or let it be sampled.",
        )


@dataclass(frozen=True, eq=False)
class Planned:
    """A split world and how to read it exactly."""

    split: Split
    plan: exact_mixed.Plan


class Mixing:
    """Reads worlds of one network that holds numbers; keeps its plans and its recorded world.

    whole: False for one of many networks asked together, whose draws get as many particles as they would have here,
    and whose point answer is not told.
    """

    def __init__(self, network: Network, whole: bool = True) -> None:
        self.network = network
        self._whole = whole
        self._plans: Kept[Hashable, exact_mixed.Plan] = Kept(PLANS)
        self._worlds: Kept[Hashable, Split] = Kept(PLANS)
        self._recorded: Kept[Hashable, Seen] = Kept(RECORDED)
        self._sampled: Kept[Hashable, list[Seen]] = Kept(RECORDED)

    def divided(self, scene: Scene, count: int) -> tuple[list[tuple[str, ...]], tuple[str, ...], NotExactError | None]:
        """Columns to read exactly, in groups, those to sample, and why these cannot be read exactly.

        Without pins and levers the groups do not hang on what was asked. Raises NotExactError when there are no columns
        and the probability of the pins by itself cannot be had exactly.
        """
        whole = tuple(node.name for node in self.network.nodes) if scene.bare else scene.columns
        if self._cost(scene.reading(whole), count) <= (AT_ONCE if scene.bare else LIMIT):
            return [whole], (), None
        exact: list[tuple[str, ...]] = []
        sampled: list[str] = []
        reason = None
        if not scene.columns:
            raise NotExactError(scene.before.columns, self._cost(scene, count), self._planned(scene).plan.why)
        for column in scene.columns:
            alone = scene.reading((column,))
            cost = self._cost(alone, count)
            if cost <= LIMIT:
                exact.append((column,))
            else:
                sampled.append(column)
                reason = reason or NotExactError((column,), cost, self._planned(alone).plan.why)
        return exact, tuple(sampled), reason

    def read(self, scene: Scene, count: int, seed: int) -> tuple[Seen, float]:
        """Read a world exactly, and what it cost. The recorded world is kept for the next question."""
        planned = self._planned(scene)
        make = partial(self._read, scene, planned, count, seed)
        seen = self._recorded.get((scene.key, count, seed), make) if scene.bare else make()
        return seen, self._cost(scene, count)

    def sampled(self, scenes: tuple[Scene, ...], count: int, seed: int) -> list[Seen]:
        """Read worlds of one question by weighting, on the same particles. The recorded world is kept."""
        make = partial(self._sample, scenes, count, seed)
        if len(scenes) == 1 and scenes[0].bare:
            return self._sampled.get((scenes[0].key, count, seed), make)
        return make() if scenes else []

    def _cost(self, scene: Scene, count: int) -> float:
        """Cells times draws to sum, infinite when there is no exact route, and those to draw as so many more."""
        return self._planned(scene).plan.cells * (1 + count) + self.cells_drawn(scene, count)

    def cells_drawn(self, scene: Scene, count: int) -> float:
        """Cells times draws of the uncertain parameters that a world needs, each as DRAWING of those summed."""
        nodes = self._apart(scene).natural.values()
        return DRAWING * count * sum(drawing.cells_drawn(node) for node in nodes)

    def joint(self, scene: Scene, count: int, seed: int) -> np.ndarray:
        """(levels or bands of each column..., 1 + count) joint shares. Raises NotExactError."""
        apart = split(self.network, scene, joint=True)
        plan = exact_mixed.plan(apart.world)
        cost = plan.cells * (1 + count)
        if not cost <= LIMIT:
            raise NotExactError(scene.columns, cost, plan.why)
        return self._shaped(apart, plan.read(apart.world, _drawn(apart, count, seed), count), scene)

    def joint_sampled(self, scene: Scene, count: int, seed: int) -> np.ndarray:
        """As `joint`, by weighting."""
        apart = split(self.network, scene, joint=True)
        return self._shaped(apart, weighting.weigh(apart.world, _drawn(apart, count, seed), count, seed), scene)

    def _shaped(self, apart: Split, read: MixedRead, scene: Scene) -> np.ndarray:
        assert apart.together is not None
        shares = read.shares[apart.together]
        return shares.reshape(*(len(self.network.node(column).levels) for column in scene.columns), shares.shape[-1])

    def _read(self, scene: Scene, planned: Planned, count: int, seed: int) -> Seen:
        apart = planned.split
        return _seen(scene, apart, planned.plan.read(apart.world, _drawn(apart, count, seed), count))

    def _sample(self, scenes: tuple[Scene, ...], count: int, seed: int) -> list[Seen]:
        parts = [self._apart(scene) for scene in scenes]
        worlds = [(apart.world, _drawn(apart, count, seed)) for apart in parts]
        particles = (weighting.PARTICLES, weighting.MOST) if self._whole else (weighting.a_draw(count),) * 2
        reads = weighting.weigh_together(worlds, count, seed, *particles)
        return [_seen(scene, apart, read) for scene, apart, read in zip(scenes, parts, reads, strict=True)]

    def _planned(self, scene: Scene) -> Planned:
        """The world and its plan; another value pinned or set in the same columns needs no new plan."""
        apart = self._apart(scene)
        return Planned(apart, self._plans.get(_shape(apart.world), partial(exact_mixed.plan, apart.world)))

    def _apart(self, scene: Scene) -> Split:
        return self._worlds.get(scene.key, partial(split, self.network, scene))


def _shape(world: MixedWorld) -> Hashable:
    """All of a world that a plan hangs on."""
    return (
        tuple((node.name, node.parents, len(node.levels), isinstance(node, Category)) for node in world.nodes),
        tuple((name, tuple(sorted(wanted))) for name, wanted in world.pins.items()),
        tuple(world.values),
        tuple(world.ranges),
        world.watch,
    )


def _drawn(apart: Split, count: int, seed: int) -> dict[str, drawing.Parameters]:
    found = {}
    for node in apart.world.nodes:
        own = apart.natural.get(node.name)
        found[node.name] = apart.added(node, count) if own is None else drawing.parameters(own, count, seed)
    return found


def _seen(scene: Scene, apart: Split, read: MixedRead) -> Seen:
    """What was read, by the names of the columns."""
    names = {apart.shown[column]: column for column in scene.columns}
    return Seen(
        {column: read.shares[name] for name, column in names.items()},
        {names[name]: number for name, number in read.numbers.items() if name in names},
        read.log_evidence,
        {names[name]: error for name, error in read.error.items() if name in names},
        read.effective,
    )
