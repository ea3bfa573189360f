"""What every check looks at: a question, its answer, and what stands behind them; and how cautions put figures."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.answering.answer import Answer, Caution, Counted
from engine.answering.counting import Records
from engine.answering.question import Question
from engine.answering.settings import AnySetting
from engine.doubting.aims import Aim, aim
from engine.doubting.rereading import Rereading
from engine.learning.cap import Capped
from engine.network.network import Network
from engine.order import Order, better_levels
from engine.records.table import SMALL_COUNT
from engine.records.wording import figure, listing

Found = tuple[Caution, ...]
Check = Callable[["Case"], Found | None]  # None: this check cannot be made of this question
MANY = 100  # records: among so many every whole per cent can occur, so that none of them tells their number


@dataclass(frozen=True, eq=False)
class Case:
    """A question that was asked of a model, and its answer.

    order and records are None for a network given as it is.  unsettled: links whose direction the support leaves open.
    capped: columns that want more parents than learning allowed; None where no such limit is known.
    beside: the question beside the unrecorded causes that were stated, None without any.
    """

    network: Network
    order: Order | None
    records: Records | None
    asked: Question
    answer: Answer
    unsettled: frozenset[tuple[str, str]] = frozenset()
    capped: tuple[Capped, ...] | None = None
    beside: Rereading | None = None

    @cached_property
    def matching(self) -> np.ndarray:
        """(rows that match,) positions of the records that match every pin; empty without records."""
        return np.empty(0, dtype=np.intp) if self.records is None else self.records.matching(self.asked.before)

    @property
    def these(self) -> str:
        """The matching records after "of", with their number where it may be told: these 412 records."""
        if not self.asked.pinned:
            return f"all {self.matching.size:,} records"
        if self.answer.matching_told:
            return f"these {self.matching.size:,} records"
        rows = 0 if self.records is None else self.records.rows
        return "nearly all records" if 0 < rows - self.matching.size < SMALL_COUNT else "these records"

    def out_of_these(self, part: int) -> str:
        """So many of the matching records as a figure, which "records" follows."""
        rows = self.matching.size
        if self.answer.matching_told:
            return out_of(part, rows)
        if part == rows:
            return "all"
        return "nearly all" if rows - part < SMALL_COUNT <= rows else "most" if 2 * part > rows else "some"

    def count(self, column: str) -> Counted | None:
        """What the matching records hold, for their shares: also where only their number may not be told."""
        told = self.answer[column].counted
        if told is None and self.records is not None and self.matching.size >= MANY:
            return self.records.count(column, self.matching)
        return told

    def in_question(self, column: str) -> tuple[str, ...]:
        """The better levels of an outcome, else the commonest level of the group."""
        better = None if self.order is None else self.order.outcomes.get(column)
        shares = self.answer[column].among.shares
        found = better_levels(better, tuple(shares), self.network.node(column).has_blank)
        return found or (max(shares, key=lambda level: shares[level]),)

    @cached_property
    def levers(self) -> dict[str, AnySetting]:
        """The levers that reach anyone and move a column in question other than themselves."""
        return self._moving(self.asked.working)

    @cached_property
    def aims(self) -> dict[str, Aim]:
        """What each of the levers would make of every record; empty without records."""
        return self._aimed(self.levers)

    @cached_property
    def aims_against(self) -> dict[str, Aim]:
        """The same of the levers that are held against."""
        reaching = {column: setting for column, setting in (self.asked.against or {}).items() if setting.reach > 0.0}
        return self._aimed(self._moving(reaching))

    @property
    def every_aim(self) -> tuple[Aim, ...]:
        return (*self.aims.values(), *self.aims_against.values())

    def _moving(self, settings: Mapping[str, AnySetting]) -> dict[str, AnySetting]:
        watch = set(self.asked.watch)
        return {column: each for column, each in settings.items() if self.network.descendants([column]) & watch}

    def _aimed(self, settings: Mapping[str, AnySetting]) -> dict[str, Aim]:
        if self.records is None:
            return {}
        records = self.records
        return {column: aim(self.network, records, column, setting) for column, setting in settings.items()}


def out_of(part: int, whole: int) -> str:
    """A count among others as a figure, without giving away a count under the limit."""
    if whole < SMALL_COUNT:
        return "all" if part == whole else "some"
    if 0 < part < SMALL_COUNT:
        return f"under {SMALL_COUNT} of {whole:,}"
    if 0 < whole - part < SMALL_COUNT:
        return f"nearly all of {whole:,}"
    return f"{part:,} of {whole:,}"


def named(names: Iterable[str], joint: str = "and") -> str:
    """Names in a sentence: "a", "a and b", "a, b and c"."""
    return listing(list(names), None, joint)


def rounded(value: float, digits: int = 4) -> str:
    """A number to so many digits, as people read it."""
    return figure(float(f"{value:.{digits}g}"))


def per_cent(share: float) -> str:
    """A share as a figure, never rounded to nothing or to all."""
    if 0.0 < share < 0.01:
        return "under 1%"
    if 0.99 < share < 1.0:
        return "over 99%"
    return f"{100.0 * share:.0f}%"
