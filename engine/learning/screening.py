"""Scores of many families of one number at once, from few records: what they share is added up once."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import prod

import numpy as np
from scipy.sparse import csc_matrix

from engine.learning.gaussian import configuration_scores
from engine.learning.scores import Floats
from engine.records.joint import LARGEST, numbered
from engine.records.moments import ArrayMoments

Parts = tuple[tuple[int, ...], tuple[int, ...]]  # category parents, number parents

_SHARED = 3  # sets of the same categories from which on their products are added up together
_TOGETHER = 24  # sets of categories that are laid side by side


def number_family_scores(
    moments: ArrayMoments, child: int, sets: Sequence[Parts], still: Callable[[], None] = lambda: None
) -> Floats:
    """(sets,) the score of the number `child` given each of `sets`, as `gaussian.family_score` of all records.

    -inf where the categories have more than LARGEST joint levels.  moments: without folds.
    Sets of the same categories share the sums of products of all their numbers; those that are left and have the same
    numbers share the products of each record.  still: called often, a chance to cancel.
    """
    scores = np.full(len(sets), -np.inf)
    by_categories: dict[tuple[int, ...], list[int]] = {}
    for place, (categories, _) in enumerate(sets):
        if prod(moments.levels[column] for column in categories) <= LARGEST:
            by_categories.setdefault(categories, []).append(place)
    by_numbers: dict[tuple[int, ...], list[int]] = {}
    for categories, places in by_categories.items():
        if len(places) < _SHARED:
            for place in places:
                by_numbers.setdefault(sets[place][1], []).append(place)
            continue
        still()
        scores[places] = _of_categories(moments, child, categories, [sets[place][1] for place in places])
    for numbers, places in by_numbers.items():
        for low in range(0, len(places), _TOGETHER):
            still()
            some = places[low : low + _TOGETHER]
            scores[some] = _of_numbers(moments, child, numbers, [sets[place][0] for place in some])
    return scores


def _of_categories(
    moments: ArrayMoments, child: int, categories: tuple[int, ...], sets: Sequence[tuple[int, ...]]
) -> Floats:
    """(sets,) scores for sets of numbers beside the same categories."""
    columns = sorted({child, *(column for numbers in sets for column in numbers)})
    term = {column: 1 + place for place, column in enumerate(columns)}
    code, occupied = _code(moments, categories)
    order = np.argsort(code.astype(np.uint16) if occupied <= 1 << 16 else code, kind="stable")  # short ones sort faster
    ends = np.cumsum(np.bincount(code, minlength=occupied))
    values = np.ones((order.size, 1 + len(columns)))
    values[:, 1:] = moments.numbers.values[:, _places(moments, columns)][order]
    weighted = values * moments.weights[order, None]
    products = np.empty((occupied, values.shape[1], values.shape[1]))
    for configuration, end in enumerate(ends.tolist()):
        start = int(ends[configuration - 1]) if configuration else 0
        products[configuration] = weighted[start:end].T @ values[start:end]
    scores = np.empty(len(sets))
    for held in {len(numbers) for numbers in sets}:
        here = [place for place, numbers in enumerate(sets) if len(numbers) == held]
        terms = np.asarray([[0, *(term[column] for column in sets[place]), term[child]] for place in here])
        rounding = moments.numbers.rounding[_places(moments, columns)][terms[:, 1:] - 1]
        own = products[:, terms[:, :, None], terms[:, None, :]]
        scores[here] = configuration_scores(own, rounding, _scale(moments, child)).sum(axis=0)
    return scores


def _of_numbers(moments: ArrayMoments, child: int, numbers: tuple[int, ...], sets: Sequence[tuple[int, ...]]) -> Floats:
    """(sets,) scores for sets of categories beside the same numbers."""
    places = _places(moments, (*numbers, child))
    term = np.ones((len(places) + 1, moments.rows))
    term[1:] = moments.numbers.values[:, places].T
    one, other = np.triu_indices(term.shape[0])
    laid = np.ascontiguousarray((term[one] * term[other]).T)
    where = np.empty((moments.rows, len(sets)), dtype=np.int32)
    starts = np.zeros(len(sets) + 1, dtype=np.int64)
    for place, categories in enumerate(sets):
        code, occupied = _code(moments, categories)
        where[:, place] = code + starts[place]
        starts[place + 1] = starts[place] + occupied
    weights = np.repeat(moments.weights, len(sets))
    ends = np.arange(0, where.size + 1, len(sets), dtype=np.int32)
    sums = csc_matrix((weights, where.reshape(-1), ends), shape=(int(starts[-1]), moments.rows)) @ laid
    products = np.empty((sums.shape[0], term.shape[0], term.shape[0]))
    products[:, one, other] = products[:, other, one] = sums
    scores = configuration_scores(products, moments.numbers.rounding[places], _scale(moments, child))
    return np.asarray(np.add.reduceat(scores, starts[:-1]))


def _code(moments: ArrayMoments, categories: Sequence[int]) -> tuple[np.ndarray, int]:
    """(rows,) which of the configurations with records each is in, and how many there are."""
    code = np.zeros(moments.rows, dtype=np.int64)
    for column in categories:
        code = code * moments.levels[column] + moments.codes[:, column]
    number, seen = numbered(code, prod(moments.levels[column] for column in categories))
    return number, int(seen.size)


def _places(moments: ArrayMoments, columns: Sequence[int]) -> list[int]:
    return [moments.numbers.columns.index(column) for column in columns]


def _scale(moments: ArrayMoments, child: int) -> float:
    return float(moments.numbers.scale[moments.numbers.columns.index(child)])
