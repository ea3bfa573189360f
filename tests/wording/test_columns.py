"""What is said of columns: small counts cannot be worked out, and amounts read as a person would write them."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.wording import amounts, columns
from engine.records.table import Column, Kind

LIMIT = 10
Blank = Literal["level", "drop row"]


def column(levels: tuple[str, ...], counts: list[int]) -> Column:
    return Column("x", "category", "few values", levels, np.repeat(np.arange(len(counts)), counts).astype(np.int32))


@given(st.lists(st.integers(0, 40), max_size=8))
def test_no_small_count_can_be_worked_out_from_the_total(counts: list[int]) -> None:
    shown = columns.shown(counts, LIMIT)
    small = [place for place, count in enumerate(counts) if 0 < count < LIMIT]
    assert set(small) <= set(shown.hidden)
    assert all(shown.counts[place] is None for place in shown.hidden)
    if small and sum(count > 0 for count in counts) > 1:
        assert len(shown.hidden) > 1
        others = sum(counts[place] > 0 for place in range(len(counts)) if place not in shown.hidden)
        assert shown.together >= LIMIT or others == 0


@given(st.lists(st.integers(LIMIT, 40), max_size=8))
def test_nothing_is_hidden_when_no_count_is_small(counts: list[int]) -> None:
    assert columns.shown(counts, LIMIT).hidden == ()


def test_a_level_under_the_limit_takes_the_next_smallest_along() -> None:
    home = column(("Old Town", "North Bank", "Hillside", "Quay"), [739, 610, 491, 7])
    shown = columns.shown(columns.level_counts(home), LIMIT)
    assert columns.levels(home, shown, LIMIT) == "Old Town 739, North Bank 610, Hillside and Quay 498 together"
    assert columns.small_levels(home, shown, LIMIT) == (
        "Quay has under 10 records. The count of Hillside is hidden too, or one would give the other away."
    )


def test_a_few_blanks_are_told_as_blanks_and_not_as_a_level() -> None:
    age = replace(column(("young", "old", "blank"), [50, 40, 3]), blanks=3)
    told = columns.small_levels(age, columns.shown([50, 40, 3], LIMIT), LIMIT)
    assert told == (
        "Under 10 are blank, few for a level of their own; leaving those rows out may serve better. "
        "The count of old is hidden too, or one would give the other away."
    )


def test_levels_are_told_with_their_shares() -> None:
    shift = column(("days", "mixed", "nights"), [52, 26, 22])
    assert columns.levels(shift, columns.shown([52, 26, 22], LIMIT), LIMIT) == "days 52%, mixed 26%, nights 22%"


@pytest.mark.parametrize(
    ("values", "told"),
    [
        ([4.0, 31.0, 95.0, np.nan], "4 to 95, middle 31, in whole numbers"),
        ([4.5, 31.5, 95.5], "4.5 to 95.5, middle 31.5, in steps of 1"),
        ([0.0, 5.0, 15.0, 1200.0], "0 to 1,200, middle 10, in steps of 5"),
        ([-2.5, 0.0, 3.5], "−2.5 to 3.5, middle 0, in steps of 0.5"),
        ([0.1, 0.2, 0.4, 1.7], "0.1 to 1.7, middle 0.3, in steps of 0.1"),
        (list(np.sqrt(np.arange(2.0, 30.0))), "1.414 to 5.385, middle 3.936, in fine steps"),
        ([21.0, 21.0], "21 to 21, middle 21"),
    ],
)
def test_a_number_is_told_by_its_range_middle_step_and_bands(values: list[float], told: str) -> None:
    levels = ("under 20", "20 and over", "blank")
    travel = Column("t", "number", "", levels, cuts=(20.0,), values=np.array(values))
    assert columns.span(travel) == f"{told}; bands: under 20, 20 and over"
    assert columns.span(replace(travel, kind="weight", levels=(), cuts=())) == told


def test_a_number_says_whether_it_is_learned_as_one_and_why_not() -> None:
    smooth = Column("<t>", "number", "", ("any value",), values=np.sqrt(np.arange(200.0)))
    assert columns.acts(smooth) == "learned as a number; on categories it acts by its bands"
    spiked = replace(smooth, values=np.repeat([0.0, *np.arange(1.0, 151.0)], [50, *[1] * 150]))
    assert columns.acts(spiked) == "learned as bands: 25% of its records hold 0"
    blank = replace(smooth, values=np.append(np.arange(99.0), np.nan), levels=("any value", "blank"), blanks=1)
    assert columns.acts(blank) == "learned as bands: a blank is a level of its own here, which only bands can have"


@pytest.mark.parametrize(
    ("sizes", "told"),
    [
        ([12, 30, 1], "3 groups, the largest of 30 records"),
        ([3, 2], "2 groups, the largest of under 10 records"),
        ([1] * 1200, "1,200 groups of one record each"),
    ],
)
def test_groups_are_told_by_their_number_and_the_largest(sizes: list[int], told: str) -> None:
    site = Column("site", "group", "", codes=np.repeat(np.arange(len(sizes)), sizes).astype(np.int32))
    assert columns.groups(site, LIMIT) == told


@pytest.mark.parametrize(
    ("kind", "blank", "meaning", "words"),
    [
        ("number", 0, "level", "no blanks"),
        ("number", 3, "level", "under 10 blank, a level of its own"),
        ("grade", 30, "level", "a blank is a level of its own"),
        ("category", 60, "drop row", "6% blank, those rows are left out"),
        ("left out", 350, "level", "35% blank"),
        ("group", 350, "level", "35% blank, each a case by itself"),
        ("group", 5, "drop row", "under 10 blank, those rows are left out"),
        ("weight", 125, "drop row", "13% blank, those rows are left out"),
    ],
)
def test_blanks_are_told_with_what_is_made_of_them(kind: Kind, blank: int, meaning: Blank, words: str) -> None:
    assert columns.blanks(Column("x", kind, "", blank=meaning, blanks=blank), 1000, LIMIT) == words


def test_lists_and_counts_read_as_written_by_a_person() -> None:
    assert amounts.listing(["a", "b", "c"]) == "a, b and c"
    assert amounts.listing(["a", "b", "c"], 1) == "a and 2 more"
    assert amounts.people(7, LIMIT) == "under 10"
    assert amounts.people(1847, LIMIT) == "1,847"
    assert amounts.number(-2.5) == "−2.5"
