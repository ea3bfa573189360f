"""Can a blank, taken as a level of its own, hide part of what the question is about?"""

from __future__ import annotations

import math

import numpy as np

from engine.answering.answer import Caution
from engine.answering.counting import Records
from engine.doubting.case import Case, Found, named, per_cent
from engine.records.table import SMALL_COUNT

SHOWN = 3


def check(case: Case) -> Found | None:
    """Tell of blanks in the levers, the columns in question, those on a directed path between, and the levers' causes.

    Records that are alike but for a value nobody wrote down share a level, so that what runs through the column is
    seen only in part (missing data as a category: Greenland & Finkle 1995).
    """
    if case.records is None:
        return None
    rows = case.records.rows
    held = {column: _blanks(case.records, column) for column in _concerned(case) if case.network.node(column).has_blank}
    told = sorted((column for column in held if held[column]), key=lambda column: -held[column])
    if not told:
        return ()
    first, *others = told
    shown = [first, *(f"{_figure(held[column], rows)} of {column}" for column in others[: SHOWN - 1])]
    if len(told) > SHOWN:
        shown.append(f"part of {len(told) - SHOWN} more")
    text = (
        f"of {named(shown)} {'are blank, and a blank' if others else 'is blank and'} is taken as a level of its own, "
        f"which can hide part of {'their' if others else 'its'} influence."
    )
    do = f"Say on the Records page what a blank means {'in each of them' if others else 'there'}."
    figures = {"share blank": held[first] / rows, "columns": len(told)}
    return (Caution("know", "blanks", _figure(held[first], rows), text, do, figures, tuple(told)),)


def _concerned(case: Case) -> tuple[str, ...]:
    watch = set(case.asked.watch)
    if case.asked.working:  # what no lever moves is not what the question is about
        watch &= case.network.descendants(case.levers)
    moved = case.network.descendants(case.levers)
    between = {column for column in moved if case.network.descendants([column]) & watch}
    causes = {parent for lever in case.levers for parent in case.network.node(lever).parents}
    wanted = watch | between | causes | case.levers.keys()
    return tuple(column for column in case.network.names if column in wanted)


def _blanks(records: Records, column: str) -> int:
    """Records in which the column is blank; a blank's level stands last."""
    return int(np.count_nonzero(records.codes(column) == len(records.levels(column)) - 1))


def _figure(held: int, rows: int) -> str:
    """A share as a figure, without giving away a count under the limit."""
    if held < SMALL_COUNT:
        return f"under {math.ceil(100 * SMALL_COUNT / rows)}%"
    if 0 < rows - held < SMALL_COUNT:
        return "nearly all"
    return per_cent(held / rows)
