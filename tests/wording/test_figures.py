"""Figures in words: whole per cent, points with their sign, and no figure that contradicts the one beside it."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.wording.figures import Change, column_figure, counted, points, records, share, signed_span

shares = st.floats(0, 1)


@pytest.mark.parametrize(
    ("part", "words"),
    [
        (0.0, "0%"),
        (1e-12, "0%"),
        (0.004, "under 1%"),
        (0.0099, "under 1%"),
        (0.01, "1%"),
        (0.545, "55%"),
        (0.99, "99%"),
        (0.9901, "over 99%"),
        (1 - 1e-12, "100%"),
        (1.0, "100%"),
    ],
)
def test_shares_are_whole_per_cent_and_never_quite_none_or_all(part, words):
    assert share(part) == words


def test_narrow_columns_hold_the_same_figures():
    assert [column_figure(part) for part in (0, 0.004, 0.54, 0.999, 1)] == ["0", "<1", "54", ">99", "100"]


@pytest.mark.parametrize(
    ("change", "decimals", "words"),
    [
        (9.2, 0, "+9 points"),
        (-9.2, 0, "−9 points"),
        (1.4, 0, "+1 point"),
        (-0.6, 0, "−1 point"),
        (0.4, 0, "0 points"),
        (-0.4, 0, "0 points"),
        (1.0, 1, "+1.0 points"),
        (-0.04, 1, "0 points"),
    ],
)
def test_points_carry_their_sign_and_one_is_one(change, decimals, words):
    assert points(change, decimals) == words


def test_the_minus_is_a_minus():
    assert signed_span(-3, 5) == "−3 to +5"


def test_ends_and_change_that_agree_stay_whole():
    change = Change(0.542, 0.63, 0.01, 0.17)
    assert (*change.ends, change.difference, change.interval) == ("54%", "63%", "+9 points", "+1 to +17")


def test_ends_and_change_that_disagree_all_get_one_decimal():
    change = Change(0.544, 0.626, 0.01, 0.17)  # 54 to 63 is 9, but the change is 8.2
    assert (*change.ends, change.difference) == ("54.4%", "62.6%", "+8.2 points")


def test_a_change_too_small_for_whole_figures_gets_one_decimal():
    change = Change(0.5412, 0.5441, 0.001, 0.005)
    assert (*change.ends, change.difference, change.interval) == ("54.1%", "54.4%", "+0.3 points", "+0.1 to +0.5")


def test_an_interval_that_leaves_zero_out_does_not_show_a_zero():
    assert Change(0.54, 0.56, 0.003, 0.037).interval == "+0.3 to +3.7"


def test_an_interval_does_not_shrink_to_one_figure():
    assert Change(0.57, 0.59, 0.016, 0.024).interval == "+1.6 to +2.4"


@given(shares, shares)
def test_a_reader_who_subtracts_the_ends_gets_the_change(start, end):
    change = Change(start, end, min(end - start, 0) - 0.2, max(end - start, 0) + 0.2)
    first, last = change.ends
    if not any(word in first + last for word in ("under", "over")):
        said = float(change.difference.split()[0].replace("−", "-"))
        assert said == pytest.approx(float(last[:-1]) - float(first[:-1]), abs=1e-9)
        assert said == pytest.approx(100 * (end - start), abs=0.51 if change.decimals == 0 else 0.11)


@given(shares, shares)
def test_a_change_that_moves_is_never_written_as_none(start, end):
    change = Change(start, end, end - start - 1e-6, end - start + 1e-6)
    if abs(end - start) > 0.001:
        assert change.moves and change.ends[0] != change.ends[1]


@given(st.integers(10, 5000).flatmap(lambda rows: st.tuples(st.integers(0, rows), st.just(rows))))
def test_a_count_under_ten_is_never_given_away_nor_what_it_leaves(pair):
    held, rows = pair
    words = counted(held, rows, 10)
    if 0 < held < 10:
        assert words == f"under 10 of {rows:,}"
    elif 0 < rows - held < 10:
        assert words == f"all but under 10 of {rows:,}"
    else:
        assert words == f"{held:,} of {rows:,}"


def test_numbers_of_records():
    assert [records(number, 10) for number in (0, 1, 9, 10, 1847)] == [
        "0 records",
        "under 10 records",
        "under 10 records",
        "10 records",
        "1,847 records",
    ]
    assert records(1840, 10, 1847) == "all but under 10 records"
    assert records(1837, 10, 1847) == "1,837 records"
    assert records(1847, 10, 1847) == "1,847 records"
