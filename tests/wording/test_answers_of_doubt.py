"""Sentences whose interval is over sampled models, and how the interval was come by."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from app.question import Question
from app.wording.answers import also_sentence
from app.wording.computed import intervals
from app.wording.estimates import estimates, level_estimates
from app.wording.parts import plain
from engine.answering.answer import Answer, Doubt, Reading
from tests.wording.test_answers import MENTOR, NIGHTS, NODES, YES, fixed, marginal, said

STEADY = np.full(1001, 0.54)


def reading(low, high, after=0.63):
    """A share among these of 54 %, and if set, whose change has the interval low to high."""
    change = np.linspace(low - (high - low) / 18, high + (high - low) / 18, 1001)
    return Reading("passed", marginal(0.61, 0.04), fixed(0.54, STEADY), fixed(after, STEADY + change))


def doubted(over, within):
    return estimates(over, YES, within)


def test_the_sentence_quotes_the_interval_over_sampled_models():
    figures = doubted(reading(0.01, 0.17), reading(0.04, 0.14))
    assert said(Question(NIGHTS, MENTOR), figures).endswith(
        "would move passed from 54% to 63% (+9 points, 90% interval +1 to +17)."
    )
    what, words = also_sentence(Question(NIGHTS, MENTOR), "passed", YES, figures, NODES, False)
    assert plain(what) + plain(words) == "passed from 54% to 63% (+9 points, 90% interval +1 to +17)"


def test_an_interval_over_sampled_models_that_holds_nothing_says_may_not():
    figures = doubted(reading(-0.02, 0.17), reading(0.04, 0.14))
    assert "may not move passed: from 54% to 63%" in said(Question(NIGHTS, MENTOR), figures)


def test_what_the_accepted_model_cannot_move_is_told_with_what_others_say():
    figures = doubted(reading(0.0, 0.05, after=0.54), reading(0.0, 0.0, after=0.54))
    text = said(Question(NIGHTS, MENTOR), figures, apart=["mentor"])
    assert "nothing in this model leads from one to the other" in text
    assert "(passed stays at 54% in this model; 90% interval over sampled models 0 to +5 points)" in text


def test_the_narrower_interval_is_kept_as_far_as_it_lies_inside():
    inside = doubted(reading(0.01, 0.17), reading(0.04, 0.14)).set
    assert inside.low < inside.inner[0] < inside.inner[1] < inside.high
    outside = doubted(reading(0.04, 0.14), reading(0.01, 0.17)).set
    assert outside.inner == (outside.low, outside.high)
    assert estimates(reading(0.04, 0.14), YES).set.inner is None
    rows = level_estimates(marginal(0.6, 0.2), marginal(0.6, 0.1))
    assert [(row.low < row.inner[0], row.inner[1] < row.high) for row in rows] == [(True, True)] * 2


@pytest.mark.parametrize(
    ("doubt", "words"),
    [
        (Doubt(50, 50, 50.0), "intervals over 50 sampled models, with 20 draws each"),
        (Doubt(50, 16, 50.0), "intervals over 50 sampled models, 16 of them different, with 20 draws each"),
        (Doubt(50, 50, 31.4), "intervals over 50 sampled models, worth 31 independent ones, with 20 draws each"),
        (Doubt(1, 1, 1.0), "intervals over 1 sampled model, with 20 draws each"),
        (Doubt(50, 50, 50.0, left_out=50), "intervals hold 90% of 200 plausible versions of this model’s figures"),
    ],
)
def test_how_the_interval_was_come_by_is_told(doubt, words):
    bare = Answer(("passed",), {}, "exact", 0.0, 0.0, 0.0)
    assert intervals(replace(bare, doubt=doubt), 200, 20).startswith(words)
    assert "leave out the doubt about its links" in intervals(bare, 200, 20)
