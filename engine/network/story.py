"""A column's rules in plain words: what it comes from, and how its shares differ, like configurations merged.

The configurations of a column's parents are split in two, again and again, where that explains most of how the told
share differs; each part is then a few conditions that can be said (regression trees: Breiman et al. 1984).
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.network.conditional import Row
from engine.network.network import Category, Network
from engine.network.said import Said, Words, figure, in_hundred, name, plain, series, these

Floats = NDArray[np.float64]
Link = tuple[str, str]
Held = tuple[tuple[int, ...], ...]

MOST = 4  # parts told of one column
LIKE = 0.05  # shares that differ by less are told as one
APART = 0.10  # a part whose configurations differ by more says so
RARE = 0.01  # a part with a smaller share of the records is not told by itself
TINY = 1e-300
LISTED = 4  # levels told of a column without parents


@dataclass(frozen=True)
class Story:
    """How a column comes about.

    touches: what it comes from and goes with, a sentence.  rules: how its shares differ.
    rows: its table, a row for each configuration of its parents.  left_out: rarer configurations without a row.
    """

    touches: Words
    rules: Rules
    rows: tuple[Row, ...]
    left_out: int

    @property
    def text(self) -> str:
        return f"{plain(self.touches)} {self.rules.text}"


@dataclass(frozen=True)
class Rules:
    """A sentence in pieces: what is told, such as "It is yes for", and a clause for each part, the highest first."""

    lead: Words
    clauses: tuple[Words, ...]

    @property
    def text(self) -> str:
        return f"{plain(self.lead)} {'; for '.join(plain(clause) for clause in self.clauses)}."


@dataclass(frozen=True, eq=False)
class Part:
    """Configurations told as one.

    held: for each parent the positions of its levels here.  weight: share of all records.  share: of the told levels.
    low, high: that share in the configurations that are not rare here.
    """

    held: Held
    weight: float
    share: float
    low: float
    high: float


@dataclass(frozen=True)
class Split:
    """A part in two by one parent. gain: weighted sum of squares explained, 0 where no split is worth telling.

    axis: which parent.  sides: its levels on each side.
    """

    gain: float
    axis: int
    sides: Held


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
    """How the shares of a category differ; a column told by its mean gets rules of its own beside these.

    weights: (parent levels...) how common each configuration of the parents is, summing to 1.
    better: positions of the levels to tell of, None to choose them.
    """
    node = network.node(column)
    table = np.asarray(node.table)
    overall = (table * weights[..., None]).reshape(-1, len(node.levels)).sum(axis=0)
    told = tuple(better) if better is not None else _telling(node, table, weights, overall)
    if not node.parents:
        return _distribution(node, overall, told if better is not None else None)
    shares = table[..., list(told)].sum(axis=-1)
    parents = tuple(network.node(parent) for parent in node.parents)
    found = parts(parents, shares, weights)
    lead = (Said("It is "), *these(node, told), Said(" for"))
    if len(found) == 1 and not _conditions(parents, found[0]):
        among = figure(found[0].share)
        if varies := _varies(parents, found[0]):
            return Rules(lead, ((among, *varies),))
        names = series([[name(parent.name)] for parent in parents], " and ")
        verb = "is" if len(parents) == 1 else "are"
        return Rules(lead, ((Said("about "), among, Said(", whatever "), *names, Said(f" {verb}")),))
    common = max(found, key=lambda part: part.weight)
    clauses: list[Words] = []
    for part in sorted(found, key=lambda part: (-part.share, part.held)):
        where = (figure(part.share), Said(" where "), *_conditions(parents, part))
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
        others = "another level" if len(rest) == 1 else f"one of {len(rest)} other levels"
        clauses.append((Said(f"{others} for "), figure(float(overall[rest].sum()))))
    return Rules((Said("It is"),), (series(clauses, " and "),))


def parts(parents: Sequence[Category], shares: Floats, weights: Floats) -> list[Part]:
    """At most MOST parts of the configurations, each a set of levels of every parent; together they are all.

    shares, weights: (parent levels...).
    """
    whole = _part(tuple(tuple(range(size)) for size in shares.shape), shares, weights)
    found = [(whole, _best_split(parents, whole, shares, weights))]
    while len(found) < MOST:
        place = max(range(len(found)), key=lambda place: found[place][1].gain)  # the first of equal ones
        split = found[place][1]
        if split.gain <= 0.0:
            break
        halves = [_part(_with(found[place][0].held, split.axis, side), shares, weights) for side in split.sides]
        found[place : place + 1] = [(half, _best_split(parents, half, shares, weights)) for half in halves]
    return [part for part, _ in found]


def _part(held: Held, shares: Floats, weights: Floats) -> Part:
    here, common = shares[np.ix_(*held)].ravel(), weights[np.ix_(*held)].ravel()
    weight = float(common.sum())
    share = float((here * common).sum() / weight) if weight > 0.0 else float(here.mean())
    seen = here[common >= RARE * weight]
    return Part(held, weight, share, float(seen.min()), float(seen.max()))


def _best_split(parents: Sequence[Category], part: Part, shares: Floats, weights: Floats) -> Split:
    """The split of one parent's levels that explains most; the first of equal ones."""
    best = Split(0.0, 0, ())
    here, common = shares[np.ix_(*part.held)], weights[np.ix_(*part.held)]
    for axis, parent in enumerate(parents):
        levels = part.held[axis]
        mass = np.moveaxis(common, axis, 0).reshape(len(levels), -1).sum(axis=1)
        told = np.moveaxis(common * here, axis, 0).reshape(len(levels), -1).sum(axis=1)
        for sequence in _sequences(parent, levels, told / np.maximum(mass, TINY)):
            left, left_told = mass[sequence].cumsum()[:-1], told[sequence].cumsum()[:-1]
            right, right_told = mass.sum() - left, told.sum() - left_told
            apart = np.abs(left_told / np.maximum(left, TINY) - right_told / np.maximum(right, TINY))
            allowed = (np.minimum(left, right) >= RARE) & (apart >= LIKE)
            gains = np.where(allowed, left * right / np.maximum(left + right, TINY) * apart**2, 0.0).round(12)
            if gains.size and gains.max() > best.gain:
                cut = int(gains.argmax()) + 1
                sides = (sequence[:cut], sequence[cut:])
                best = Split(
                    float(gains.max()), axis, tuple(tuple(sorted(levels[at] for at in side)) for side in sides)
                )
    return best


