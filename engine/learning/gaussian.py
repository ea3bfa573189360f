"""Scores of sets that hold numbers, each stored once; a number's family is the difference of two."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from itertools import combinations
from math import comb, log, pi

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from engine.learning.scores import Floats, Ints, SetScores
from engine.records.joint import LARGEST
from engine.records.moments import ArrayMoments, FamilySums, Sums

MEAN_WEIGHT = 1.0  # records that the prior mean counts for
SCATTER = MEAN_WEIGHT * MEAN_WEIGHT / (MEAN_WEIGHT + 1.0)  # prior scatter of every standardised number


def number_scores(
    moments: ArrayMoments, size: int, grain: float = 0.0, tick: Callable[[float], None] | None = None
) -> SetScores:
    """Gaussian log marginal likelihoods, in the columns' own units, of every set of columns that holds a number.

    The score of a set of categories C and numbers Z is the sum over the configurations of C of ln p(Z in it) under
    the normal-Wishart prior (Geiger & Heckerman 2002, constants as corrected by Kuipers, Moffa & Heckerman 2014) on
    standardised numbers: MEAN_WEIGHT 1, degrees of freedom |Z| + 2, prior scatter SCATTER on the diagonal. A number
    v with parents P has the score of P and v less that of P; a set without numbers has the score 0.
    Rounding is added to the diagonal: records x step^2 / 12.

    by_size and the parts are those of `SetScores`, ranks count all columns; -inf where the categories have more than
    LARGEST joint levels.  size: columns in the largest set.  grain: scores are multiples of this power of two or of
    a coarser one, see `coarsened`.
    """
    columns = len(moments.levels)
    size = min(size, columns)
    parts = 1 if moments.folds == 1 else 1 + moments.folds
    by_size = tuple(np.zeros((parts, comb(columns, each))) for each in range(size + 1))
    _leave_out_large(moments, by_size)
    for sums in moments.blocks(size, tick):
        for numbers, scores in _block_scores(moments, sums, parts, size - sums.sets.shape[1]):
            held = sums.sets.shape[1] + numbers.shape[1]
            ranks = _union_ranks(sums.sets, np.asarray(moments.numbers.columns, dtype=np.int64)[numbers])
            for part in range(parts):
                np.add.at(by_size[held][part], ranks, scores[:, part, :])
    return coarsened(SetScores(columns, 0.0, by_size), max(grain, _grain(columns, by_size)))


def family_score(sums: FamilySums) -> float:
    """The score of one number given its parents, from all records: the difference of two set scores."""
    products = sums.part(0)
    products = products[products[:, 0, 0] > 0.0]
    places = list(sums.columns)
    return float(
        configuration_scores(products, sums.numbers.rounding[places], float(sums.numbers.scale[places[-1]])).sum()
    )


def configuration_scores(products: Floats, rounding: Floats, scale: float) -> Floats:
    """(...,) what each configuration with records adds to the score of a number given its number parents.

    products: (..., terms, terms) sums of products of (1, number parents, child), standardised.
    rounding: (..., terms - 1) variances that rounding adds.  scale: of the child.
    """
    count, first = products[..., 0, 0], products[..., 0, 1:]
    held = first.shape[-1]
    scatter = products[..., 1:, 1:] - first[..., :, None] * first[..., None, :] / (count + MEAN_WEIGHT)[..., None, None]
    scatter += (count[..., None] * rounding + SCATTER)[..., None, :] * np.eye(held)
    logs = 2.0 * np.log(np.diagonal(np.linalg.cholesky(scatter), axis1=-2, axis2=-1))
    with_child, without = (-0.5 * (count + shape + MEAN_WEIGHT + 1.0) for shape in (held, held - 1))
    score = _one_more(count, held) + with_child * logs.sum(axis=-1) - without * logs[..., :-1].sum(axis=-1)
    return np.asarray(score - count * np.log(scale))


def coarsened(scores: SetScores, grain: float) -> SetScores:
    """The same scores as multiples of `grain`, a power of two: what is added up exactly has one grain.

    Give category and number scores the larger of their two grains before a graph's score is summed over both.
    """
    if grain <= scores.grain:
        return scores
    rounded = tuple(np.where(np.isneginf(each), each, np.rint(each / grain) * grain) for each in scores.by_size)
    return SetScores(scores.columns, grain, rounded)


def _block_scores(
    moments: ArrayMoments, sums: Sums, parts: int, size: int
) -> Iterator[tuple[NDArray[np.int64], Floats]]:
    """(subsets, numbers) positions among the numbers, and their scores (subsets, parts, sets of categories)."""
    count = _by_part(sums.count[None], parts)[0]
    matrices = _scatter(moments, sums, count, parts)
    numbers = len(moments.numbers.columns)
    units = np.log(moments.numbers.scale)
    records = np.add.reduceat(count, sums.starts, axis=-1)
    constant = np.zeros_like(count)
    constants: list[Floats] = []
    for held in range(1, min(size, numbers) + 1):
        constant = constant + _one_more(count, held)
        constants.append(np.add.reduceat(constant, sums.starts, axis=-1))
    found: list[list[Floats]] = [[] for _ in constants]
    for held, logs in _determinants(matrices, sums.pairs, min(size, numbers)):
        weighted = logs * (-0.5 * (count + held + MEAN_WEIGHT + 1.0))
        found[held - 1].append(np.add.reduceat(weighted, sums.starts, axis=-1))
    for held, (pieces, fixed) in enumerate(zip(found, constants, strict=True), start=1):
        subsets = np.asarray(list(combinations(range(numbers), held)), dtype=np.int64).reshape(-1, held)
        in_units = units[subsets].sum(axis=1)[:, None, None] * records
        yield subsets, np.concatenate(pieces) + fixed - in_units


def _by_part(sums: Floats, parts: int) -> Floats:
    """(terms, folds, configurations) to (terms, parts, configurations): all folds, then all but each."""
    if parts == 1:
        return sums
    whole = sums.sum(axis=1, keepdims=True)
    return np.concatenate([whole, whole - sums], axis=1)


def _scatter(moments: ArrayMoments, sums: Sums, count: Floats, parts: int) -> Floats:
    """Posterior scatter: (numbers, numbers, parts, configurations), or its diagonal alone (numbers, ...)."""
    first = _by_part(sums.first, parts)
    second = _by_part(sums.second, parts)
    rounding = moments.numbers.rounding[:, None, None] * count + SCATTER
    less = 1.0 / (count + MEAN_WEIGHT)
    if not sums.pairs:
        return np.asarray(second - first * first * less + rounding)
    numbers = first.shape[0]
    matrices = np.empty((numbers, numbers, *count.shape))
    begin = 0
    for place in range(numbers):
        end = begin + numbers - place
        row = second[begin:end] - first[place] * less * first[place:]
        row[0] += rounding[place]
        matrices[place, place:] = row
        matrices[place:, place] = row
        begin = end
    return matrices


def _one_more(count: Floats, held: int) -> Floats:
    """What the `held`-th number of a set adds to a configuration's score, its determinant aside."""
    shape = held + MEAN_WEIGHT + 1.0
    prior = 0.5 * (shape * held - (shape - 1.0) * (held - 1)) * log(SCATTER)
    gammas = gammaln(0.5 * (count + shape)) - gammaln(0.5 * shape)
    return np.asarray(gammas + prior + 0.5 * np.log(MEAN_WEIGHT / (MEAN_WEIGHT + count)) - 0.5 * log(pi) * count)


