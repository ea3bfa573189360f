"""The order of levels is read from their names, and only where the names tell it."""

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.grading import LADDERS, grading, natural


def ordered(levels):
    found = grading(levels)
    return None if found is None or found.outside else [levels[place] for place in found.order]


@pytest.mark.parametrize(
    "levels",
    [
        ["low", "medium", "High"],
        ["never", "sometimes", "Always"],
        ["strongly disagree", "disagree", "neutral", "agree", "strongly agree"],
        ["poor", "fair", "good", "very good", "excellent"],
        ["little", "some", "most"],
        ["primary", "lower", "upper"],
        ["S", "M", "L", "XL"],
        ["18-24", "25-34", "35–49", "50+"],
        ["under 18", "18 to 24", "25 and over"],
        ["18 to under 20", "20 to under 30"],
        ["up to 5", "6 to 10", "more than 10"],
        ["18-49", "50 or older"],
        ["< 5", "5-9", ">=10"],
        ["under £10,000", "£10,000-£19,999", "£20,000+"],
        ["10k-20k", "20k-30k", "30k+"],
        ["less than 1 hour", "1-2 hours", "more than 2 hours"],
        ["0 to 10%", "10 to 20%", "over 20%"],
        ["-5 to 0", "0 to 5"],
        ["none", "one or two", "three or more"],
        ["none", "1", "2 or more"],
        ["2 - few", "9 - some", "10 - many"],
        ["Year 7", "Year 8", "Year 11"],
    ],
)
def test_levels_that_tell_their_order_are_grades(levels):
    assert ordered(levels[::-1]) == levels
    assert ordered(sorted(levels)) == levels


@pytest.mark.parametrize(
    "levels",
    [
        ["yes", "no"],
        ["north", "south"],
        ["days", "mixed", "nights"],
        ["Route 5", "Route 12"],
        ["monday", "tuesday"],
        ["m", "s"],
        ["1", "2", "3"],
        ["low", "low "],
        ["low", "purple"],
        ["1-3", "2-4"],
        ["24-18", "25-34"],
        ["12:30-13:00", "13:00-14:00"],
        ["2021-01", "2021-02"],
        ["only one"],
        [],
    ],
)
def test_levels_that_do_not_are_none(levels):
    assert grading(levels) is None


def test_answers_without_a_place_are_set_apart():
    found = grading(["high", "don't know", "low", "medium"])
    assert found.order == (2, 3, 0) and found.outside == (1,)


@given(
    st.lists(st.integers(0, 500), min_size=2, max_size=9, unique=True),
    st.sampled_from(["{}-{}", "{} to {}", "£{}–£{}", "{}-{} km"]),
    st.randoms(),
)
def test_bands_written_as_words_come_back_in_order(edges, words, random):
    edges = sorted(edges)
    levels = [words.format(low, high) for low, high in pairwise(edges)]
    levels = [f"under {edges[0]}", *levels, f"{edges[-1]} and over"]
    shuffled = random.sample(levels, len(levels))
    assert ordered(shuffled) == levels


@given(st.sampled_from(LADDERS), st.data())
def test_words_of_one_ladder_come_back_in_its_order(ladder, data):
    places = sorted(data.draw(st.lists(st.integers(0, len(ladder) - 1), min_size=3, max_size=len(ladder), unique=True)))
    levels = [data.draw(st.sampled_from(ladder[place].split("|"))) for place in places]
    assert ordered([level.upper() for level in levels[::-1]]) == [level.upper() for level in levels]


@given(st.lists(st.integers(0, 10**6), min_size=1, unique=True))
def test_texts_sort_by_the_numbers_in_them(numbers):
    texts = [f"Ward {number}" for number in numbers]
    assert sorted(texts, key=natural) == [f"Ward {number}" for number in sorted(numbers)]


@given(st.lists(st.text(), unique=True))
def test_any_texts_sort_one_way(texts):
    assert sorted(texts, key=natural) == sorted(texts[::-1], key=natural)


@given(st.lists(st.text(min_size=1), max_size=5, unique=True))
def test_an_order_names_each_level_once_or_not_at_all(levels):
    found = grading(levels)
    if found is not None:
        assert sorted(found.order + found.outside) == list(range(len(levels)))
