"""Straight from the records: who matches the pins, and what was recorded of them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cached_property

import numpy as np

from engine.answering.answer import Counted
from engine.records.table import SMALL_COUNT, Coded


class Records:
    """The coded records behind a model, for counting: never for estimating."""

    def __init__(self, coded: Coded) -> None:
        self.coded = coded
        self._place = {name: place for place, name in enumerate(coded.names)}

    @property
    def rows(self) -> int:
        return int(self.coded.codes.shape[0])

    @cached_property
    def _all(self) -> Mapping[str, Counted]:
        every = np.arange(self.rows)
        return {name: self._count(name, every) for name in self.coded.names}

    def codes(self, column: str) -> np.ndarray:
        """(rows,) level positions of a column."""
        return self.coded.codes[:, self._place[column]]

    def levels(self, column: str) -> tuple[str, ...]:
        return self.coded.levels[self._place[column]]

    def matching(self, pins: Mapping[str, frozenset[int]]) -> np.ndarray:
        """(rows that match,) positions of the records that match every pin."""
        found = np.arange(self.rows)
        for column, wanted in pins.items():
            allowed = np.zeros(len(self.levels(column)), dtype=bool)
            allowed[list(wanted)] = True
            found = found[allowed[self.codes(column)[found]]]
        return found

    def counted(self, columns: Iterable[str], matching: np.ndarray) -> dict[str, Counted | None]:
        """What the matching records hold, column by column; None under the small-count limit."""
        if matching.size < SMALL_COUNT:
            return dict.fromkeys(columns)
        if matching.size == self.rows:
            return {column: self._all[column] for column in columns}
        return {column: self._count(column, matching) for column in columns}

    def _count(self, column: str, rows: np.ndarray) -> Counted:
        levels = self.levels(column)
        counts = np.bincount(self.codes(column)[rows], minlength=len(levels))
        return Counted(int(rows.size), {level: int(count) for level, count in zip(levels, counts, strict=True)})