def _determinants(matrices: Floats, pairs: bool, size: int) -> Iterator[tuple[int, Floats]]:
    """Log determinants of the submatrices of 1 to `size` numbers, depth first by Schur complements.

    Yields (numbers in the set, (sets that share all but the last number, parts, configurations)); the sets of one
    size come in lexicographic order.
    """
    if not pairs:
        yield 1, np.log(matrices)
        return
    diagonal = np.einsum("ii...->i...", matrices)
    yield from _deeper(matrices, diagonal, np.zeros(matrices.shape[2:]), 1, size)


def _deeper(
    matrix: Floats | None, diagonal: Floats, before: Floats, held: int, size: int
) -> Iterator[tuple[int, Floats]]:
    """`matrix`: Schur complement of the numbers after the set's last one; None when only its diagonal is wanted."""
    logs = np.log(diagonal)
    logs += before
    yield held, logs
    if held == size or matrix is None:
        return
    for place in range(diagonal.shape[0] - 1):
        column = matrix[place + 1 :, place]
        scaled = column / diagonal[place]
        after = diagonal[place + 1 :] - scaled * column
        rest = None
        if held + 1 < size and after.shape[0] > 1:
            rest = matrix[place + 1 :, place + 1 :] - scaled[:, None] * column[None]
        yield from _deeper(rest, after, logs[place], held + 1, size)


def _union_ranks(sets: Ints, numbers: Ints) -> Ints:
    """(subsets of numbers, sets of categories) the rank of each union among all columns."""
    shape = (numbers.shape[0], sets.shape[0])
    both = np.concatenate(
        [
            np.broadcast_to(numbers[:, None, :], (*shape, numbers.shape[1])),
            np.broadcast_to(sets[None, :, :], (*shape, sets.shape[1])),
        ],
        axis=-1,
    )
    both = np.sort(both, axis=-1)
    ranks = np.zeros(shape, dtype=np.int64)
    for place in range(both.shape[-1]):
        ranks += _choose(int(both.max(initial=0)) + 1, place + 1)[both[..., place]]
    return ranks


def _choose(columns: int, places: int) -> Ints:
    return np.asarray([comb(column, places) for column in range(columns)], dtype=np.int64)


def _leave_out_large(moments: ArrayMoments, by_size: Sequence[Floats]) -> None:
    """-inf to every set with a number whose categories have more than LARGEST joint levels."""
    numbers = np.asarray(moments.numbers.columns, dtype=np.int64)
    size = len(by_size) - 1
    levels = np.asarray(moments.levels, dtype=np.float64)
    for count in range(1, min(size - 1, len(moments.categories)) + 1):
        largest = np.sort(levels[list(moments.categories)])[::-1][:count].prod()
        if largest <= LARGEST:
            continue
        sets = np.asarray(list(combinations(moments.categories, count)), dtype=np.int64)
        large = sets[levels[sets].prod(axis=1) > LARGEST]
        for held in range(1, min(size - count, numbers.size) + 1):
            subsets = numbers[np.asarray(list(combinations(range(numbers.size), held)), dtype=np.int64)]
            by_size[count + held][:, _union_ranks(large, subsets).reshape(-1)] = -np.inf


def _grain(columns: int, by_size: Sequence[Floats]) -> float:
    """The finest power of two in whose multiples every sum of scores over a graph is exact in double precision."""
    largest = max((float(np.abs(each[np.isfinite(each)]).max(initial=1.0)) for each in by_size), default=1.0)
    return float(2.0 ** (np.ceil(np.log2(4.0 * (columns + 1) * largest)) - 52))
