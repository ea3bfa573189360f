"""Do enough sampled particles carry an answer that could not be summed exactly?"""

from __future__ import annotations

import math

from engine.answering.answer import Caution
from engine.answering.weighed import FEW, FEWEST
from engine.doubting.case import Case, Found


def check(case: Case) -> Found | None:
    """Weakens under FEW effective particles (Kish 1965), and blocks under FEWEST, which cannot tell their own error."""
    effective = case.answer.effective
    if math.isinf(effective):
        return None
    if effective >= FEW:
        return ()
    blocks = effective < FEWEST
    text = (
        "sampled particles are what this answer rests on: what is pinned is so unlikely in this model that nearly none "
        f"of those drawn fits it. {'So few cannot tell how far off they are.' if blocks else 'Its figures are rough.'}"
    )
    do = "Pin a wider range, or take a pin out."
    return (
        Caution(
            "blocks" if blocks else "weakens",
            "sampled",
            f"{max(effective, 1.0):.0f}",
            text,
            do,
            {"effective": effective, "error": case.answer.mc_error},
            case.asked.pinned or case.asked.watch,
        ),
    )
