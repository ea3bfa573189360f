"""Judging learned models: every figure against a plain computation, and what is found in worlds that are known."""

import json

import numpy as np
import pandas as pd
import pytest
from sklearn.metrics import log_loss

import engine
from engine.judging.archive import as_text, from_text
from engine.judging.relearned import relearned
from engine.judging.rule import verdict
from engine.judging.yardstick import Yardstick
from engine.learning.folds import folds
from tests.judging.schools import school


@pytest.fixture(scope="module")
def judged():
    table, order = school(1_500, 0)
    learned = engine.learn(table, order, graphs=1)
    return table, learned, engine.judge(learned, table)


def test_held_out_scores_are_those_of_models_learned_without_the_part(judged):
    """By a second way: learn from the frame without the part, score the part's rows with the model's own method."""
    table, learned, judgement = judged
    part = folds(table.rows, learned.seed)
    chosen = {score.column: score for score in judgement.columns}
    own, base = np.empty(table.rows), np.empty(table.rows)
    for each in range(5):
        rest = engine.Table.from_frame(table.frame[part != each].reset_index(drop=True))
        again = engine.learn(rest, learned.order, graphs=1, folds=False)
        size = max(links for links in again.chosen if links <= judgement.links)
        shares = again.model(size).predict(table.frame[part == each][["shift", "distance", "mentor"]], "passed")
        happened = table.frame["passed"][part == each]
        own[part == each] = [np.log(shares.loc[at, level]) for at, level in happened.items()]
        share = predicted_base(rest.frame["passed"])
        base[part == each] = [np.log(share[level]) for level in happened]
    score = chosen["passed"]
    assert score.base == pytest.approx(base.mean(), abs=1e-9)
    assert score.gain.mean == pytest.approx((own - base).mean(), abs=1e-9)
    assert score.gain.se == pytest.approx((own - base).std(ddof=1) / np.sqrt(table.rows), abs=1e-9)


def predicted_base(column):
    """One record spread as the smoothed shares are, added to the counts."""
    counts = column.value_counts()
    smooth = (counts + 1.0 / len(counts)) / (counts.sum() + 1.0)
    return ((counts + smooth) / (counts.sum() + 1.0)).to_dict()


def test_the_log_loss_of_an_outcome_is_that_of_a_general_library(judged):
    table, learned, judgement = judged
    (said,) = judgement.reliability
    again = relearned(learned, judgement.links)
    shares = again.foreseen(learned.coded.names.index("passed"))[:, 1]
    assert said.log_loss == pytest.approx(log_loss(table.frame["passed"] == "yes", shares))
    assert said.brier.score == pytest.approx(((shares - (table.frame["passed"] == "yes")) ** 2).mean())


def test_a_model_of_the_true_structure_passes_all_four_tests(judged):
    judgement = judged[2]
    assert [each.code for each in judgement.tests] == ["base rates", "come true", "yardstick", "missed"]
    assert judgement.verdict == "yes" and all(each.met for each in judgement.tests)


def test_columns_are_told_outcomes_first_then_as_the_order_lists_them(judged):
    assert [each.column for each in judged[2].columns] == ["passed", "shift", "distance", "mentor"]


def test_the_same_records_and_seed_give_the_same_judgement(judged):
    table, learned, judgement = judged
    assert as_text(engine.judge(learned, table)) == as_text(judgement)


def test_a_judgement_reads_back_from_its_text_and_nothing_else_does(judged):
    text = as_text(judged[2])
    assert as_text(from_text(text)) == text
    broken = json.loads(text)
    broken["judgement"]["verdict"] = "perhaps"
    for other in ("", "[]", "{}", text.replace("judgement", "jugement"), json.dumps(broken)):
        with pytest.raises(engine.Refusal, match="no judgement"):
            from_text(other)


@pytest.mark.parametrize("seed", range(4))
def test_help_that_turns_to_harm_elsewhere_is_found_where_the_model_misses_it(seed):
    """The links from both are ruled out as a pair would be overlooked: on average the mentor does nothing."""
    table, order = school(2_500, seed, interaction=True, order={"rule_out": [("shift", "passed")]})
    learned = engine.learn(table, order, graphs=1)
    judgement = engine.judge(learned, table)
    found = [each for each in judgement.dependences.missed if each.counts]
    assert any(each.columns == ("mentor", "passed", "shift") for each in found)
    assert judgement.verdict != "yes" and not judgement.tests[3].met
    shown = next(each for each in found if len(each.columns) == 3)
    held = np.logical_and.reduce([table.frame[column] == level for column, level in shown.when])
    assert shown.records == held.sum()
    assert shown.seen == pytest.approx((table.frame["passed"][held] == "yes").mean())
    assert abs(shown.seen - shown.said) > 0.1


@pytest.mark.parametrize("seed", range(4))
def test_nothing_is_missed_where_the_model_may_have_every_link(seed):
    table, order = school(2_500, seed, interaction=True, order={"insist": [("shift", "passed"), ("mentor", "passed")]})
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    assert judgement.dependences.missed == () and judgement.tests[3].met


