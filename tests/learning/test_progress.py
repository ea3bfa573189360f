"""How far learning is: fractions that go by the work of each step."""

import numpy as np
import pytest

from engine.learning.families import candidates
from engine.learning.progress import Saying
from engine.order import Order
from engine.records.counts import ArrayCounts


def saying(stages, told, rows=100):
    names = [f"c{place}" for place in range(sum(stages))]
    ends = np.cumsum(stages)
    order = Order([(f"s{end}", names[end - width : end]) for end, width in zip(ends, stages, strict=True)])
    counts = ArrayCounts(np.zeros((rows, len(names)), dtype=np.int32), [2] * len(names))
    return Saying(lambda fraction, words: told.append(fraction), counts, None, candidates(order, 3), 3)


def test_in_a_wide_stage_finding_the_best_model_takes_more_of_the_bar_than_weighing_all():
    told = []
    say = saying([18], told)
    for words in ("Counting", "Finding", "Weighing", "Trying"):
        say.begin(words)
    _counting, finding, weighing = np.diff(told)
    assert 1.2 * weighing < finding < 4.0 * weighing  # 1.9 s and .9 s where it was measured


def test_in_narrow_stages_weighing_takes_more():
    told = []
    say = saying([10, 10], told)
    for words in ("Counting", "Finding", "Weighing", "Trying"):
        say.begin(words)
    _counting, finding, weighing = np.diff(told)
    assert weighing > 5.0 * finding  # 2.0 s and .14 s


def test_the_last_step_is_counted_as_long_as_it_is_found_to_be_and_nothing_goes_back():
    told = []
    say = saying([4, 4], told)
    say.begin("Counting")
    say.begin("Finding")
    before = told[-1]
    say.expect_of_last(1e3)
    say.begin("Weighing")
    assert told[-1] >= before
    say.begin("Trying")
    assert told[-1] == pytest.approx(before, abs=0.01)
    say.within(0.5)
    assert told[-1] == pytest.approx(0.5, abs=0.01)
    say.finish()
    assert told[-1] == 1.0
