"""The slow truths of numbers: one configuration, one record at a time."""

from collections.abc import Sequence

import numpy as np
from scipy.stats import multivariate_t
from scipy.stats import t as student_t

from engine.records.moments import ArrayMoments, Numbers


def as_given(columns: Sequence[int], values: np.ndarray, step: float = 0.0) -> Numbers:
    """Numbers scored as they stand, neither centred nor scaled."""
    ones = np.ones(len(columns))
    return Numbers(tuple(columns), np.asarray(values, dtype=np.float64), 0.0 * ones, ones, step * ones)


def mixed(
    rows: int, levels: Sequence[int], numbers: int, seed: int = 0
) -> tuple[np.ndarray, np.ndarray, tuple[int, ...]]:
    """(codes of all columns, values, positions of the numbers); categories and numbers take turns."""
    rng = np.random.default_rng(seed)
    columns = len(levels) + numbers
    places = tuple(range(1, 2 * numbers, 2)) if numbers <= len(levels) else tuple(range(len(levels), columns))
    codes = np.zeros((rows, columns), dtype=np.int32)
    for place, count in zip([p for p in range(columns) if p not in places], levels, strict=True):
        codes[:, place] = rng.integers(0, count, rows)
    values = rng.normal(size=(rows, numbers)) @ rng.normal(size=(numbers, numbers)) * rng.uniform(0.1, 50.0, numbers)
    return codes, values + codes[:, :1] + rng.uniform(-9.0, 9.0, numbers), places


def all_levels(codes: np.ndarray, places: Sequence[int]) -> list[int]:
    return [2 if place in places else int(codes[:, place].max()) + 1 for place in range(codes.shape[1])]


def set_score(values: np.ndarray, scatter: float = 0.5) -> float:
    """ln p of all numbers in one configuration: a product of one-step multivariate t densities (Geiger & Heckerman)."""
    numbers = values.shape[1]
    weight, freedom = 1.0, numbers + 2.0
    mean, matrix = np.zeros(numbers), scatter * np.eye(numbers)
    total = 0.0
    for row in values:
        left = freedom - numbers + 1.0
        total += multivariate_t(mean, matrix * (weight + 1.0) / (weight * left), left).logpdf(row)
        away = row - mean
        matrix = matrix + np.outer(away, away) * weight / (weight + 1.0)
        mean = mean + away / (weight + 1.0)
        weight, freedom = weight + 1.0, freedom + 1.0
    return float(total)


def regression_score(design: np.ndarray, child: np.ndarray) -> float:
    """ln p of a number given its number parents, record by record, from the regression's own prior: intercept
    precision 1, slope precisions 1/2, 1 / variance ~ Gamma((parents + 3) / 2, rate 1/4)."""
    parents = design.shape[1]
    precision = np.diag([1.0, *[0.5] * parents])
    shape, rate, moment, total = (parents + 3) / 2, 0.25, np.zeros(1 + parents), 0.0
    for row, value in zip(np.column_stack([np.ones(len(child)), design]), child, strict=True):
        mean = np.linalg.solve(precision, moment)
        wide = 1.0 + row @ np.linalg.solve(precision, row)
        total += student_t.logpdf(value, 2 * shape, row @ mean, np.sqrt(rate / shape * wide))
        rate += (value - row @ mean) ** 2 / wide / 2.0
        shape, precision, moment = shape + 0.5, precision + np.outer(row, row), moment + row * value
    return float(total)


def configurations(codes: np.ndarray, categories: Sequence[int]) -> list[np.ndarray]:
    """Rows of each occupied configuration."""
    _, place = np.unique(codes[:, list(categories)], axis=0, return_inverse=True)
    place = place.reshape(-1) if categories else np.zeros(len(codes), dtype=int)
    return [np.flatnonzero(place == each) for each in np.unique(place)]


def moments(codes, values, places, fold=None, folds=1) -> ArrayMoments:
    return ArrayMoments(codes, all_levels(codes, places), Numbers.standardised(places, values), fold, folds)
