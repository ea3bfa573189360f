"""In which order to sum columns out: greedy orders on the graph of columns that share a table."""

from __future__ import annotations

import random
from collections.abc import Callable, Mapping, Sequence

Scopes = Sequence[tuple[int, ...]]
Rule = Callable[[int, Sequence[int], Sequence[float]], float]

ENOUGH = (2e4, 1e5, 1e6)  # cells: a plan below the first runs sooner than a better one is found, and so on


def elimination_order(scopes: Scopes, sizes: Mapping[int, int], keep: Sequence[int] = ()) -> tuple[int, ...]:
    """An order in which to sum out every label of `scopes` except those in `keep`.

    The cheapest of min-weight and min-fill (Kjaerulff 1990; Koller & Friedman 2009, section 9.4), ties broken
    by several fixed seeds; the costlier the order, the more seeds are tried.
    """
    labels = sorted({label for scope in scopes for label in scope})
    place = {label: position for position, label in enumerate(labels)}
    neighbours = [0] * len(labels)
    for scope in scopes:
        together = 0
        for label in scope:
            together |= 1 << place[label]
        for label in scope:
            neighbours[place[label]] |= together
    for position in range(len(labels)):
        neighbours[position] &= ~(1 << position)
    cards = [float(sizes[label]) for label in labels]
    free = [place[label] for label in labels if label not in set(keep)]

    best, cost = _greedy(neighbours, cards, free, _weight, None)
    for seed, enough in enumerate(ENOUGH):
        if cost <= enough:
            break
        for rule in (_fill, _weight) if seed else (_fill,):
            found, needed = _greedy(neighbours, cards, free, rule, random.Random(seed))
            if needed < cost:
                best, cost = found, needed
    return tuple(labels[position] for position in best)


def _greedy(
    start: Sequence[int], cards: Sequence[float], free: Sequence[int], rule: Rule, ties: random.Random | None
) -> tuple[list[int], float]:
    """Take the label that `rule` scores lowest, join its neighbours, repeat. Also the cells of all cliques met."""
    neighbours = list(start)
    luck = {position: ties.random() if ties else 0.0 for position in free}
    scores = {position: (rule(position, neighbours, cards), luck[position]) for position in free}
    order: list[int] = []
    cells = 0.0
    while scores:
        chosen = min(scores, key=scores.__getitem__)
        del scores[chosen]
        order.append(chosen)
        around = neighbours[chosen]
        cells += _weight(chosen, neighbours, cards)
        touched = around
        for position in _bits(around):
            neighbours[position] = (neighbours[position] | around) & ~(1 << position) & ~(1 << chosen)
            if rule is _fill:
                touched |= neighbours[position]
        for position in _bits(touched):
            if position in scores:
                scores[position] = (rule(position, neighbours, cards), luck[position])
    return order, cells


def _weight(position: int, neighbours: Sequence[int], cards: Sequence[float]) -> float:
    """Cells of the table that summing this label out would need."""
    cells = cards[position]
    for other in _bits(neighbours[position]):
        cells *= cards[other]
    return cells


def _fill(position: int, neighbours: Sequence[int], cards: Sequence[float]) -> float:
    """Pairs of neighbours that summing this label out would join, each weighed by its cells."""
    around = neighbours[position]
    missing = 0.0
    for one in _bits(around):
        for other in _bits(around & ~neighbours[one] & ~((2 << one) - 1)):
            missing += cards[one] * cards[other]
    return missing


def _bits(mask: int) -> list[int]:
    found = []
    while mask:
        low = mask & -mask
        found.append(low.bit_length() - 1)
        mask ^= low
    return found
