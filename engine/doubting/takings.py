"""Which levers take, and at which levels: every world that reach, mixes and rules make, each identified by itself."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import islice

import numpy as np

from engine.answering.settings import MixSetting, OfCategory, RuleSetting, Setting
from engine.doubting.graph import Graph
from engine.doubting.identification import Functional, Hedge, identify
from engine.doubting.identified import Joint, identified_shares
from engine.network.network import Network
from engine.refusal import Refusal

Positions = Mapping[str, frozenset[int]]
MOST_WORLDS = 1_000
AT_ONCE = 50  # draws


@dataclass(frozen=True)
class Asked:
    """What `outcomes` would be among the pinned, with levers on categories set.

    outcomes: none of the levers, the pins, or the columns that rule a lever.  settings: of every lever.
    pins: seen before any lever.  after: seen after the levers.  levels: column -> how many it has.
    """

    outcomes: tuple[str, ...]
    settings: Mapping[str, OfCategory]
    pins: Positions
    after: Positions
    levels: Mapping[str, int]

    @property
    def before(self) -> Positions:
        """Pins that mean the same in every world: on no column that rules, or that is pinned after the levers too."""
        rulers = {setting.ruler for setting in self.settings.values()}
        return {column: at for column, at in self.pins.items() if column not in rulers | self.after.keys()}


@dataclass(frozen=True)
class Taking:
    """One world. share: how often levers take so, where `seen` is seen.  at: lever that takes -> position it sets."""

    share: float
    at: Mapping[str, int]
    seen: Positions


@dataclass(frozen=True)
class Way:
    """How one world is read: the outcomes given all that is seen, and what is seen of its own; None for nothing."""

    taking: Taking
    outcomes: Functional
    seen: Functional | None


def ways(graph: Graph, asked: Asked) -> tuple[Way, ...] | Hedge:
    """How to read every world; what stands against the first that does not follow from the records.

    Raises Refusal for more than MOST_WORLDS worlds.
    """
    known: dict[tuple[frozenset[str], ...], Functional | Hedge] = {}

    def identified(outcomes: frozenset[str], levers: frozenset[str], pins: frozenset[str]) -> Functional | Hedge:
        key = (outcomes, levers, pins)
        if key not in known:
            known[key] = identify(graph, *key)
        return known[key]

    found: list[Way] = []
    before = frozenset(asked.before)
    worlds = tuple(islice(_takings(asked), MOST_WORLDS + 1))
    if len(worlds) > MOST_WORLDS:
        raise Refusal(
            "These levers can take in too many ways to read each beside unrecorded causes.",
            where=", ".join(asked.settings),
            do="Set fewer levers at once, or fix them instead of mixing.",
        )
    for taking in worlds:
        acting, seen = frozenset(taking.at), frozenset(taking.seen)
        outcomes = identified(frozenset(asked.outcomes), acting, before | seen)
        if isinstance(outcomes, Hedge):
            return outcomes
        several = any(len(at) > 1 for at in ({**asked.before, **taking.seen}).values())
        if several and isinstance(outcomes.weights, Hedge):
            return outcomes.weights
        own = identified(seen, acting, before) if seen else None
        if isinstance(own, Hedge):
            return own
        found.append(Way(taking, outcomes, own))
    return tuple(found)


def shares(found: tuple[Way, ...], asked: Asked, network: Network, tables: Mapping[str, np.ndarray]) -> np.ndarray:
    """(levels of each outcome in the graph's sequence..., draws) joint shares of the outcomes over all worlds.

    network: the fitted one, of categories.  tables: column -> (levels of its parents..., own levels, draws).
    Raises Refusal where it takes cases that cannot be, or too large a table.
    """
    draws = max(table.shape[-1] for table in tables.values())
    parts = []
    for start in range(0, draws, AT_ONCE):
        part = {column: table[..., start : start + AT_ONCE] for column, table in tables.items()}
        parts.append(_over_worlds(found, asked, Joint(network, part)))
    return np.concatenate(parts, axis=-1)


def _over_worlds(found: tuple[Way, ...], asked: Asked, joint: Joint) -> np.ndarray:
    every, counted = [], []
    for way in found:
        taking = way.taking
        weight = np.full(1, taking.share)
        if way.seen is not None:
            seen = identified_shares(way.seen, joint, taking.at, asked.before)
            kept = np.ix_(*(sorted(taking.seen[column]) for column in way.seen.outcomes))
            weight = taking.share * seen[kept].reshape(-1, seen.shape[-1]).sum(axis=0)
        every.append(weight * identified_shares(way.outcomes, joint, taking.at, {**asked.before, **taking.seen}))
        counted.append(weight)
    return np.asarray(sum(every) / sum(counted))


def _takings(asked: Asked) -> Iterator[Taking]:
    """Worlds with a share above 0; rulers are decided before what they rule."""
    levers = list(asked.settings)
    in_turn: list[str] = []
    while levers:
        ready = next(lever for lever in levers if asked.settings[lever].ruler not in levers)
        levers.remove(ready)
        in_turn.append(ready)
    counted = {column: frozenset(range(asked.levels[column])) for column in asked.after}
    counted |= {column: at for column, at in asked.pins.items() if column not in asked.before}
    yield from _grown(asked, in_turn, Taking(1.0, {}, counted))


def _grown(asked: Asked, levers: list[str], so_far: Taking) -> Iterator[Taking]:
    if not levers:
        yield from _seen_after(asked, so_far)
        return
    lever, rest = levers[0], levers[1:]
    for share, position, seen in _decided(asked, lever, so_far):
        changes = position is not None and asked.pins.get(lever) != frozenset((position,))
        at = so_far.at if position is None or not changes else {**so_far.at, lever: position}
        if share > 0.0:
            yield from _grown(asked, rest, Taking(so_far.share * share, at, seen))


def _decided(asked: Asked, lever: str, so_far: Taking) -> Iterator[tuple[float, int | None, Positions]]:
    """(share, position it is set to or None for its own, seen) for every way in which one lever can take."""
    setting = asked.settings[lever]
    if isinstance(setting, Setting):
        yield setting.reach, setting.position, so_far.seen
        yield 1.0 - setting.reach, None, so_far.seen
    elif isinstance(setting, MixSetting):
        for position, share in enumerate(setting.shares):
            yield setting.reach * share, position, so_far.seen
        yield 1.0 - setting.reach, None, so_far.seen
    else:
        yield from _ruled(asked, setting, so_far)


def _ruled(asked: Asked, setting: RuleSetting, so_far: Taking) -> Iterator[tuple[float, int | None, Positions]]:
    ruler = setting.ruler
    if ruler in so_far.at:  # it reads what its column was set to
        shown = {so_far.at[ruler]: so_far.seen}
    else:
        could = so_far.seen.get(ruler, range(asked.levels[ruler]))
        shown = {level: {**so_far.seen, ruler: frozenset((level,))} for level in could}
    for level, seen in shown.items():
        position = setting.positions[level]
        taken = 0.0 if position is None else setting.reach
        yield taken, position, seen
        yield 1.0 - taken, None, seen


def _seen_after(asked: Asked, world: Taking) -> Iterator[Taking]:
    """The world with what is seen after the levers; none when a lever sets its column to another level."""
    seen = dict(world.seen)
    for column, wanted in asked.after.items():
        if column in world.at:
            if world.at[column] not in wanted:
                return
        else:
            seen[column] = seen[column] & wanted
    if all(seen.values()):
        kept = {column: at for column, at in seen.items() if len(at) < asked.levels[column]}
        yield Taking(world.share, world.at, kept)
