"""Configurations of a column's parents that are told as one.

They are split in two, again and again, where that explains most of how a figure differs; each part is then a few
conditions that can be said (regression trees: Breiman et al. 1984).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.network.nodes import Node
from engine.network.said import Said, Words, name, series, these

Floats = NDArray[np.float64]
Held = tuple[tuple[int, ...], ...]

MOST = 4  # parts told of one column
LIKE = 0.05  # shares that differ by less are told as one
RARE = 0.01  # a part with a smaller share of the records is not told by itself
TINY = 1e-300


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


def parts(parents: Sequence[Node], shares: Floats, weights: Floats) -> list[Part]:
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


def _best_split(parents: Sequence[Node], part: Part, shares: Floats, weights: Floats) -> Split:
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


def _sequences(parent: Node, levels: tuple[int, ...], shares: Floats) -> list[list[int]]:
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


def conditions(parents: Sequence[Node], part: Part) -> Words:
    """What tells a part from the others: site is north and shift is nights; nothing where it is all there is."""
    conditions = [
        (name(parent.name), Said(" is "), *these(parent, levels))
        for parent, levels in zip(parents, part.held, strict=True)
        if len(levels) < len(parent.levels)
    ]
    return series(conditions, " and ") if conditions else ()


def whatever(parents: Sequence[Node]) -> Words:
    """, whatever site and shift are"""
    names = series([[name(parent.name)] for parent in parents], " and ")
    return (Said(", whatever "), *names, Said(" is" if len(parents) == 1 else " are"))


def varying(parents: Sequence[Node], part: Part, low: str, high: str) -> Words:
    """How far the configurations of a part differ, from `low` to `high`, and with what: (10 to 40 depending on site)"""
    with_what = [[name(parent.name)] for parent, held in zip(parents, part.held, strict=True) if len(held) > 1]
    ends = (Said(low, "figure"), Said(" to "), Said(high, "figure"))
    return (Said(" ("), *ends, Said(" depending on "), *series(with_what, " and "), Said(")"))
