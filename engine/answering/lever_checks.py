"""Levers checked against a network: unknown values, shares that do not sum to 1, rules in a circle."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from numbers import Real

from engine.answering.levers import Fix, Mix, Rule, Shift
from engine.answering.naming import known, listed, nearest, position
from engine.answering.pins import finite, pinned_levels
from engine.answering.settings import (
    AnySetting,
    MixSetting,
    RuleSetting,
    Setting,
    ShiftSetting,
    ValueRuleSetting,
    ValueSetting,
)
from engine.network.network import Network
from engine.network.nodes import Node, Number
from engine.refusal import Refusal, quoted

ROUNDING = 1e-8  # how far the shares of a mix may be from 1: as the rows of a table


def checked_setting(network: Network, column: object, lever: object, changeable: Collection[str] | None) -> AnySetting:
    """A lever as places. changeable: columns that may get one; None: every column.

    Raises Refusal for an unknown column or level, a column that may not be set, a reach that is no probability, shares
    that do not sum to 1, a value that is none, a shift of a category, and what is no lever.
    """
    node = known(network, column)
    if changeable is not None and node.name not in changeable:
        do = f"Set one of these: {listed(tuple(changeable))}." if changeable else "Mark it as changeable in the order."
        raise Refusal(f"{quoted(node.name)} is not marked as changeable, so it cannot be set.", where=node.name, do=do)
    if not isinstance(lever, Fix | Mix | Shift | Rule):
        wanted = "a value" if isinstance(node, Number) else '"a level"'
        raise Refusal(
            f"{quoted(node.name)} is set by something that is no lever.",
            where=node.name,
            do=f"Write engine.Fix({wanted}), or a Mix, a Shift or a Rule.",
        )
    if isinstance(lever.reach, bool) or not isinstance(lever.reach, Real) or not 0.0 <= lever.reach <= 1.0:
        raise Refusal(
            f"The reach of {quoted(node.name)} is {lever.reach}, which is no probability.",
            where=node.name,
            do="Give a reach from 0 to 1.",
        )
    reach = float(lever.reach)
    if isinstance(lever, Fix):
        if isinstance(node, Number):
            return ValueSetting((_value(node, lever.value),), (1.0,), reach)
        place = _level(node, lever.value)
        return Setting(place, reach, node.levels[place])
    if isinstance(lever, Shift):
        if not isinstance(node, Number):
            banded = " taken as bands" if node.kind == "number" else ""
            raise Refusal(
                f"{quoted(node.name)} is a {'number' if banded else node.kind}{banded}, so nothing can be added to it.",
                where=node.name,
                do=f"Set it to one of its levels instead: {listed(node.levels)}.",
            )
        return ShiftSetting(finite(node, lever.amount, "shifted by"), reach)
    return _mix(node, lever, reach) if isinstance(lever, Mix) else _rule(network, node, lever, reach)


def _level(node: Node, value: object) -> int:
    positions = pinned_levels(node, value)
    if len(positions) != 1:
        raise Refusal(
            f"{quoted(node.name)} can be set to one level only.",
            where=node.name,
            do=f"Name one of {listed(node.levels)}.",
        )
    (place,) = positions
    return place


def _value(node: Node, value: object) -> float:
    if isinstance(value, str) and value in node.levels:
        raise Refusal(
            f"{quoted(node.name)} is a number, and its band {quoted(value)} is no one value to set it to.",
            where=node.name,
            do="Give a value, such as one from the middle of that band.",
        )
    return finite(node, value, "set to")


def _mix(node: Node, lever: Mix, reach: float) -> MixSetting | ValueSetting:
    name = node.name
    if not isinstance(lever.shares, Mapping) or not lever.shares:
        raise Refusal(
            f"The mix of {quoted(name)} names no shares.",
            where=name,
            do='Write engine.Mix({"a level": 0.3, "another": 0.7}).',
        )
    shares: dict[float, float] = {}
    for value, share in lever.shares.items():
        if isinstance(share, bool) or not isinstance(share, Real) or not 0.0 <= share <= 1.0:
            raise Refusal(
                f"The share of {quoted(value)} in the mix of {quoted(name)} is {share}, which is no share.",
                where=name,
                do="Give shares from 0 to 1 that sum to 1.",
            )
        place = _value(node, value) if isinstance(node, Number) else _level(node, value)
        if place in shares:
            raise Refusal(
                f"The mix of {quoted(name)} names {quoted(value)} twice.", where=name, do="Give each value once."
            )
        shares[place] = float(share)
    total = math.fsum(shares.values())
    if abs(total - 1.0) > ROUNDING:
        raise Refusal(
            f"The mix of {quoted(name)} sums to {total:.6g} instead of 1.",
            where=name,
            do="Correct its shares; nothing is rescaled here.",
        )
    if isinstance(node, Number):
        return ValueSetting(tuple(shares), tuple(shares.values()), reach)
    return MixSetting(tuple(shares.get(place, 0.0) for place in range(len(node.levels))), reach)


def _rule(network: Network, node: Node, lever: Rule, reach: float) -> RuleSetting | ValueRuleSetting:
    name = node.name
    ruler = known(network, lever.column)
    if ruler.name == name:
        raise Refusal(
            f"{quoted(name)} is ruled by itself.", where=name, do="Let a rule go by a column that comes before it."
        )
    if ruler.name in network.descendants([name]):
        raise Refusal(
            f"{quoted(name)} is ruled by {quoted(ruler.name)}, which follows from it.",
            where=name,
            do="Let a rule go by a column that comes before the one it sets.",
        )
    if not isinstance(lever.values, Mapping) or not lever.values:
        raise Refusal(
            f"The rule for {quoted(name)} names no level of {quoted(ruler.name)}.",
            where=name,
            do=f"Give a value for some of these: {listed(ruler.levels)}.",
        )
    by_place = {_ruling(ruler, level): value for level, value in lever.values.items()}
    places = range(len(ruler.levels))
    if isinstance(node, Number):
        values = {place: _value(node, value) for place, value in by_place.items()}
        return ValueRuleSetting(ruler.name, tuple(values.get(place) for place in places), reach)
    positions = {place: _level(node, value) for place, value in by_place.items()}
    return RuleSetting(ruler.name, tuple(positions.get(place) for place in places), reach)


def _ruling(ruler: Node, level: object) -> int:
    if not isinstance(level, str):
        raise Refusal(
            f"A rule goes by the levels of {quoted(ruler.name)}, and {quoted(level)} is none.",
            where=ruler.name,
            do=f"{nearest(level, ruler.levels)}Its levels are {listed(ruler.levels)}.",
        )
    return position(ruler, level)


def refuse_circles(network: Network, settings: Mapping[str, AnySetting]) -> None:
    """Raise Refusal for levers of which one, by the rules and the links, hangs on itself."""
    hangs: dict[str, list[str]] = {}
    for node in network.nodes:
        ruler = settings[node.name].ruler if node.name in settings else None
        hangs[node.name] = [*node.parents, *([] if ruler is None else [ruler])]
    done: set[str] = set()
    for column in settings:
        _walk(column, hangs, [], done)


def _walk(column: str, hangs: Mapping[str, list[str]], path: list[str], done: set[str]) -> None:
    if column in path:
        circle = path[path.index(column) :]
        raise Refusal(
            f"The rules run in a circle: {', '.join(map(quoted, circle))} and back to {quoted(column)}.",
            where=circle[0],
            do="Take out one of the rules.",
        )
    if column not in done:
        for before in hangs[column]:
            _walk(before, hangs, [*path, column], done)
        done.add(column)
