"""How many records stand behind the pinned group?"""

from __future__ import annotations

from engine.answering.answer import Caution
from engine.doubting.case import Case, Found
from engine.records.table import SMALL_COUNT

FEW = 30  # records: below this a share counted directly is uncertain by about 15 points or more


def check(case: Case) -> Found | None:
    """No record behind the pins blocks what a lever would do; under the small-count limit weakens; few are told."""
    if case.records is None or not case.asked.pinned:
        return None
    rows = int(case.matching.size)
    several = len(case.asked.pinned) > 1
    values = "all of these values" if several else "this value"
    do = (
        "Take out a pin to ask about a wider group." if several else "Take the pin out, or pin several values together."
    )
    columns = tuple(case.asked.pinned)
    figures = {"rows": rows}
    if rows == 0 and case.levers:
        text = f"has {values}, so what setting {' and '.join(case.levers)} would do for them is not in the records."
        return (Caution("blocks", "thin", "no record", text, do, figures, columns),)
    if rows == 0:
        text = f"has {values}, so the answer comes from the model alone."
        return (Caution("weakens", "thin", "no record", text, do, figures, columns),)
    if rows < SMALL_COUNT:
        text = f"records have {values}, so the answer leans on the model alone."
        return (Caution("weakens", "thin", f"under {SMALL_COUNT}", text, do, figures, columns),)
    if rows < FEW:
        text = f"records have {values}; for so few the answer leans mostly on the model."
        figure = f"{rows}" if case.answer.matching_told else f"under {FEW}"
        return (Caution("know", "thin", figure, text, do, figures, columns),)
    return ()
