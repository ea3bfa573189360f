"""From a question to readings: which worlds, which route, what it costs, what is already known."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import reduce

import numpy as np

from engine.answering.contradicting import contradiction
from engine.answering.mixing import Mixing, NotExactError
from engine.answering.pins import Pins
from engine.answering.question import Question
from engine.answering.scenes import Scene, Seen
from engine.answering.settings import AnySetting, Setting, ShiftSetting, ValueSetting
from engine.answering.summing import LIMIT, Plans, Summing, TooWideError, Work
from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.refusal import Refusal, quoted

TREE = "by one tree over the columns that bear on the question"
MIXED = "by every configuration of the categories that touch its numbers"
WEIGHTING = "by likelihood weighting"
SET = ("set", "against")  # worlds with levers
FEW = 3  # sampled columns that are named


@dataclass(frozen=True)
class Worlds:
    """What was read of every world.

    set: None without levers.  had: None without fixed levers or where nobody can have their values.  against: None
    unless a second set of levers was asked about.
    log_evidence: of the pins, at the posterior mean.  cost: table cells times draws that were summed, and those that
    had to be drawn, each weighed.  method: "exact" or "sampled", and by which route.
    """

    recorded: Seen
    among: Seen
    set: Seen | None
    had: Seen | None
    against: Seen | None
    log_evidence: float
    cost: float
    method: str

    @property
    def every(self) -> tuple[Seen, ...]:
        worlds = (self.recorded, self.among, self.set, self.had, self.against)
        return tuple(seen for seen in worlds if seen is not None)

    @property
    def mc_error(self) -> float:
        """Largest Monte Carlo standard error, 0 when exact."""
        return max((error for seen in self.every for error in seen.error.values()), default=0.0)

    @property
    def effective(self) -> float:
        """Fewest effective particles of any world, infinite when exact."""
        return min(seen.effective for seen in self.every)


@dataclass
class Turn:
    """One question being answered: its draws, its choice of route, and what was done for it so far."""

    count: int
    seed: int
    exact: bool | None
    work: Work = field(default_factory=Work)
    cells: float = 0.0
    tree: bool = False
    mixed: bool = False
    sampled: dict[str, None] = field(default_factory=dict)
    reads: dict[str, None] = field(default_factory=dict)


@dataclass
class Begun:
    """A world read so far: what was read of it exactly, and the columns left to sample, None where nothing is."""

    scene: Scene
    parts: list[Seen] = field(default_factory=list)
    left: tuple[str, ...] | None = None

    @property
    def possible(self) -> bool:
        """Whether the pins can be, as far as that is known yet."""
        return all(part.possible for part in self.parts)


class Planner:
    """Answers questions of one network; keeps its plans and its recorded world.  plans, whole: as in `Summing`."""

    def __init__(self, network: Network, plans: Plans | None = None, whole: bool = True) -> None:
        self.network = network
        self.categories = _only_categories(network)
        self._summing = Summing(self.categories, plans, whole)
        self._mixing = Mixing(network, whole)

    def worlds(self, asked: Question, draws: int, seed: int, exact: bool | None = None) -> Worlds:
        """Every world that `asked` needs. exact: True never samples, False always, None where summing costs too much.

        Raises Refusal when the pins contradict each other, or when the cost is beyond what can be done.
        """
        turn = Turn(draws if self.network.drawable else 0, seed, exact)
        recorded = self._read(Scene(Pins(), {}, asked.columns), turn)
        begun: dict[str, Begun] = {}
        if asked.pinned:
            begun["among"] = self._begin(Scene(asked.before, {}, asked.columns), turn)
            if not begun["among"].possible:
                raise self._impossible(Scene(asked.before, {}, ()), turn)
        for name, levers in zip(SET, (asked.levers, asked.against or {}), strict=True):
            scene = self._moved(asked, levers)
            if scene.columns:
                begun[name] = self._begin(scene, turn)
        had = self._pins_of_had(asked) if asked.levers else None
        if had is not None:
            begun["had"] = self._begin(Scene(had, {}, asked.watch), turn)
        read = self._finish(begun, turn)
        among = read.get("among", recorded)
        log_evidence = float(among.log_evidence[0]) if asked.pinned else 0.0
        if not (asked.values or among.error):
            log_evidence = min(log_evidence, 0.0)  # rounding may lift certainty above it
        if asked.pinned and not among.possible:
            raise self._impossible(Scene(asked.before, {}, ()), turn)
        for name in [name for name in SET if name in read]:
            if asked.after.columns and not read[name].possible:
                raise self._impossible(begun[name].scene.reading(()), turn)
        set_world, against = (read[name].over(among, asked.columns) if name in read else among for name in SET)
        seen = read["had"] if "had" in read and read["had"].possible else None
        told = set_world if asked.levers else None
        held = against if asked.against is not None else None
        cost = turn.cells + self._summing.total(turn.work, turn.count)
        return Worlds(recorded, among, told, seen, held, log_evidence, cost, _method(turn))

    def joint(self, columns: tuple[str, ...]) -> np.ndarray:
        """(levels or bands of each column in order...) joint shares at the posterior mean, as recorded.

        Raises Refusal when the cost is beyond what can be done.
        """
        return self._joint(Scene(Pins(), {}, columns), 0, 0, None)[0][..., 0]

    def joints(
        self, asked: Question, draws: int, seed: int, exact: bool | None, columns: tuple[str, ...]
    ) -> dict[str, tuple[np.ndarray, bool]]:
        """world -> (levels or bands of each column in order..., 1 + draws) joint shares, and whether they were sampled.

        columns: each once.
        Raises Refusal when the cost is beyond what can be done.
        """
        scenes = {"recorded": Scene(Pins(), {}, columns), "among": Scene(asked.before, {}, columns)}
        if asked.levers:
            scenes["set"] = Scene(asked.before, self._splits(asked, asked.levers), columns, asked.after)
        if asked.against is not None:
            scenes["against"] = Scene(asked.before, self._splits(asked, asked.against), columns, asked.after)
        count = draws if self.network.drawable else 0
        return {world: self._joint(scene, count, seed, exact) for world, scene in scenes.items()}

    def _joint(self, scene: Scene, count: int, seed: int, exact: bool | None) -> tuple[np.ndarray, bool]:
        """Joint shares in one world, and whether they were sampled."""
        if exact is not False and self._fits(scene) and all(name in self.categories.index for name in scene.columns):
            try:
                return self._summing.joint(scene, count, seed), False
            except TooWideError as wide:
                if exact:
                    raise _too_wide(wide.cost) from None
        try:
            if exact is not False:
                return self._mixing.joint(scene, count, seed), False
        except NotExactError as reason:
            if exact:
                raise reason.refusal() from None
        return self._mixing.joint_sampled(scene, count, seed), True

    def _moved(self, asked: Question, levers: Mapping[str, AnySetting]) -> Scene:
        """The world with levers, and the columns that they move; the others are as among these, to the last digit."""
        splits = self._splits(asked, levers)
        moved = self.network.descendants(splits) | splits.keys()
        after = asked.after if levers else Pins()
        columns = tuple(column for column in asked.columns if column in moved or (levers and after.columns))
        return Scene(asked.before, splits, columns, after)

    def _splits(self, asked: Question, levers: Mapping[str, AnySetting]) -> dict[str, AnySetting]:
        """The levers that reach anyone; a column pinned before and after is split even where nothing is set."""
        found = {column: setting for column, setting in levers.items() if setting.reach > 0.0}
        for column in asked.after.columns:
            if column not in found and column in asked.pinned:
                node = self.network.node(column)
                idle = ShiftSetting(0.0, 1.0) if isinstance(node, Number) else Setting(0, 0.0, node.levels[0])
                found[column] = idle
        return found

    def _pins_of_had(self, asked: Question) -> Pins | None:
        """The pins, and the levers' values as pins; None where these are not all fixed, or nobody can have them."""
        pins: Pins | None = asked.before
        for column, setting in asked.levers.items():
            node = self.network.node(column)
            if pins is None:
                return None
            if isinstance(setting, Setting):
                pins = pins.at(node, setting.position)
            elif isinstance(setting, ValueSetting) and isinstance(node, Number) and len(setting.values) == 1:
                pins = pins.at_value(node, setting.values[0])
            else:
                return None
        return pins

    def _read(self, scene: Scene, turn: Turn) -> Seen:
        """Read one world by the routes that cost least."""
        return self._finish({"": self._begin(scene, turn)}, turn)[""]

    def _begin(self, scene: Scene, turn: Turn) -> Begun:
        """Read of one world what can be read exactly; the recorded world is kept."""
        turn.reads.update(dict.fromkeys(scene.columns))
        if turn.exact is False:
            return Begun(scene, left=scene.columns)
        begun = Begun(scene)
        if not self._fits(scene):
            self._with_numbers(begun, scene.columns, turn)
            return begun
        inside = tuple(column for column in scene.columns if column in self.categories.index)
        rest = tuple(column for column in scene.columns if column not in self.categories.index)
        if inside or not rest:
            try:
                begun.parts.append(self._summed(scene.reading(inside), turn))
            except TooWideError as wide:
                if turn.exact:
                    raise _too_wide(wide.cost) from None
                begun.left = inside
        if rest:
            self._with_numbers(begun, rest, turn)
        return begun

    def _summed(self, scene: Scene, turn: Turn) -> Seen:
        turn.tree = True
        if scene.bare:
            return Seen(self._summing.recorded(scene.columns, turn.count, turn.seed, turn.work))
        return self._summing.read(scene, turn.count, turn.seed, turn.work)

    def _with_numbers(self, begun: Begun, columns: tuple[str, ...], turn: Turn) -> None:
        """Exactly where that can be, column by column where not all of them can be; the others are left to sample."""
        exact, sampled, reason = self._mixing.divided(begun.scene.reading(columns), turn.count)
        if sampled and turn.exact:
            assert reason is not None
            raise reason.refusal()
        for group in exact:
            turn.mixed = True
            part, cells = self._mixing.read(begun.scene.reading(group), turn.count, turn.seed)
            turn.cells += cells
            begun.parts.append(part)
        if sampled:
            begun.left = (*(begun.left or ()), *sampled)

    def _finish(self, begun: Mapping[str, Begun], turn: Turn) -> dict[str, Seen]:
        """Sample what is left of worlds of one question, all on the same particles."""
        left = {name: each.scene.reading(each.left) for name, each in begun.items() if each.left is not None}
        cells = [self._mixing.cells_drawn(scene, turn.count) for scene in left.values()]
        if cells and max(cells) > LIMIT:
            raise _too_wide(max(cells))
        turn.cells += sum(cells)
        for scene in left.values():
            turn.sampled.update(dict.fromkeys(scene.columns))
        sampled = dict(zip(left, self._mixing.sampled(tuple(left.values()), turn.count, turn.seed), strict=True))
        found: dict[str, Seen] = {}
        for name, each in begun.items():
            parts = [*each.parts, *([sampled[name]] if name in sampled else [])]
            found[name] = reduce(Seen.with_other, parts)
        return found

    def _fits(self, scene: Scene) -> bool:
        """Whether pins and levers lie among the categories that no number leads to."""
        inside = self.categories.index
        if len(inside) == len(self.network.nodes):
            return True
        named = (*scene.before.columns, *scene.after.columns)
        rulers = [setting.ruler for setting in scene.levers.values() if setting.ruler is not None]
        return all(column in inside for column in (*named, *scene.levers, *rulers))

    def _impossible(self, scene: Scene, turn: Turn) -> Refusal:
        return contradiction(self.network, scene, lambda tried: self._possible(tried), turn.sampled)

    def _possible(self, scene: Scene) -> bool:
        """Whether some record can have the pins; taken to be so where that cannot be summed exactly."""
        try:
            return self._read(scene, Turn(0, 0, True)).possible
        except (Refusal, NotExactError):
            return True


def _only_categories(network: Network) -> Network:
    """The categories that no number leads to, with their links."""
    inside: dict[str, Category] = {}
    for node in network.nodes:
        if isinstance(node, Category) and all(parent in inside for parent in node.parents):
            inside[node.name] = node
    return network if len(inside) == len(network.nodes) else Network(tuple(inside.values()))


def _method(turn: Turn) -> str:
    """Which route answered, as a sentence may go on from it."""
    routes = [words for used, words in ((turn.tree, TREE), (turn.mixed, MIXED)) if used]
    if not turn.sampled:
        return f"exact, {' and '.join(routes)}" if routes else "exact, for nothing needs summing"
    if not routes:
        return f"sampled, {WEIGHTING}"
    few = ", ".join(map(quoted, turn.sampled)) if len(turn.sampled) <= FEW else f"{len(turn.sampled)} columns"
    return f"sampled, {WEIGHTING}, for {few}; the others exactly, {' and '.join(routes)}"


def _too_wide(cost: float) -> Refusal:
    return Refusal(
        f"This question is too wide to sum exactly: {cost:.1e} table cells, where {LIMIT:.0e} is the most.",
        do="Watch fewer columns, pin more of them, ask for fewer draws, or accept a model with fewer links.",
    )
