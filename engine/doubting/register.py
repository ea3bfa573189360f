"""Every check, in the order in which cautions of one rank are told. A new one joins with one line."""

from __future__ import annotations

from engine.answering.answer import Caution
from engine.doubting import blanks, cap, counted, direction, models, outside, overlap, sampled, thin, unidentified
from engine.doubting.case import Case, Check

CHECKS: tuple[Check, ...] = (
    unidentified.check,
    sampled.check,
    overlap.check,
    outside.check,
    thin.check,
    direction.check,
    cap.check,
    models.check,
    counted.check,
    blanks.check,
)
RANKS = ("blocks", "weakens", "know")


def cautions(case: Case) -> tuple[tuple[Caution, ...], int]:
    """The cautions about an answer, those that block first, and how many checks could be made of it."""
    results = [found for found in (check(case) for check in CHECKS) if found is not None]
    every = [caution for found in results for caution in found]
    return tuple(sorted(every, key=lambda caution: RANKS.index(caution.rank))), len(results)
