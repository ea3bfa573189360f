"""From a question to readings: which worlds, which route, what it costs, what is already known."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

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
        among, log_evidence = recorded, 0.0
        if asked.pinned:
            among = self._read(Scene(asked.before, {}, asked.columns), turn)
            log_evidence = float(among.log_evidence[0])
            if not (asked.values or among.error):
                log_evidence = min(log_evidence, 0.0)  # rounding may lift certainty above it
            if not among.possible:
                raise self._impossible(Scene(asked.before, {}, ()), turn)
        set_world, against, had = None, None, None
        if asked.levers:
            set_world = self._set(asked, asked.levers, among, turn)
            had = self._had(asked, turn)
        if asked.against is not None:
            against = self._set(asked, asked.against, among, turn)
        cost = turn.cells + self._summing.total(turn.work, turn.count)
        return Worlds(recorded, among, set_world, had, against, log_evidence, cost, _method(turn))

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

    def _set(self, asked: Question, levers: Mapping[str, AnySetting], among: Seen, turn: Turn) -> Seen:
        """The world with levers; what none of them moves is as among these, to the last digit."""
        splits = self._splits(asked, levers)
        moved = self.network.descendants(splits) | splits.keys()
        after = asked.after.columns
        columns = tuple(column for column in asked.columns if after or column in moved)
        if not columns:
            return among
        scene = Scene(asked.before, splits, columns, asked.after)
        found = self._read(scene, turn)
        if after and not found.possible:
            raise self._impossible(scene.reading(()), turn)
        return found.over(among, asked.columns)

    def _splits(self, asked: Question, levers: Mapping[str, AnySetting]) -> dict[str, AnySetting]:
        """The levers that reach anyone; a column pinned before and after is split even where nothing is set."""
        found = {column: setting for column, setting in levers.items() if setting.reach > 0.0}
        for column in asked.after.columns:
            if column not in found and column in asked.pinned:
                node = self.network.node(column)
                idle = ShiftSetting(0.0, 1.0) if isinstance(node, Number) else Setting(0, 0.0, node.levels[0])
                found[column] = idle
        return found

    def _had(self, asked: Question, turn: Turn) -> Seen | None:
        """The columns in question among those who had the levers' values anyway."""
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
        if pins is None:
            return None
        found = self._read(Scene(pins, {}, asked.watch), turn)
        return found if found.possible else None

    def _read(self, scene: Scene, turn: Turn) -> Seen:
        """Read one world by the routes that cost least; the recorded world is kept."""
        turn.reads.update(dict.fromkeys(scene.columns))
        bare = not (scene.before.columns or scene.levers or scene.after.columns)
        if turn.exact is False:
            return self._sampled(scene, turn, bare)
        if not self._fits(scene):
            return self._with_numbers(scene, turn, bare)
        inside = tuple(column for column in scene.columns if column in self.categories.index)
        rest = tuple(column for column in scene.columns if column not in self.categories.index)
        found: Seen | None = None
        if inside or not rest:
            try:
                found = self._summed(scene.reading(inside), turn, bare)
            except TooWideError as wide:
                if turn.exact:
                    raise _too_wide(wide.cost) from None
                found = self._sampled(scene.reading(inside), turn, bare)
        if not rest:
            assert found is not None
            return found
        other = self._with_numbers(scene.reading(rest), turn, bare)
        return other if found is None else found.with_other(other)

    def _summed(self, scene: Scene, turn: Turn, bare: bool) -> Seen:
        turn.tree = True
        if bare:
            return Seen(self._summing.recorded(scene.columns, turn.count, turn.seed, turn.work))
        return self._summing.read(scene, turn.count, turn.seed, turn.work)

    def _with_numbers(self, scene: Scene, turn: Turn, bare: bool) -> Seen:
        """Exactly where that can be, column by column where not all of them can be; the others sampled."""
        exact, sampled, reason = self._mixing.divided(scene, turn.count)
        if sampled and turn.exact:
            assert reason is not None
            raise reason.refusal()
        found: Seen | None = None
        for columns in exact:
            turn.mixed = True
            part, cells = self._mixing.read(scene.reading(columns), turn.count, turn.seed, bare)
            turn.cells += cells
            found = part if found is None else found.with_other(part)
        if sampled:
            part = self._sampled(scene.reading(sampled), turn, bare)
            found = part if found is None else found.with_other(part)
        assert found is not None
        return found

    def _sampled(self, scene: Scene, turn: Turn, bare: bool) -> Seen:
        cells = self._mixing.cells_drawn(scene, turn.count)
        if cells > LIMIT:
            raise _too_wide(cells)
        turn.sampled.update(dict.fromkeys(scene.columns))
        turn.cells += cells
        return self._mixing.sampled(scene, turn.count, turn.seed, bare)

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