def test_a_pair_left_without_its_link_is_missed():
    table, order = school(2_500, 5, order={"rule_out": [("mentor", "passed")]})
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    assert ("mentor", "passed") in [each.columns for each in judgement.dependences.missed]
    assert not judgement.tests[3].met and judgement.verdict == "in part"


def test_an_outcome_that_nothing_leads_to_is_no_better_than_its_base_rate():
    table, order = school(600, 6, order={"rule_out": [(name, "passed") for name in ("shift", "distance", "mentor")]})
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    assert judgement.columns[0].gain.mean == judgement.columns[0].gain.se == 0.0
    assert judgement.verdict == "no" and not judgement.tests[0].met


def test_without_an_outcome_there_is_no_verdict():
    table, _ = school(400, 7)
    order = engine.Order([("All", ["shift", "distance", "mentor", "passed"])])
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    assert judgement.verdict is None and judgement.tests == () and verdict(()) is None


def test_the_yardstick_sees_no_later_column(judged):
    _, learned, judgement = judged
    yardstick = Yardstick(relearned(learned, judgement.links), learned.order)
    names = learned.coded.names
    before = {name: {names[at] for at in yardstick.before(0, at_name)} for at_name, name in enumerate(names)}
    assert before["mentor"] == {"shift", "distance"} and before["passed"] == {"shift", "distance", "mentor"}
    for at, name in enumerate(names):
        assert not {names[other] for other in yardstick.again.after(0, at)} & before[name]


def test_the_yardstick_finds_what_a_model_without_the_link_cannot():
    table, order = school(2_000, 8)
    learned = engine.learn(table, order, graphs=1)
    judgement = engine.judge(learned, table, links=min(learned.chosen))
    outcome = judgement.columns[0]
    assert outcome.gain.mean == 0.0 and outcome.yardstick.low > 0.0 and outcome.lead.low > 0.0
    assert not judgement.tests[2].met


def numbers(rows, seed, skewed=False):
    rng = np.random.default_rng(seed)
    site = rng.integers(0, 2, rows)
    hours = rng.normal(10.0, 3.0, rows)
    noise = rng.exponential(4.0, rows) if skewed else rng.normal(0.0, 4.0, rows)
    mark = 40.0 + 5.0 * site + 1.5 * hours + noise
    frame = pd.DataFrame({"site": np.array(["a", "b"])[site], "hours": hours, "mark": mark})
    order = engine.Order([("s", ["site"]), ("h", ["hours"]), ("m", ["mark"])], outcomes={"mark": engine.MORE})
    return engine.Table.from_frame(frame), order


def test_a_number_is_judged_by_where_its_values_fall_in_what_was_foreseen():
    table, order = numbers(2_000, 0)
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    told = {each.column: each for each in judgement.reliability}
    assert told["mark"].outcome and told["mark"].levels == () and told["mark"].agree >= 9
    assert judgement.verdict == "yes"
    linear = 0.5 * np.log(np.var(table.frame["mark"]) / 16.0)  # of the best forecast there is, normal noise of sd 4
    assert judgement.columns[0].gain.mean == pytest.approx(linear, abs=0.02)
    assert judgement.columns[0].yardstick.mean == pytest.approx(linear, abs=0.05)


def test_a_number_whose_noise_has_another_shape_does_not_come_true():
    table, order = numbers(2_000, 1, skewed=True)
    judgement = engine.judge(engine.learn(table, order, graphs=1), table)
    assert not judgement.tests[1].met and judgement.verdict == "in part"


def test_progress_is_told_in_words_and_raising_inside_it_cancels(judged):
    table, learned, _ = judged
    told = []
    engine.judge(learned, table, progress=lambda fraction, words: told.append((fraction, words)))
    fractions = [fraction for fraction, _ in told]
    assert fractions == sorted(fractions) and told[-1] == (1.0, "Done")
    assert len({words for _, words in told}) >= 4

    class StoppedError(Exception):
        pass

    def stop(fraction, words):
        if fraction > 0.4:
            raise StoppedError

    with pytest.raises(StoppedError):
        engine.judge(learned, table, progress=stop)


def test_other_records_than_those_learned_from_are_refused(judged):
    _, learned, _ = judged
    other, _ = school(1_500, 99)
    with pytest.raises(engine.Refusal, match="not the records"):
        engine.judge(learned, other)
    with pytest.raises(engine.Refusal, match="links"):
        engine.judge(learned, judged[0], links=999)


def test_what_lies_below_a_value_is_the_integral_of_what_was_foreseen():
    table, order = numbers(300, 3)
    again = relearned(engine.learn(table, order, graphs=1), 2)
    regression = again.regression(0, 2, (0, 1))
    grid = np.linspace(-100.0, 80.0, 200_001)
    many = np.full(grid.size, 0), np.full((grid.size, 1), 12.0)
    density = np.exp(regression.log_density(many[0][:, None], many[1], grid))
    below = regression.below(np.zeros((1, 1), dtype=int), np.array([[12.0]]), np.array([80.0]))
    assert below[0] == pytest.approx(density.sum() * (grid[1] - grid[0]), abs=1e-6) and 0.9 < below[0] < 1.0
