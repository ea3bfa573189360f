"""The slow truths of tables with categories and numbers: families one by one, records one by one."""

from collections.abc import Sequence

import numpy as np

from engine.network.network import Network
from engine.network.parameters import dirichlet_posterior
from engine.network.regression import regression
from engine.order import Order
from engine.records.bands import band_codes, band_levels, equal_count_cuts
from engine.records.table import Coded
from tests.learning import numbers_plainly, plainly


def coded_mixed(
    names: Sequence[str], codes: np.ndarray, values: np.ndarray, numbers: Sequence[int], bands: int = 3
) -> Coded:
    """codes: (rows, columns), those of numbers not looked at.  values: (rows, numbers), cut into equal counts."""
    codes = np.array(codes, dtype=np.int32, order="F")
    levels, cuts = [], []
    for place in range(len(names)):
        if place in numbers:
            of = values[:, numbers.index(place)]
            cuts.append(equal_count_cuts(of, bands))
            codes[:, place] = band_codes(of, cuts[-1])
            levels.append(band_levels(cuts[-1]))
        else:
            cuts.append(())
            levels.append(tuple(f"{names[place]} {level}" for level in range(int(codes[:, place].max()) + 1)))
    return Coded(
        tuple(names),
        tuple("number" if place in numbers else "category" for place in range(len(names))),
        tuple(levels),
        tuple(cuts),
        (False,) * len(names),
        codes,
        np.ones(len(codes)),
        tuple(numbers),
        np.asfortranarray(values, dtype=np.float64),
    )


def family_score(coded: Coded, child: int, parents: Sequence[int], whole: Coded | None = None) -> float:
    """The BDeu score of a category; of a number its regressions, record by record, in its own unit.

    whole: the records that numbers are standardised by, when they are not these.
    """
    whole = coded if whole is None else whole
    if child not in coded.numbers:
        return plainly.family_score(coded.codes, [len(each) for each in coded.levels], child, parents)
    scale = whole.values.std(axis=0)
    scaled = (coded.values - whole.values.mean(axis=0)) / scale
    categories = [parent for parent in parents if parent not in coded.numbers]
    slopes = [coded.numbers.index(parent) for parent in parents if parent in coded.numbers]
    own = coded.numbers.index(child)
    score = -len(scaled) * np.log(scale[own])
    for rows in numbers_plainly.configurations(coded.codes, categories):
        score += numbers_plainly.regression_score(scaled[np.ix_(rows, slopes)], scaled[rows, own])
    return float(score)


def every_graph(coded: Coded, order: Order, max_parents: int, whole: Coded | None = None) -> dict[plainly.Graph, float]:
    """The score of every graph that the order allows."""
    known: dict[tuple[int, tuple[int, ...]], float] = {}
    found = {}
    for graph in plainly.graphs(order, max_parents):
        total = 0.0
        for child, parents in enumerate(graph):
            if (child, parents) not in known:
                known[child, parents] = family_score(coded, child, parents, whole)
            total += known[child, parents]
        found[graph] = total
    return found


def best_graphs(scores: dict[plainly.Graph, float]) -> dict[int, plainly.Graph]:
    """Links -> the graph with the best score."""
    found: dict[int, plainly.Graph] = {}
    for graph, score in scores.items():
        links = plainly.links_of(graph)
        if links not in found or score > scores[found[links]]:
            found[links] = graph
    return found


def log_scores(coded: Coded, learned_from: np.ndarray, scored: np.ndarray, graph: plainly.Graph) -> np.ndarray:
    """(rows scored,) log score of rows by a graph whose parameters come from other rows; both are positions.

    Each row counts for its weight.
    """
    total = np.zeros(len(scored))
    for child, parents in enumerate(graph):
        total += _log_family(coded, learned_from, scored, child, parents)
    return total


def _log_family(
    coded: Coded, learned_from: np.ndarray, scored: np.ndarray, child: int, parents: Sequence[int]
) -> np.ndarray:
    categories = [parent for parent in parents if child not in coded.numbers or parent not in coded.numbers]
    shape = [len(coded.levels[parent]) for parent in categories]
    if child not in coded.numbers:
        counts = np.zeros((*shape, len(coded.levels[child])))
        for row in learned_from:
            counts[tuple(coded.codes[row, [*categories, child]])] += coded.weights[row]
        shares = dirichlet_posterior(counts)
        shares = shares / shares.sum(axis=-1, keepdims=True)
        return np.asarray([np.log(shares[tuple(coded.codes[row, [*categories, child]])]) for row in scored])
    places = [coded.numbers.index(number) for number in (*(p for p in parents if p not in categories), child)]
    share = (coded.weights / coded.weights.sum())[:, None]
    centre = (share * coded.values[:, places]).sum(axis=0)
    scale = np.sqrt((share * (coded.values[:, places] - centre) ** 2).sum(axis=0))
    products = np.zeros((int(np.prod(shape)), len(places) + 1, len(places) + 1))
    for row in learned_from:
        terms = np.asarray([1.0, *(coded.values[row, places] - centre) / scale])
        at = np.ravel_multi_index(coded.codes[row, categories], shape) if categories else 0
        products[at] += coded.weights[row] * np.outer(terms, terms)
    found = regression(products, shape, centre, scale)
    return found.log_density(
        coded.codes[np.ix_(scored, categories)],
        coded.values[np.ix_(scored, places[:-1])],
        coded.values[scored, places[-1]],
    )


def same_network(one: Network, other: Network) -> bool:
    """To the last digit."""
    for left, right in zip(one.nodes, other.nodes, strict=True):
        if (type(left), left.name, left.parents, left.levels, left.cuts) != (
            type(right),
            right.name,
            right.parents,
            right.levels,
            right.cuts,
        ):
            return False
        for what in ("table", "dirichlet", "intercept", "slopes", "variance"):
            if not np.array_equal(getattr(left, what, 0.0), getattr(right, what, 0.0)):
                return False
    return True
