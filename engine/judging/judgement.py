"""What was found out about a model, as one value."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from engine.judging.blank import Blank
from engine.judging.calibration import Brier, Tenth
from engine.judging.gains import Gain
from engine.judging.missed import Dependences
from engine.judging.thin import Thin

Verdict = Literal["yes", "in part", "no"]


@dataclass(frozen=True)
class ColumnScore:
    """How well one column is foreseen on records held out of learning.

    linked: whether the model has a link to it.  gain: over the base rate.  yardstick: the black box's gain, on the
    same folds and the columns that may come before; None where it was not tried.  lead: yardstick less model.
    """

    column: str
    stage: str
    outcome: bool
    changeable: bool
    linked: bool
    base: float
    gain: Gain
    yardstick: Gain | None = None
    lead: Gain | None = None


@dataclass(frozen=True)
class Reliability:
    """Whether what is said of an outcome, or of a number, comes true on records held out of learning.

    levels: whose share is said, the better ones; empty for a number, of which each tenth of what was foreseen should
    hold a tenth of the records.  tenths: what was said and seen.  brier, log_loss: of `levels`; None for a number.
    """

    column: str
    outcome: bool
    levels: tuple[str, ...]
    tenths: tuple[Tenth, ...]
    brier: Brier | None = None
    log_loss: float | None = None

    @property
    def agree(self) -> int:
        """Tenths in which said and seen differ by no more than chance allows."""
        return sum(each.agrees for each in self.tenths)


@dataclass(frozen=True)
class Test:
    """One of the four parts of the rule.

    code: "base rates", "come true", "yardstick" or "missed".  held, of: how many outcomes pass; for "missed" the
    number missed, and of 0.  text: what is tested and found, in a sentence.
    """

    __test__ = False  # no test of pytest

    code: str
    met: bool
    held: int
    of: int
    text: str


@dataclass(frozen=True)
class Judgement:
    """Does a model describe the records it was learned from well enough?

    verdict: "yes" when all four tests are met, "no" when the first is not, else "in part"; None without an outcome.
    It cannot say whether the order is right.  links, rows, parts: of the model, the records, the parts held out.
    unmeasured: columns for which no yardstick was tried, to save work.
    """

    verdict: Verdict | None
    tests: tuple[Test, ...]
    links: int
    rows: int
    parts: int
    columns: tuple[ColumnScore, ...]
    unmeasured: tuple[str, ...]
    reliability: tuple[Reliability, ...]
    dependences: Dependences
    thin: tuple[Thin, ...]
    blanks: tuple[Blank, ...]
    digest: str