def _sequences(parent: Category, levels: tuple[int, ...], shares: Floats) -> list[list[int]]:
    """Sequences of places in `levels` that may be cut, by `shares` (of each) where levels have no order (Fisher 1958).

    Levels in order stay so, a blank at either end.
    """
    places = list(range(len(levels)))
    if parent.kind not in ("grade", "number"):
        return [sorted(places, key=lambda place: (round(float(shares[place]), 9), place))]
    if not parent.has_blank or levels[-1] != len(parent.levels) - 1:
        return [places]
    return [places, [places[-1], *places[:-1]]]


def _with(held: Held, axis: int, levels: tuple[int, ...]) -> Held:
    return (*held[:axis], levels, *held[axis + 1 :])


def _conditions(parents: Sequence[Category], part: Part) -> Words:
    conditions = [
        (name(parent.name), Said(" is "), *these(parent, levels))
        for parent, levels in zip(parents, part.held, strict=True)
        if len(levels) < len(parent.levels)
    ]
    return series(conditions, " and ") if conditions else ()


def _varies(parents: Sequence[Category], part: Part) -> Words:
    """How far the configurations of a part differ, where they differ much, and with what."""
    if part.high - part.low <= APART:
        return ()
    with_what = [[name(parent.name)] for parent, levels in zip(parents, part.held, strict=True) if len(levels) > 1]
    low, high = in_hundred(part.low).removesuffix(" in 100"), in_hundred(part.high).removesuffix(" in 100")
    return (Said(f" ({low} to {high} depending on "), *series(with_what, " and "), Said(")"))
