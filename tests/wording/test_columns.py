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


def test_a_number_is_told_by_its_range_middle_and_bands() -> None:
    values = np.array([4.0, 31.0, 95.0, np.nan])
    travel = Column("t", "number", "", ("under 20", "20 and over", "blank"), cuts=(20.0,), values=values)
    assert columns.span(travel) == "4 to 95, middle 31; bands: under 20, 20 and over"


@pytest.mark.parametrize(
    ("kind", "blank", "meaning", "words"),
    [
        ("number", 0, "level", "no blanks"),
        ("number", 3, "level", "under 10 blank, a level of its own"),
        ("grade", 30, "level", "a blank is a level of its own"),
        ("category", 60, "drop row", "6% blank, those rows are left out"),
        ("left out", 350, "level", "35% blank"),
    ],
)
def test_blanks_are_told_with_what_is_made_of_them(kind: Kind, blank: int, meaning: Blank, words: str) -> None:
    assert columns.blanks(Column("x", kind, "", blank=meaning, blanks=blank), 1000, LIMIT) == words


@pytest.mark.parametrize(
    ("part", "words"), [(0.0, "0%"), (0.004, "under 1%"), (0.545, "55%"), (0.997, "over 99%"), (1.0, "100%")]
)
def test_shares_are_in_whole_per_cent_without_false_certainty(part: float, words: str) -> None:
    assert amounts.share(part) == words


def test_lists_and_counts_read_as_written_by_a_person() -> None:
    assert amounts.listing(["a", "b", "c"]) == "a, b and c"
    assert amounts.listing(["a", "b", "c"], 1) == "a and 2 more"
    assert amounts.people(7, LIMIT) == "under 10"
    assert amounts.people(1847, LIMIT) == "1,847"
    assert amounts.number(-2.5) == "−2.5"
