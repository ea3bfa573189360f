"""Does an answer follow from what is recorded, when causes that are in no column drive two columns?

The graph has the links and the pairs that share an unrecorded cause. A district is a set of columns tied by such
causes; q(C) below is what the columns of C do when all others are set (Tian & Pearl 2002, whose Q[C] it is). The
records give q of every whole district; what is asked for needs q of smaller ones, and either it can be worked out
from those, or no method can (Huang & Valtorta 2006 (m); Shpitser & Pearl 2006).
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from engine.doubting.functional import Columns, Expression, Share, product, ratio, set_at, total
from engine.doubting.graph import Graph


@dataclass(frozen=True)
class Hedge:
    """Why an answer does not follow: the columns of one district cannot be told apart by any records.

    columns: the district at fault; ends: those of it whose shares would be needed without the others'; pairs: the
    unrecorded causes that tie it.
    """

    columns: tuple[str, ...]
    ends: tuple[str, ...]
    pairs: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Functional:
    """How an answer is read from the fitted joint.

    shares: of the outcomes given the pins, with the levers set.  weights: of the pins with the levers set, which
    counts only where a pin holds several levels; a Hedge where it does not follow.
    """

    outcomes: tuple[str, ...]
    levers: tuple[str, ...]
    pins: tuple[str, ...]
    shares: Expression
    weights: Expression | Hedge


def identify(
    graph: Graph, outcomes: Collection[str], levers: Collection[str], pins: Collection[str] = ()
) -> Functional | Hedge:
    """P(outcomes | pins) where `levers` are set, from P(all columns); or what stands against it.

    A pin may follow a lever (the case is then seen after it) or be on a lever's own column: that is its value before,
    which the lever's children do not see (the split graph of Richardson & Robins 2013); so is an outcome that is a
    lever. outcomes: none of the pins. The conditional form is that of Shpitser & Pearl 2006, Identification of
    conditional interventional distributions (m): a pin that could as well have been set is set.
    """
    acting, seen = frozenset(levers), frozenset(pins)
    wanted = frozenset(outcomes)
    while True:
        could_be_set = (
            pin
            for pin in graph.sorted(seen)
            if graph.without_links_from(acting | {pin}).apart(wanted, frozenset((pin,)), seen - {pin})
        )
        pin = next(could_be_set, None)
        if pin is None:
            break
        acting, seen = acting | {pin}, seen - {pin}
    joint = _joint(graph, wanted | seen, acting, frozenset(levers))
    if isinstance(joint, Hedge):
        return joint
    return Functional(
        outcomes=graph.sorted(wanted),
        levers=graph.sorted(frozenset(levers)),
        pins=graph.sorted(frozenset(pins)),
        shares=ratio(joint, total(wanted, joint)) if seen else joint,
        weights=_joint(graph, frozenset(pins), frozenset(levers), frozenset(levers)),
    )


def _joint(graph: Graph, wanted: Columns, acting: Columns, levers: Columns) -> Expression | Hedge:
    """P(wanted) where `acting` are set: the product of q over the districts of all that leads to it, summed."""
    whole = graph.among(graph.ancestors(wanted))
    cut = whole.without_links_from(acting)
    needed = cut.ancestors(wanted)
    parts: list[Expression] = []
    for district in cut.among(needed).districts:
        both = district & acting & whole.parents(district)
        if both:  # the value that a lever has before and the one that it is set to, in one q
            return _hedge(whole, whole.district(next(iter(district))), district)
        found = _part_of(whole, district)
        if isinstance(found, Hedge):
            return found
        parts.append(set_at(levers - district, found))
    return total(needed - wanted, product(parts))


def _part_of(graph: Graph, wanted: Columns) -> Expression | Hedge:
    """q(wanted) from the district that holds it, as a function of its own columns and their parents alone."""
    district = graph.district(next(iter(wanted)))
    shares = []
    for column in graph.sorted(district):
        before = graph.among((*graph.before(column), column))
        tied = before.district(column)
        shares.append(Share(column, before.sorted((tied | before.parents(tied)) - {column})))
    found = _within(graph, wanted, district, product(shares))
    if isinstance(found, Hedge):
        return found
    # It may also be written with columns that it does not depend on, whatever their level: weigh these as recorded.
    beside = graph.sorted(found.free - wanted - graph.parents(wanted))
    weights = [Share(column, beside[:place]) for place, column in enumerate(beside)]
    return total(beside, product([*weights, found]))


def _within(graph: Graph, wanted: Columns, held: Columns, known: Expression) -> Expression | Hedge:
    """q(wanted) from q(held) = `known`, where both are tied by unrecorded causes and `held` holds `wanted`.

    What does not lead to `wanted` is summed out. When that leaves `wanted`, it is found; when it leaves all of
    `held`, nothing more can be known; else what is left falls into smaller districts, whose q are ratios of sums.
    """
    leading = graph.among(held).ancestors(wanted)
    summed = total(held - leading, known)
    if leading == wanted:
        return summed
    if leading == held:
        return _hedge(graph, held, wanted)
    smaller = graph.among(leading)
    district = smaller.district(next(iter(wanted)))
    parts = []
    for place, column in enumerate(smaller.columns):
        if column in district:
            later = smaller.columns[place + 1 :]
            parts.append(ratio(total(later, summed), total((column, *later), summed)))
    return _within(graph, wanted, district, product(parts))


def _hedge(graph: Graph, columns: Columns, ends: Columns) -> Hedge:
    tied = sorted(graph.sorted(pair) for pair in graph.among(columns).pairs)
    return Hedge(graph.sorted(columns), graph.sorted(ends), tuple((first, second) for first, second in tied))
