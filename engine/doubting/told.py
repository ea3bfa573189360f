"""How an answer follows beside unrecorded causes, in words, and what would let one follow that does not."""

from __future__ import annotations

import itertools
from collections.abc import Collection
from dataclasses import dataclass

from engine.doubting.case import named
from engine.doubting.graph import Columns, Graph
from engine.doubting.identification import Hedge, identify

BETWEEN = 2  # columns that a way through is sought by, at most: more make no sentence


@dataclass(frozen=True)
class Told:
    """kind: "nothing", "seen", "alike", "through" or "parts".  columns: told by these.  text: goes on from "read"."""

    kind: str
    columns: tuple[str, ...]
    text: str


def told(graph: Graph, outcome: str, levers: Collection[str], pins: Collection[str] = ()) -> Told:
    """How an identified answer follows: by the back door, by the front door (Pearl 1995), or in parts."""
    if outcome not in graph.descendants(levers):
        return Told("nothing", (), f"as it is among these: no link leads there from {named(graph.sorted(levers))}")
    if len(levers) == 1:
        (lever,) = levers
        found = _alike(graph, outcome, lever, frozenset(pins)) or _through(graph, outcome, lever, frozenset(pins))
        if found is not None:
            return found
    cut = graph.without_links_from(levers)
    parts = graph.sorted(cut.ancestors([outcome]) - frozenset(levers) - frozenset(pins))
    how = f"{named(parts)} {'comes' if len(parts) == 1 else 'come'} about"
    text = f"part by part: what the records tell of how {how}, each from what comes before it"
    return Told("parts", parts, text)


def would_let_it_follow(
    graph: Graph, outcomes: Collection[str], levers: Collection[str], pins: Collection[str] = ()
) -> tuple[tuple[str, str], ...]:
    """Pairs whose shared cause, recorded in a column of its own, would alone let a refused answer follow."""
    found = []
    for pair in sorted(graph.sorted(pair) for pair in graph.pairs):
        cause = "\x00"
        links = graph.links | {(cause, column) for column in pair}
        recorded = Graph((cause, *graph.columns), links, graph.pairs - {frozenset(pair)})
        if not isinstance(identify(recorded, outcomes, levers, pins), Hedge):
            found.append((pair[0], pair[1]))
    return tuple(found)


def _alike(graph: Graph, outcome: str, lever: str, pins: Columns) -> Told | None:
    after = graph.descendants([lever])
    if pins & after:
        return None
    no_effect = _Apart(graph.without_links_from([lever]), frozenset((lever,)), frozenset((outcome,)))
    alike = _fewest([no_effect], graph, graph.ancestors({lever, outcome} | pins) - after, pins)
    if alike is None:
        return None
    if not alike:
        return Told("seen", (), f"as recorded: nothing stated drives both {lever} and {outcome}")
    return Told("alike", alike, f"by comparing like with like in {named(alike)}")


def _through(graph: Graph, outcome: str, lever: str, pins: Columns) -> Told | None:
    after = graph.descendants([lever])
    if pins & after:
        return None
    before = graph.ancestors({lever, outcome} | pins) - after
    possible = graph.sorted(after & graph.ancestors([outcome]) - {lever, outcome})
    first, last = frozenset((lever,)), frozenset((outcome,))
    for count in range(1, BETWEEN + 1):
        for between in itertools.combinations(possible, count):
            middle = frozenset(between)
            onward = graph.without_links_from(middle)
            if outcome in onward.descendants([lever]):
                continue  # there is a way past them
            conditions = [_Apart(graph.without_links_from(first), first, middle), _Apart(onward, middle, last, first)]
            alike = _fewest(conditions, graph, before, pins)
            if alike is not None:
                each, it = ("each level of it", "it") if count == 1 else ("each of their levels", "them")
                text = (
                    f"through {named(between)}, weighing {each} by how often it comes with what is set, and what "
                    f"follows from {it} by comparing like with like in {named((lever, *alike))}"
                )
                return Told("through", between, text)
    return None


@dataclass(frozen=True)
class _Apart:
    """That in a graph nothing but what is named ties left to right."""

    graph: Graph
    left: Columns
    right: Columns
    beside: Columns = frozenset()

    def holds(self, given: Columns) -> bool:
        return self.graph.apart(self.left, self.right, given | self.beside)


def _fewest(conditions: list[_Apart], graph: Graph, before: Columns, pins: Columns) -> tuple[str, ...] | None:
    """The pins, and of `before` none that could be spared, under which all conditions hold; None where none do.

    When any columns before the lever do, all that lead to the lever, the outcome or the pins do
    (Perković, Textor, Kalisch & Maathuis 2018 (m)).
    """
    for could in (pins, before | pins):
        if all(each.holds(could) for each in conditions):
            left = set(could)
            for column in graph.sorted(could - pins):
                if all(each.holds(frozenset(left - {column})) for each in conditions):
                    left.discard(column)
            return graph.sorted(left)
    return None
