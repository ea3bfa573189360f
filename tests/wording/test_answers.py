"""Every sentence of a question and its answer, as people will read it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.question import Question
from app.wording.answers import also_sentence, answer_sentence, counted_sentence, had_sentence
from app.wording.estimates import estimates
from app.wording.parts import Part, plain
from app.wording.questions import question_sentence
from app.wording.values import in_question
from engine.answering.answer import Counted, Marginal, Reading
from engine.network.network import Category
from engine.order import LESS, MORE

NODES = {
    "shift work": Category("shift work", ("days", "mixed", "nights")),
    "mentor": Category("mentor", ("no", "yes")),
    "study group": Category("study group", ("no", "yes")),
    "travel time": Category(
        "travel time", ("under 20", "20 to under 45", "45 and over", "blank"), kind="number", has_blank=True
    ),
    "passed": Category("passed", ("no", "yes")),
    "result": Category("result", ("fail", "pass", "merit"), kind="grade"),
}
NIGHTS = {"shift work": ("nights",)}
MENTOR = {"mentor": ("yes", 1.0)}
YES = ("yes",)


def marginal(share, spread=0.0):
    """Two levels; `spread` between the 5 and the 95 per cent quantiles of many even draws."""
    draws = np.linspace(share - spread / 1.8, share + spread / 1.8, 1001)
    return Marginal(("no", "yes"), np.array([1 - share, share]), np.vstack([1 - draws, draws]))


def fixed(share, draws):
    return Marginal(("no", "yes"), np.array([1 - share, share]), np.vstack([1 - np.array(draws), np.array(draws)]))


def found(recorded=0.61, among=0.54, after=None, low=None, high=None, had=None):
    """Estimates whose change has the interval low to high, over common draws."""
    steady = np.full(1001, among)
    change = (
        np.linspace(0, 1, 1001) if low is None else np.linspace(low - (high - low) / 18, high + (high - low) / 18, 1001)
    )
    return estimates(
        Reading(
            "passed",
            recorded=marginal(recorded, 0.04),
            among=fixed(among, steady),
            set=None if after is None else fixed(after, steady + change),
            had=None if had is None else marginal(had, 0.1),
        ),
        YES,
    )


def said(question, figures, **more):
    return answer_sentence(question, "passed", YES, figures, NODES, 1847, **more).text


def asked(question, watch="passed", wanted=YES):
    return plain(question_sentence(question, watch, wanted, NODES))


def test_nothing_asked():
    assert said(Question(), found()) == "Across all 1,847 records passed is yes for 61%. (within this model 59% to 63%)"
    assert asked(Question()) == "What is passed across all records?"


def test_pins():
    figures = estimates(Reading("passed", fixed(0.61, [0.60, 0.62]), fixed(0.54, [0.51, 0.57])), YES)
    assert said(Question(NIGHTS), figures) == (
        "Among records with shift work = nights, passed is yes for 54%, against 61% of all records. "
        "(−7 points, within this model −9 to −5)"
    )
    assert asked(Question(NIGHTS)) == "What is passed among records with shift work = nights?"


def test_a_lever():
    assert said(Question({}, MENTOR), found(among=0.61, after=0.68, low=0.03, high=0.11)) == (
        "By this estimate, setting mentor to yes would move passed from 61% to 68% "
        "(+7 points, within this model +3 to +11)."
    )
    assert asked(Question({}, MENTOR)) == "What would passed be across all records if mentor were yes for all of them?"


def test_pins_and_a_lever():
    assert said(Question(NIGHTS, MENTOR), found(after=0.63, low=0.01, high=0.17)) == (
        "By this estimate, among records with shift work = nights, setting mentor to yes would move passed "
        "from 54% to 63% (+9 points, within this model +1 to +17)."
    )
    assert asked(Question(NIGHTS, MENTOR)) == (
        "What would passed be among records with shift work = nights if mentor were yes for all of them?"
    )


def test_an_interval_that_holds_zero_may_not_move():
    assert said(Question(NIGHTS, MENTOR), found(after=0.55, low=-0.03, high=0.05)) == (
        "By this estimate, among records with shift work = nights, setting mentor to yes may not move passed: "
        "from 54% to 55% (+1 point, within this model −3 to +5)."
    )


def test_a_fall_would_move_too():
    assert "would move passed from 54% to 45% (−9 points, within this model −17 to −1)." in said(
        Question(NIGHTS, MENTOR), found(after=0.45, low=-0.17, high=-0.01)
    )


def test_a_model_known_exactly_has_no_interval():
    figures = estimates(Reading("passed", fixed(0.61, []), fixed(0.54, []), fixed(0.63, [])), YES)
    assert said(Question(NIGHTS, MENTOR), figures).endswith("from 54% to 63% (+9 points).")
    assert said(Question(), figures) == "Across all 1,847 records passed is yes for 61%."


def test_reach_is_said_for_whom():
    some = {"mentor": ("yes", 0.8)}
    figures = found(after=0.61, low=0.01, high=0.13)
    assert "setting mentor to yes for 80% of them would move" in said(Question(NIGHTS, some), figures)
    assert "setting mentor to yes for 80% of all records would move" in said(Question({}, some), figures)
    assert asked(Question(NIGHTS, some)).endswith("if mentor were yes for 80% of them?")


def test_several_levers_and_pins_are_joined_by_and():
    pins = {"shift work": ("mixed", "nights"), "travel time": ("20 to under 45",), "study group": ("no",)}
    levers = {"mentor": ("yes", 0.125), "study group": ("yes", 1.0)}
    figures = found(after=0.63, low=0.01, high=0.17)
    assert said(Question(pins, levers), figures).startswith(
        "By this estimate, among records with shift work = mixed or nights, travel time 20 to under 45 and "
        "study group = no, setting mentor to yes for 12.5% of them and study group to yes would move passed"
    )
    assert asked(Question(pins, levers)).endswith(
        "if mentor were yes for 12.5% of them and study group were yes for all of them?"
    )


def test_a_blank_is_no_range():
    assert "with travel time = blank," in said(Question({"travel time": ("blank",)}), found())


def test_where_most_are_thin_the_model_is_said_to_fill_in():
    figures = found(after=0.63, low=0.01, high=0.17)
    assert said(Question(NIGHTS, MENTOR), figures, thin=True).startswith(
        "By this estimate, most of it filled in by the model, among records with shift work = nights, "
        "setting mentor to yes would move passed from 54% to 63%"
    )
    assert said(Question({}, MENTOR), found(after=0.55, low=-0.03, high=0.05), thin=True).startswith(
        "By this estimate, most of it filled in by the model, setting mentor to yes "
        "may not move passed: from 54% to 55%"
    )


def still(share=0.54):
    """Estimates of what no lever moves; if set, sums are rounded another way."""
    after = fixed(share + 1e-16, [share - 0.02 + 1e-17, share + 0.02 - 2e-17])
    return estimates(
        Reading("passed", fixed(0.61, [0.6, 0.62]), fixed(share, [share - 0.02, share + 0.02]), after), YES
    )


@pytest.mark.parametrize(
    ("pins", "levers", "apart", "words"),
    [
        (
            {},
            MENTOR,
            {"mentor"},
            "Setting mentor to yes would not move passed: nothing in this model leads from one to the other.",
        ),
        (
            NIGHTS,
            {"mentor": ("yes", 0.5)},
            {"mentor"},
            "Among records with shift work = nights, setting mentor to yes would not move passed: "
            "nothing in this model leads from one to the other.",
        ),
        (
            {},
            {"mentor": ("yes", 1.0), "study group": ("no", 1.0)},
            {"mentor", "study group"},
            "Setting mentor to yes and study group to no would not move passed: "
            "nothing in this model leads from mentor or study group to it.",
        ),
        (
            NIGHTS,
            {"mentor": ("yes", 0.0)},
            set(),
            "Among records with shift work = nights, setting mentor to yes would not move passed: "
            "for 0% of them nothing changes.",
        ),
        (
            {},
            {"mentor": ("yes", 1.0), "study group": ("no", 0.0)},
            {"mentor"},
            "Setting mentor to yes and study group to no would not move passed: nothing in this model leads from "
            "mentor to it, and study group is set for 0% of all records.",
        ),
        (
            {"mentor": ("yes",)},
            MENTOR,
            set(),
            "Among records with mentor = yes, setting mentor to yes would not move passed: "
            "all of them have mentor = yes already.",
        ),
        (
            {"mentor": ("yes",)},
            {"mentor": ("yes", 0.5), "study group": ("no", 0.0)},
            set(),
            "Among records with mentor = yes, setting mentor to yes and study group to no would not move passed: "
            "it changes none of these records.",
        ),
        (
            {"mentor": ("yes",)},
            {"mentor": ("yes", 1.0), "study group": ("no", 1.0)},
            {"study group"},
            "Among records with mentor = yes, setting mentor to yes and study group to no would not move passed: "
            "nothing in this model leads from study group to it, and all of them have mentor = yes already.",
        ),
    ],
)
def test_a_lever_that_cannot_reach_the_column_would_not_move_it(pins, levers, apart, words):
    assert said(Question(pins, levers), still(), apart=apart) == f"{words} (passed stays at 54%)"


def test_one_lever_that_leads_there_makes_it_move():
    levers = {"mentor": ("yes", 1.0), "study group": ("no", 0.0)}
    assert "would move passed" in said(
        Question({}, levers), found(after=0.63, low=0.01, high=0.17), apart={"study group"}
    )


def test_what_else_is_watched_and_cannot_move_stays():
    what, figures = also_sentence(Question({}, MENTOR), "passed", YES, still(), NODES, False)
    assert plain(what) + plain(figures) == "passed stays at 54%"


def test_those_who_had_it_anyway_are_kept_apart():
    question, figures = Question(NIGHTS, MENTOR), found(after=0.63, low=0.01, high=0.17, had=0.48)
    assert (
        plain(had_sentence(question, figures, NODES)) == "Those with mentor = yes anyway: 48%. That is not the effect."
    )
    assert had_sentence(Question(NIGHTS), figures, NODES) == []


def test_a_blocked_answer_says_what_cannot_be_said_and_shows_no_figure_of_it():
    figures = found(after=0.63, low=0.01, high=0.17)
    words = said(Question(NIGHTS, MENTOR), figures, blocked=True)
    assert words.startswith("These records cannot say what setting mentor to yes would do to passed. ")
    assert "Among records with shift work = nights it is 54%, against 61% of all records (−7 points, " in words
    assert words.endswith("If set: withheld")
    assert "63%" not in words
    alone = said(Question({}, MENTOR), figures, blocked=True)
    assert "Across all 1,847 records it is 61%. If set: withheld" in alone


def test_pins_alone_are_never_withheld():
    assert "withheld" not in said(Question(NIGHTS), found(), blocked=True)


def test_an_answer_about_other_levels_names_them():
    node, wanted = NODES["result"], ("pass", "merit")
    reading = Reading(
        "result",
        *(
            Marginal(node.levels, np.array(shares), np.empty((3, 0)))
            for shares in ([0.4, 0.4, 0.2], [0.5, 0.3, 0.2], [0.3, 0.4, 0.3])
        ),
    )
    figures = estimates(reading, wanted)
    words = answer_sentence(Question(NIGHTS, MENTOR), "result", wanted, figures, NODES).text
    assert "would move result = pass or merit from 50% to 70% (+20 points)." in words
    assert answer_sentence(Question(), "result", wanted, figures, NODES).text == (
        "Across all records result is pass or merit for 60%."
    )


@pytest.mark.parametrize(
    ("pins", "count", "matching", "words"),
    [
        (NIGHTS, Counted(412, {"no": 189, "yes": 223}), 412, "Counted in the records: 223 of 412 have passed = yes."),
        (
            NIGHTS,
            Counted(412, {"no": 403, "yes": 9}),
            412,
            "Counted in the records: under 10 of 412 have passed = yes.",
        ),
        (
            NIGHTS,
            Counted(412, {"no": 3, "yes": 409}),
            412,
            "Counted in the records: all but under 10 of 412 have passed = yes.",
        ),
        (
            NIGHTS,
            Counted(1840, {"no": 713, "yes": 1127}),
            1840,
            "All but under 10 records have this value, so nothing is counted; the figures come from the model.",
        ),
        (
            NIGHTS,
            None,
            978,
            "How many records have this value is not shown: it would give a count under 10 away.",
        ),
        (
            {},
            Counted(1847, {"no": 713, "yes": 1127, "blank": 7}, frozenset({"yes", "blank"})),
            1847,
            "How many records have passed = yes is not shown: it would give a count under 10 away.",
        ),
        (
            NIGHTS,
            None,
            4,
            "Under 10 records have this value, so nothing is counted; the figures come from the model.",
        ),
        (
            {**NIGHTS, "mentor": ("no",)},
            None,
            0,
            "No record has all of these values, so nothing is counted; the figures come from the model.",
        ),
    ],
)
def test_the_records_are_counted_without_giving_small_counts_away(pins, count, matching, words):
    assert plain(counted_sentence(Question(pins), "passed", YES, count, matching, NODES, 10, 1847)) == words


@pytest.mark.parametrize(
    ("question", "blocked", "words"),
    [
        (Question(NIGHTS, MENTOR), False, "passed from 54% to 63% (+9 points, within this model +1 to +17)"),
        (
            Question(NIGHTS, MENTOR),
            True,
            "passed 54%, against 61% of all records (−7 points, within this model −9 to −5)",
        ),
        (Question(), False, "passed 61%"),
    ],
)
def test_what_else_is_watched(question, blocked, words):
    what, figures = also_sentence(question, "passed", YES, found(after=0.63, low=0.01, high=0.17), NODES, blocked)
    assert plain(what) + plain(figures) == words


def test_names_figures_and_worlds_have_their_own_style():
    words = answer_sentence(Question(NIGHTS, MENTOR), "passed", YES, found(after=0.63, low=0.01, high=0.17), NODES)
    styled = [(part.style, part.text) for part in words.headline if isinstance(part, Part) and part.style != "plain"]
    assert styled == [
        ("name", "shift work = nights"),
        ("name", "mentor"),
        ("name", "yes"),
        ("name", "passed"),
        ("among", "54%"),
        ("set", "63%"),
    ]


def test_without_pins_the_start_is_the_recorded_world():
    words = answer_sentence(
        Question({}, MENTOR), "passed", YES, found(among=0.61, after=0.68, low=0.03, high=0.11), NODES
    )
    assert ("recorded", "61%") in [(part.style, part.text) for part in words.headline if isinstance(part, Part)]


@given(st.lists(st.text(min_size=1), min_size=5, max_size=5, unique=True), st.booleans(), st.booleans())
def test_hostile_names_stand_in_the_sentence_as_they_are(names, pinned, levered):
    a, b, y, first, second = names
    nodes = {name: Category(name, (first, second)) for name in (a, b, y)}
    question = Question({a: (first,)} if pinned else {}, {b: (second, 1.0)} if levered else {})
    marginals = [
        Marginal((first, second), np.array([1 - share, share]), np.empty((2, 0))) for share in (0.61, 0.54, 0.63)
    ]
    figures = estimates(Reading(y, *marginals), (second,))
    words = answer_sentence(question, y, (second,), figures, nodes).text
    assert (
        y in words
        and (not pinned or f"{a} = {first}" in words)
        and (not levered or f"setting {b} to {second}" in words)
    )
    assert not any(word in words.replace(a, "").replace(b, "").replace(y, "") for word in ("improve", "cause"))


def test_the_levels_in_question():
    travel, passed, result = NODES["travel time"], NODES["passed"], NODES["result"]
    assert in_question(passed, None, [0.9, 0.1]) == ("yes",)
    assert in_question(passed, ("no",), [0.9, 0.1]) == ("no",)
    assert in_question(result, None, [0.2, 0.5, 0.3]) == ("pass",)
    assert in_question(result, ("merit", "pass"), [0.2, 0.5, 0.3]) == ("pass", "merit")
    assert in_question(travel, MORE, [0.2, 0.5, 0.2, 0.1]) == ("45 and over",)
    assert in_question(travel, LESS, [0.2, 0.5, 0.2, 0.1]) == ("under 20",)
