"""Pins: columns seen at a value, in a set of values, or in a range."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from numbers import Real

from engine.answering.naming import known, listed, position
from engine.network.network import Network
from engine.network.nodes import Node, Number
from engine.records.bands import is_range, level_positions, range_ends
from engine.records.wording import figure
from engine.refusal import Refusal, quoted


@dataclass(frozen=True)
class Pins:
    """Pins as places in a network; a column is in one of the three at most.

    positions: column -> positions of its levels, or of a number's bands.  values: number -> its value.
    ranges: number -> (low, high), low <= x < high, either end may be infinite; not a set of its bands.
    """

    positions: Mapping[str, frozenset[int]] = field(default_factory=dict)
    values: Mapping[str, float] = field(default_factory=dict)
    ranges: Mapping[str, tuple[float, float]] = field(default_factory=dict)

    @property
    def columns(self) -> tuple[str, ...]:
        return (*self.positions, *self.values, *self.ranges)

    @property
    def key(self) -> tuple[object, ...]:
        """The same for the same pins in the same order."""
        return tuple(self.positions.items()), tuple(self.values.items()), tuple(self.ranges.items())

    def only(self, columns: Iterable[str]) -> Pins:
        """The pins on some of the columns."""
        some = set(columns)
        return Pins(
            {column: wanted for column, wanted in self.positions.items() if column in some},
            {column: value for column, value in self.values.items() if column in some},
            {column: ends for column, ends in self.ranges.items() if column in some},
        )

    def without(self, column: str) -> Pins:
        return self.only(other for other in self.columns if other != column)

    def at(self, node: Node, place: int) -> Pins | None:
        """These pins and one more, on a level of `node`; None when they contradict it."""
        if not {place} & self.positions.get(node.name, frozenset([place])):
            return None
        return Pins({**self.positions, node.name: frozenset([place])}, self.values, self.ranges)

    def at_value(self, number: Number, value: float) -> Pins | None:
        """These pins and one more, on the value of a number; None when they contradict it."""
        low, high = self.ranges.get(number.name, (-math.inf, math.inf))
        bands = self.positions.get(number.name)
        if self.values.get(number.name, value) != value or not low <= value < high:
            return None
        if bands is not None and not bands & level_positions(number.levels, number.kind, number.cuts, value):
            return None
        rest = self.without(number.name)
        return Pins(rest.positions, {**rest.values, number.name: value}, rest.ranges)


def checked_pins(network: Network, pins: Mapping[str, object] | None) -> Pins:
    """The pins of a question.

    Raises Refusal for an unknown column or level, no level at all, a range that holds nothing, a value that is none,
    and a range of a number taken as bands that does not match them.
    """
    positions: dict[str, frozenset[int]] = {}
    values: dict[str, float] = {}
    ranges: dict[str, tuple[float, float]] = {}
    for column, wanted in (pins or {}).items():
        node = known(network, column)
        if isinstance(node, Number) and not _names_bands(wanted):
            if is_range(node.kind, wanted):
                assert isinstance(wanted, tuple)
                low, high = range_ends(wanted[0], wanted[1], column)
                edges = (-math.inf, *node.cuts, math.inf)
                if low in edges and high in edges:
                    positions[column] = frozenset(range(edges.index(low), edges.index(high)))
                else:
                    ranges[column] = (low, high)
            else:
                values[column] = finite(node, wanted, "pinned to")
        else:
            positions[column] = pinned_levels(node, wanted)
    return Pins(positions, values, ranges)


def _names_bands(wanted: object) -> bool:
    if isinstance(wanted, str):
        return True
    try:
        return all(isinstance(each, str) for each in wanted)  # type: ignore[attr-defined]
    except TypeError:  # nothing that can be gone through, such as a number
        return False


def finite(node: Node, value: object, what: str) -> float:
    """A value of a number. what: "pinned to" or "set to". Raises Refusal for anything that is no finite number."""
    if isinstance(value, bool) or not isinstance(value, Real) or not _fits_a_float(value):
        do = "Give one number, or a (low, high) range" if what == "pinned to" else "Give one number"
        bands = f", or some of its bands: {listed(node.levels)}." if what == "pinned to" and node.cuts else "."
        raise Refusal(
            f"{quoted(node.name)} is a number and cannot be {what} {quoted(value)}.", where=node.name, do=do + bands
        )
    return float(value) + 0.0


def _fits_a_float(value: Real) -> bool:
    try:
        return math.isfinite(value)
    except OverflowError:
        return False


def pinned_levels(node: Node, wanted: object) -> frozenset[int]:
    """Positions of the levels that `wanted` names. Raises Refusal when it names none, or one that is unknown."""
    if isinstance(wanted, str):
        return frozenset([position(node, wanted)])
    several = list(wanted) if isinstance(wanted, Iterable) else [wanted]
    levels = [level for level in several if isinstance(level, str)]
    if len(levels) == len(several):
        found = frozenset(position(node, level) for level in levels)
    else:
        try:
            found = level_positions(node.levels, node.kind, node.cuts, wanted)
        except Refusal as refused:
            raise Refusal(f"{quoted(node.name)}: {refused.message}", where=node.name, do=refused.do) from None
        except (TypeError, ValueError):
            raise Refusal(
                f"{quoted(node.name)} cannot be {quoted(wanted)}.",
                where=node.name,
                do=f"Its levels are {listed(node.levels)}.",
            ) from None
    if not found:
        raise Refusal(
            f"{quoted(node.name)} is pinned to no level at all.",
            where=node.name,
            do=f"Name one of {listed(node.levels)}.",
        )
    return found


def told(node: Node, pins: Pins) -> str:
    """The pin on a column in words: “region” = “north” or “south”."""
    name = node.name
    if name in pins.values:
        return f"{quoted(name)} = {figure(pins.values[name])}"
    if name in pins.ranges:
        low, high = pins.ranges[name]
        start = "" if low == -math.inf else figure(low) if high < math.inf else f"{figure(low)} and over"
        end = "" if high == math.inf else f"under {figure(high)}"
        return f"{quoted(name)} = {' to '.join(part for part in (start, end) if part)}"
    levels = node.levels
    return f"{quoted(name)} = {' or '.join(quoted(levels[place]) for place in sorted(pins.positions[name]))}"
