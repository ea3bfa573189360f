"""Do the records, counted directly, agree with the model about the pinned group?"""

from __future__ import annotations

import math

from engine.answering.answer import Caution, Counted, Marginal
from engine.doubting.case import Case, Found, named, per_cent, rounded
from engine.records.intervals import wilson
from engine.records.table import SMALL_COUNT

COVERAGE = 0.90
ENOUGH = 100  # records: among fewer, a share that chance explains is not worth knowing
DEVIATION = 1.6448536269514722  # the standard normal deviate that leaves 5 % on each side


def check(case: Case) -> Found | None:
    """Tell where the counted share of an outcome lies outside the model's interval for the same group.

    Weakens when the model's share lies outside the count's own interval too (Wilson 1927), so that chance among so
    many records is no likely reason; else worth knowing, of ENOUGH records or more: among fewer the two often part.
    """
    readings = [case.answer[column] for column in case.asked.watch]
    counts = [(reading.column, reading.among, case.count(reading.column)) for reading in readings]
    compared = [(column, among, count) for column, among, count in counts if count is not None]
    if not compared or not case.network.drawable:
        return None
    return tuple(caution for column, among, count in compared for caution in _caution(case, column, among, count))


def _caution(case: Case, column: str, among: Marginal, count: Counted) -> list[Caution]:
    if count.mean is not None and among.number is not None:
        return _of_mean(case, column, among, count, count.mean)
    levels = case.in_question(column)
    low, high = among.interval(levels, COVERAGE)
    share = sum(count.shares[level] for level in levels)
    held = share * count.rows  # with weights, what they make of the count
    if low <= share <= high:
        return []
    at_least, at_most = wilson(held, count.rows)
    said = among.share(levels)
    by_chance = at_least <= said <= at_most
    if by_chance and count.rows < ENOUGH:
        return []
    text = (
        f"of {case.these} have {column} = {named(levels, 'or')} when counted; "
        f"the model says {per_cent(said)}, between {per_cent(low)} and {per_cent(high)}."
    )
    do = "For how things are, go by the count; on the Model page, see whether more links bring the two together."
    figures = {"counted": share, "model": said, "low": low, "high": high, "rows": count.rows}
    return [
        Caution(
            "know" if by_chance else "weakens",
            "counted",
            _counted(held, count.rows),
            text,
            do,
            figures,
            (column, *case.asked.pinned),
        )
    ]


def _of_mean(case: Case, column: str, among: Marginal, count: Counted, mean: float) -> list[Caution]:
    """The same of a number's mean; its own interval is the normal one around it."""
    low, high = among.interval(None, COVERAGE)
    if low <= mean <= high:
        return []
    by_chance = abs(among.mean - mean) <= DEVIATION * among.sd / math.sqrt(count.rows)
    if by_chance and count.rows < ENOUGH:
        return []
    text = (
        f"is the mean of {column} when {case.these} are counted; the model says {rounded(among.mean)}, between "
        f"{rounded(low)} and {rounded(high)}."
    )
    do = "For how things are, go by the count; on the Model page, see whether more links bring the two together."
    figures = {"counted": mean, "model": among.mean, "low": low, "high": high, "rows": count.rows}
    rank = "know" if by_chance else "weakens"
    return [Caution(rank, "counted", rounded(mean), text, do, figures, (column, *case.asked.pinned))]


def _counted(held: float, rows: int) -> str:
    """A counted share as a figure, without giving away a count under the limit."""
    if 0 < held < SMALL_COUNT:
        return f"under {SMALL_COUNT}"
    if 0 < rows - held < SMALL_COUNT:
        return "nearly all"
    return per_cent(held / rows)
