"""Would a lever take a number to where none was recorded?"""

from __future__ import annotations

import numpy as np

from engine.answering.answer import Caution
from engine.doubting.case import Case, Found, per_cent, rounded
from engine.network.nodes import Number

WEAKENS_FROM = 0.05  # share of the records asked about; common practice, no source
RANGE = (0.01, 0.99)  # quantiles of the records that are called their range: single extremes say little


def check(case: Case) -> Found | None:
    """Weakens when a number would be set, or shifted, beyond the range recorded: there a straight line is alone."""
    numbers = [aimed for aimed in case.every_aim if isinstance(case.network.node(aimed.column), Number)]
    if case.records is None or not numbers or not case.matching.size:
        return None
    found = []
    for aimed in numbers:
        column = aimed.column
        low, high = np.quantile(case.records.values(column), RANGE)
        asked = case.matching[aimed.concerned[case.matching]]
        beyond = 0.0
        for way in aimed.ways:
            assert way.values is not None
            values = way.values[asked]
            beyond += way.share * float(((values < low) | (values > high)).mean()) if asked.size else 0.0
        if beyond < WEAKENS_FROM:
            continue
        text = (
            f"of the records asked about would have {column} outside {rounded(low, 3)} to {rounded(high, 3)}, "
            f"where 98% of the records lie. Beyond, the model's straight lines run on without any to hold them."
        )
        do = f"Set {column} to where there are records."
        figures = {"share beyond": beyond, "low": float(low), "high": float(high)}
        found.append(Caution("weakens", "outside", per_cent(beyond), text, do, figures, (column,)))
    return tuple(found)
