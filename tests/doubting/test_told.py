"""How an answer follows beside unrecorded causes, in words; what would let one follow that does not."""

import itertools

import pytest

from engine.doubting.graph import graph
from engine.doubting.identification import Hedge, identify
from engine.doubting.told import told, would_let_it_follow
from tests.doubting.tied import graphs

SCHOOL = ["age", "mentor", "attendance", "passed"]
THROUGH = [("mentor", "attendance"), ("attendance", "passed")]


@pytest.mark.parametrize(
    ("links", "pairs", "pins", "text"),
    [
        (
            THROUGH,
            [("mentor", "passed")],
            [],
            "through attendance, weighing each level of it by how often it comes with what is set, and what follows "
            "from it by comparing like with like in mentor",
        ),
        (
            [*THROUGH, ("age", "mentor"), ("age", "attendance"), ("age", "passed")],
            [("mentor", "passed")],
            [],
            "through attendance, weighing each level of it by how often it comes with what is set, and what follows "
            "from it by comparing like with like in mentor and age",
        ),
        ([("age", "mentor"), ("mentor", "passed")], [("age", "passed")], [], "by comparing like with like in age"),
        (THROUGH, [("attendance", "passed")], [], "as recorded: nothing stated drives both mentor and passed"),
        (THROUGH, [("attendance", "passed")], ["age"], "by comparing like with like in age"),
        (
            [("age", "mentor"), ("age", "passed")],
            [("mentor", "passed")],
            [],
            "as it is among these: no link leads there from mentor",
        ),
        # the lever's effect is a ratio only: Pearl & Mackenzie 2018, The Book of Why
        (
            [("age", "attendance"), ("attendance", "mentor"), ("mentor", "passed")],
            [("age", "mentor"), ("age", "passed")],
            [],
            "part by part: what the records tell of how passed comes about, each from what comes before it",
        ),
    ],
)
def test_in_words(links, pairs, pins, text):
    declared = graph(SCHOOL, links, pairs)
    assert not isinstance(identify(declared, ["passed"], ["mentor"], pins), Hedge)
    assert told(declared, "passed", ["mentor"], pins).text == text


def test_what_is_told_by_a_door_always_follows():
    kinds = set()
    for columns, links in graphs(4):
        for pair in itertools.combinations(columns, 2):
            declared = graph(columns, links, [pair])
            for lever in "abc":
                found = told(declared, "d", [lever])
                follows = not isinstance(identify(declared, ["d"], [lever]), Hedge)
                assert follows or found.kind == "parts", (links, pair, lever)
                kinds.add(found.kind)
    assert kinds == {"nothing", "seen", "alike", "through", "parts"}


def test_recording_the_cause_lets_an_answer_follow():
    links = [("mentor", "passed"), ("age", "mentor")]
    declared = graph(SCHOOL, links, [("mentor", "passed"), ("age", "mentor")])
    assert isinstance(identify(declared, ["passed"], ["mentor"]), Hedge)
    assert would_let_it_follow(declared, ["passed"], ["mentor"]) == (("mentor", "passed"),)


def test_recording_one_of_two_causes_may_not_be_enough():
    declared = graph("abc", [("a", "b"), ("b", "c"), ("a", "c")], [("a", "b"), ("a", "c")])
    assert isinstance(identify(declared, ["c"], ["a"]), Hedge)
    assert would_let_it_follow(declared, ["c"], ["a"]) == ()
