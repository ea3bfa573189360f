"""A column's rules in plain words: what it comes from, and how its shares differ, like configurations merged."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.network.conditional import NumberRow, Row
from engine.network.merging import Part, conditions, parts, varying, whatever
from engine.network.network import Network
from engine.network.nodes import Category, Node
from engine.network.said import Said, Words, figure, in_hundred, name, plain, series, these

Floats = NDArray[np.float64]
Link = tuple[str, str]

APART = 0.10  # a part whose configurations differ by more says so
LISTED = 6  # levels told of a column without parents


@dataclass(frozen=True)
class Story:
    """How a column comes about.

    touches: what it comes from and goes with, a sentence.  rules: how its shares, or its mean, differ.
    rows: the table of a category, a row for each configuration of its parents.  left_out: rarer configurations
    without a row.  means: of a number, a row for each configuration of its category parents, at one value of each
    number parent; held: those values, in words, nothing without number parents.
    """

    touches: Words
    rules: Rules
    rows: tuple[Row, ...]
    left_out: int
    means: tuple[NumberRow, ...] = ()
    held: Words = ()

    @property
    def text(self) -> str:
        return f"{plain(self.touches)} {self.rules.text}"


@dataclass(frozen=True)
class Rules:
    """A sentence in pieces: what is told, such as "It is yes for", and a clause for each part, the highest first.

    between: what stands between clauses in one line of text.  then: a sentence about all parts, or nothing.
    """

    lead: Words
    clauses: tuple[Words, ...]
    between: str = "; for "
    then: Words = ()

    @property
    def text(self) -> str:
        told = f"{plain(self.lead)} {self.between.join(plain(clause) for clause in self.clauses)}."
        return f"{told} {plain(self.then)}" if self.then else told


def touches(network: Network, column: str, unsettled: Collection[Link]) -> Words:
    """What a column comes from, and what it goes with. unsettled: links whose direction nobody settled."""
    comes = [source for source, target in network.links if target == column and (source, target) not in unsettled]
    beside = [
        source if target == column else target
        for source, target in network.links
        if column in (source, target) and (source, target) in unsettled
    ]
    clauses = [
        (Said(verb), *series([[name(other)] for other in others], " and "))
        for verb, others in (("comes from ", comes), ("goes with ", beside))
        if others
    ]
    if clauses:
        return (*series(clauses, "; ", "; "), Said("."))
    if any(column in link for link in network.links):
        return (Said("comes from no other column."),)
    return (Said("stands alone: no link of this model touches it."),)


def rules(network: Network, column: str, weights: Floats, better: Sequence[int] | None = None) -> Rules:
    """How the shares of a category differ.

    weights: (parent levels...) how common each configuration of the parents is, summing to 1.
    better: positions of the levels to tell of, None to choose them.
    """
    node = network.category(column)
    table = np.asarray(node.table)
    overall = (table * weights[..., None]).reshape(-1, len(node.levels)).sum(axis=0)
    told = tuple(better) if better is not None else _telling(node, table, weights, overall)
    if not node.parents:
        return _distribution(node, overall, told if better is not None else None)
    shares = table[..., list(told)].sum(axis=-1)
    parents = tuple(network.node(parent) for parent in node.parents)
    found = parts(parents, shares, weights)
    lead = (Said("It is "), *these(node, told), Said(" for"))
    if len(found) == 1 and not conditions(parents, found[0]):
        among = figure(found[0].share)
        if varies := _varies(parents, found[0]):
            return Rules(lead, ((among, *varies),))
        return Rules(lead, ((Said("about "), among, *whatever(parents)),))
    common = max(found, key=lambda part: part.weight)
    clauses: list[Words] = []
    for part in sorted(found, key=lambda part: (-part.share, part.held)):
        where = (figure(part.share), Said(" where "), *conditions(parents, part))
        commonest = (Said(", the commonest case"),) if part is common and len(found) > 2 else ()
        clauses.append((*where, *_varies(parents, part), *commonest))
    return Rules(lead, tuple(clauses))


def _telling(node: Category, table: Floats, weights: Floats, overall: Floats) -> tuple[int, ...]:
    """Positions of the levels whose share tells most of a column.

    Its yes; of an ordered column the levels from the threshold on that parts its records most evenly; else the level
    whose share differs most between configurations, the commonest of those that differ as much.
    """
    real = len(node.levels) - int(node.has_blank and len(node.levels) > 1)
    folded = [level.casefold() for level in node.levels[:real]]
    if sorted(folded) == ["no", "yes"]:
        return (folded.index("yes"),)
    if node.kind in ("grade", "number") and real > 1:
        above = overall[:real][::-1].cumsum()[::-1]
        start = min(range(1, real), key=lambda place: (round(abs(float(above[place]) - 0.5), 9), place))
        return tuple(range(start, real))
    flat, common = table.reshape(-1, len(node.levels))[:, :real], weights.reshape(-1, 1)
    differs = (common * (flat - overall[:real]) ** 2).sum(axis=0)
    return (min(range(real), key=lambda place: (-round(float(differs[place]), 9), -overall[place], place)),)


def _distribution(node: Category, overall: Floats, better: tuple[int, ...] | None) -> Rules:
    """The shares of a column without parents: all levels, or the commonest of many."""
    if better is not None or len(node.levels) <= 2:
        told = better or _telling(node, overall, np.ones(()), overall)
        return Rules((Said("It is "), *these(node, told), Said(" for")), ((figure(float(overall[list(told)].sum())),),))
    ranked = sorted(range(len(node.levels)), key=lambda place: (-overall[place], place))
    most = LISTED if len(node.levels) <= LISTED else LISTED - 1
    shown = ranked[:most] if node.kind == "category" else sorted(ranked[:most])
    clauses: list[Words] = [(name(node.levels[place]), Said(" for "), figure(float(overall[place]))) for place in shown]
    if rest := ranked[most:]:
        together = float(overall[rest].sum())
        rarer = ", none commoner," if together >= overall[ranked[most - 1]] else ""
        clauses.append((Said(f"one of {len(rest)} other levels{rarer} for "), figure(together)))
    return Rules((Said("It is"),), (series(clauses, " and "),))


def _varies(parents: Sequence[Node], part: Part) -> Words:
    """How far the configurations of a part differ, where they differ much, and with what."""
    if part.high - part.low <= APART:
        return ()
    low, high = (in_hundred(end).removesuffix(" in 100") for end in (part.low, part.high))
    return varying(parents, part, low, high)
