"""Bands of a number: cut into equal counts, named in words, and met by a level, a value or a range."""

import math
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.bands import (
    band_codes,
    band_levels,
    checked_cuts,
    equal_count_cuts,
    level_positions,
    shortest_between,
)
from engine.refusal import Refusal

finite = st.floats(-1e9, 1e9)
few = st.lists(st.integers(0, 6).map(float), min_size=1, max_size=40)
values = st.one_of(few, st.lists(finite, min_size=1, max_size=40))


@given(values, st.integers(1, 6))
def test_no_band_is_empty_and_there_are_at_most_as_many_as_wished(values, bands):
    cuts = equal_count_cuts(np.array(values), bands)
    sizes = np.bincount(band_codes(np.array(values), cuts), minlength=len(cuts) + 1)
    assert len(sizes) <= bands and (sizes > 0).all()


@given(values)
def test_every_cut_parts_the_values_as_near_to_its_quarter_as_ties_allow(values):
    distinct = sorted(set(values))
    below = [sum(value < each for value in values) for each in distinct[1:]]
    nearest = (
        {min(below, key=lambda count: (abs(count - len(values) * k / 4), -count)) for k in (1, 2, 3)}
        if below
        else set()
    )
    found = [sum(value < cut for value in values) for cut in equal_count_cuts(np.array(values))]
    assert found == sorted(nearest)


@given(st.lists(finite, min_size=8, max_size=40, unique=True))
def test_without_ties_bands_differ_by_one_value_at_most(values):
    sizes = np.bincount(band_codes(np.array(values), equal_count_cuts(np.array(values))))
    assert len(sizes) == 4 and sizes.max() - sizes.min() <= 1


def trailing_zeros(whole):
    return 99 if whole == 0 else len(str(whole)) - len(str(whole).rstrip("0"))


@given(st.integers(-3000, 3000), st.integers(1, 3000), st.integers(0, 3))
def test_a_cut_is_the_number_with_the_fewest_digits_between_the_values(low, width, places):
    high = low + width
    best = max(range(low + 1, high + 1), key=lambda whole: (trailing_zeros(whole), whole))
    found = shortest_between(low / 10**places, high / 10**places)
    assert Decimal(repr(found)) == Decimal(best).scaleb(-places)


@given(st.floats(allow_nan=False, allow_infinity=False), st.floats(allow_nan=False, allow_infinity=False))
def test_a_cut_lies_above_the_lower_and_not_above_the_higher_value(one, other):
    low, high = sorted((one, other))
    if low < high:
        assert low < shortest_between(low, high) <= high


@pytest.mark.parametrize(
    ("cuts", "levels"),
    [
        ((), ("any value",)),
        ((20,), ("under 20", "20 and over")),
        ((20, 45), ("under 20", "20 to under 45", "45 and over")),
        ((-2.5, 0), ("under −2.5", "−2.5 to under 0", "0 and over")),
        ((1000, 25000), ("under 1,000", "1,000 to under 25,000", "25,000 and over")),
        ((1999, 2010), ("under 1999", "1999 to under 2010", "2010 and over")),
        (
            (0.1, 1e15, 1e16),
            (
                "under 0.1",
                "0.1 to under 1,000,000,000,000,000",
                "1,000,000,000,000,000 to under 1e+16",
                "1e+16 and over",
            ),
        ),
    ],
)
def test_bands_are_named_in_words(cuts, levels):
    assert band_levels([float(cut) for cut in cuts]) == levels


@given(st.lists(finite, min_size=1, max_size=8, unique=True).map(sorted))
def test_no_two_bands_have_the_same_name(cuts):
    assert len(set(band_levels(cuts))) == len(cuts) + 1


CUTS = st.lists(st.integers(-5, 5), max_size=4, unique=True).map(lambda cuts: sorted(map(float, cuts)))


@given(CUTS, st.lists(st.integers(-7, 7).map(float) | st.just(math.nan), max_size=20), st.data())
def test_a_range_holds_the_bands_whose_values_it_holds(cuts, values, data):
    edges = [-math.inf, *cuts, math.inf]
    start = data.draw(st.integers(0, len(edges) - 2))
    end = data.draw(st.integers(start + 1, len(edges) - 1))
    low, high = edges[start], edges[end]
    wanted = (None if low == -math.inf and data.draw(st.booleans()) else low, high)
    positions = level_positions([*band_levels(cuts), "blank"], "number", cuts, wanted)
    inside = [code in positions for code in band_codes(np.array(values), cuts)]
    assert inside == [low <= value < high for value in values]


@given(CUTS, st.integers(-7, 7))
def test_a_value_means_the_band_that_holds_it(cuts, value):
    (found,) = level_positions(band_levels(cuts), "number", cuts, value)
    assert found == sum(cut <= value for cut in cuts)


LEVELS = ("under 20", "20 to under 45", "45 and over", "blank")


@pytest.mark.parametrize(
    ("wanted", "positions"),
    [
        ("blank", {3}),
        ({"under 20", "blank"}, {0, 3}),
        (["45 and over", "45 and over"], {2}),
        ((None, None), {0, 1, 2}),
        ((20, 45), {1}),
        ((20, math.inf), {1, 2}),
        (np.int64(20), {1}),
        ([10, 50], {0, 2}),
        ((level for level in ("blank",)), {3}),
    ],
)
def test_ways_to_name_levels_of_a_number(wanted, positions):
    assert level_positions(LEVELS, "number", (20.0, 45.0), wanted) == positions


@pytest.mark.parametrize(
    "wanted",
    [
        *("20", "under 21", "", None, math.nan, True, 10**400),
        *((21, 45), (45, 20), (20, 20), (math.nan, 45), (None, 30)),
        *((), [], {"under 20", "over"}, ["under 20", None], (10**400, None), ("under 20", 45, None)),
    ],
)
def test_what_is_no_level_and_no_whole_bands_is_refused_with_the_column(wanted):
    with pytest.raises(Refusal) as refused:
        level_positions(LEVELS, "number", (20.0, 45.0), wanted, "age")
    assert refused.value.where == "age" and refused.value.do


def test_numbers_name_the_levels_of_a_grade_and_a_pair_is_no_range_there():
    assert level_positions(("1", "2", "3"), "grade", (), 2.0) == {1}
    assert level_positions(("1", "2", "3"), "grade", (), (1, 3)) == {0, 2}
    assert level_positions(("False", "True"), "category", (), True) == {1}


@pytest.mark.parametrize(
    ("cuts", "says"),
    [
        ([3, 2], "do not rise"),
        ([2, 2], "do not rise"),
        ([1, math.inf], "not a number"),
        ([1, math.nan], "not a number"),
        (["5"], "not a number"),
        ("5", "not a number"),
        ([True], "not a number"),
        ([10**400], "not a number"),
    ],
)
def test_cuts_must_be_rising_numbers(cuts, says):
    with pytest.raises(Refusal, match=says) as refused:
        checked_cuts("age", cuts)
    assert refused.value.where == "age" and refused.value.do
