"""What a card of the Records page shows of its column: a histogram and a few words, made once for a table."""

from __future__ import annotations

from dataclasses import dataclass
from weakref import WeakKeyDictionary

from markupsafe import Markup

from app.drawing import histogram
from app.wording import columns as wording
from app.wording.amounts import count, plural
from engine.records.table import SMALL_COUNT, Column, Table


@dataclass(frozen=True)
class Picture:
    """told: levels or range.  acts: what the column is taken as and how it acts, where levels do not tell it.

    warnings: that go with hidden counts.
    """

    histogram: Markup
    told: str
    acts: str = ""
    warnings: tuple[str, ...] = ()


_known: WeakKeyDictionary[Table, dict[str, Picture]] = WeakKeyDictionary()


def picture(table: Table, name: str) -> Picture:
    """The picture of the column `name`; it is kept as long as the table is."""
    known = _known.setdefault(table, {})
    if name not in known:
        known[name] = _made(table, table.columns[name])
    return known[name]


def _made(table: Table, column: Column) -> Picture:
    match column.kind:
        case "left out":
            different = int(table.frame[column.name].nunique())
            return Picture(histogram.plain(), f"{count(different)} different {plural(different, 'value')}")
        case "group":
            return Picture(histogram.plain(), wording.groups(column, SMALL_COUNT), wording.GROUP)
        case "weight":
            assert column.values is not None
            return Picture(histogram.number(column.values, SMALL_COUNT), wording.span(column), wording.WEIGHT)
    counts = wording.shown(wording.level_counts(column), SMALL_COUNT)
    under = wording.small_levels(column, counts, SMALL_COUNT)
    warnings = (under,) if under else ()
    if column.kind == "number" and column.values is not None:
        drawn = histogram.number(column.values, SMALL_COUNT, column.cuts)
        return Picture(drawn, wording.span(column), wording.acts(column), warnings)
    drawn = histogram.levels(counts.counts, counts.together)
    return Picture(drawn, wording.levels(column, counts, SMALL_COUNT), warnings=warnings)
