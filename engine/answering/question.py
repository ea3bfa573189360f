"""A question, checked: pins, levers and watches as places in the network."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass
from numbers import Real

from engine.answering.levers import Fix
from engine.network.network import Category, Network
from engine.records.bands import level_positions
from engine.refusal import Refusal, quoted

SHOWN = 12  # levels or columns named in a refusal; more are counted


@dataclass(frozen=True)
class Setting:
    """A lever as places: the level's position, the probability that it takes, and the level's name."""

    position: int
    reach: float
    level: str


@dataclass(frozen=True)
class Question:
    """What is asked of a network.

    pins: column -> positions of the levels it is pinned to, before any lever.  levers: column -> Setting.
    watch: columns the question is about.  beside: further columns to read.
    """

    pins: Mapping[str, frozenset[int]]
    levers: Mapping[str, Setting]
    watch: tuple[str, ...]
    beside: tuple[str, ...] = ()

    @property
    def columns(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys((*self.watch, *self.beside)))

    @property
    def working(self) -> dict[str, Setting]:
        """The levers that reach anyone."""
        return {column: setting for column, setting in self.levers.items() if setting.reach > 0.0}


def question(
    network: Network,
    pins: Mapping[str, object] | None,
    levers: Mapping[str, Fix] | None,
    watch: Iterable[str],
    beside: Iterable[str] = (),
    changeable: Collection[str] | None = None,
) -> Question:
    """Check a question against `network`. changeable: columns that may get a lever; None: every column.

    Raises Refusal for an unknown column or level, an empty pin, a range that does not match the bands, a lever that
    is not changeable or whose reach lies outside 0 to 1, a pin downstream of a lever, nothing to watch.
    """
    for what, given in (("pins", pins), ("levers", levers)):
        if given is not None and not isinstance(given, Mapping):
            raise Refusal(
                f"The {what} of a question are a dictionary, column to value.", do='Write {"region": "north"}.'
            )
    for what, names in (("watch", watch), ("beside", beside)):
        if isinstance(names, str):
            raise Refusal(f"The columns to {what} are one text, not a list.", where=what, do=f"Write [{names!r}].")
    found_pins = {column: _pin(network, column, wanted) for column, wanted in (pins or {}).items()}
    found_levers = {column: _lever(network, column, lever, changeable) for column, lever in (levers or {}).items()}
    found = Question(
        pins=found_pins,
        levers=found_levers,
        watch=tuple(_known(network, column).name for column in dict.fromkeys(watch)),
        beside=tuple(_known(network, column).name for column in dict.fromkeys(beside)),
    )
    if not found.columns:
        raise Refusal("The question watches no column.", do="Name at least one column to watch.")
    _before_the_levers(network, found)
    return found


def _known(network: Network, column: object) -> Category:
    if not isinstance(column, str) or column not in network.index:
        raise Refusal(
            f"There is no column {quoted(column)} in this model.",
            where=str(column),
            do=f"Its columns are {listed(network.names)}.",
        )
    return network.node(column)


def _pin(network: Network, column: str, wanted: object) -> frozenset[int]:
    node = _known(network, column)
    if isinstance(wanted, str):
        return frozenset([_position(node, wanted)])
    several = list(wanted) if isinstance(wanted, Iterable) else [wanted]
    levels = [level for level in several if isinstance(level, str)]
    if len(levels) == len(several):
        found = frozenset(_position(node, level) for level in levels)
    else:
        try:
            found = level_positions(node.levels, node.kind, node.cuts, wanted)
        except Refusal as refused:
            raise Refusal(f"{quoted(column)}: {refused.message}", where=column, do=refused.do) from None
        except (TypeError, ValueError):
            raise Refusal(
                f"{quoted(column)} cannot be {quoted(wanted)}.",
                where=column,
                do=f"Its levels are {listed(node.levels)}.",
            ) from None
    if not found:
        raise Refusal(
            f"{quoted(column)} is pinned to no level at all.", where=column, do=f"Name one of {listed(node.levels)}."
        )
    return found


def _position(node: Category, level: str) -> int:
    if level not in node.levels:
        raise Refusal(
            f"{quoted(node.name)} has no level {quoted(level)}.",
            where=node.name,
            do=f"Its levels are {listed(node.levels)}.",
        )
    return node.levels.index(level)


def _lever(network: Network, column: str, lever: object, changeable: Collection[str] | None) -> Setting:
    node = _known(network, column)
    if changeable is not None and column not in changeable:
        do = f"Set one of these: {listed(tuple(changeable))}." if changeable else "Mark it as changeable in the order."
        raise Refusal(f"{quoted(column)} is not marked as changeable, so it cannot be set.", where=column, do=do)
    if not isinstance(lever, Fix):
        raise Refusal(
            f"{quoted(column)} is set by something that is no lever.", where=column, do='Write engine.Fix("a level").'
        )
    if isinstance(lever.reach, bool) or not isinstance(lever.reach, Real) or not 0.0 <= lever.reach <= 1.0:
        raise Refusal(
            f"The reach of {quoted(column)} is {lever.reach}, which is no probability.",
            where=column,
            do="Give a reach from 0 to 1.",
        )
    positions = _pin(network, column, lever.value)
    if len(positions) != 1:
        raise Refusal(
            f"{quoted(column)} can be set to one level only.", where=column, do=f"Name one of {listed(node.levels)}."
        )
    (position,) = positions
    return Setting(position, float(lever.reach), node.levels[position])


def _before_the_levers(network: Network, asked: Question) -> None:
    """Pins describe the case before any lever: refuse one that a lever would move."""
    for column in asked.pins:
        for lever in asked.levers:
            if column in network.descendants([lever]):
                raise Refusal(
                    f"{quoted(column)} follows {quoted(lever)}, which you set, so pinning it would mix two worlds.",
                    where=column,
                    do=f"Take out the pin on {quoted(column)}, or do not set {quoted(lever)}.",
                )


def listed(names: Iterable[str]) -> str:
    """Names in a row for a sentence: the first dozen, the others counted."""
    every = list(names)
    shown = ", ".join(every[:SHOWN])
    return shown if len(every) <= SHOWN else f"{shown} and {len(every) - SHOWN} more"
