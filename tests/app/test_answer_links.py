"""The links under a printed answer: which it runs through, and who gave them their direction."""

from __future__ import annotations

import pytest

import engine
from app.pages import answer_view
from app.pages.asking import Asked, Spine
from app.question import Question

NO_YES = ["no", "yes"]
ORDER = engine.Order(
    [("Before", ["language", "shift"]), ("Offer", ["mentor"]), ("After", ["homework", "passed", "work"])],
    changeable=["mentor"],
    outcomes={"passed": "yes"},
)


def nodes() -> list[engine.Category]:
    """Language leads to shift and homework, shift to mentor, mentor to homework, homework to passed, passed to work."""
    one = [[0.6, 0.4], [0.3, 0.7]]
    return [
        engine.Category("language", NO_YES, [], [0.5, 0.5]),
        engine.Category("shift", NO_YES, ["language"], one),
        engine.Category("mentor", NO_YES, ["shift"], one),
        engine.Category("homework", NO_YES, ["language", "mentor"], [one, one]),
        engine.Category("passed", NO_YES, ["homework"], one),
        engine.Category("work", NO_YES, ["passed"], one),
    ]


def asked(question: Question, unsettled: frozenset[tuple[str, str]] = frozenset()) -> Asked:
    model = engine.Model(engine.Model.from_network(nodes()).network, ORDER, None, unsettled)
    levers = {column: engine.Fix(level) for column, (level, _) in question.levers.items()}
    answer = model.ask(dict(question.pins), levers, watch=["passed"], draws=0)
    return Asked(question, ("passed",), answer, Spine(model))


def pairs(links: list[answer_view.Link]) -> set[tuple[str, str]]:
    return {(link.source, link.target) for link in links}


MENTOR = {"mentor": ("yes", 1.0)}


@pytest.mark.parametrize(
    ("pins", "others"),
    [
        ({}, {("language", "shift"), ("language", "homework"), ("passed", "work")}),
        ({"shift": ("yes",)}, {("passed", "work")}),  # what is seen of the shift tells of the language
    ],
)
def test_a_lever_among_those_pinned_runs_through_what_the_pin_tells_of(
    pins: dict[str, tuple[str, ...]], others: set[tuple[str, str]]
) -> None:
    through, rest = answer_view.links(asked(Question(pins, MENTOR)))
    assert pairs(rest) == others
    assert len(through) + len(rest) == 6


def test_a_link_whose_direction_the_model_calls_unsettled_goes_with_on_every_page() -> None:
    loose = asked(Question({}, MENTOR), frozenset({("homework", "passed")}))
    through, rest = answer_view.links(loose)
    told = {(link.source, link.target): (link.verb, link.settled) for link in through + rest}
    assert told["homework", "passed"] == ("goes with", "nobody")
    assert told["passed", "work"] == ("leads to", "the data, if nothing unrecorded")
    assert told["mentor", "homework"] == ("leads to", "your order")
    assert loose.spine.goes_with("passed") == ["homework"]
    assert loose.spine.comes_from("passed") == []
