"""Every sentence of a question about numbers and of its answer, as people will read it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.question import By, Question, To, Within
from app.wording.answers import also_sentence, answer_sentence, counted_sentence, had_sentence
from app.wording.estimates import estimates
from app.wording.parts import plain
from app.wording.questions import question_sentence
from app.wording.values import in_question
from engine.answering.answer import Counted, Marginal, Reading
from engine.answering.mixture import Mixture
from engine.network.nodes import Category, Number
from engine.order import LESS, MORE

NODES = {
    "shift work": Category("shift work", ("days", "mixed", "nights")),
    "mentor": Category("mentor", ("no", "yes")),
    "hours": Number("hours", bands=(5.0, 15.0)),
    "travel time": Number("travel time", bands=(20.0, 45.0)),
    "passed": Category("passed", ("no", "yes")),
}
NIGHTS = {"shift work": ("nights",)}
MENTOR = {"mentor": ("yes", 1.0)}
LONGER = {"hours": (By(2.0), 1.0)}


def marginal(mean, draws=(), sd=6.0):
    """A number that is normal, with its mean in each draw."""
    mixture = Mixture(np.ones((1, 1)), np.full((1, 1), mean), np.full((1, 1), sd))
    return Marginal(("low", "high"), np.array([0.5, 0.5]), np.empty((2, 0)), mixture, np.array(draws, dtype=float))


def found(recorded=12.31, among=12.31, after=None, low=None, high=None, had=None, steady=True):
    """Estimates whose change has the interval low to high, over common draws; `among` alone is off by 0.2."""
    even = np.linspace(-1 / 18, 19 / 18, 1001)
    base = np.full(1001, among) if steady else among + 0.4 * (even - 0.5)
    change = np.zeros(1001) if low is None else low + (high - low) * even
    return estimates(
        Reading(
            "hours",
            recorded=marginal(recorded, recorded + 0.4 * (even - 0.5)),
            among=marginal(among, base),
            set=None if after is None else marginal(after, base + change),
            had=None if had is None else marginal(had, had + 2 * (even - 0.5)),
        ),
        (),
    )


def said(question, figures, watch="hours", **more):
    return answer_sentence(question, watch, (), figures, NODES, 1847, **more).text


def asked(question, watch="hours", wanted=()):
    return plain(question_sentence(question, watch, wanted, NODES))


def test_nothing_asked():
    assert said(Question(), found()) == (
        "Across all 1,847 records hours is 12.31 on average. (within this model 12.11 to 12.51)"
    )
    assert asked(Question()) == "What is hours on average across all records?"


def test_pins():
    figures = found(recorded=12.31, among=10.2)
    assert said(Question(NIGHTS), figures) == (
        "Among records with shift work = nights, hours is 10.20 on average, against 12.31 across all records. "
        "(−2.11, within this model −2.31 to −1.91)"
    )
    assert asked(Question(NIGHTS)) == "What is hours on average among records with shift work = nights?"


def test_a_lever_moves_a_mean():
    assert said(Question({}, MENTOR), found(after=14.08, low=0.41, high=3.14)) == (
        "By this estimate, setting mentor to yes would move hours from 12.3 to 14.1 on average "
        "(+1.8, within this model +0.4 to +3.1)."
    )
    assert asked(Question({}, MENTOR)) == (
        "What would hours be on average across all records if mentor were yes for all of them?"
    )


def test_an_interval_that_holds_zero_may_not_move():
    assert "setting mentor to yes may not move hours: from 12.3 to 12.5 on average (+0.2, " in said(
        Question(NIGHTS, MENTOR), found(after=12.5, low=-1.2, high=1.6)
    )


@pytest.mark.parametrize(
    ("lever", "doing", "if_so"),
    [
        (To(12.0), "setting hours to 12", "hours were 12 for all of them"),
        (To(-1200.5), "setting hours to −1,200.5", "hours were −1,200.5 for all of them"),
        (By(2.0), "raising hours by 2", "hours were raised by 2 for all of them"),
        (By(-0.5), "lowering hours by 0.5", "hours were lowered by 0.5 for all of them"),
    ],
)
def test_a_number_is_set_raised_or_lowered(lever, doing, if_so):
    question = Question({}, {"hours": (lever, 1.0)})
    figures = found(recorded=50.0, among=50.0, after=53.0, low=1.0, high=5.0)
    assert said(question, figures, "travel time").startswith(f"By this estimate, {doing} would move travel time from ")
    assert asked(question, "travel time").endswith(f" if {if_so}?")


def test_a_verb_stands_once_for_the_levers_it_rules():
    levers = {"mentor": ("yes", 1.0), "hours": (By(2.0), 0.8), "travel time": (To(30.0), 1.0)}
    words = said(Question({}, levers), found(after=14.08, low=0.41, high=3.14))
    assert (
        "setting mentor to yes and travel time to 30 and raising hours by 2 for 80% of all records would move" in words
    )


@pytest.mark.parametrize(
    ("pin", "words"),
    [
        (("under 5",), "hours under 5"),
        (Within(5.0, 12.5), "hours 5 to under 12.5"),
        (Within(None, 1200.0), "hours under 1,200"),
        (Within(-3.0), "hours −3 and over"),
        (Within(7.0, 7.0), "hours = 7"),
    ],
)
def test_a_pin_of_a_number_is_told_as_its_bands_are(pin, words):
    assert asked(Question({"hours": pin}), "passed", ("yes",)) == f"What is passed among records with {words}?"


def test_those_who_had_the_value_anyway_are_kept_apart():
    figures = found(after=14.08, low=0.41, high=3.14, had=13.2)
    assert plain(had_sentence(Question({}, {"travel time": (To(30.0), 1.0)}), figures, NODES)) == (
        "Those with travel time = 30 anyway: 13.2 on average. That is not the effect."
    )


def test_nobody_was_shifted_anyway():
    assert had_sentence(Question({}, LONGER), found(after=14.08, low=0.41, high=3.14, had=13.2), NODES) == []


def test_a_number_that_all_have_already_is_not_moved_by_setting_it():
    question = Question({"travel time": Within(30.0, 30.0)}, {"travel time": (To(30.0), 1.0)})
    figures = found(after=12.31, low=0.0, high=0.0)
    assert said(question, figures) == (
        "Among records with travel time = 30, setting travel time to 30 would not move hours: "
        "all of them have travel time = 30 already. (hours stays at 12.31 on average)"
    )


def test_a_shift_that_leads_nowhere_would_not_move():
    figures = found(after=12.31, low=0.0, high=0.0)
    assert said(Question({}, LONGER), figures, "travel time", apart={"hours"}).startswith(
        "Raising hours by 2 would not move travel time: nothing in this model leads from one to the other. "
        "(travel time stays at 12.3"
    )


def test_a_shift_moves_its_own_number_by_as_much_without_doubt():
    even = np.linspace(12, 13, 101)
    reading = Reading("hours", marginal(12.5, even), marginal(12.5, even), marginal(14.5, even + 2))
    assert said(Question({}, LONGER), estimates(reading, ())).endswith(" to 14.50 on average (+2.00).")


def test_a_withheld_mean_is_told_nowhere():
    figures = found(among=10.2, after=14.08, low=3.0, high=4.7)
    words = said(Question(NIGHTS, LONGER), figures, "travel time", blocked=True)
    assert words.startswith("These records cannot say what raising hours by 2 would do to travel time. ")
    assert "it is 10.2" in words and "on average, against 12.3" in words and "across all records" in words
    assert "14" not in words and words.endswith("If set: withheld")


def test_a_mean_is_counted_in_the_records():
    count = Counted(412, {"under 5": 12}, mean=12.38)
    words = counted_sentence(Question(NIGHTS), "hours", (), count, 412, NODES, 10, 1847, 1)
    assert plain(words) == "Counted in the records: mean 12.4 over 412 records."
    few = counted_sentence(Question(NIGHTS), "hours", (), None, 4, NODES, 10, 1847, 1)
    assert plain(few).startswith("Under 10 records have this value")


def test_what_else_is_watched():
    figures = found(after=14.08, low=0.41, high=3.14)
    what, words = also_sentence(Question({}, MENTOR), "hours", (), figures, NODES, False)
    assert plain(what) + plain(words) == "hours from 12.3 to 14.1 on average (+1.8, within this model +0.4 to +3.1)"
    what, words = also_sentence(Question(), "hours", (), found(), NODES, False)
    assert plain(what) + plain(words) == "hours 12.31 on average"


def test_a_number_is_answered_by_its_mean_whichever_way_is_better():
    for better in (None, MORE, LESS):
        assert in_question(NODES["hours"], better, [0.2, 0.5, 0.3]) == ()


@given(st.text(min_size=1), st.text(min_size=1), st.floats(-1e9, 1e9), st.booleans())
def test_hostile_names_stand_in_the_sentence_as_they_are(one, other, value, shifted):
    if one == other:
        other += "2"
    nodes = {name: Number(name) for name in (one, other)}
    lever = By(value or 1.0) if shifted else To(value)
    question = Question({one: Within(None, value)}, {one: (lever, 0.5)})
    figures = found(after=14.08, low=0.41, high=3.14)
    words = answer_sentence(question, other, (), figures, nodes).text
    assert f"{one} under " in words and other in words
    assert not any(word in words.replace(one, "").replace(other, "") for word in ("improve", "cause"))
