"""A world of both kinds as nodes: every lever splits its column into the natural column and its set copy.

The natural column keeps its name and its parameters, the set copy feeds its children (Richardson & Robins 2013). A
lever on a number that takes for only some, or mixes values, has a category of its own that says for whom it takes.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from engine.answering.drawing import Parameters
from engine.answering.mixed import MixedWorld
from engine.answering.pins import Pins
from engine.answering.scenes import Scene
from engine.answering.settings import (
    AnySetting,
    MixSetting,
    RuleSetting,
    Setting,
    ShiftSetting,
    ValueRuleSetting,
)
from engine.network.network import Network
from engine.network.nodes import Category, Node, Number
from engine.network.regression import Coefficients


@dataclass(frozen=True, eq=False)
class Split:
    """A world as the routes take it.

    natural: node of the world -> the network's own node, whose parameters it has; not for nodes that levers add.
    shown: column -> name of the node that its children, and readers, see.  together: name of the node whose levels
    are the joint levels of the columns read, in a world made for that.
    """

    world: MixedWorld
    natural: Mapping[str, Node]
    shown: Mapping[str, str]
    together: str | None = None

    def added(self, node: Node, count: int) -> Parameters:
        """Of a node that a lever added: the same in every draw."""
        if isinstance(node, Category):
            return _same(np.asarray(node.table), count)
        intercept, slopes, variance = np.asarray(node.intercept), np.asarray(node.slopes), np.asarray(node.variance)
        return Coefficients(_same(intercept, count), _same(slopes, count), _same(variance, count))


def split(network: Network, scene: Scene, joint: bool = False) -> Split:
    """The nodes that `scene` needs and no others, parents first. joint: read the columns' joint levels, not each."""
    names = _Names(network)
    shown = {name: names.new(f"{name} as set") if name in scene.levers else name for name in network.names}
    nodes: dict[str, Node] = {}
    natural: dict[str, Node] = {}
    certain: dict[str, frozenset[int]] = {}
    for node in network.nodes:
        own = replace(node, parents=tuple(shown[parent] for parent in node.parents))
        nodes[node.name], natural[node.name] = own, node
        if node.name in scene.levers:
            setting = scene.levers[node.name]
            nodes.update((added.name, added) for added in _copies(network, node, setting, shown, names))
            if isinstance(setting, Setting) and setting.reach == 1.0:
                certain[shown[node.name]] = frozenset([setting.position])
    pins = _merged(scene, shown, certain)
    watch = tuple(shown[column] for column in scene.columns)
    together = None
    if joint:
        together = names.new("together")
        sizes = [len(network.node(column).levels) for column in scene.columns]
        cells = int(np.prod(sizes))
        levels = tuple(str(place) for place in range(cells))
        nodes[together] = Category(together, levels, watch, np.eye(cells).reshape(*sizes, cells))
        watch = (together,)
    needed = _needed(nodes, (*pins.columns, *watch))
    pinned = {name: wanted for name, wanted in pins.positions.items() if name in needed}
    world = MixedWorld(tuple(needed.values()), pinned, pins.values, pins.ranges, watch)
    return Split(world, {name: node for name, node in natural.items() if name in needed}, shown, together)


def _merged(scene: Scene, shown: Mapping[str, str], certain: Mapping[str, frozenset[int]]) -> Pins:
    """Pins before the levers on natural columns, those after them on what is shown; what is certain is pinned too."""
    after = scene.after
    positions = dict(scene.before.positions)
    for column, wanted in after.positions.items():
        positions[shown[column]] = wanted
    return Pins(
        {**certain, **positions},
        {**scene.before.values, **{shown[column]: value for column, value in after.values.items()}},
        {**scene.before.ranges, **{shown[column]: ends for column, ends in after.ranges.items()}},
    )


