"""What is learned from the records of the evening school agrees with what is true of it."""

from pathlib import Path

import pytest

import engine

FOLDER = Path(__file__).parents[2] / "sample_data" / "lantern_street"
MOST = 0.015  # an answer further than this from the truth would round to another story


@pytest.fixture(scope="module")
def learned(study):
    table = engine.read_table(FOLDER / "records.csv", **study["choices"])
    assert table.rows == 4000
    plan = study["plan"]
    order = engine.Order(
        plan["stages"],
        insist=plan["insist"],
        rule_out=plan["rule_out"],
        changeable=plan["changeable"],
        outcomes=plan["outcomes"],
    )
    return engine.learn(table, order, seed=0)


@pytest.fixture(scope="module")
def model(learned):
    return learned.model()


def asked(model, column, outcome, shift, level="yes"):
    pins = {} if shift is None else {"shift work": shift}
    return model.ask(pins=pins, levers={column: engine.Fix(level)}, watch=[outcome])


def test_the_recommended_model_has_the_links_of_the_network_and_no_others(script, model):
    true = {frozenset((parent, node.name)) for node in script.NETWORK for parent in node.pulls}
    assert {frozenset(link) for link in model.links} == true


@pytest.mark.parametrize("shift", [None, "days", "mixed", "nights"])
@pytest.mark.parametrize("column", ["mentor", "study group", "fee waived"])
@pytest.mark.parametrize("outcome", ["passed", "in work after a year"])
def test_the_answers_agree_with_the_truth(model, effects, column, outcome, shift):
    truth = effects[column, outcome, shift]
    answer = asked(model, column, outcome, shift)
    reading = answer[outcome]
    low, high = reading.set.interval("yes", 0.90)
    assert low <= truth["set"]["yes"] <= high
    change, least, most = answer.change(outcome, "yes", coverage=0.90)
    true_change = truth["set"]["yes"] - truth["recorded"]
    assert least <= true_change <= most
    assert abs(change - true_change) < MOST
    assert abs(reading.among.shares["yes"] - truth["recorded"]) < MOST
    assert high - low < 0.06


@pytest.mark.parametrize("shift", [None, "nights"])
def test_the_model_shows_that_a_mentor_looks_harmful_and_helps(model, shift):
    answer = asked(model, "mentor", "passed", shift)
    reading = answer["passed"]
    assert reading.had.interval("yes")[1] < reading.among.shares["yes"]
    assert reading.set.interval("yes")[0] > reading.among.shares["yes"]
    assert answer.change("passed", "yes")[1] > 0.05


def test_the_thin_place_is_told_where_it_is_asked_about(model):
    def overlap(column, shift):
        cautions = asked(model, column, "passed", shift).cautions
        return [caution.rank for caution in cautions if caution.code == "overlap"]

    assert overlap("study group", "nights") == ["weakens"]
    assert overlap("mentor", "nights") == ["weakens"]
    assert overlap("mentor", None) == overlap("mentor", "days") == []
    assert overlap("study group", "days") == []
