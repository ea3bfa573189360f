"""A question, checked: pins, levers and watches as places in the network."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, field

from engine.answering.lever_checks import checked_setting, refuse_circles
from engine.answering.levers import Lever
from engine.answering.naming import known, listed
from engine.answering.pins import Pins, checked_pins
from engine.answering.settings import AnySetting, Setting
from engine.network.network import Network
from engine.refusal import Refusal, quoted

__all__ = ["Pins", "Question", "Setting", "listed", "question"]


@dataclass(frozen=True)
class Question:
    """What is asked of a network.

    pins, values, ranges: as in `Pins`, what is seen before any lever.  levers: column -> its setting.
    watch: columns the question is about.  beside: further columns to read.
    against: the levers of a second world to compare with, None without one.
    after: pins on what is seen after the levers, in the worlds where something is set.
    """

    pins: Mapping[str, frozenset[int]]
    levers: Mapping[str, AnySetting]
    watch: tuple[str, ...]
    beside: tuple[str, ...] = ()
    values: Mapping[str, float] = field(default_factory=dict)
    ranges: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    against: Mapping[str, AnySetting] | None = None
    after: Pins = field(default_factory=Pins)

    @property
    def columns(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys((*self.watch, *self.beside)))

    @property
    def before(self) -> Pins:
        """All that is seen before any lever."""
        return Pins(self.pins, self.values, self.ranges)

    @property
    def pinned(self) -> tuple[str, ...]:
        """Columns seen before any lever."""
        return (*self.pins, *self.values, *self.ranges)

    @property
    def working(self) -> dict[str, AnySetting]:
        """The levers that reach anyone."""
        return {column: setting for column, setting in self.levers.items() if setting.reach > 0.0}


def question(
    network: Network,
    pins: Mapping[str, object] | None,
    levers: Mapping[str, Lever] | None,
    watch: Iterable[str],
    beside: Iterable[str] = (),
    changeable: Collection[str] | None = None,
    against: Mapping[str, Lever] | None = None,
    pins_after: Mapping[str, object] | None = None,
) -> Question:
    """Check a question against `network`. changeable: columns that may get a lever; None: every column.

    Raises Refusal for an unknown column or level, what is no pin or no lever, a lever that is not changeable, rules in
    a circle, a pin downstream of a lever, one for after the levers that no lever moves, nothing to watch.
    """
    for what, given in (("pins", pins), ("levers", levers), ("levers against", against), ("pins after", pins_after)):
        if given is not None and not isinstance(given, Mapping):
            example = '{"a column": engine.Fix("a level")}' if what.startswith("levers") else '{"a column": "a level"}'
            raise Refusal(
                f"The {what} of a question are a dictionary, column to value.", where=what, do=f"Write {example}."
            )
    for what, names in (("watch", watch), ("beside", beside)):
        told = "to watch" if what == "watch" else "to read beside"
        if isinstance(names, str):
            raise Refusal(f"The columns {told} are one text, not a list.", where=what, do=f"Write [{names!r}].")
        if not isinstance(names, Iterable):
            raise Refusal(f"The columns {told} are no list of names.", where=what, do='Write ["a column"].')
    watch, beside = list(watch), list(beside)
    before = checked_pins(network, pins)
    found = Question(
        pins=before.positions,
        levers=_settings(network, levers, changeable),
        watch=tuple(dict.fromkeys(known(network, column).name for column in watch)),
        beside=tuple(dict.fromkeys(known(network, column).name for column in beside)),
        values=before.values,
        ranges=before.ranges,
        against=_settings(network, against, changeable) if against else None,
        after=checked_pins(network, pins_after),
    )
    if not found.columns:
        raise Refusal("The question watches no column.", do="Name at least one column to watch.")
    if found.against is not None and not found.levers:
        raise Refusal("There is nothing to hold against: no lever is set.", where="against", do="Set a lever first.")
    _before_the_levers(network, found)
    _after_the_levers(network, found)
    return found


def _settings(
    network: Network, levers: Mapping[str, Lever] | None, changeable: Collection[str] | None
) -> dict[str, AnySetting]:
    found = {column: checked_setting(network, column, lever, changeable) for column, lever in (levers or {}).items()}
    refuse_circles(network, found)
    return found


def _before_the_levers(network: Network, asked: Question) -> None:
    """Pins describe the case before any lever: refuse one that a lever would move."""
    moved = {lever: network.descendants([lever]) for lever in (*asked.levers, *(asked.against or ()))}
    for column in asked.pinned:
        for lever, below in moved.items():
            if column in below:
                raise Refusal(
                    f"{quoted(column)} follows {quoted(lever)}, which you set, so pinning it would mix two worlds.",
                    where=column,
                    do=f"Take out the pin on {quoted(column)}, or do not set {quoted(lever)}. To ask about those who "
                    "would show it after the lever, give it in pins_after.",
                )


def _after_the_levers(network: Network, asked: Question) -> None:
    """Pins for after the levers are on what a lever sets or moves; others hold before it as well."""
    if not asked.after.columns:
        return
    if not asked.levers:
        raise Refusal(
            "There is no lever for a pin to come after.", where="pins_after", do="Set a lever, or give it in pins."
        )
    moved = network.descendants(asked.levers) | asked.levers.keys()
    for column in asked.after.columns:
        if column not in moved:
            raise Refusal(
                f"No lever moves {quoted(column)}, so it is the same before and after.",
                where=column,
                do="Give it in pins instead.",
            )
