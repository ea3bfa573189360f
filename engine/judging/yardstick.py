"""A flexible model that nobody can read, as a yardstick: how much could be foreseen from the same columns?"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from engine.judging.relearned import Relearned
from engine.network.parameters import smoothed_shares
from engine.order import Order
from engine.records.table import Coded

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

ROUNDS = 40  # trees a level, of which as many are kept as foresee the tuning records best
TUNING = 10  # one record in so many chooses the rounds, and a number's variance
_TREES = {"learning_rate": 0.15, "max_leaf_nodes": 10, "min_samples_leaf": 20, "max_bins": 64}
_CATEGORIES = 64  # levels of a column that trees may split in any way; more are taken in their sequence
_SECONDS = 9.0  # of boosting in all, by estimate; outcomes are boosted whatever it takes
_TREE, _CELL = 1.0e-3, 9.0e-9  # seconds a tree takes, and each record and column of it


class Yardstick:
    """Histogram gradient boosting (Ke et al. 2017) on the columns that may come before one by the order."""

    def __init__(self, again: Relearned, order: Order) -> None:
        self.again = again
        self.order = order
        self.features = _features(again.coded)

    def before(self, part: int, column: int) -> list[int]:
        """Columns that may lead to `column` by the order, but for those that it leads to in that part's model."""
        names = self.again.coded.names
        after = self.again.after(part, column)
        return [
            place
            for place in range(len(names))
            if place not in after and self.order.may_lead(names[place], names[column])
        ]

    def within_reach(self, columns: Sequence[int]) -> list[int]:
        """The columns with anything before them: outcomes, and the first others that need no more than _SECONDS."""
        found, seconds = [], 0.0
        coded = self.again.coded
        for column in columns:
            before = len(self.before(0, column))
            levels = len(coded.levels[column])
            trees = ROUNDS * len(self.again.parents) * (1 if column in coded.numbers or levels == 2 else levels)
            seconds += trees * (_TREE + _CELL * len(coded.codes) * before)
            if before and (seconds <= _SECONDS or coded.names[column] in self.order.outcomes):
                found.append(column)
        return found

    def scores(self, column: int, still: Callable[[], None] = lambda: None) -> Floats:
        """(rows,) log score of each record while it was held out, natural log, in the column's own unit."""
        found = self.again.scores(column, linked=False)
        for part in range(len(self.again.parents)):
            still()
            before = self.before(part, column)
            if before:
                rows = self.again.held(part)
                score = self._number if column in self.again.coded.numbers else self._category
                found[rows] = score(column, before, rows, *self._dealt(part, column))
        return found

    def _dealt(self, part: int, column: int) -> tuple[Ints, Ints]:
        """The records not held out: to boost from, and to tune by; what belongs together stays together."""
        rest = np.flatnonzero(self.again.fold != part)
        group = self.again.coded.group
        rng = np.random.default_rng([part, column, TUNING])
        cases, at = np.unique(rest if group is None else group[rest], return_inverse=True)
        tuning = np.isin(at.ravel(), rng.permutation(cases.size)[: max(cases.size // TUNING, 1)])
        return rest[~tuning], rest[tuning]

    def _category(self, column: int, before: list[int], rows: Ints, boost: Ints, tune: Ints) -> Floats:
        from sklearn.ensemble import HistGradientBoostingClassifier

        coded = self.again.coded
        levels = len(coded.levels[column])
        codes, weights = coded.codes[:, column], coded.weights
        both = np.concatenate([boost, tune])
        base = smoothed_shares(np.bincount(codes[both], weights[both], levels))
        if np.unique(codes[boost]).size < 2:
            return np.asarray(np.log(base)[codes[rows]])
        model = HistGradientBoostingClassifier(**self._settings(before))
        model.fit(self.features[boost][:, before], codes[boost], sample_weight=weights[boost])
        worth = float(weights[boost].sum())

        def foreseen(staged: NDArray[np.floating], records: Ints) -> Floats:
            """(records,) log share of what happened; one record's worth of the base keeps every share over 0."""
            shares = np.zeros((len(records), levels))
            shares[:, model.classes_] = staged
            mixed = (worth * shares + base) / (worth + 1.0)
            return np.asarray(np.log(mixed[np.arange(len(records)), codes[records]]))

        tuned = [
            float(np.average(foreseen(staged, tune), weights=weights[tune]))
            for staged in model.staged_predict_proba(self.features[tune][:, before])
        ]
        without = np.log(base)
        if float(np.average(without[codes[tune]], weights=weights[tune])) >= max(tuned):
            return np.asarray(without[codes[rows]])
        return foreseen(_stage(model.staged_predict_proba(self.features[rows][:, before]), tuned), rows)

    def _number(self, column: int, before: list[int], rows: Ints, boost: Ints, tune: Ints) -> Floats:
        """Boosting of what a linear regression leaves; on the number itself it would be beaten by that alone."""
        from sklearn.ensemble import HistGradientBoostingRegressor
        from sklearn.linear_model import Ridge

        coded = self.again.coded
        own, weights = coded.values[:, coded.numbers.index(column)], coded.weights
        straight = _straight(coded, before)
        linear = Ridge(alpha=1.0).fit(straight[boost], own[boost], sample_weight=weights[boost])
        left = own - linear.predict(straight)
        model = HistGradientBoostingRegressor(**self._settings(before))
        model.fit(self.features[boost][:, before], left[boost], sample_weight=weights[boost])
        tuned = [
            -float(np.average((left[tune] - staged) ** 2, weights=weights[tune]))
            for staged in model.staged_predict(self.features[tune][:, before])
        ]
        alone = -float(np.average(left[tune] ** 2, weights=weights[tune]))
        away = left[rows]
        if alone < max(tuned):
            away = away - _stage(model.staged_predict(self.features[rows][:, before]), tuned)
        return _log_student(away, -max(alone, *tuned), float(len(tune)))

    def _settings(self, before: list[int]) -> dict[str, Any]:
        coded = self.again.coded
        free = [coded.kinds[each] == "category" and len(coded.levels[each]) <= _CATEGORIES for each in before]
        return {**_TREES, "max_iter": ROUNDS, "early_stopping": False, "categorical_features": free, "random_state": 0}


def _stage(stages: Any, tuned: list[float]) -> Floats:
    """What the best round foresees."""
    best = int(np.argmax(tuned))
    return np.asarray(next(staged for place, staged in enumerate(stages) if place == best))


def _features(coded: Coded) -> Floats:
    """(rows, columns) values of numbers, else positions of levels; a blank of what has a sequence is nan."""
    found = np.array(coded.codes, dtype=np.float64)
    for place, kind in enumerate(coded.kinds):
        if place in coded.numbers:
            found[:, place] = coded.values[:, coded.numbers.index(place)]
        elif coded.has_blank[place] and kind != "category":
            found[found[:, place] == len(coded.levels[place]) - 1, place] = np.nan
    return found


def _straight(coded: Coded, before: list[int]) -> Floats:
    """(rows, terms) for a linear regression: numbers in standard deviations, a term for every level but the first."""
    terms = [np.zeros(len(coded.codes))]
    for place in before:
        if place in coded.numbers:
            values = coded.values[:, coded.numbers.index(place)]
            terms.append((values - values.mean()) / (values.std() or 1.0))
        else:
            terms += [(coded.codes[:, place] == level) * 1.0 for level in range(1, len(coded.levels[place]))]
    return np.column_stack(terms)


def _log_student(away: Floats, variance: float, freedom: float) -> Floats:
    """Log density of a Student t whose squared scale was found from `freedom` records."""
    square = max(variance, np.finfo(np.float64).tiny)
    return np.asarray(
        gammaln(0.5 * (freedom + 1.0))
        - gammaln(0.5 * freedom)
        - 0.5 * np.log(np.pi * freedom * square)
        - 0.5 * (freedom + 1.0) * np.log1p(away * away / (freedom * square))
    )
