"""The whole question lives in the address, whatever columns and levels are called."""

from __future__ import annotations

from dataclasses import replace
from urllib.parse import parse_qsl, urlsplit

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.address import Misread, from_a_form, parse
from app.names import Names, slugs
from app.question import SHOWS, By, Question, To, Within, query, url

NAMES = Names(
    [
        ("shift work", ("days", "mixed", "nights")),
        ("mentor", ("no", "yes")),
        ("travel time", ("under 20", "20 to under 45", "45 and over")),
        ("passed", ("no", "yes")),
        ("mentor hours", ("under 5", "5 to under 15", "15 and over")),
    ],
    {"mentor hours"},
)
HOURS = "mentor hours"

amounts = st.floats(-1e15, 1e15).map(lambda value: value + 0.0)
texts = st.text(max_size=12) | st.sampled_from(
    ["<script>", "a.b", "a&b=c", "", "Ä", "ä", "%2E", "a b", "a-b", "夜勤", "-"]
)


@st.composite
def named_questions(draw):
    columns = draw(st.lists(texts, min_size=1, max_size=5, unique=True))
    levels = {name: draw(st.lists(texts, min_size=1, max_size=4, unique=True)) for name in columns}
    numbers = draw(st.sets(st.sampled_from(columns)))
    names = Names([(name, levels[name]) for name in columns], numbers)
    pins, levers = {}, {}
    for name in columns:
        if name in numbers and draw(st.booleans()):
            low, high = sorted(draw(st.tuples(amounts, amounts)))
            ends = [Within(low, high), Within(low, None), Within(None, high)]
            pins[name] = draw(st.sampled_from(ends))
        elif draw(st.booleans()):
            chosen = draw(st.sets(st.sampled_from(levels[name]), min_size=1))
            pins[name] = tuple(level for level in levels[name] if level in chosen)
        if draw(st.booleans()):
            shifts = amounts.filter(bool).map(By)
            settings = amounts.map(To) | shifts if name in numbers else st.sampled_from(levels[name])
            levers[name] = (draw(settings), draw(st.integers(0, 10**6)) / 10**6)
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


@pytest.mark.parametrize(
    ("pin", "lever", "address"),
    [
        (("5 to under 15",), To(12.0), "pin=mentor-hours.5-to-under-15&set=mentor-hours.to.12"),
        (Within(5.5, 12.25), To(0.5), "pin=mentor-hours.from.5.5.under.12.25&set=mentor-hours.to.0.5"),
        (Within(-2.0), By(-2.5), "pin=mentor-hours.from.-2&shift=mentor-hours.by.-2.5"),
        (Within(None, 1e12), By(1e-7), "pin=mentor-hours.under.1000000000000&shift=mentor-hours.by.1e-07"),
        (Within(7.0, 7.0), By(3.0), "pin=mentor-hours.at.7&shift=mentor-hours.by.3"),
    ],
)
def test_addresses_of_numbers_are_readable(pin, lever, address):
    assert query(Question({HOURS: pin}, {HOURS: (lever, 1.0)}), NAMES) == address


@pytest.mark.parametrize(
    ("typed", "value"),
    [("12", 12.0), (" 12.5 ", 12.5), ("12,5", 12.5), ("1,200", 1200.0), ("−1,200.5", -1200.5), ("+3", 3.0)],
)
def test_the_forms_of_a_number_send_values_as_people_type_them(typed, value):
    sent = [
        ("set.mentor-hours", typed),
        ("reach.mentor-hours", "80"),
        ("from.mentor-hours", ""),
        ("under.mentor-hours", typed),
    ]
    assert from_a_form(sent)
    found = parse(sent, NAMES)
    assert found == Question({HOURS: Within(None, value)}, {HOURS: (To(value), 0.8)})
    assert parse([("shift.mentor-hours", typed)], NAMES).levers == {HOURS: (By(value), 1.0)}


def test_a_range_that_is_left_empty_is_no_pin():
    assert parse([("from.mentor-hours", " "), ("under.mentor-hours", "")], NAMES) == Question()


def test_an_address_of_its_own_is_no_form():
    assert not from_a_form(parse_qsl("pin=mentor-hours.from.5.5&set=mentor-hours.to.12&reach=mentor-hours.5&find=a.b"))


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
        (("set", "mentor-hours.12"), "a number and is set to a value"),
        (("set", "mentor-hours.5-to-under-15"), "a number and is set to a value"),
        (("set", "mentor-hours.to."), "No number was given for mentor hours"),
        (("set", "mentor-hours.to.inf"), "“inf”"),
        (("set", "mentor-hours.to.1_000"), "“1_000”"),
        (("set.mentor-hours", "1e300"), "“1e300”"),
        (("set.mentor", "12"), "mentor is no number"),
        (("shift", "mentor.by.2"), "mentor is no number"),
        (("shift", "mentor-hours.by.many"), "“many”"),
        (("shift.mentor-hours", "0"), "leaves mentor hours as it is"),
        (("pin", "mentor-hours.from"), "no range of it"),
        (("pin", "mentor-hours.from.9.under.3"), "9 or over and under 3 at once"),
        (("pin", "mentor-hours.at.nan"), "“nan”"),
        (("under.mentor-hours", "<b>"), "“<b>”"),
        (("from.passed", "3"), "passed is no number"),
    ],
)
def test_what_cannot_be_read_is_said_and_the_rest_is_kept(pair, says):
    given = [("pin", "shift-work.nights"), ("set", "mentor.yes"), pair]
    with pytest.raises(Misread) as misread:
        parse(given, NAMES)
    assert says in misread.value.message and misread.value.do
    assert misread.value.rest.pins == {"shift work": ("nights",)}
    assert misread.value.rest.levers == {"mentor": ("yes", 1.0)}


def test_what_cannot_be_set_is_not_said_to_be_missing():
    with pytest.raises(Misread) as misread:
        parse([("set.mentor-hours", "lots"), ("reach.mentor-hours", "80")], NAMES)
    assert misread.value.message == "“lots” is no number that mentor hours could be."


def test_a_number_is_set_or_shifted_but_not_both():
    with pytest.raises(Misread, match="twice for mentor hours") as misread:
        parse([("set", "mentor-hours.to.3"), ("shift", "mentor-hours.by.2")], NAMES)
    assert misread.value.rest.levers == {HOURS: (To(3.0), 1.0)}


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