def _needed(nodes: Mapping[str, Node], wanted: tuple[str, ...]) -> dict[str, Node]:
    """`wanted` and all that leads to them, parents first, else in the order given (Kahn 1962)."""
    found: dict[str, Node] = {}

    def walk(name: str) -> None:
        if name not in found:
            for parent in nodes[name].parents:
                walk(parent)
            found[name] = nodes[name]

    ahead: set[str] = set()
    waiting = list(wanted)
    while waiting:
        name = waiting.pop()
        if name not in ahead:
            ahead.add(name)
            waiting.extend(nodes[name].parents)
    for name in nodes:
        if name in ahead:
            walk(name)
    return found


class _Names:
    """Names that no column has."""

    def __init__(self, network: Network) -> None:
        self.taken = set(network.names)

    def new(self, name: str) -> str:
        while name in self.taken:
            name += "*"
        self.taken.add(name)
        return name


def _copies(network: Network, node: Node, setting: AnySetting, shown: Mapping[str, str], names: _Names) -> list[Node]:
    """The set copy of a column, with what it needs, parents first."""
    own = shown[node.name]
    if isinstance(setting, Setting | MixSetting | RuleSetting):
        before = () if setting.ruler is None else (shown[setting.ruler],)
        parents = before if setting.forgets else (*before, node.name)
        return [Category(own, node.levels, parents, setting.copy(len(node.levels)))]
    assert isinstance(node, Number)
    if isinstance(setting, ValueRuleSetting):
        return _ruled(network, node, setting, shown, names)
    if isinstance(setting, ShiftSetting):
        ways, shares = [(1.0, setting.amount)], [setting.reach]
    else:
        ways = [(0.0, value) for value in setting.values]
        shares = [setting.reach * share for share in setting.shares]
    if setting.reach < 1.0:
        ways, shares = [(1.0, 0.0), *ways], [1.0 - setting.reach, *shares]
    added: list[Node] = []
    takes: tuple[str, ...] = ()
    if len(ways) > 1:
        takes = (names.new(f"{node.name} taking"),)
        added.append(Category(takes[0], tuple(str(way) for way in range(len(ways))), (), np.array(shares)))
    slopes = np.array([slope for slope, _ in ways])
    amounts = np.array([amount for _, amount in ways])
    if not takes:
        slopes, amounts = slopes[0], amounts[0]
    return [*added, _moved(node, own, takes, slopes, amounts)]


def _ruled(
    network: Network, node: Number, setting: ValueRuleSetting, shown: Mapping[str, str], names: _Names
) -> list[Node]:
    """A number copied by the levels of another column; a number rules by its bands."""
    added: list[Node] = []
    ruler = network.node(setting.ruler)
    ruling = shown[ruler.name]
    if isinstance(ruler, Number):
        ruling = names.new(f"{ruler.name} band")
        added.append(Category(ruling, ruler.levels, (shown[ruler.name],), np.eye(len(ruler.levels))))
    slopes = np.array([1.0 if value is None else 0.0 for value in setting.values])
    amounts = np.array([0.0 if value is None else value for value in setting.values])
    parents: tuple[str, ...] = (ruling,)
    if setting.reach < 1.0:
        takes = names.new(f"{node.name} taking")
        added.append(Category(takes, ("no", "yes"), (), np.array([1.0 - setting.reach, setting.reach])))
        parents = (takes, ruling)
        slopes = np.stack([np.ones_like(slopes), slopes])
        amounts = np.stack([np.zeros_like(amounts), amounts])
    return [*added, _moved(node, shown[node.name], parents, slopes, amounts)]


def _moved(node: Number, name: str, parents: tuple[str, ...], slopes: np.ndarray, amounts: np.ndarray) -> Number:
    """A number that is the natural one, or nothing, plus an amount, by its category parents."""
    if not slopes.any():
        return Number(name, parents, amounts, (), np.zeros_like(amounts), node.bands)
    return Number(name, (*parents, node.name), amounts, slopes[..., None], np.zeros_like(amounts), node.bands)


def _same(array: np.ndarray, count: int) -> np.ndarray:
    return np.broadcast_to(array[..., None], (*array.shape, 1 + count))
