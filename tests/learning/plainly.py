"""The slow truths of learning: one family at a time, one graph at a time."""

from collections.abc import Iterator, Sequence
from itertools import combinations, product
from math import prod

import numpy as np
from scipy.special import gammaln

from engine.learning.scores import ESS
from engine.order import Order
from engine.records.table import Coded

Graph = tuple[tuple[int, ...], ...]  # the parents of each column


def coded_columns(names: Sequence[str], levels: Sequence[int], codes: np.ndarray, grades: Sequence[str] = ()) -> Coded:
    """Level positions as learning takes them: categories, and grades where named."""
    return Coded(
        tuple(names),
        tuple("grade" if name in grades else "category" for name in names),
        tuple(tuple(f"{name} {level}" for level in range(count)) for name, count in zip(names, levels, strict=True)),
        ((),) * len(names),
        (False,) * len(names),
        np.asfortranarray(codes, dtype=np.int32),
        np.ones(codes.shape[0]),
    )


def family_score(
    codes: np.ndarray, levels: Sequence[int], child: int, parents: Sequence[int], ess: float = ESS
) -> float:
    """BDeu score of one family, configuration by configuration."""
    q, r = prod(levels[parent] for parent in parents), levels[child]
    score = 0.0
    for configuration in product(*(range(levels[parent]) for parent in parents)):
        rows = np.all(codes[:, list(parents)] == configuration, axis=1)
        counts = np.bincount(codes[rows, child], minlength=r)
        score += gammaln(ess / q) - gammaln(ess / q + counts.sum())
        score += (gammaln(ess / (q * r) + counts) - gammaln(ess / (q * r))).sum()
    return float(score)


def acyclic(graph: Graph) -> bool:
    left = set(range(len(graph)))
    while left:
        free = {child for child in left if not left & set(graph[child])}
        if not free:
            return False
        left -= free
    return True


def graphs(order: Order, max_parents: int) -> Iterator[Graph]:
    """Every graph that the order allows."""
    names = order.columns
    insisted = {(names.index(source), names.index(target)) for source, target in order.insist}
    choices = []
    for child, name in enumerate(names):
        leads = [place for place, other in enumerate(names) if order.may_lead(other, name)]
        must = {source for source, target in insisted if target == child}
        sets = [set_ for count in range(max_parents + 1) for set_ in combinations(leads, count) if must <= set(set_)]
        choices.append(sets)
    for graph in product(*choices):
        if acyclic(graph):
            yield graph


def links_of(graph: Graph) -> int:
    return sum(len(parents) for parents in graph)


def best_by_links(
    codes: np.ndarray, levels: Sequence[int], order: Order, max_parents: int, ess: float = ESS
) -> dict[int, float]:
    """Links -> best score, by trying every graph."""
    known: dict[tuple[int, tuple[int, ...]], float] = {}
    best: dict[int, float] = {}
    for graph in graphs(order, max_parents):
        total = 0.0
        for child, parents in enumerate(graph):
            if (child, parents) not in known:
                known[child, parents] = family_score(codes, levels, child, parents, ess)
            total += known[child, parents]
        best[links_of(graph)] = max(best.get(links_of(graph), -np.inf), total)
    return best
