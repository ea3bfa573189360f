"""The rule of "does it describe these records well enough?": four tests, outcomes only."""

from __future__ import annotations

from collections.abc import Sequence

from engine.judging.calibration import TENTHS
from engine.judging.judgement import ColumnScore, Reliability, Test, Verdict
from engine.judging.missed import Dependences
from engine.records.wording import listing
from engine.refusal import quoted

TRUE = 9  # tenths, of ten, that must agree
ENOUGH = 0.75  # of the yardstick's gain


def tests(
    scores: Sequence[ColumnScore], reliability: Sequence[Reliability], dependences: Dependences
) -> tuple[Test, ...]:
    """The four, in their order; none without an outcome."""
    outcomes = [each for each in scores if each.outcome]
    if not outcomes:
        return ()
    said = [each for each in reliability if each.outcome]
    return (_better(outcomes), _come_true(said), _yardstick(outcomes), _missed(dependences))


def verdict(found: Sequence[Test]) -> Verdict | None:
    """Yes when all are met, no when the first is not, else in part."""
    if not found:
        return None
    return "yes" if all(each.met for each in found) else "in part" if found[0].met else "no"


def ahead(score: ColumnScore) -> bool:
    """Whether an outcome is foreseen better than by its base rate, beyond chance: its 90% interval lies above 0."""
    return score.gain.low > 0.0


def enough(score: ColumnScore) -> bool:
    """Whether it gains at least ENOUGH of what the yardstick gains."""
    return score.yardstick is None or score.gain.mean >= ENOUGH * score.yardstick.mean


def comes_true(reliability: Reliability) -> bool:
    """Whether said and seen agree in nine of ten tenths, or as many of the parts there are."""
    return reliability.agree >= len(reliability.tenths) - (TENTHS - TRUE)


def _better(outcomes: Sequence[ColumnScore]) -> Test:
    held = [each for each in outcomes if ahead(each)]
    text = "outcomes are predicted better than from their base rates, on records held out of the learning"
    behind = [quoted(each.column) for each in outcomes if not ahead(each)]
    if behind:
        text += f"; {listing(behind, None)} {'is' if len(behind) == 1 else 'are'} not"
    return Test("base rates", not behind, len(held), len(outcomes), f"{text}.")


def _come_true(said: Sequence[Reliability]) -> Test:
    held = sum(comes_true(each) for each in said)
    counts = listing([f"{quoted(each.column)} in {each.agree}" for each in said], None)
    text = (
        f"outcomes come true about as often as said, within what chance allows, in at least {TRUE} of {TENTHS} tenths"
    )
    return Test("come true", held == len(said), held, len(said), f"{text}: {counts}.")


def _yardstick(outcomes: Sequence[ColumnScore]) -> Test:
    held = sum(enough(each) for each in outcomes)
    gains = [
        f"{quoted(each.column)} {points(each.gain.mean)} of {points(each.yardstick.mean)}"
        for each in outcomes
        if each.yardstick is not None
    ]
    text = "outcomes gain at least three quarters of what the yardstick gains"
    told = f": {listing(gains, None)} score points" if gains else "; no column may come before them"
    return Test("yardstick", held == len(outcomes), held, len(outcomes), f"{text}{told}.")


def _missed(dependences: Dependences) -> Test:
    found = [each for each in dependences.missed if each.counts]
    verb = (
        "dependence between a changeable column and an outcome is"
        if len(found) == 1
        else ("dependences between a changeable column and an outcome are")
    )
    return Test("missed", not found, len(found), 0, f"{verb} missed; none may be.")


def points(nats: float) -> str:
    """A gain in score points, hundredths of a nat per record; one decimal under 10."""
    value = 100.0 * nats
    told = f"{value:.1f}" if abs(value) < 9.95 else f"{value:,.0f}"
    return "0" if float(told.replace(",", "")) == 0.0 else told.removesuffix(".0").replace("-", "−")
