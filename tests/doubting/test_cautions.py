"""What holds of every caution, and of none."""

import pytest

import engine
from engine.doubting import STANDING, UNSEEN
from tests.doubting.schools import hidden_beside, offer, school, settling


def test_cautions_come_in_the_order_of_their_ranks_each_with_something_to_do():
    model = settling([("x", "m"), ("m", "y")])
    answers = [
        offer(school(nights_with_mentor=0), {"shift": "nights"}),
        offer(school(nights_with_mentor=9, nights=18), {"shift": "nights"}),
        model.ask({"z": "a"}, {"x": engine.Fix("a")}),
    ]
    for answer in answers:
        ranks = [("blocks", "weakens", "know").index(caution.rank) for caution in answer.cautions]
        assert ranks == sorted(ranks) and ranks
        for caution in answer.cautions:
            assert caution.figure and caution.do.endswith(".") and caution.text.rstrip().endswith(".")
            assert caution.text[0].islower() and caution.columns


def test_the_same_question_has_the_same_cautions():
    model = settling([("x", "m"), ("m", "y")])
    first, second = (model.ask({"z": "a"}, {"x": engine.Fix("a")}) for _ in range(2))
    assert first.cautions == second.cautions and first.cautions


def test_a_network_given_as_it_is_has_no_records_to_doubt():
    model = engine.Model.from_network([engine.Category("a", ["x", "y"], [], [0.5, 0.5])])
    answer = model.ask({"a": "x"})
    assert answer.cautions == () and answer.checks_made == 0 and answer.matching is None


def test_the_standing_words_say_what_an_estimate_cannot_replace():
    assert STANDING.startswith("An estimate from records.") and "does not replace a trial" in STANDING
    assert UNSEEN == "They cannot see what was not recorded."


@pytest.mark.parametrize(("with_mentor", "figure"), [(0, "all"), (8, "all"), (100, None)])
def test_cautions_of_a_group_whose_number_is_not_told_have_no_total(with_mentor, figure):
    answer = offer(hidden_beside(with_mentor), {"shift": "nights"})
    assert not answer.matching_told
    found = [caution.figure for caution in answer.cautions if caution.code == "overlap"]
    assert found == ([] if figure is None else [figure])
    assert not any("200" in f"{caution.figure} {caution.text}" for caution in answer.cautions)
