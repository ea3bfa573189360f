"""Straight from the records: who matches the pins, and what was recorded of them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cached_property

import numpy as np

from engine.answering.answer import Counted
from engine.answering.pins import Pins
from engine.records.small_counts import hidden_levels
from engine.records.table import SMALL_COUNT, Coded


class Records:
    """The coded records behind a model, for counting: never for estimating."""

    def __init__(self, coded: Coded) -> None:
        self.coded = coded
        self._place = {name: place for place, name in enumerate(coded.names)}
        self._numbers = {coded.names[place]: at for at, place in enumerate(coded.numbers)}

    @property
    def rows(self) -> int:
        return int(self.coded.codes.shape[0])

    @cached_property
    def _all(self) -> Mapping[str, Counted]:
        every = np.arange(self.rows)
        return {name: self.count(name, every) for name in self.coded.names}

    def codes(self, column: str) -> np.ndarray:
        """(rows,) level positions of a column."""
        return self.coded.codes[:, self._place[column]]

    def values(self, column: str) -> np.ndarray:
        """(rows,) values of a column learned as a number."""
        return self.coded.values[:, self._numbers[column]]

    def levels(self, column: str) -> tuple[str, ...]:
        return self.coded.levels[self._place[column]]

    def matching(self, pins: Pins) -> np.ndarray:
        """(rows that match,) positions of the records that match every pin."""
        found = np.arange(self.rows)
        for column, wanted in pins.positions.items():
            allowed = np.zeros(len(self.levels(column)), dtype=bool)
            allowed[list(wanted)] = True
            found = found[allowed[self.codes(column)[found]]]
        for column, value in pins.values.items():
            found = found[self.values(column)[found] == value]
        for column, (low, high) in pins.ranges.items():
            values = self.values(column)[found]
            found = found[(low <= values) & (values < high)]
        return found

    def tellable(self, pins: Pins, matching: np.ndarray) -> bool:
        """Whether the number of matching records may be told: neither it nor what it leaves out is a small count.

        Of a column with a small level, a pin takes in all of the levels that are hidden with it, or none: the counts of
        two questions, one of each kind of level, would otherwise leave the small one. That is looked at over all
        records, and again among those that match the other pins. So is what a value or a range of a number takes, or
        leaves, of each of its bands.
        """
        if 0 < matching.size < SMALL_COUNT or 0 < self.rows - matching.size < SMALL_COUNT:
            return False
        if matching.size == 0:
            return True
        for column, wanted in pins.positions.items():
            among = self._hidden_among(column, self.matching(pins.without(column)))
            if not _whole(self._hidden[column], wanted) or not _whole(among, wanted):
                return False
        return not any(self._gives_away(column, pins, matching) for column in (*pins.values, *pins.ranges))

    def _gives_away(self, column: str, pins: Pins, matching: np.ndarray) -> bool:
        """Whether the part of a band that matches, or the rest of it, is a small count."""
        bands = len(self.levels(column))
        every = np.bincount(self.codes(column)[self.matching(pins.without(column))], minlength=bands)
        held = np.bincount(self.codes(column)[matching], minlength=bands)
        left = every - held
        return bool(np.any((held > 0) & (held < SMALL_COUNT)) or np.any((left > 0) & (left < SMALL_COUNT) & (held > 0)))

    def counted(self, columns: Iterable[str], pins: Pins, matching: np.ndarray) -> dict[str, Counted | None]:
        """What the matching records hold, column by column; None where none match or their number is not told."""
        if matching.size == 0 or not self.tellable(pins, matching):
            return dict.fromkeys(columns)
        if matching.size == self.rows:
            return {column: self._all[column] for column in columns}
        return {column: self.count(column, matching) for column in columns}

    @cached_property
    def _hidden(self) -> dict[str, frozenset[int]]:
        """column -> positions of its levels whose counts over all records are hidden."""
        return {name: self._hidden_among(name, np.arange(self.rows)) for name in self.coded.names}

    def _hidden_among(self, column: str, rows: np.ndarray) -> frozenset[int]:
        counts = np.bincount(self.codes(column)[rows], minlength=len(self.levels(column)))
        return frozenset(hidden_levels(counts.tolist()))

    def count(self, column: str, rows: np.ndarray) -> Counted:
        """What some of the records hold, whether or not it may be told; shares and means by the records' weights."""
        levels = self.levels(column)
        codes = self.codes(column)[rows]
        counts = np.bincount(codes, minlength=len(levels))
        weights = self.coded.weights[rows]
        mean, weighed = None, None
        if column in self._numbers and weights.sum() > 0.0:
            mean = float(np.average(self.values(column)[rows], weights=weights))
        if self._weighted and weights.sum() > 0.0:
            shares = np.bincount(codes, weights=weights, minlength=len(levels)) / weights.sum()
            weighed = {level: float(share) for level, share in zip(levels, shares, strict=True)}
        return Counted(
            int(rows.size),
            {level: int(count) for level, count in zip(levels, counts, strict=True)},
            frozenset(levels[place] for place in self._hidden[column] | frozenset(hidden_levels(counts.tolist()))),
            mean,
            weighed,
        )

    @cached_property
    def _weighted(self) -> bool:
        """Whether some records count for more than others."""
        weights = self.coded.weights
        return bool(weights.size and np.any(weights != weights[0]))


def _whole(hidden: frozenset[int], wanted: frozenset[int]) -> bool:
    """Whether these levels hold all hidden levels, or none."""
    return not hidden & wanted or hidden <= wanted
