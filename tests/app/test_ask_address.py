"""The whole question lives in the address, whatever columns and levels are called."""

from __future__ import annotations

from dataclasses import replace
from urllib.parse import parse_qsl, urlsplit

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.address import Misread, parse
from app.names import Names, slugs
from app.question import SHOWS, Question, query, url

NAMES = Names(
    [
        ("shift work", ("days", "mixed", "nights")),
        ("mentor", ("no", "yes")),
        ("travel time", ("under 20", "20 to under 45", "45 and over")),
        ("passed", ("no", "yes")),
    ]
)

texts = st.text(max_size=12) | st.sampled_from(
    ["<script>", "a.b", "a&b=c", "", "Ä", "ä", "%2E", "a b", "a-b", "夜勤", "-"]
)


@st.composite
def named_questions(draw):
    columns = draw(st.lists(texts, min_size=1, max_size=5, unique=True))
    levels = {name: draw(st.lists(texts, min_size=1, max_size=4, unique=True)) for name in columns}
    names = Names([(name, levels[name]) for name in columns])
    pins, levers = {}, {}
    for name in columns:
        if draw(st.booleans()):
            chosen = draw(st.sets(st.sampled_from(levels[name]), min_size=1))
            pins[name] = tuple(level for level in levels[name] if level in chosen)
        if draw(st.booleans()):
            levers[name] = (draw(st.sampled_from(levels[name])), draw(st.integers(0, 10**6)) / 10**6)
    some = st.frozensets(st.sampled_from(columns))
    return names, Question(
        pins,
        levers,
        draw(st.none() | st.sampled_from(columns)),
        draw(some),
        draw(some),
        draw(some),
        " ".join(draw(texts).split()),
        draw(st.sampled_from(SHOWS)),
    )


@given(named_questions())
def test_a_question_comes_back_from_its_address_as_it_was(named):
    names, question = named
    address = url("study", question, names)
    assert parse(parse_qsl(urlsplit(address).query, keep_blank_values=True), names) == question
    assert address.isascii() and '"' not in address and "<" not in address


@given(st.lists(texts, max_size=8))
def test_slugs_are_unique_and_hold_nothing_that_separates(names):
    found = slugs(names, "level")
    assert len(set(found)) == len(names)
    assert all(slug and all(each.isalnum() or each == "-" for each in slug) for slug in found)


def test_addresses_are_readable():
    question = Question({"shift work": ("nights",)}, {"mentor": ("yes", 0.8)}, "passed")
    assert url("s", question, NAMES) == "/study/s/ask?pin=shift-work.nights&set=mentor.yes&reach=mentor.80&watch=passed"
    assert url("s", Question(), NAMES, "answer") == "/study/s/answer"


def test_several_levels_and_bands_are_joined_by_dots():
    question = Question({"shift work": ("mixed", "nights"), "travel time": ("20 to under 45",)})
    assert query(question, NAMES) == "pin=shift-work.mixed.nights&pin=travel-time.20-to-under-45"


def test_the_order_of_an_address_does_not_change_the_question():
    one = parse([("set", "mentor.yes"), ("pin", "passed.no"), ("pin", "shift-work.nights.mixed")], NAMES)
    other = parse([("pin", "shift-work.mixed.nights"), ("pin", "passed.no"), ("set", "mentor.yes")], NAMES)
    assert one == other and list(one.pins) == ["shift work", "passed"]


@pytest.mark.parametrize(("typed", "reach"), [("80", 0.8), (" 80 % ", 0.8), ("12,5", 0.125), ("0", 0.0), ("100", 1.0)])
def test_the_form_of_a_card_sends_a_reach_as_people_type_it(typed, reach):
    assert parse([("set", "mentor.yes"), ("reach.mentor", typed)], NAMES).levers == {"mentor": ("yes", reach)}


@pytest.mark.parametrize(
    ("pair", "says"),
    [
        (("pin", "shoe-size.43"), "no column “shoe-size”"),
        (("pin", "mentor.perhaps"), "no level “perhaps”"),
        (("pin", "mentor"), "no level of it"),
        (("set", "passed.no.yes"), "one level only"),
        (("reach", "mentor.180"), "“180”"),
        (("reach.mentor", "nan"), "“nan”"),
        (("reach.mentor", "<b>"), "“<b>”"),
        (("reach", "passed.50"), "passed, which is not set"),
        (("watch", ""), "names no column."),
        (("pin", ""), "names no column."),
        (("show", "everything"), "“everything”"),
        (("drop", "table"), "“drop”"),
        (("pin", "shift-work.days"), "twice"),
    ],
)
def test_what_cannot_be_read_is_said_and_the_rest_is_kept(pair, says):
    given = [("pin", "shift-work.nights"), ("set", "mentor.yes"), pair]
    with pytest.raises(Misread) as misread:
        parse(given, NAMES)
    assert says in misread.value.message and misread.value.do
    assert misread.value.rest.pins == {"shift work": ("nights",)}
    assert misread.value.rest.levers == {"mentor": ("yes", 1.0)}


def test_the_same_complaint_is_made_once():
    with pytest.raises(Misread) as misread:
        parse([("pin", "shoe.43"), ("drop", "a"), ("pin", "shoe.44"), ("drop", "b"), ("watch", ""), ("set", "")], NAMES)
    assert misread.value.message == (
        "There is no column “shoe” in this model. The address holds “drop”, which means nothing here. "
        "The address names no column."
    )


def test_every_change_of_a_question_leaves_the_rest_alone():
    start = Question({"mentor": ("no",)}, {"mentor": ("yes", 0.5)}, "passed", find="t")
    assert start.pinned("passed", ("no",)).unpinned("passed") == start
    assert start.with_lever("passed", "no").without_lever("passed") == start
    assert start.opening("mentor").folding("mentor") == replace(start, folded=frozenset({"mentor"}))
    assert start.folding("mentor").opening("mentor") == replace(start, opened=frozenset({"mentor"}))
    assert start.folding("mentor").watching("mentor") == replace(start, watch="mentor")
    assert start.asked == replace(start, find="")
